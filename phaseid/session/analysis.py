"""From clusters and what was said about them to the ranked answer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from phaseid.image.clustering import Cluster
from phaseid.inference.advice import AdviceContext, Measure, advise
from phaseid.inference.consistency import refuse_reversed, suspect_anchors
from phaseid.inference.coupling import Coupling
from phaseid.inference.grouping import place
from phaseid.inference.observations import Observation
from phaseid.inference.ranking import Question, Ranking, rank
from phaseid.inference.scale import ScaleProblem
from phaseid.inference.series import ImageGreys, Series, link
from phaseid.session.answers import Analysis, Candidate, ClusterAnswer, Notice, ScaleAnswer
from phaseid.session.candidates import Candidates
from phaseid.session.knowledge import Knowledge
from phaseid.session.marking import Marked, Place, extra_phases, gather, nearest
from phaseid.session.plugged import plugin_evidence
from phaseid.session.settling import settle
from phaseid.session.smallness import Feature, small_features
from phaseid.session.state import State

TOP = 8
# Beam energies an analyst would try next, keV.
OTHER_ENERGIES = (5.0, 10.0, 15.0, 20.0, 30.0)


@dataclass(frozen=True)
class Picture:
    """What the ranking needs of an image of the session: no pixels, so a series of thousands fits."""

    index: int
    path: str
    energy_keV: float | None
    tilt_deg: float | None
    clusters: tuple[Cluster, ...]
    diameters_um: tuple[float, ...] = ()


def analyse(
    state: State,
    knowledge: Knowledge,
    pictures: Sequence[Picture],
    *,
    top: int = TOP,
    with_advice: bool = True,
    seed: int = 0,
) -> Analysis:
    """Rank the candidates of every cluster of images that share one grey scale.

    Parameters
    ----------
    state : State
    knowledge : Knowledge
    pictures : sequence of Picture
        One image, or the images of a series.
    top : int
        Candidates listed per cluster; listed and accepted phases are added.
    with_advice : bool
        Whether to work out what to measure next.
    seed : int

    Returns
    -------
    Analysis

    Raises
    ------
    InputError
        For conditions or evidence that cannot be used.
    """
    conditions, notices = settle(state, pictures, [p.path for p in pictures], knowledge.model)
    candidates = knowledge.candidates(conditions, extra_phases(state))
    kept = _kept_clusters(state, pictures)
    series = link([greys for _, greys in kept])
    observations = _observations(pictures, kept, series)
    places = _places(pictures, kept, series)
    marked = gather(state, knowledge, candidates, observations, places, [p.index for p in pictures])
    marked.evidence *= plugin_evidence(
        state, knowledge, candidates, _members(pictures, kept, series), len(observations)
    )
    notices += _drift_notices(pictures, series)
    drift = np.column_stack([series.gain, series.offset])
    ranking = None
    if observations:
        refuse_reversed(marked.anchors, candidates.departure)
        question = _question(state, knowledge, candidates, observations, marked)
        ranking = rank(question, seed)
        small, told = small_features(ranking, candidates, _sizes(pictures, kept, series))
        if small:
            ranking = rank(replace(question, small=small), seed)
            notices += told
        notices += _evidence_notices(question, marked)
    clusters = _answers(state, candidates, pictures, kept, series, marked, ranking, top)
    advice: tuple[Measure, ...] = ()
    if with_advice and ranking is not None:
        advice = _advice(knowledge, candidates, clusters, marked, ranking)
    return Analysis(
        tuple(p.index for p in pictures),
        conditions,
        knowledge.check_contexts(state.contexts),
        clusters,
        _scale(ranking, marked),
        advice,
        tuple(notices),
        ranking,
        drift,
    )


def _kept_clusters(state: State, pictures: Sequence[Picture]) -> list[tuple[list[int], ImageGreys]]:
    """For each picture, which of its clusters take part, and their greys."""
    kept = []
    for picture in pictures:
        clusters = picture.clusters
        places = [Place(picture.index, c.grey_mean, c.grey_sd, n) for n, c in enumerate(clusters)]
        left_out = {nearest(places, m).observation for m in state.marked("ignored", picture.index)}
        members = [n for n in range(len(clusters)) if n not in left_out]
        chosen = [clusters[n] for n in members]
        kept.append(
            (
                members,
                ImageGreys(
                    np.array([c.grey_mean for c in chosen]),
                    np.array([c.grey_se for c in chosen]),
                    np.array([c.area_fraction for c in chosen]),
                ),
            )
        )
    return kept


def _observations(
    pictures: Sequence[Picture], kept: Sequence[tuple[list[int], ImageGreys]], series: Series
) -> list[Observation]:
    """One observation per family of clusters; for a single image, one per cluster."""
    clipped: dict[int, Literal["low", "high"]] = {}
    for picture, (members, _), families in zip(pictures, kept, series.member, strict=True):
        for n, family in zip(members, families, strict=True):
            end = picture.clusters[n].clipped
            if end is not None:
                clipped[int(family)] = end
    alone = len(pictures) == 1
    observations = []
    for f, grey in enumerate(series.grey):
        se = kept[0][1].grey_se[list(series.member[0]).index(f)] if alone else series.grey_se[f]
        observations.append(Observation(float(grey), float(se), clipped=clipped.get(f)))
    return observations


def _sizes(
    pictures: Sequence[Picture], kept: Sequence[tuple[list[int], ImageGreys]], series: Series
) -> list[Feature]:
    """For each family, how large its features are and which family surrounds them."""
    area = np.zeros(len(series.grey))
    sizes: list[list[float]] = [[] for _ in series.grey]
    for picture, (members, greys), families in zip(pictures, kept, series.member, strict=True):
        for n, family, share in zip(members, families, greys.area, strict=True):
            area[family] += share
            if picture.diameters_um:
                sizes[family].append(picture.diameters_um[n])
    matrix = int(area.argmax()) if len(area) else 0
    return [
        Feature(k, matrix, float(np.median(found)) if found else float("nan"))
        for k, found in enumerate(sizes)
    ]


def _members(
    pictures: Sequence[Picture], kept: Sequence[tuple[list[int], ImageGreys]], series: Series
) -> list[tuple[int, list[Cluster], list[int]]]:
    """For each image, the clusters that take part and their families."""
    return [
        (picture.index, [picture.clusters[n] for n in members], [int(f) for f in families])
        for picture, (members, _), families in zip(pictures, kept, series.member, strict=True)
    ]


def _places(
    pictures: Sequence[Picture], kept: Sequence[tuple[list[int], ImageGreys]], series: Series
) -> list[Place]:
    return [
        Place(picture.index, c.grey_mean, c.grey_sd, int(family))
        for picture, (members, _), families in zip(pictures, kept, series.member, strict=True)
        for c, family in zip((picture.clusters[n] for n in members), families, strict=True)
    ]


def _drift_notices(pictures: Sequence[Picture], series: Series) -> list[Notice]:
    return [
        Notice(
            "drift",
            f"The grey scale of {p.path} has drifted against the series: gain "
            f"{series.gain[i]:.3f}, offset {series.offset[i]:+.3g} grey levels; it was corrected.",
            "Check the beam current, or analyse this image on its own.",
        )
        for i, p in enumerate(pictures)
        if series.drifted[i]
    ]


def _question(
    state: State,
    knowledge: Knowledge,
    candidates: Candidates,
    observations: Sequence[Observation],
    marked: Marked,
) -> Question:
    prior = knowledge.prior(state, candidates)
    same = (
        np.where(candidates.variable, 1.0, 0.05) if state.distinct else np.ones(candidates.set.size)
    )
    coupling = Coupling(knowledge.coexistence(candidates, state.contexts), same)
    return Question(
        candidates.set,
        candidates.departure,
        observations,
        prior,
        marked.evidence,
        marked.none_evidence,
        marked.anchors,
        marked.known,
        state.none_weight,
        coupling=coupling,
    )


def _evidence_notices(question: Question, marked: Marked) -> list[Notice]:
    problem = ScaleProblem(
        question.candidates.axis,
        question.departure,
        (),
        np.zeros((0, len(question.candidates.axis))),
        marked.anchors,
    )
    found = [
        Notice(
            "suspect-reference",
            f"{anchor.label} at grey {anchor.grey:.4g} lies {score:.1f} standard deviations from where "
            "the other references put it.",
            "Check whether it is that phase and was imaged at the same settings.",
        )
        for anchor, score in suspect_anchors(problem, marked.anchors)[:1]
    ]
    for k in range(len(question.observations)):
        if k not in marked.known and (marked.seen.get(k) or marked.unseen.get(k)):
            best = float(question.evidence[k].max())
            if best < 0.05:
                found.append(
                    Notice(
                        "no-phase-has-these-elements",
                        f"No phase of the databases agrees with the elements reported for the cluster at "
                        f"grey {question.observations[k].grey_mean:.4g}.",
                        "Check for a neighbouring phase in the X-ray volume, or add the phase.",
                    )
                )
    return found


def _answers(
    state: State,
    candidates: Candidates,
    pictures: Sequence[Picture],
    kept: Sequence[tuple[list[int], ImageGreys]],
    series: Series,
    marked: Marked,
    ranking: Ranking | None,
    top: int,
) -> tuple[ClusterAnswer, ...]:
    placed: dict[int, tuple[tuple[Candidate, ...], float]] = {}
    answers = []
    for picture, (members, _), families in zip(pictures, kept, series.member, strict=True):
        family_of = dict(zip(members, (int(f) for f in families), strict=True))
        names = _names(state, picture)
        for n, cluster in enumerate(picture.clusters):
            k = family_of.get(n)
            listed: tuple[Candidate, ...] = ()
            resolution = none = float("nan")
            if k is not None and ranking is not None:
                if k not in placed:
                    placed[k] = _candidates(candidates, ranking, k, top, marked.listed.get(k, []))
                listed, resolution = placed[k]
                none = float(ranking.none[k])
            known = marked.known.get(k) if k is not None else None
            accepted = marked.accepted.get(k) if k is not None else None
            answers.append(
                ClusterAnswer(
                    picture.index,
                    cluster.id,
                    names.get(n, ""),
                    cluster.grey_mean,
                    cluster.grey_se,
                    cluster.grey_sd,
                    cluster.clipped,
                    cluster.area_fraction,
                    cluster.pixels,
                    cluster.regions,
                    k,
                    none,
                    listed,
                    resolution,
                    None if known is None else candidates.set.names[known],
                    None if accepted is None else candidates.set.names[accepted],
                    tuple(marked.seen.get(k, [])) if k is not None else (),
                    tuple(marked.unseen.get(k, [])) if k is not None else (),
                    tuple(cluster.notes),
                )
            )
    return tuple(answers)


def _names(state: State, picture: Picture) -> dict[int, str]:
    places = [
        Place(picture.index, c.grey_mean, c.grey_sd, n) for n, c in enumerate(picture.clusters)
    ]
    return {nearest(places, m).observation: m.value for m in state.marked("named", picture.index)}


def _candidates(
    candidates: Candidates, ranking: Ranking, k: int, top: int, listed: Sequence[int]
) -> tuple[tuple[Candidate, ...], float]:
    # Nothing else is a candidate of a cluster the user has named.
    placing = place(ranking, k, 1 if k in ranking.question.known else top, also=listed)
    return (
        tuple(
            candidates.describe(
                int(p),
                predicted_grey=float(grey),
                predicted_grey_sd=float(sd),
                probability=float(ranking.probability[k, p]),
                group=int(group),
                listed=int(p) in listed,
            )
            for p, grey, sd, group in zip(
                placing.phases,
                placing.predicted_grey,
                placing.predicted_sd,
                placing.group,
                strict=True,
            )
        ),
        placing.resolution,
    )


def _advice(
    knowledge: Knowledge,
    candidates: Candidates,
    clusters: Sequence[ClusterAnswer],
    marked: Marked,
    ranking: Ranking,
) -> tuple[Measure, ...]:
    """Advice per family of clusters, told of the first cluster of the family."""
    first: dict[int, int] = {}
    for n, cluster in enumerate(clusters):
        if cluster.observation is not None:
            first.setdefault(cluster.observation, n)
    labels = [_label(clusters[first[k]]) for k in range(len(ranking.probability))]
    asked = {
        k: {*marked.seen.get(k, []), *marked.unseen.get(k, [])}
        for k in range(len(ranking.probability))
    }
    now = candidates.conditions.energy_keV
    others = {
        energy: candidates.signals_at(energy)
        for energy in OTHER_ENERGIES
        if abs(energy - now) > 2.0 and energy > candidates.conditions.detector.lowest_energy_keV + 1
    }
    context = AdviceContext(
        candidates.visible,
        labels,
        asked,
        others,
        [s.structure for s in candidates.shown],
        frozenset(marked.known),
    )
    measures = advise(ranking, context)
    return tuple(replace(m, cluster=first[m.cluster]) for m in measures)


def _label(cluster: ClusterAnswer) -> str:
    name = f" ({cluster.name})" if cluster.name else ""
    return f"cluster {cluster.id}{name} at grey {cluster.grey_mean:.4g}"


def _scale(ranking: Ranking | None, marked: Marked) -> ScaleAnswer | None:
    if ranking is None:
        return None
    if len(ranking.question.observations) + len(marked.anchors) < 2:
        return None
    particles = ranking.particles
    offset, offset_se = particles.centre(particles.offset)
    gain, gain_se = particles.centre(particles.gain)
    return ScaleAnswer(
        offset,
        gain,
        offset_se,
        gain_se,
        tuple(f"{a.label} at grey {a.grey:.4g}" for a in marked.anchors),
    )
