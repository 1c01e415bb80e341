"""Decisions on measured clusters: one phase in many orientations, zoning, pores; words for each."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.measuring import Measured
from phaseid.image.noise import NoiseLaw
from phaseid.image.notices import Finding

FloatArray = NDArray[np.float64]

# Orientation contrast of a metal's grains, as a share of the grey (common practice: up to 10 %).
CHANNELLING_SHARE = 0.10
CHANNELLING_SPAN = 0.25
# Separation of two clusters in units of their regions' own scatter; more where regions are few, because
# few regions leave gaps by chance.
SEPARATION = 3.6
FEW_REGIONS = 14.0
SMALLEST_REGION = 30
# The noise law is known to a few per cent.
NOISE_MARGIN = 1.06
ZONED = 0.5


@dataclass(frozen=True)
class Population:
    """Greys of the regions of one cluster."""

    mean: float
    scatter: float
    regions: float
    pixels: float


def populations(measured: Measured, noise: NoiseLaw, labels: list[int]) -> dict[int, Population]:
    """Region statistics per label, of regions large enough to count.

    Where grains grow together into one region, their differences show in the pixels' spread instead.
    """
    table = measured.regions[measured.regions["interior_pixels"] >= SMALLEST_REGION]
    found = {}
    for k in labels:
        mean = float(measured.mean[k])
        variance = float(noise.variance(mean))
        inner = max(float(measured.sd[k]) ** 2 - NOISE_MARGIN * variance, 0.0)
        mine = table[table["cluster"] == k]
        weight = mine["interior_pixels"].astype(float)
        excess, effective = 0.0, 0.0
        if len(mine):
            share = weight / weight.sum()
            mean = float(share @ mine["grey_mean"])
            excess = float(share @ ((mine["grey_mean"] - mean) ** 2 - mine["grey_se"] ** 2))
            effective = 1.0 / float(np.sum(share**2))
        scatter = float(np.sqrt(max(excess, inner, 0.0)))
        found[k] = Population(mean, scatter, effective, float(measured.pixels[k]))
    return found


def channelled(measured: Measured, noise: NoiseLaw, labels: list[int]) -> list[tuple[int, int]]:
    """Pairs of neighbouring clusters that are orientations of one phase.

    Grains of one phase differ by their orientation continuously; cut into clusters, each cluster's regions
    scatter about as much as the clusters lie apart. Regions of true phases agree within their errors.

    Returns
    -------
    list of (label, label)
        To be merged, in this order.
    """
    found = populations(measured, noise, labels)
    merged: list[tuple[int, int]] = []
    alive = sorted(labels, key=lambda k: found[k].mean)
    span = {k: (found[k].mean, found[k].mean) for k in alive}
    while len(alive) > 1:
        best, pair = np.inf, -1
        for n, (a, b) in enumerate(itertools.pairwise(alive)):
            score = _apart(found[a], found[b], noise, (*span[a], *span[b]))
            if score < best:
                best, pair = score, n
        if best >= 1.0:
            break
        a, b = alive[pair], alive[pair + 1]
        merged.append((a, b))
        found[a] = _united(found[a], found[b])
        span[a] = (span[a][0], span[b][1])
        del alive[pair + 1]
    return merged


def _apart(
    a: Population, b: Population, noise: NoiseLaw, spans: tuple[float, float, float, float]
) -> float:
    """Separation over the least that two phases need; below one they are one phase."""
    step = b.mean - a.mean
    grey = max(abs(b.mean), 1e-9)
    gap, span = spans[2] - spans[1], spans[3] - spans[0]
    if gap > CHANNELLING_SHARE * grey or span > CHANNELLING_SPAN * grey:
        return np.inf
    fewest = max(min(a.regions, b.regions), 1.0)
    # An error of a few per cent of the noise is always there, from borders drawn a little wrong.
    floor = 0.02 * float(noise.sd(b.mean))
    scatter = np.sqrt((a.scatter**2 + b.scatter**2) / 2 + floor**2)
    if fewest < 3.0:
        # A single grain has no scatter of its own to show; its neighbours' speaks for it.
        scatter = np.hypot(max(a.scatter, b.scatter), floor)
    return float(step / scatter / (SEPARATION + FEW_REGIONS / fewest))


def _united(a: Population, b: Population) -> Population:
    total = a.pixels + b.pixels
    mean = (a.pixels * a.mean + b.pixels * b.mean) / total
    variance = (
        a.pixels * (a.scatter**2 + (a.mean - mean) ** 2)
        + b.pixels * (b.scatter**2 + (b.mean - mean) ** 2)
    ) / total
    return Population(mean, float(np.sqrt(variance)), a.regions + b.regions, total)


def void_labels(
    measured: Measured, noise: NoiseLaw, ascending: list[int], lowest: float
) -> set[int]:
    """Darkest clusters that look like pores, cracks or mounting medium.

    Parameters
    ----------
    measured : Measured
    noise : NoiseLaw
    ascending : list of int
        Labels by grey.
    lowest : float
        Lowest grey the range holds.

    Returns
    -------
    set of int
        Never the brightest.
    """
    found: set[int] = set()
    brightest = float(measured.mean[ascending[-1]])
    for k in ascending[:-1]:
        mean = float(measured.mean[k])
        share = (mean - lowest) / max(brightest - lowest, 1e-9)
        rough = float(measured.sd[k]) / max(float(noise.sd(mean)), 1e-9)
        cut = measured.clipped(k) == "low"
        first = not found
        if (
            cut
            or (share < 0.25 and rough > 1.3)
            or (share < 0.5 and rough > (3.0 if first else 5.0))
        ):
            found.add(k)
        else:
            break
    return found


def finding_of(code: str, amount: float = 0.0, unit: str = "") -> Finding:
    """The sentence for something noticed while clustering."""
    message, remedy, severity = SENTENCES[code]
    return Finding(code, message.format(amount=amount, unit=unit), remedy, severity)  # type: ignore[arg-type]


SENTENCES: dict[str, tuple[str, str, str]] = {
    "shading": (
        "The grey drifts smoothly by {amount:.3g} levels across the image; this was taken off.",
        "Centre the detector and the sample, or keep to the middle of the field.",
        "note",
    ),
    "line-noise": (
        "Rows differ by an offset of {amount:.2g} levels (standard deviation); this was taken off.",
        "Average frames instead of lines, and check for mains hum.",
        "note",
    ),
    "charging-bands": (
        "Bands of rows jump by up to {amount:.3g} levels, as charging makes; this was taken off as far as "
        "it is common to whole rows.",
        "Coat the sample, lower the current or the dwell time, or use low vacuum.",
        "caution",
    ),
    "channelling": (
        "Grains of one phase differ by {amount:.2g} levels (standard deviation), as crystal orientation makes "
        "(channelling contrast); they were kept as one phase.",
        "Average over many grains, tilt slightly or widen the beam's convergence before trusting small "
        "grey differences.",
        "caution",
    ),
    "zoned": (
        "Regions of the cluster at grey {amount:.4g} differ more than noise explains: zoning, a solid "
        "solution or orientation contrast.",
        "Split the cluster if its regions form groups.",
        "note",
    ),
    "slope": (
        "Greys between {unit} change gradually and were kept as one phase.",
        "Split the cluster at a grey if you know better.",
        "note",
    ),
    "blends": (
        "Greys that occur only as borders or thin layers between a darker and a brighter phase were not "
        "taken for a phase ({amount:.2%} of the area).",
        "Use a finer pixel or a lower beam energy if a thin layer is expected there.",
        "note",
    ),
    "cracks": (
        "Dark lines (cracks) cover {amount:.2%} of the area; they are no phase.",
        "Nothing, unless they are expected to be filled.",
        "note",
    ),
    "scratches": (
        "Bright lines (scratches or ridges) cover {amount:.2%} of the area; they are no phase.",
        "Polish again if they disturb.",
        "note",
    ),
    "pores": (
        "{amount:.2%} of the area is dark and uneven: pores, cracks or mounting medium rather than a phase.",
        "Do not use this grey as a reference.",
        "note",
    ),
    "lone-specks": (
        "{amount:.0f} small spots differ from their surroundings but are too few to be called a phase.",
        "Look at them at a higher magnification.",
        "note",
    ),
}
