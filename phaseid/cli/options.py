"""Options that several commands share, and how they become a state."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import Any

import click

from phaseid.errors import InputError
from phaseid.session.state import Mark, MarkKind, State


def conditions_options(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add beam energy, tilt, coat, detector, model and rule."""
    for option in reversed(
        [
            click.option("--energy", type=float, metavar="KEV", help="Beam energy."),
            click.option("--tilt", type=float, metavar="DEG", help="Tilt from normal incidence."),
            click.option("--coat", metavar="MATERIAL:NM", help="Conductive coat, e.g. C:15."),
            click.option(
                "--detector",
                metavar="KIND[:KEV]",
                help="Detector and its threshold, e.g. solid-state:2.",
            ),
            click.option("--model", metavar="NAME", help="Backscatter model."),
            click.option("--rule", metavar="NAME", help="Compound rule."),
        ]
    ):
        command = option(command)
    return command


def database_option(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add --database."""
    return click.option(
        "--database",
        "databases",
        multiple=True,
        metavar="FILE",
        help="A database file beside those that ship; repeatable.",
    )(command)


def evidence_options(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add everything that can be said about greys and contexts."""
    for option in reversed(
        [
            click.option(
                "--context",
                "contexts",
                multiple=True,
                metavar="NAME",
                help="What the sample is, e.g. steel/aluminium-killed; repeatable.",
            ),
            click.option(
                "--clusters",
                type=click.IntRange(1, 60),
                metavar="N",
                help="Force the number of clusters.",
            ),
            click.option(
                "--known",
                multiple=True,
                metavar="GREY=PHASE",
                help="The cluster nearest GREY is PHASE; repeatable.",
            ),
            click.option(
                "--standard",
                multiple=True,
                metavar="GREY=FORMULA",
                help="A standard imaged at the same settings; repeatable.",
            ),
            click.option("--dark", type=float, metavar="GREY", help="Grey with no beam."),
            click.option(
                "--seen",
                multiple=True,
                metavar="GREY:Fe,O",
                help="X-ray elements found in the cluster nearest GREY; repeatable.",
            ),
            click.option(
                "--unseen",
                multiple=True,
                metavar="GREY:Mg",
                help="X-ray elements looked for and not found; repeatable.",
            ),
            click.option(
                "--content",
                multiple=True,
                metavar="GREY:Fe=60,O=30",
                help="A quick quantification in mass per cent; repeatable.",
            ),
        ]
    ):
        command = option(command)
    return command


def build_state(
    *,
    energy: float | None,
    tilt: float | None,
    coat: str | None,
    detector: str | None,
    model: str | None,
    rule: str | None,
    contexts: Sequence[str] = (),
    databases: Sequence[str] = (),
    known: Sequence[str] = (),
    standard: Sequence[str] = (),
    dark: float | None = None,
    seen: Sequence[str] = (),
    unseen: Sequence[str] = (),
    content: Sequence[str] = (),
    same_settings: bool = False,
) -> State:
    """The state that the options describe, without images.

    Raises
    ------
    InputError
        If an option is not of its form.
    """
    state = State(
        energy_keV=energy,
        tilt_deg=tilt,
        coat=coat,
        detector=detector,
        model=model,
        rule=rule,
        contexts=tuple(contexts),
        databases=tuple(databases),
        same_settings=same_settings,
    )
    marks = [_mark("known", "--known", "=", "GREY=PHASE", text) for text in known]
    marks += [_mark("standard", "--standard", "=", "GREY=FORMULA", text) for text in standard]
    if dark is not None:
        marks.append(Mark("dark", dark))
    marks += [_mark("seen", "--seen", ":", "GREY:Fe,O", text) for text in seen]
    marks += [_mark("unseen", "--unseen", ":", "GREY:Mg", text) for text in unseen]
    marks += [_mark("content", "--content", ":", "GREY:Fe=60,O=30", text) for text in content]
    return replace(state, marks=tuple(marks))


def _mark(kind: MarkKind, option: str, separator: str, form: str, text: str) -> Mark:
    grey, found, value = text.partition(separator)
    try:
        number = float(grey)
    except ValueError:
        number = float("nan")
    if not found or not value.strip() or number != number or abs(number) == float("inf"):
        raise InputError(
            f"{option} {text!r} is not of the form {form}; write for example {_EXAMPLE[kind]}."
        )
    return Mark(kind, number, value.strip())


_EXAMPLE = {
    "known": "--known 142=Quartz",
    "standard": '--standard 200="Cu"',
    "seen": "--seen 142:Si,O",
    "unseen": "--unseen 142:Al",
    "content": "--content 142:Si=47,O=53",
}
