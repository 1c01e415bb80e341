"""Table and plot of what can be told apart."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

if TYPE_CHECKING:
    from matplotlib.figure import Figure

ROSE = 5.0
SURE = 2.0


def verdict(pair: Mapping[str, Any]) -> str:
    """What a pair's numbers mean, in words."""
    noise, model = pair["noise_ratio"], pair["model_ratio"]
    if pair["contrast"] is None or not pair["contrast"]:
        return "no contrast"
    if noise is not None and noise < ROSE:
        return "hidden by noise"
    if model is not None and model < SURE:
        return "apart, but which is brighter is not sure"
    return "apart"


def separation_table(document: Mapping[str, Any]) -> Group:
    """Table of a separation document."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0))
    table.add_column("pair", overflow="fold")
    for heading in ("keV", "tilt", "contrast %", "electrons", "noise ratio", "boundary um"):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("verdict", overflow="fold")
    last = None
    for pair in document["pairs"]:
        name = f"{pair['first']} / {pair['second']}"
        contrast, electrons = pair["contrast"], pair["electrons_per_pixel"]
        table.add_row(
            Text(name if name != last else ""),
            f"{pair['energy_keV']:g}",
            f"{pair['tilt_deg']:g}",
            "" if contrast is None else f"{100 * contrast:.2f}",
            "" if electrons is None else f"{electrons:.3g}",
            "" if pair["noise_ratio"] is None else f"{pair['noise_ratio']:.1f}",
            "" if pair["resolution_um"] is None else f"{pair['resolution_um']:.2f}",
            verdict(pair),
        )
        last = name
    notes: list[RenderableType] = [
        table,
        Text(
            "contrast: difference over the brighter signal; electrons: per pixel by the Rose criterion "
            "(difference over noise of 5); boundary: width over which the two blend."
        ),
    ]
    notes += [Text(f"(!) {p['name']}: {p['hazard']}") for p in document["phases"] if p["hazard"]]
    return Group(*notes)


def plot_separation(document: Mapping[str, Any]) -> Figure:
    """Contrast of every pair against beam energy."""
    from matplotlib.figure import Figure

    drawn = Figure(figsize=(8, 5), layout="constrained")
    axes = drawn.add_subplot()
    curves: dict[tuple[str, str, float], list[tuple[float, float]]] = {}
    for pair in document["pairs"]:
        if pair["contrast"] is not None:
            key = (pair["first"], pair["second"], pair["tilt_deg"])
            curves.setdefault(key, []).append((pair["energy_keV"], 100 * pair["contrast"]))
    tilted = len({key[2] for key in curves}) > 1
    for (first, second, tilt), points in curves.items():
        label = f"{first} / {second}" + (f", {tilt:g} degrees" if tilted else "")
        axes.plot(*zip(*points, strict=True), marker="o", label=label)
    axes.set_xlabel("beam energy (keV)")
    axes.set_ylabel("contrast (% of the brighter signal)")
    axes.set_ylim(bottom=0)
    axes.legend(fontsize=8)
    return drawn
