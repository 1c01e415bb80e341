"""The grey scale of an image: the joint posterior of offset, gain and the smooth departure.

    grey of cluster k = offset + gain * apparent signal + noise
    true signal = apparent signal + departure(apparent signal)

The posterior is carried by weighted particles. Each particle takes two of the pieces of evidence
(known phases first, else the darkest and the brightest cluster), draws what they are, solves for the
line through them, and is weighted by all the evidence that is left (importance sampling; Robert &
Casella 2004, Monte Carlo Statistical Methods, ch. 3). No particle ever needs to be moved, so several
separate explanations of an image stay in the answer with the weight they deserve.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.axis import SignalAxis
from phaseid.inference.departure import Departure
from phaseid.inference.drawing import lattice, normal_cdf, normal_quantile
from phaseid.inference.observations import Anchor, Observation
from phaseid.inference.proposal import PairProposal, adapt

Floats = NDArray[np.float64]

_BATCH = 1 << 14
_TINY = 1e-300


@dataclass(frozen=True)
class Particles:
    """Weighted draws from the posterior of the grey scale.

    Attributes
    ----------
    offset, gain : ndarray of shape (N,)
        The line of each particle: grey = offset + gain * apparent signal.
    curves : ndarray of shape (N, knots)
        Departure of each particle.
    signal : ndarray of shape (N, K)
        True signal each particle gives to each cluster (the bound, for a clipped one).
    weight : ndarray of shape (N,)
        Weights, summing to one.
    log_evidence : float
        Logarithm of the mean likelihood: how well the evidence hangs together.
    """

    offset: Floats
    gain: Floats
    curves: Floats
    signal: Floats
    weight: Floats
    log_evidence: float

    @property
    def effective(self) -> float:
        """Effective number of particles (Kish 1965)."""
        return float(1.0 / np.sum(self.weight**2))

    def mean_sd(self, values: Floats) -> tuple[Floats, Floats]:
        """Weighted mean and standard deviation of particle values along the first axis."""
        mean = self.weight @ values
        variance = self.weight @ (values - mean) ** 2
        return mean, np.sqrt(np.maximum(variance, 0.0))

    def centre(self, values: Floats) -> tuple[float, float]:
        """Weighted median of particle values and half the width of their central 68 %.

        Without a known phase the scale's posterior has long tails that a mean would follow.
        """
        order = np.argsort(values, kind="stable")
        share = np.cumsum(self.weight[order])
        low, middle, high = (
            float(values[order[min(int(np.searchsorted(share, q)), len(order) - 1)]])
            for q in (0.16, 0.5, 0.84)
        )
        return middle, (high - low) / 2


@dataclass(frozen=True)
class ScaleProblem:
    """Everything that bears on the grey scale.

    Attributes
    ----------
    axis : SignalAxis
    departure : Departure
    observations : sequence of Observation
        K clusters; those that an anchor names are skipped here, the anchor speaks for them.
    densities : ndarray of shape (K, n)
        For each cluster the density of its true signal over all candidates, evidence included.
    anchors : sequence of Anchor
    drift : tuple of float
        Standard deviations, between the images of a series, of ln gain and of the offset in grey levels.
    """

    axis: SignalAxis
    departure: Departure
    observations: Sequence[Observation]
    densities: Floats
    anchors: Sequence[Anchor] = ()
    drift: tuple[float, float] = (0.0, 0.0)

    def sample(self, seed: int = 0, effective: float = 2000.0, most: int = 8 * _BATCH) -> Particles:
        """Draw particles until `effective` of them count, or `most` are drawn.

        Parameters
        ----------
        seed : int
            The same seed gives the same answer.
        effective : float
            Effective number of particles wanted.
        most : int
            Largest number of particles drawn.

        Returns
        -------
        Particles
        """
        generator = np.random.default_rng(seed)
        sampler = _Sampler(self)
        batches = [sampler.batch(_BATCH, generator)]
        weight, peak = _weights(batches)
        for _ in range(2):
            # A first look that found little is not kept: it only shows where to look.
            if _effective(weight) >= min(effective, 0.2 * _BATCH) or not sampler.adapt(batches[-1]):
                break
            batches = [sampler.batch(_BATCH, generator)]
            weight, peak = _weights(batches)
        while _effective(weight) < effective and len(weight) < most:
            batches.append(sampler.batch(_BATCH, generator))
            weight, peak = _weights(batches)
        total = float(weight.sum())
        # Particles that carry nothing only cost time downstream.
        kept = weight > 1e-9 * weight.max()
        joined = _Batch.join(batches)
        return Particles(
            joined.offset[kept],
            joined.gain[kept],
            joined.curves[kept],
            joined.signal[kept],
            weight[kept] / weight[kept].sum(),
            float(np.log(total / len(weight)) + peak),
        )


@dataclass(frozen=True)
class _Batch:
    offset: Floats
    gain: Floats
    curves: Floats
    signal: Floats
    pair: Floats
    log_weight: Floats

    @staticmethod
    def join(batches: Sequence[_Batch]) -> _Batch:
        if len(batches) == 1:
            return batches[0]
        names = ("offset", "gain", "curves", "signal", "pair", "log_weight")
        return _Batch(*(np.concatenate([getattr(b, n) for b in batches]) for n in names))


def _weights(batches: Sequence[_Batch]) -> tuple[Floats, float]:
    log_weight = np.concatenate([b.log_weight for b in batches])
    peak = float(log_weight.max())
    return np.exp(log_weight - peak), peak


def _effective(weight: Floats) -> float:
    return float(weight.sum() ** 2 / np.sum(weight**2))


class _Sampler:
    """Draws batches of particles for one problem."""

    def __init__(self, problem: ScaleProblem) -> None:
        self.problem = problem
        axis = problem.axis
        self.named = {a.observation for a in problem.anchors if a.observation is not None}
        self.anchor_densities = [_anchor_density(axis, a) for a in problem.anchors]
        self.images = 1 + max(
            [0, *(o.image for o in problem.observations), *(a.image for a in problem.anchors)]
        )
        self.pair = self._choose_pair()
        self.proposal: PairProposal | None = None
        steps = np.diff(axis.nodes)
        halves = (problem.densities[:, 1:] + problem.densities[:, :-1]) / 2
        self.cumulative = np.zeros_like(problem.densities)
        np.cumsum(halves * steps, axis=1, out=self.cumulative[:, 1:])

    def _choose_pair(self) -> list[tuple[str, int]]:
        """Pick the two pieces of evidence that the line is drawn through."""
        anchors = [i for i, a in enumerate(self.problem.anchors) if a.clipped is None]
        free = [
            k
            for k, o in enumerate(self.problem.observations)
            if o.clipped is None and o.blend is None and k not in self.named
        ]
        greys = {k: self.problem.observations[k].grey_mean for k in free}
        if len(anchors) >= 2:
            known = self.problem.anchors
            pairs = [(i, j) for n, i in enumerate(anchors) for j in anchors[n + 1 :]]
            far = max(pairs, key=lambda p: _lever(known[p[0]], known[p[1]]))
            return [("anchor", far[0]), ("anchor", far[1])]
        if anchors:
            grey = self.problem.anchors[anchors[0]].grey
            others = [k for k in free if greys[k] != grey]
            if not others:
                return [("anchor", anchors[0])]
            far_cluster = max(others, key=lambda k: abs(greys[k] - grey))
            return [("anchor", anchors[0]), ("cluster", far_cluster)]
        if len(free) >= 2:
            low, high = min(free, key=greys.__getitem__), max(free, key=greys.__getitem__)
            if greys[low] < greys[high]:
                return [("cluster", low), ("cluster", high)]
        return [("cluster", k) for k in free[:1]]

    def batch(self, count: int, generator: np.random.Generator) -> _Batch:
        problem, departure = self.problem, self.problem.departure
        uniforms = lattice(count, 2 + departure.terms, generator)
        curves = departure.curves(normal_quantile(uniforms[:, 2:]))
        drifts = self._drifts(count, generator)
        pair, log_weight = self._pair_signals(uniforms[:, :2], generator)
        offset, gain, line_weight = self._lines(pair, uniforms, curves, drifts, generator)
        log_weight += line_weight
        drawn = {i: pair[:, n] for n, (kind, i) in enumerate(self.pair) if kind == "cluster"}
        signal = np.zeros((count, len(problem.observations)))
        # Blends need the signal of the cluster around them, so they come last.
        order = sorted(
            range(len(problem.observations)),
            key=lambda k: problem.observations[k].blend is not None,
        )
        for k in order:
            if k in drawn:
                signal[:, k] = drawn[k]
                continue
            log_weight += self._cluster(k, offset, gain, curves, drifts, signal, generator)
        paired = {index for kind, index in self.pair if kind == "anchor"}
        for i, anchor in enumerate(problem.anchors):
            if i not in paired:
                log_weight += self._anchor(anchor, offset, gain, curves, drifts)
        log_weight = np.nan_to_num(log_weight, nan=-1e9, neginf=-1e9)
        return _Batch(offset, gain, curves, signal, pair, log_weight)

    def _drifts(self, count: int, generator: np.random.Generator) -> tuple[Floats, Floats]:
        """Per particle and image: how far gain (a factor) and offset have moved since the first image."""
        gain_sd, offset_sd = self.problem.drift
        gains = np.exp(gain_sd * generator.standard_normal((count, self.images)))
        offsets = offset_sd * generator.standard_normal((count, self.images))
        gains[:, 0], offsets[:, 0] = 1.0, 0.0
        return gains, offsets

    def adapt(self, batch: _Batch) -> bool:
        """Learn from a first look where to draw the next lines; False where there is nothing to learn."""
        densities = [self._density(kind, index) for kind, index in self.pair]
        if len(densities) < 2 or densities[0] is None or densities[1] is None:
            return False
        weight, _ = _weights([batch])
        own = (densities[0], densities[1])
        self.proposal = adapt(self.problem.axis, own, batch.pair[:, 0], batch.pair[:, 1], weight)
        return True

    def _density(self, kind: str, index: int) -> Floats | None:
        if kind == "anchor":
            return self.anchor_densities[index]
        row: Floats = self.problem.densities[index]
        return row

    def _pair_signals(
        self, uniforms: Floats, generator: np.random.Generator
    ) -> tuple[Floats, Floats]:
        """Draw the true signals of the pair, and the log ratio of their own density to the drawn one."""
        count = len(uniforms)
        if self.proposal is not None:
            first, second, log_ratio = self.proposal.draw(uniforms, generator)
            return np.column_stack([first, second]), log_ratio
        pair = np.zeros((count, len(self.pair)))
        for column, (kind, index) in enumerate(self.pair):
            density = self._density(kind, index)
            # The dark level is zero signal exactly.
            if density is not None:
                pair[:, column] = self.problem.axis.draw(density, uniforms[:, column])
        return pair, np.zeros(count)

    def _lines(
        self,
        pair: Floats,
        uniforms: Floats,
        curves: Floats,
        drifts: tuple[Floats, Floats],
        generator: np.random.Generator,
    ) -> tuple[Floats, Floats, Floats]:
        """Solve for the line through the two chosen pieces of evidence, one line per particle."""
        points: list[tuple[Floats, Floats]] = []
        for column, (kind, index) in enumerate(self.pair):
            seen: Anchor | Observation
            if kind == "anchor":
                seen = self.problem.anchors[index]
                grey = seen.grey
            else:
                seen = self.problem.observations[index]
                grey = seen.grey_mean
            jitter = seen.grey_se * generator.standard_normal(len(pair))
            apparent = self.problem.departure.undo(curves, pair[:, column])
            points.append(
                (grey + jitter - drifts[1][:, seen.image], apparent * drifts[0][:, seen.image])
            )
        while len(points) < 2:
            points.append(self._free_point(points, uniforms[:, len(points)]))
        (grey_a, at_a), (grey_b, at_b) = points
        with np.errstate(divide="ignore", invalid="ignore"):
            gain = (grey_a - grey_b) / (at_a - at_b)
            # Prior 1/gain (an operator sets the contrast to fill the range, whatever the phases are)
            # over the Jacobian |signal_a - signal_b| of solving for the line.
            log_weight = -np.log(np.abs(grey_a - grey_b) + _TINY)
        bad = ~np.isfinite(gain) | (gain <= 0)
        gain = np.where(bad, 1.0, gain)
        log_weight = np.where(bad, -np.inf, log_weight)
        return grey_a - gain * at_a, gain, log_weight

    def _free_point(
        self, points: list[tuple[Floats, Floats]], uniform: Floats
    ) -> tuple[Floats, Floats]:
        """Stand in for a missing point: anything on the axis.

        The grey is placed one unit away, as the unit of grey is then arbitrary; the ranking of a lone
        cluster comes out as the prior, which is the truth: one grey alone says nothing.
        """
        upper = self.problem.axis.upper
        if not points:
            return np.zeros(len(uniform)), np.zeros(len(uniform))
        grey, apparent = points[0]
        return grey + np.where(uniform * upper >= apparent, 1.0, -1.0), uniform * upper

    def _cluster(
        self,
        k: int,
        offset: Floats,
        gain: Floats,
        curves: Floats,
        drifts: tuple[Floats, Floats],
        signal: Floats,
        generator: np.random.Generator,
    ) -> Floats:
        """Fill in the cluster's signal and return its log likelihood for every particle."""
        problem, seen = self.problem, self.problem.observations[k]
        gains = gain * drifts[0][:, seen.image]
        jitter = 0.0 if seen.clipped else seen.grey_se
        grey = seen.grey_mean + jitter * generator.standard_normal(len(offset))
        apparent = (grey - offset - drifts[1][:, seen.image]) / gains
        shift, slope = problem.departure.at(curves, apparent)
        true, stretch = apparent + shift, 1.0 + slope
        if seen.blend is not None:
            spread = seen.blend.fraction_sd * generator.standard_normal(len(offset))
            fraction = np.clip(seen.blend.fraction + spread, 0.02, 1.0)
            true = (true - (1 - fraction) * signal[:, seen.blend.matrix]) / fraction
            stretch = stretch / fraction
        signal[:, k] = true
        if k in self.named:
            return np.zeros(len(offset))
        if seen.clipped is not None:
            return self._bound(k, true, seen.clipped)
        below, share, inside = problem.axis.locate(true)
        row = problem.densities[k]
        density = row[below] + share * (row[below + 1] - row[below])
        likelihood = np.where(inside, density * np.abs(stretch) / gains, 0.0)
        return np.asarray(np.log(likelihood + _TINY))

    def _bound(self, k: int, true: Floats, clipped: str) -> Floats:
        below, share, _ = self.problem.axis.locate(true)
        row = self.cumulative[k]
        under = row[below] + share * (row[below + 1] - row[below])
        # Off the dark end nothing can be darker; off the bright end everything is.
        under = np.where(true < 0, 0.0, under)
        left = under if clipped == "low" else row[-1] - under
        return np.asarray(np.log(np.maximum(left, 0.0) + 1e-12))

    def _anchor(
        self,
        anchor: Anchor,
        offset: Floats,
        gain: Floats,
        curves: Floats,
        drifts: tuple[Floats, Floats],
    ) -> Floats:
        gains = gain * drifts[0][:, anchor.image]
        offsets = offset + drifts[1][:, anchor.image]
        total = np.full(len(offset), _TINY)
        for signal, own_sd, share in zip(anchor.signal, anchor.own_sd, anchor.share, strict=True):
            apparent = self.problem.departure.undo(curves, np.full(len(offset), signal))
            predicted = offsets + gains * apparent
            if anchor.clipped is not None:
                sign = 1.0 if anchor.clipped == "low" else -1.0
                spread = np.sqrt(anchor.grey_se**2 + (gains * own_sd) ** 2) + 1e-9
                total += share * normal_cdf(sign * (anchor.grey - predicted) / spread)
                continue
            variance = anchor.grey_se**2 + (gains * own_sd) ** 2 + 1e-12
            total += (
                share
                * np.exp(-0.5 * (anchor.grey - predicted) ** 2 / variance)
                / np.sqrt(2 * np.pi * variance)
            )
        return np.asarray(np.log(total))


def _lever(first: Anchor, second: Anchor) -> float:
    """How well two anchors fix the line: their distance over their errors."""
    error = np.hypot(
        np.max(first.own_sd) + 0.02 * first.mean_signal,
        np.max(second.own_sd) + 0.02 * second.mean_signal,
    )
    return float(abs(first.mean_signal - second.mean_signal) / (error + 1e-9))


def _anchor_density(axis: SignalAxis, anchor: Anchor) -> Floats | None:
    """Density of an anchor's true signal; None for the dark level, which is zero exactly."""
    if not np.any(anchor.signal) and not np.any(anchor.own_sd):
        return None
    density: Floats = anchor.share @ axis.kernels(anchor.signal, anchor.own_sd).astype(float)
    return density
