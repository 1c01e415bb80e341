"""Explanations as text: why a candidate stands where it does, and what separates two."""

from __future__ import annotations

import numpy as np

from phaseid.inference.explain import compare, explain
from phaseid.physics.elements import SYMBOLS
from phaseid.session.answers import Analysis, Candidate, ClusterAnswer


def tell_why(analysis: Analysis, cluster: ClusterAnswer, candidate: Candidate) -> str:
    """Why a candidate has its probability: a sentence, and terms in bits that add up."""
    if analysis.ranking is None or cluster.observation is None:
        return "The cluster is left out."
    told = explain(analysis.ranking, cluster.observation, candidate.phase)
    lines = [told.sentence, ""]
    lines += [f"{term.bits:+8.2f} bits  {term.name}" for term in told.terms]
    if told.terms:
        lines.append(
            f"{told.total_bits:+8.2f} bits  log2 of the probability {candidate.probability:.3%}"
        )
    lines += [t for t in ("", candidate.hazard, candidate.note) if t is not None]
    return "\n".join(lines)


def tell_difference(analysis: Analysis, cluster: ClusterAnswer, first: int, second: int) -> str:
    """What separates two candidates so far, and which elements would."""
    ranking = analysis.ranking
    if ranking is None or cluster.observation is None:
        return "The cluster is left out."
    terms, sentence = compare(ranking, cluster.observation, first, second)
    lines = [sentence, "", *(f"{t.bits:+8.2f} bits  {t.name}" for t in terms), ""]
    candidates = ranking.question.candidates
    content = [
        (candidates.share[rows] @ candidates.mass_fractions[rows]).astype(float)
        for rows in (candidates.phase == first, candidates.phase == second)
    ]
    apart = np.abs(content[0] - content[1])
    best = [i for i in np.argsort(-apart)[:4] if apart[i] > 0.02]
    if best:
        names = candidates.names
        lines.append("X-ray would part them by:")
        lines += [
            f"  {SYMBOLS[i]}: {content[0][i]:.1%} in {names[first]}, {content[1][i]:.1%} in {names[second]}"
            for i in best
        ]
    else:
        lines.append("Their compositions are the same: only diffraction can part them.")
    return "\n".join(lines)
