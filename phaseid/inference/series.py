"""Images taken at the same settings: which clusters recur, and how far the grey scale has drifted."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

# Prior spread of drift between two images of a series: ln gain, and offset as a share of the greys'
# range. Beam current drifts by about one per cent an hour, worse for cold emitters (common practice).
GAIN_DRIFT = 0.03
OFFSET_DRIFT = 0.02
# Scatter of one phase's mean grey between images that is neither drift nor noise, as a share of range.
SCATTER = 0.004
# Largest gap, in standard deviations, between a cluster and the family it joins.
REACH = 4.0


@dataclass(frozen=True)
class ImageGreys:
    """Clusters of one image: mean greys, their standard errors and area fractions, shape (n,) each."""

    grey: Floats
    grey_se: Floats
    area: Floats


@dataclass(frozen=True)
class Series:
    """Families of clusters on the common grey scale of a series.

    Attributes
    ----------
    grey, grey_se : ndarray of shape (F,)
        Pooled grey of each family and its standard error, ascending.
    member : tuple of ndarray of int
        For each image, the family of each of its clusters.
    gain, offset : ndarray of shape (I,)
        Grey in image i = offset[i] + gain[i] * common grey.
    gain_se, offset_se : ndarray of shape (I,)
    drifted : ndarray of bool, shape (I,)
        Where the drift is beyond what noise explains (three standard errors and one per cent).
    """

    grey: Floats
    grey_se: Floats
    member: tuple[Ints, ...]
    gain: Floats
    offset: Floats
    gain_se: Floats
    offset_se: Floats
    drifted: NDArray[np.bool_]


def link(images: Sequence[ImageGreys]) -> Series:
    """Link the clusters of a series of images.

    Parameters
    ----------
    images : sequence of ImageGreys
        I images; the one with most clusters defines the common scale.

    Returns
    -------
    Series

    Notes
    -----
    The lines between the images' scales are least-squares lines with a Gaussian prior at "no drift"; the
    families are found by matching each image's clusters under its best line, twice over, so that an
    image seen early profits from families met later.
    """
    everything = np.concatenate([i.grey for i in images])
    span = max(float(np.ptp(everything)), 1.0)
    first = max(range(len(images)), key=lambda i: (len(images[i].grey), -i))
    order = [first, *(i for i in range(len(images)) if i != first)]
    lines = np.tile([1.0, 0.0], (len(images), 1))
    errors = np.zeros((len(images), 2))
    members: list[Ints] = [np.zeros(0, dtype=np.intp)] * len(images)
    families = _Families(span)
    for turn in range(2):
        for i in order:
            image = images[i]
            known = families if turn == 0 else families.without(i)
            if i != first and len(known.grey):
                lines[i], errors[i] = _align(image, known, span)
            members[i] = families.join(i, image, lines[i], renew=turn > 0)
    return _series(images, families, members, lines, errors, span)


class _Families:
    """Growing list of families; each cluster is entered with its grey on the common scale."""

    def __init__(self, span: float) -> None:
        self.span = span
        self.entries: list[dict[tuple[int, int], tuple[float, float]]] = []

    @property
    def grey(self) -> Floats:
        return np.array([self._pool(e)[0] for e in self.entries])

    @property
    def sd(self) -> Floats:
        return np.array([self._pool(e)[1] for e in self.entries])

    def _pool(self, entry: dict[tuple[int, int], tuple[float, float]]) -> tuple[float, float]:
        values = np.array(list(entry.values()))
        weight = 1.0 / (values[:, 1] ** 2 + (SCATTER * self.span) ** 2)
        return float(weight @ values[:, 0] / weight.sum()), float(weight.sum() ** -0.5)

    def without(self, image: int) -> _Families:
        """The families as the other images see them."""
        other = _Families(self.span)
        kept = ({k: v for k, v in e.items() if k[0] != image} for e in self.entries)
        other.entries = [e for e in kept if e]
        return other

    def join(self, image: int, greys: ImageGreys, line: Floats, renew: bool) -> Ints:
        """Enter an image's clusters, each in the nearest family within reach or in a new one."""
        if renew:
            self.entries = self.without(image).entries
        common = (greys.grey - line[1]) / line[0]
        error = greys.grey_se / line[0]
        member = np.full(len(common), -1, dtype=np.intp)
        centre, spread = self.grey, self.sd
        if len(centre):
            noise = np.sqrt(error[:, None] ** 2 + spread[None, :] ** 2 + (SCATTER * self.span) ** 2)
            gap = np.abs(common[:, None] - centre[None, :]) / noise
            # One cluster per image and family: the closest pairs are settled first.
            for flat in np.argsort(gap, axis=None, kind="stable"):
                n, f = np.unravel_index(flat, gap.shape)
                if gap[n, f] > REACH:
                    break
                if member[n] < 0 and f not in member:
                    member[n] = f
        for n in range(len(common)):
            if member[n] < 0:
                member[n] = len(self.entries)
                self.entries.append({})
            self.entries[int(member[n])][image, n] = (float(common[n]), float(error[n]))
        return member


