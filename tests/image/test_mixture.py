"""The mixture estimator, against scikit-learn's where both apply, and alone where only ours does."""

from __future__ import annotations

import numpy as np
import pytest
from sklearn.base import clone
from sklearn.mixture import GaussianMixture
from sklearn.model_selection import GridSearchCV
from sklearn.pipeline import make_pipeline
from sklearn.preprocessing import StandardScaler

from phaseid.errors import InputError
from phaseid.image.mixture import GreyMixture


def drawn(seed: int = 0, n: int = 4000) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return np.concatenate(
        [rng.normal(60, 5, n), rng.normal(105, 4, n // 2), rng.normal(200, 8, n // 4)]
    )[:, None]


@pytest.mark.parametrize("k", [1, 3])
def test_same_fit_as_scikit_learn(k: int) -> None:
    x = drawn()
    start = np.array([60.0, 105.0, 200.0])[:k]
    ours = GreyMixture(k, means_init=start, tol=1e-10, max_iter=2000).fit(x)
    theirs = GaussianMixture(
        k, means_init=start[:, None], tol=1e-10, max_iter=2000, reg_covar=1e-9
    ).fit(x)
    order = np.argsort(theirs.means_[:, 0])
    np.testing.assert_allclose(ours.means_[:, 0], theirs.means_[order, 0], rtol=1e-4)
    np.testing.assert_allclose(ours.weights_, theirs.weights_[order], rtol=1e-3)
    np.testing.assert_allclose(
        ours.covariances_[:, 0, 0], theirs.covariances_[order, 0, 0], rtol=2e-3
    )
    assert ours.score(x) == pytest.approx(theirs.score(x), abs=1e-6)
    assert ours.bic(x) == pytest.approx(theirs.bic(x), rel=1e-6)
    assert ours.aic(x) == pytest.approx(theirs.aic(x), rel=1e-6)
    rank = np.argsort(order)
    np.testing.assert_array_equal(ours.predict(x), rank[theirs.predict(x)])
    np.testing.assert_allclose(ours.predict_proba(x), theirs.predict_proba(x)[:, order], atol=2e-3)


def test_weights_are_repetitions() -> None:
    rng = np.random.default_rng(2)
    values = np.rint(drawn(3, 500)).ravel()
    once, count = np.unique(values, return_counts=True)
    start = [60.0, 105.0, 200.0]
    weighted = GreyMixture(3, means_init=start).fit(once, sample_weight=count)
    repeated = GreyMixture(3, means_init=start).fit(rng.permutation(values))
    np.testing.assert_allclose(weighted.means_, repeated.means_, rtol=1e-9)
    np.testing.assert_allclose(weighted.covariances_, repeated.covariances_, rtol=1e-7)
    assert weighted.score(once, sample_weight=count) == pytest.approx(repeated.score(values))


def test_bins_take_rounding_out_of_the_variance() -> None:
    rng = np.random.default_rng(4)
    values, count = np.unique(np.rint(rng.normal(100.3, 0.6, 200_000)), return_counts=True)
    plain = GreyMixture(1).fit(values, sample_weight=count)
    binned = GreyMixture(1, bin_width=1.0).fit(values, sample_weight=count)
    assert np.sqrt(plain.covariances_[0, 0, 0]) > 0.655  # 0.6 and the rounding's 1 / 12
    assert np.sqrt(binned.covariances_[0, 0, 0]) == pytest.approx(0.6, abs=0.005)
    assert binned.means_[0, 0] == pytest.approx(100.3, abs=0.005)


def test_cut_off_ends_are_mass_beyond_them() -> None:
    rng = np.random.default_rng(5)
    values, count = np.unique(
        np.clip(np.rint(rng.normal(3, 6, 100_000)), 0, 255), return_counts=True
    )
    plain = GreyMixture(1, bin_width=1.0).fit(values, sample_weight=count)
    censored = GreyMixture(1, bin_width=1.0, limits=(0.0, 255.0), max_iter=2000).fit(
        values, sample_weight=count
    )
    assert plain.means_[0, 0] > 4.0
    assert censored.means_[0, 0] == pytest.approx(3.0, abs=0.15)
    assert np.sqrt(censored.covariances_[0, 0, 0]) == pytest.approx(6.0, abs=0.15)


def test_noise_law_bounds_and_ties_the_spread() -> None:
    x = drawn()
    law = (4.0, 0.2)
    tied = GreyMixture(3, noise=law, spread="noise", random_state=0).fit(x)
    np.testing.assert_allclose(tied.covariances_[:, 0, 0], 4.0 + 0.2 * tied.means_[:, 0], rtol=1e-9)
    assert tied.parameters() == 5
    floor = GreyMixture(3, noise=(49.0, 0.0), spread="floor", random_state=0).fit(x)
    assert np.all(floor.covariances_ >= 49.0)
    assert floor.covariances_[2, 0, 0] == pytest.approx(64, rel=0.1)


def test_starts_are_reproducible_and_find_far_peaks() -> None:
    x = drawn(7)
    a = GreyMixture(3, random_state=1).fit(x)
    b = GreyMixture(3, random_state=1).fit(x)
    np.testing.assert_array_equal(a.means_, b.means_)
    np.testing.assert_allclose(a.means_[:, 0], [60, 105, 200], atol=1.0)
    assert a.converged_
    assert a.n_iter_ > 0


def test_it_is_a_scikit_learn_estimator() -> None:
    model = GreyMixture(2, bin_width=1.0)
    again = clone(model)
    assert again.get_params() == model.get_params()
    assert repr(again) == "GreyMixture(n_components=2, bin_width=1.0)"
    pipeline = make_pipeline(StandardScaler(), GreyMixture(3, random_state=0)).fit(drawn())
    assert len(np.unique(pipeline.predict(drawn()))) == 3
    search = GridSearchCV(GreyMixture(random_state=0), {"n_components": [1, 3]}, cv=2).fit(
        np.random.default_rng(0).permutation(drawn(1, 400))
    )
    assert search.best_params_ == {"n_components": 3}
    with pytest.raises(ValueError, match="Invalid parameter"):
        model.set_params(colour=1)


def test_sample_follows_the_fit() -> None:
    model = GreyMixture(3, random_state=0).fit(drawn())
    values, which = model.sample(20_000)
    assert values.shape == (20_000, 1)
    for k in range(3):
        assert values[which == k].mean() == pytest.approx(model.means_[k, 0], abs=0.5)


@pytest.mark.parametrize(
    ("options", "x", "weight", "words"),
    [
        ({"n_components": 0}, [1.0, 2.0], None, "n_components"),
        ({"spread": "noise"}, [1.0, 2.0], None, "noise law"),
        ({"spread": "odd"}, [1.0, 2.0], None, "spread"),
        ({}, [1.0, np.nan], None, "finite"),
        ({}, [1.0, 2.0], [1.0, -1.0], "not negative"),
        ({}, [1.0, 2.0], [0.0, 0.0], "no greys"),
        ({}, [[1.0, 2.0]], None, "2 features"),
        ({"n_components": 2, "means_init": [1.0]}, [1.0, 2.0], None, "means_init"),
    ],
)
def test_bad_input(options: dict[str, object], x: object, weight: object, words: str) -> None:
    with pytest.raises(InputError, match=words):
        GreyMixture(**options).fit(x, sample_weight=weight)


def test_not_fitted() -> None:
    with pytest.raises(InputError, match="not fitted"):
        GreyMixture().predict([1.0])
