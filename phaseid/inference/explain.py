"""Why a candidate has its probability: terms that add up, in bits and in one sentence."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from phaseid.inference.ranking import Ranking


@dataclass(frozen=True)
class Term:
    """One factor of a probability.

    Attributes
    ----------
    name : {"context", "evidence", "grey", "other clusters", "normalisation"}
    bits : float
        Base-2 logarithm of the factor; positive speaks for the candidate.
    """

    name: str
    bits: float


@dataclass(frozen=True)
class Explanation:
    """The terms of one candidate in one cluster.

    Attributes
    ----------
    phase, cluster : int
    terms : tuple of Term
        Their bits sum to log2 of the probability.
    sentence : str
    """

    phase: int
    cluster: int
    terms: tuple[Term, ...]
    sentence: str

    @property
    def total_bits(self) -> float:
        """Sum of the terms, log2 of the probability."""
        return sum(t.bits for t in self.terms)


def explain(ranking: Ranking, cluster: int, phase: int) -> Explanation:
    """Split a candidate's probability into its causes.

    Parameters
    ----------
    ranking : Ranking
    cluster, phase : int

    Returns
    -------
    Explanation
        Terms measured against an even prior over all phases; "grey" holds grey and scale together.
    """
    question = ranking.question
    name = question.candidates.names[phase]
    if cluster in question.known:
        said = question.candidates.names[question.known[cluster]]
        return Explanation(
            phase, cluster, (), f"The user said that this cluster is {said}; nothing else counts."
        )
    prior = question.prior / question.prior.mean()
    members = question.candidates.phase == phase
    evidence = float(question.candidates.share[members] @ question.evidence[cluster, members])
    factors = {
        "context": float(prior[phase]),
        "evidence": evidence,
        "grey": float(ranking.grey_term[cluster, phase]),
        "other clusters": float(ranking.coupling_term[cluster, phase]),
    }
    terms = [Term(n, float(np.log2(max(f, 1e-300)))) for n, f in factors.items()]
    probability = max(float(ranking.probability[cluster, phase]), 1e-300)
    rest = float(np.log2(probability)) - sum(t.bits for t in terms)
    terms.append(Term("normalisation", rest))
    return Explanation(phase, cluster, tuple(terms), _sentence(name, terms, probability))


def compare(ranking: Ranking, cluster: int, first: int, second: int) -> tuple[list[Term], str]:
    """What speaks for one candidate over another, in bits per cause and in one sentence.

    Parameters
    ----------
    ranking : Ranking
    cluster, first, second : int

    Returns
    -------
    terms : list of Term
        Differences; they sum to log2 of the odds.
    sentence : str
    """
    left, right = explain(ranking, cluster, first), explain(ranking, cluster, second)
    other = {t.name: t.bits for t in right.terms}
    terms = [
        Term(t.name, t.bits - other.get(t.name, 0.0))
        for t in left.terms
        if t.name != "normalisation"
    ]
    names = ranking.question.candidates.names
    total = sum(t.bits for t in terms)
    ahead, behind = (first, second) if total >= 0 else (second, first)
    strong = sorted((t for t in terms if abs(t.bits) > 0.1), key=lambda t: -abs(t.bits))
    if not strong:
        return terms, f"Nothing known so far separates {names[first]} from {names[second]}."
    causes = ", ".join(
        f"{t.name} {'for' if (t.bits > 0) == (total >= 0) else 'against'} it by {abs(t.bits):.1f} bits"
        for t in strong
    )
    return terms, f"{names[ahead]} leads {names[behind]} by {abs(total):.1f} bits: {causes}."


def _sentence(name: str, terms: list[Term], probability: float) -> str:
    strong = [t for t in terms if t.name != "normalisation" and abs(t.bits) > 0.3]
    if not strong:
        return (
            f"{name} stands at {probability:.1%}; nothing speaks for or against it in particular."
        )
    speaking = ", ".join(
        f"{t.name} speaks {'for' if t.bits > 0 else 'against'} it ({t.bits:+.1f} bits)"
        for t in sorted(strong, key=lambda t: -abs(t.bits))
    )
    return f"{name} stands at {probability:.1%}: {speaking}."
