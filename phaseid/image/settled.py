"""From labels to numbered, measured clusters with their notes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.clusters import Cluster, Components
from phaseid.image.components import fit_components
from phaseid.image.counting import grey_counts, range_ends
from phaseid.image.deciding import channelled, finding_of, populations, void_labels
from phaseid.image.finding_clusters import Found
from phaseid.image.greyimage import GreyImage
from phaseid.image.measuring import Measured, measure
from phaseid.image.notices import Finding

# Scatter of a cluster's regions, in noise standard deviations, that is worth saying.
SCATTERED = 0.4
# Orientation contrast is some per cent of the signal; more than this is a change of composition.
ORIENTATION_SHARE = 0.06


ROW_ERROR = 0.05


@dataclass(frozen=True, eq=False)
class Settled:
    """Everything that depends on the labels."""

    clusters: tuple[Cluster, ...]
    labels: NDArray[np.uint8]
    edge_bits: NDArray[np.uint8]
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]]
    mixture: Components
    warnings: tuple[Finding, ...]
    regions: NDArray[Any]


def settle(image: GreyImage, found: Found) -> Settled:
    """Measure the clusters, merge what is one phase, number them by grey, and say what limits them.

    Parameters
    ----------
    image : GreyImage
    found : Found

    Returns
    -------
    Settled
    """
    labels = found.labels
    if not labels.any():
        raise InputError("Nothing of the image is left; exclude less.")
    histogram = grey_counts(image.data, labels)
    ends = range_ends(histogram, image)
    warnings = list(found.warnings)
    specks = dict(found.specks)
    measured = _measured(image, found, labels, ends)
    present = [int(k) for k in np.flatnonzero(measured.pixels)]
    if found.automatic:
        pairs = channelled(measured, found.noise, [k for k in present if k not in specks])
        if pairs:
            table = np.arange(256, dtype=np.uint8)
            for a, b in pairs:
                table[table == table[b]] = table[a]
            labels = table[labels]
            measured = _measured(image, found, labels, ends)
            present = [int(k) for k in np.flatnonzero(measured.pixels)]
            scatter = max(float(measured.scatter[table[a]]) for a, _ in pairs)
            warnings.append(finding_of("channelling", scatter))
    present.sort(key=lambda k: specks[k][0] if k in specks else measured.mean[k])
    number = np.zeros(256, dtype=np.uint8)
    number[present] = np.arange(1, len(present) + 1)
    labels = number[labels]
    regions = measured.regions
    regions["cluster"] = number[regions["cluster"]]
    used = float(measured.pixels.sum())
    lowest = 0.0 if ends[0] is None else min(ends[0], float(measured.mean[present[0]]))
    dark = void_labels(measured, found.noise, [k for k in present if k not in specks], lowest)
    clusters = tuple(
        _cluster(measured, k, int(number[k]), used, found, specks, k in dark) for k in present
    )
    if found.automatic:
        warnings += _scattered(measured, found, clusters, present, warnings)
    voids = sum(c.area_fraction for c in clusters if c.kind == "void")
    if voids and found.automatic:
        warnings.append(finding_of("pores", voids))
    mixture = fit_components(histogram, clusters, found.noise, ends)
    return Settled(clusters, labels, measured.edge, histogram, mixture, tuple(warnings), regions)


def _scattered(
    measured: Measured,
    found: Found,
    clusters: tuple[Cluster, ...],
    present: list[int],
    before: list[Finding],
) -> list[Finding]:
    """Say of phases that their regions differ more than noise explains."""
    spread = populations(measured, found.noise, present)
    said = {w.code for w in before}
    new: list[Finding] = []
    for k, cluster in zip(present, clusters, strict=True):
        scatter = spread[k].scatter
        noise_sd = float(found.noise.sd(cluster.grey_mean))
        if cluster.kind == "void" or k in found.specks or cluster.clipped:
            continue
        # Compression and imperfectly flattened shading widen a cluster too.
        least = SCATTERED * (1.0 if not said & {"lossy-blocks", "shading"} else 2.0)
        if scatter < least * noise_sd or scatter < 2.0 * cluster.grey_se:
            continue
        orientation = scatter < ORIENTATION_SHARE * max(abs(cluster.grey_mean), 1e-9)
        code = "channelling" if orientation else "zoned"
        if code not in said:
            said.add(code)
            new.append(finding_of(code, scatter if orientation else cluster.grey_mean))
    return new


def _measured(
    image: GreyImage,
    found: Found,
    labels: NDArray[np.uint8],
    ends: tuple[float | None, float | None],
) -> Measured:
    return measure(
        image.data,
        labels,
        found.noise,
        found.shading,
        found.crop[0],
        ends,
        image.pixel_size_nm,
        found.blur_px,
        found.muted,
    )


def _cluster(
    measured: Measured,
    label: int,
    number: int,
    used: float,
    found: Found,
    specks: dict[int, tuple[float, float]],
    void: bool,
) -> Cluster:
    mean, se = float(measured.mean[label]), float(measured.se[label])
    sd = float(measured.sd[label])
    if found.shading.lines is not None:
        # Row offsets are known to some hundredths of the noise, and are common to all of a row.
        se = float(np.hypot(se, ROW_ERROR * found.noise.sd(mean)))
    notes = []
    if label in specks:
        mean, se = specks[label]
        sd = max(float(found.noise.sd(mean)), 1e-9)
        notes.append("occurs only in small specks; the grey is corrected for blur")
    elif measured.interior[label] < 20:
        notes.append("has almost no interior; its grey is a blend with its surroundings")
    noise_sd = float(found.noise.sd(mean))
    if label not in specks and not void:
        scatter = float(measured.scatter[label])
        if scatter > 0.3 * noise_sd and scatter > 2.0 * se / np.sqrt(2):
            notes.append(
                f"its regions differ by {scatter:.2g} levels more than noise explains; phases less than "
                f"{2 * scatter:.2g} levels apart cannot be told from one another in it"
            )
    clipped = measured.clipped(label)
    if clipped:
        share = measured.low[label] if clipped == "low" else measured.high[label]
        notes.append(f"{share:.0%} of its pixels are cut off; its grey is only a bound")
    fraction = float(measured.pixels[label]) / used
    table = measured.regions
    return Cluster(
        id=number,
        grey_mean=mean,
        grey_se=se,
        grey_sd=sd,
        clipped=clipped,
        area_fraction=fraction,
        pixels=int(measured.pixels[label]),
        regions=int(np.count_nonzero(table["cluster"] == number)),
        kind="void" if void else "phase",
        weight=fraction,
        component_sd=sd,
        interior_pixels=int(measured.interior[label]),
        notes=tuple(notes),
    )