def _align(image: ImageGreys, families: _Families, span: float) -> tuple[Floats, Floats]:
    """Find the line from the common scale to an image's scale, with its standard errors."""
    centre, spread = families.grey, families.sd
    noise = np.hypot(image.grey_se, SCATTER * span)
    prior = np.array([GAIN_DRIFT, OFFSET_DRIFT * span])
    best, best_score = np.array([1.0, 0.0]), -np.inf
    pairs = [(n, f) for n in range(len(image.grey)) for f in range(len(centre))]
    trials = [np.array([1.0, 0.0])]
    for n, f in pairs:
        trials.append(np.array([1.0, image.grey[n] - centre[f]]))
        for m, g in pairs:
            if image.grey[m] > image.grey[n] and centre[g] > centre[f]:
                gain = (image.grey[m] - image.grey[n]) / (centre[g] - centre[f])
                trials.append(np.array([gain, image.grey[n] - gain * centre[f]]))
    for trial in trials:
        pull = ((trial - [1.0, 0.0]) / prior) ** 2
        if pull.max() > 16.0:
            continue
        predicted = trial[1] + trial[0] * centre
        gap = np.abs(image.grey[:, None] - predicted[None, :]) / np.hypot(
            noise[:, None], spread[None, :]
        )
        nearest = np.minimum(gap.min(axis=1), REACH)
        score = -0.5 * float((nearest**2).sum()) - 0.5 * float(pull.sum())
        if score > best_score:
            best, best_score = trial, score
    return _refine(image, centre, spread, noise, best, prior)


def _refine(
    image: ImageGreys, centre: Floats, spread: Floats, noise: Floats, line: Floats, prior: Floats
) -> tuple[Floats, Floats]:
    """Least squares on the matched clusters, with the prior as two more observations."""
    covariance = np.diag(prior**2)
    for _ in range(3):
        predicted = line[1] + line[0] * centre
        gap = np.abs(image.grey[:, None] - predicted[None, :])
        nearest = gap.argmin(axis=1)
        error = np.hypot(noise, spread[nearest])
        used = gap[np.arange(len(gap)), nearest] < REACH * error
        design = np.column_stack([centre[nearest[used]], np.ones(used.sum())]) / error[used, None]
        target = image.grey[used] / error[used]
        normal = design.T @ design + np.diag(prior**-2.0)
        right = design.T @ target + np.array([1.0, 0.0]) * prior**-2.0
        covariance = np.linalg.inv(normal)
        line = covariance @ right
    return line, np.sqrt(np.diag(covariance))


def _series(
    images: Sequence[ImageGreys],
    families: _Families,
    members: list[Ints],
    lines: Floats,
    errors: Floats,
    span: float,
) -> Series:
    filled = [f for f, entry in enumerate(families.entries) if entry]
    grey, sd = families.grey[filled] if filled else np.zeros(0), families.sd[filled]
    order = np.argsort(grey, kind="stable")
    renumber = np.full(len(families.entries), -1, dtype=np.intp)
    renumber[np.array(filled, dtype=np.intp)[order]] = np.arange(len(filled))
    middle = float(np.mean(grey)) if len(grey) else 0.0
    # Drift is judged at the middle of the greys, where offset and gain do not trade against each other.
    shift = np.abs(lines[:, 1] + (lines[:, 0] - 1.0) * middle)
    beyond = (np.abs(lines[:, 0] - 1) > np.maximum(3 * errors[:, 0], 0.01)) | (
        shift > np.maximum(3 * SCATTER * span, 0.01 * span)
    )
    return Series(
        grey[order],
        sd[order],
        tuple(renumber[m] for m in members),
        lines[:, 0],
        lines[:, 1],
        errors[:, 0],
        errors[:, 1],
        np.asarray(beyond),
    )
