"""From what the user said and what the image's metadata say to the conditions that are used."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Protocol

from phaseid.errors import InputError
from phaseid.physics.conditions import Coat, Conditions
from phaseid.physics.detector import Detector
from phaseid.physics.elemental import BackscatterModel
from phaseid.session.answers import Notice
from phaseid.session.state import State


class HasConditions(Protocol):
    """What an image's metadata may tell."""

    @property
    def energy_keV(self) -> float | None: ...
    @property
    def tilt_deg(self) -> float | None: ...


def settle(
    state: State,
    images: Sequence[HasConditions],
    names: Sequence[str],
    model_named: Callable[[str], str | BackscatterModel] = str,
) -> tuple[Conditions, list[Notice]]:
    """Choose the conditions of an analysis.

    Parameters
    ----------
    state : State
    images : sequence
        Images analysed together; they must agree.
    names : sequence of str
        What to call them in messages.
    model_named : callable
        Finds a backscatter model by name, so that those of plugins can be chosen.

    Returns
    -------
    conditions : Conditions
    notices : list of Notice

    Raises
    ------
    InputError
        If the beam energy is neither given nor in the metadata, or the images disagree.
    """
    notices: list[Notice] = []
    found = {i.energy_keV for i in images if i.energy_keV is not None}
    energy = state.energy_keV
    if energy is None:
        if len(found) > 1:
            raise InputError(
                f"The metadata of {', '.join(names)} give different beam energies "
                f"({', '.join(f'{e:g}' for e in sorted(found))} keV); images of one series need one: "
                "analyse them separately or give the energy."
            )
        if not found:
            raise InputError(
                f"The beam energy of {names[0]} is not in its metadata; give it, for example "
                "--energy 20."
            )
        energy = found.pop()
    elif any(abs(e - energy) > 0.02 * energy for e in found):
        notices.append(
            Notice(
                "energy-differs",
                f"The metadata give a beam energy of {sorted(found)[0]:g} keV, {energy:g} keV was given "
                "and is used.",
                "Check which is right.",
            )
        )
    tilts = {i.tilt_deg for i in images if i.tilt_deg is not None}
    tilt = (
        state.tilt_deg if state.tilt_deg is not None else (tilts.pop() if len(tilts) == 1 else 0.0)
    )
    options: dict[str, object] = {}
    if state.model is not None:
        options["model"] = model_named(state.model)
    if state.rule is not None:
        options["rule"] = state.rule
    conditions = Conditions(
        energy_keV=energy,
        tilt_deg=abs(tilt),
        coat=Coat.parse(state.coat) if state.coat else None,
        detector=parse_detector(state.detector),
        **options,  # type: ignore[arg-type]
    )
    notices += [Notice(flag.code, flag.message) for flag in conditions.flags]
    return conditions, notices


def parse_detector(text: str | None) -> Detector:
    """Read KIND or KIND:THRESHOLD_KEV.

    Raises
    ------
    InputError
        If the kind is unknown or the threshold is no number.
    """
    if text is None:
        return Detector()
    kind, _, threshold = text.partition(":")
    if not threshold:
        return Detector(kind)
    try:
        value = float(threshold)
    except ValueError:
        raise InputError(
            f"The detector threshold {threshold!r} is not a number of keV; write for example "
            "solid-state:2."
        ) from None
    return Detector(kind, value)
