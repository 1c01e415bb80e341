"""Elements, coupling, groups, explanations, advice."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.inference.advice import AdviceContext, advise, element_bits, entropy_bits
from phaseid.inference.coupling import Coupling
from phaseid.inference.evidence import (
    content_evidence,
    detection_limits,
    elements_evidence,
    none_likelihood,
    visibility,
)
from phaseid.inference.explain import compare, explain
from phaseid.inference.grouping import place
from phaseid.inference.ranking import rank
from phaseid.physics.elements import atomic_number

from .conftest import candidate_set, question

FE, OX, MG, CA = (atomic_number(s) - 1 for s in ("Fe", "O", "Mg", "C"))


@pytest.fixture
def oxides():
    """Four phases of nearly one signal with different elements, and two far away."""
    content = np.zeros((6, 103), np.float32)
    content[1, [FE, OX]] = 0.7, 0.3
    content[2, [MG, OX]] = 0.6, 0.4
    content[3, [FE, MG, OX]] = 0.4, 0.3, 0.3
    content[4, [CA]] = 1.0
    content[0, [OX]] = content[5, [FE]] = 1.0
    return candidate_set([0.05, 0.16, 0.161, 0.162, 0.163, 0.28], composition=content)


def test_detection_limits_follow_common_practice():
    limits = detection_limits(20.0)
    assert np.isinf(limits[:4]).all()  # H to Be give no usable line
    assert limits[FE] == pytest.approx(0.002)
    assert limits[CA] > limits[OX] > limits[MG]


def test_low_beam_energy_hides_high_lines():
    # Fe K needs 6.4 keV (from memory); Mg K 1.25 keV.
    assert np.isinf(detection_limits(5.0)[FE])
    assert np.isfinite(detection_limits(5.0)[MG])


def test_seen_and_unseen_elements_weigh(oxides):
    visible = visibility(oxides)
    likelihood = elements_evidence(visible, seen=["Fe"], unseen=["Mg"])
    assert likelihood.argmax() in (1, 5)
    assert likelihood[3] < 0.1 * likelihood[1]
    assert 0 < none_likelihood(oxides, likelihood) < likelihood[1]


def test_quick_quantification_weighs_ratios_and_forgives_the_total(oxides):
    right = content_evidence(oxides, {"Fe": 70.0, "O": 30.0})
    assert right.argmax() == 1
    low_total = content_evidence(oxides, {"Fe": 63.0, "O": 27.0})
    assert low_total.argmax() == 1
    assert low_total[1] > 0.5 * right[1]
    assert right[2] < 0.01 * right[1]
    assert content_evidence(oxides, {"O": 30.0})[3] == pytest.approx(1.0, abs=0.01)
    with pytest.raises(InputError, match="Qq"):
        content_evidence(oxides, {"Qq": 3.0})


def test_terms_add_up_to_the_probability(oxides):
    evidence = np.tile(elements_evidence(visibility(oxides), seen=["Fe"]), (3, 1))
    evidence[[0, 2]] = 1.0
    answer = rank(
        question(
            oxides,
            [60.0, 172.0, 290.0],
            known={0: 0, 2: 5},
            evidence=evidence,
            prior=np.array([1, 1, 5, 1, 1, 1.0]),
        )
    )
    for phase in range(1, 5):
        told = explain(answer, 1, phase)
        assert told.total_bits == pytest.approx(np.log2(answer.probability[1, phase]), abs=1e-6)
    terms, sentence = compare(answer, 1, 1, 2)
    odds = np.log2(answer.probability[1, 1] / answer.probability[1, 2])
    assert sum(t.bits for t in terms) == pytest.approx(odds, abs=1e-6)
    assert "evidence" in sentence
    assert "phase 1" in sentence


def test_known_cluster_is_explained_by_the_user(oxides):
    answer = rank(question(oxides, [60.0, 172.0, 290.0], known={0: 0, 2: 5}))
    assert "user" in explain(answer, 0, 0).sentence


def test_inseparable_phases_form_one_group(oxides):
    answer = rank(question(oxides, [60.0, 172.0, 290.0], known={0: 0, 2: 5}))
    placing = place(answer, 1, 6)
    group = dict(zip(placing.phases.tolist(), placing.group.tolist(), strict=True))
    assert group[1] == group[2] == group[3] == group[4] == 1
    assert group[0] != 1
    assert group[5] != 1
    grey = dict(zip(placing.phases.tolist(), placing.predicted_grey.tolist(), strict=True))
    assert grey[1] == pytest.approx(170, abs=5)


def test_element_information_is_the_mutual_information(oxides):
    answer = rank(question(oxides, [60.0, 172.0, 290.0], known={0: 0, 2: 5}))
    visible = visibility(oxides)
    bits = element_bits(answer, visible, 1)
    # Written out for Fe: H(outcome) - sum of p H(outcome | phase).
    p = np.append(answer.probability[1], answer.none[1])
    seen = np.append(visible[:, FE], visible[:, FE].mean())

    def entropy(q):
        return -(q * np.log2(q) + (1 - q) * np.log2(1 - q))

    assert bits[FE] == pytest.approx(entropy(p @ seen) - p @ entropy(seen), abs=1e-3)
    assert bits.max() <= entropy_bits(p) + 1e-9


def test_advice_asks_for_what_separates(oxides):
    answer = rank(question(oxides, [60.0, 172.0, 290.0], known={0: 0, 2: 5}))
    context = AdviceContext(
        visibility(oxides), ["a", "the grey grains", "c"], known=frozenset({0, 2})
    )
    measures = advise(answer, context)
    assert measures[0].cluster == 1
    assert measures[0].kind == "spectrum"
    asked_first = next(m for m in measures if m.kind == "element")
    assert asked_first.detail in ("Fe", "Mg", "O")
    assert asked_first.detail in measures[0].text
    # A whole spectrum tells at least what its best element tells, and no more than there is to know.
    assert measures[0].bits >= asked_first.bits - 0.05
    assert measures[0].bits <= entropy_bits(np.append(answer.probability[1], answer.none[1]))
    assert "the grey grains" in measures[0].text
    asked = AdviceContext(
        visibility(oxides),
        ["a", "b", "c"],
        known=frozenset({0, 2}),
        asked={1: {"Fe", "Mg", "O", "C"}},
    )
    assert not [m for m in advise(answer, asked) if m.detail in ("Fe", "Mg", "O", "C")]


def test_two_clusters_are_not_the_same_phase():
    candidates = candidate_set([0.05, 0.16, 0.164, 0.28])
    greys = [60.0, 170.0, 175.0, 290.0]
    free = rank(question(candidates, greys, known={0: 0, 3: 3}))
    coupled = rank(
        question(candidates, greys, known={0: 0, 3: 3}, coupling=Coupling({}, np.full(4, 1e-3)))
    )
    assert free.probability[1, 2] > 0.05
    assert coupled.probability[1, 2] < 0.5 * free.probability[1, 2] + 0.02
    np.testing.assert_allclose(coupled.probability.sum(1) + coupled.none, 1.0, atol=1e-9)


def test_coexistence_reaches_the_other_cluster():
    # Phases 1 and 2 look the same; 2 never occurs with 3, and 3 is there for certain.
    candidates = candidate_set([0.05, 0.160, 0.1605, 0.28])
    coupling = Coupling({(2, 3): 0.01}, np.ones(4))
    answer = rank(question(candidates, [60.0, 170.0, 290.0], known={0: 0, 2: 3}, coupling=coupling))
    assert answer.probability[1, 1] > 0.85
    told = explain(answer, 1, 2)
    assert {t.name: t.bits for t in told.terms}["other clusters"] < -4
