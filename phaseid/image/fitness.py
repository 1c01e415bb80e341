"""Whether an image is fit for reading greys: each doubt with a code, a sentence and a remedy."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.counting import grey_counts, grey_step, range_ends
from phaseid.image.greyimage import GreyImage
from phaseid.image.infobar import used_rows
from phaseid.image.metadata import is_secondary
from phaseid.image.noise import NoiseLaw, estimate_noise
from phaseid.image.notices import Finding
from phaseid.image.tiling import joins_of

# Common practice: above about one per cent at an end, the greys there are only bounds.
CLIPPED = 0.01
CLIPPED_BADLY = 0.05
FEW_LEVELS = 48
FEWEST_LEVELS = 12
DITHER = 0.5
NARROW_SHARE = 0.15
COMB_SHARE = 0.15
# Mean squared difference across the borders of 8 x 8 blocks over that inside of them.
BLOCK_RATIO = 1.10
BLOCK_SIGMAS = 4.0
# Phases a step of atomic number apart differ by some three per cent of the signal (Fe-Co, 20 keV).
FAINT_CONTRAST = 0.03
SMALLEST_SIGNAL_TO_NOISE = 3.0


def assess(
    image: GreyImage, noise: NoiseLaw | None = None, wanted_contrast: float = FAINT_CONTRAST
) -> list[Finding]:
    """Judge an image before its greys are used.

    Parameters
    ----------
    image : GreyImage
    noise : NoiseLaw, optional
        Estimated from the image if not given.
    wanted_contrast : float
        Smallest difference in signal that is to be seen, as a share of the signal.

    Returns
    -------
    list of Finding
        Most serious first; empty for a fit image. What was noticed while reading comes with it.
    """
    first, end = used_rows(image.data, image.provenance.get("image_rows"))
    data = image.data[first:end]
    noise = noise if noise is not None else estimate_noise(data)
    histogram = grey_counts(data)
    found = list(image.flags)
    if end - first < image.data.shape[0]:
        found.append(_bar(image, first, end))
    found += _clipping(histogram, image)
    found += _levels(histogram, image, noise, data)
    found += _detector(image)
    found += _blocks(data)
    found += joins_of(data, noise)
    found += _signal_to_noise(histogram, noise, wanted_contrast)
    order = {"serious": 0, "caution": 1, "note": 2}
    return sorted(found, key=lambda f: order[f.severity])


def _bar(image: GreyImage, first: int, end: int) -> Finding:
    rows = image.data.shape[0]
    where = f"rows {end} to {rows - 1}" if first == 0 else f"rows 0 to {first - 1}"
    return Finding(
        "info-bar", f"A bar of text ({where}) is not part of the image and is left out.", "", "note"
    )


def _clipping(
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]], image: GreyImage
) -> list[Finding]:
    values, counts = histogram
    low, high = range_ends(histogram, image)
    total = counts.sum()
    found = []
    for end, name, code in ((low, "darkest", "clipped-low"), (high, "brightest", "clipped-high")):
        if end is None:
            continue
        at_end = values <= end if code == "clipped-low" else values >= end
        share = float(counts[at_end].sum() / total)
        if share < CLIPPED:
            continue
        badly = share >= CLIPPED_BADLY and code == "clipped-high"
        found.append(
            Finding(
                code,
                f"{share:.1%} of the pixels have the {name} grey, {end:g}: what lies beyond is cut off, "
                "so such a phase has only a bound and cannot serve as a reference.",
                "Lower the contrast"
                + (
                    " or the brightness." if code == "clipped-high" else " or raise the brightness."
                ),
                "serious" if badly else "caution",
            )
        )
    return found


def _levels(
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]],
    image: GreyImage,
    noise: NoiseLaw,
    data: NDArray[Any],
) -> list[Finding]:
    values, counts = histogram
    if image.data.dtype.kind != "u":
        return []
    found = []
    used = int(np.count_nonzero(counts))
    span = float(values[-1] - values[0])
    cumulative = np.cumsum(counts) / counts.sum()
    bulk = (cumulative > 0.005) & (cumulative < 0.995)
    inside = counts[bulk]
    empty = float(np.mean(inside == 0)) if len(inside) > 8 else 0.0
    step = grey_step(data)
    width = float(values[bulk][-1] - values[bulk][0]) if bulk.any() else 0.0
    typical = float(noise.sd(np.median(data)))
    # Of a 16-bit image not every grey need occur; gaps are a comb only where the noise would fill them.
    if empty > COMB_SHARE and used >= 4 and step > 1 and typical > 0.5 and counts.sum() > 20 * span:
        found.append(
            Finding(
                "comb-histogram",
                f"{empty:.0%} of the greys between the others never occur (a comb): the image was "
                f"stretched after recording, to steps of {step:g} levels.",
                "Use the image as recorded, without contrast stretch.",
            )
        )
    elif len(inside) > 16:
        found += _spikes(values[bulk], inside)
    # Noise of a level or more carries the greys between the levels through any average.
    if used < FEWEST_LEVELS or (used < FEW_LEVELS and typical < DITHER):
        found.append(
            Finding(
                "few-grey-levels",
                f"Only {used} grey levels occur; steps between phases may be lost to rounding.",
                "Record with more contrast, or 16 bits.",
                "caution" if typical > 0.4 else "serious",
            )
        )
    limits = image.full_range
    if limits is not None and width < NARROW_SHARE * (limits[1] - limits[0]) and image.bits <= 8:
        found.append(
            Finding(
                "narrow-range",
                f"The greys use {width:.0f} of {limits[1] - limits[0]:.0f} levels.",
                "Raise the contrast so that the phases of interest fill the range.",
                "note",
            )
        )
    return found


def _spikes(values: NDArray[np.float64], counts: NDArray[np.int64]) -> list[Finding]:
    """Greys that hold about twice their neighbours, at even spacing: two recorded levels in one."""
    middle = counts[1:-1].astype(float)
    around = 0.5 * (counts[:-2] + counts[2:])
    excess = (middle - around) / np.sqrt(np.maximum(middle + around, 1.0))
    spikes = (excess > 8) & (middle > 1.5 * around)
    if np.count_nonzero(spikes) < 4:
        return []
    gaps = np.diff(values[1:-1][spikes])
    if np.ptp(gaps) > 1.0 + 0.2 * gaps.mean():
        return []
    return [
        Finding(
            "comb-histogram",
            f"Every {gaps.mean():.1f}th grey holds about twice as many pixels as its neighbours: the "
            "contrast was compressed after recording.",
            "Use the image as recorded.",
        )
    ]


def _detector(image: GreyImage) -> list[Finding]:
    found = []
    if is_secondary(image.detector):
        found.append(
            Finding(
                "secondary-electrons",
                f"The metadata name the detector {image.detector!r}, which records secondary electrons: "
                "its greys show topography and surface, not composition.",
                "Use the backscattered-electron image of the same field.",
                "serious",
            )
        )
    if image.tilt_deg is not None and abs(image.tilt_deg) > 2:
        found.append(
            Finding(
                "tilted",
                f"The metadata give a stage tilt of {image.tilt_deg:g} degrees, which compresses the contrast.",
                "Check whether the surface is tilted against the beam, and give the tilt.",
            )
        )
    return found


def _blocks(data: NDArray[Any]) -> list[Finding]:
    """Look for steps along a grid of 8 pixels."""
    if min(data.shape) < 64:
        return []
    part = data[: 8 * (data.shape[0] // 8)]
    step = max(1, part.shape[0] // 1024)
    ratios = []
    for array in (part[::step], part[:, :: max(1, part.shape[1] // 1024)].T):
        difference = np.abs(np.diff(array.astype(np.float32), axis=1))
        by_column = difference.mean(axis=0)
        by_phase = np.array([by_column[k::8].mean() for k in range(8)])
        others = by_phase[:7]
        scatter = float(others.std()) + 1e-3 * float(others.mean()) + 1e-9
        ratios.append(
            (by_phase[7] / max(others.mean(), 1e-9), (by_phase[7] - others.mean()) / scatter)
        )
    if min(r[0] for r in ratios) < BLOCK_RATIO or min(r[1] for r in ratios) < BLOCK_SIGMAS:
        return []
    return [
        Finding(
            "lossy-blocks",
            f"Steps along a grid of 8 pixels are {np.mean([r[0] for r in ratios]) - 1:.0%} larger than "
            "elsewhere: the image went through a lossy (JPEG) compression, which moves greys.",
            "Export the image as TIFF or PNG from the instrument.",
        )
    ]


def _signal_to_noise(
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]],
    noise: NoiseLaw,
    wanted_contrast: float,
) -> list[Finding]:
    values, counts = histogram
    median = float(values[np.searchsorted(np.cumsum(counts), counts.sum() / 2)])
    # Black is taken as no signal; with a raised black level the contrast is less still.
    span = max(median, 1e-9)
    sd = float(noise.sd(median))
    # What a grain of 100 pixels tells.
    error = sd * float(np.sqrt(noise.correlated_pixels / 100))
    ratio = wanted_contrast * span / max(error, 1e-12)
    if ratio >= SMALLEST_SIGNAL_TO_NOISE:
        return []
    return [
        Finding(
            "noisy",
            f"The noise is {sd:.3g} levels; even grains of 100 pixels that differ by {wanted_contrast:.0%} "
            f"of the signal stand only {ratio:.1f} standard errors apart.",
            f"Average {int(np.ceil((SMALLEST_SIGNAL_TO_NOISE / max(ratio, 1e-3)) ** 2))} frames, or dwell longer.",
            "note",
        )
    ]


def codes(findings: Sequence[Finding]) -> list[str]:
    """Codes of findings, in order."""
    return [f.code for f in findings]
