"""A Gaussian mixture over greys that knows how greys come about.

Greys are counted in bins, cut off at the ends of the range, and no pure phase can be narrower than the
noise. Expectation-maximisation for grouped and censored data follows McLachlan & Jones (1988),
Biometrics 44, 571; the number of components can be judged by the criterion of Schwarz (1978).
"""

from __future__ import annotations

import inspect
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from phaseid.errors import InputError
from phaseid.image.mixture_steps import (
    Grouped,
    component_log_mass,
    component_moments,
    log_sum,
    starting_means,
)

Spread = Literal["free", "floor", "noise"]


class GreyMixture:
    """Gaussian mixture of one variable, weighted, grouped and censored; scikit-learn's estimator API.

    Parameters
    ----------
    n_components : int
        Number of components.
    noise : (float, float) or None
        Noise law: the variance of a pure grey g is ``noise[0] + noise[1] * g``.
    spread : {"free", "floor", "noise"}
        Variance of a component: free, at least the noise law's, or exactly the noise law's.
    bin_width : float
        Width of the bins the values stand for (1 for integer greys); 0 takes them as exact.
    limits : (float or None, float or None)
        Values at or below the first, at or above the second, are cut off: only the side is known.
    max_iter : int
    tol : float
        Stop when the mean log-likelihood gains less.
    n_init : int
        Starts; the best is kept. The first is deterministic, the others are drawn at random.
    means_init : array-like of shape (n_components,) or None
    reg_covar : float
        Smallest variance.
    random_state : int, Generator or None

    Attributes
    ----------
    weights_ : ndarray of shape (n_components,)
    means_ : ndarray of shape (n_components, 1)
        Ascending.
    covariances_ : ndarray of shape (n_components, 1, 1)
    converged_ : bool
    n_iter_ : int
    lower_bound_ : float
        Mean log-likelihood per unit weight.
    n_features_in_ : int
    """

    _estimator_type = "density_estimator"

    def __init__(
        self,
        n_components: int = 1,
        *,
        noise: tuple[float, float] | None = None,
        spread: Spread = "free",
        bin_width: float = 0.0,
        limits: tuple[float | None, float | None] = (None, None),
        max_iter: int = 200,
        tol: float = 1e-7,
        n_init: int = 3,
        means_init: ArrayLike | None = None,
        reg_covar: float = 1e-6,
        random_state: int | np.random.Generator | None = None,
    ) -> None:
        self.n_components = n_components
        self.noise = noise
        self.spread = spread
        self.bin_width = bin_width
        self.limits = limits
        self.max_iter = max_iter
        self.tol = tol
        self.n_init = n_init
        self.means_init = means_init
        self.reg_covar = reg_covar
        self.random_state = random_state

    # scikit-learn's protocol, without importing scikit-learn (1.3 s) to inherit it.
    def get_params(self, deep: bool = True) -> dict[str, Any]:
        """Parameters by name."""
        names = inspect.signature(type(self).__init__).parameters
        return {n: getattr(self, n) for n in names if n != "self"}

    def set_params(self, **params: Any) -> GreyMixture:
        """Set parameters by name."""
        known = self.get_params()
        for name, value in params.items():
            if name not in known:
                raise ValueError(
                    f"Invalid parameter {name!r} for GreyMixture; valid: {sorted(known)}"
                )
            setattr(self, name, value)
        return self

    def __sklearn_tags__(self) -> Any:
        from sklearn.utils import InputTags, Tags, TargetTags

        return Tags(
            estimator_type="density_estimator",
            target_tags=TargetTags(required=False),
            input_tags=InputTags(two_d_array=True),
        )

    def __sklearn_is_fitted__(self) -> bool:
        return hasattr(self, "means_")

    def __repr__(self) -> str:
        defaults = inspect.signature(type(self).__init__).parameters
        changed = {n: v for n, v in self.get_params().items() if not _same(v, defaults[n].default)}
        return f"GreyMixture({', '.join(f'{n}={v!r}' for n, v in changed.items())})"

    def fit(
        self, X: ArrayLike, y: None = None, sample_weight: ArrayLike | None = None
    ) -> GreyMixture:
        """Fit by expectation-maximisation.

        Parameters
        ----------
        X : array-like of shape (n,) or (n, 1)
            Greys, or the values of a histogram's bins.
        y : ignored
        sample_weight : array-like of shape (n,), optional
            Counts; need not be integers.

        Returns
        -------
        GreyMixture

        Raises
        ------
        InputError
            If the values or parameters cannot be used.
        """
        self._check()
        data = self._grouped(X, sample_weight)
        rng = np.random.default_rng(self.random_state)
        best: tuple[float, NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]] | None
        best = None
        starts = 1 if self.means_init is not None else max(1, self.n_init)
        for start in range(starts):
            means = (
                np.asarray(self.means_init, dtype=float).reshape(-1)
                if self.means_init is not None
                else starting_means(data, self.n_components, rng if start else None)
            )
            if len(means) != self.n_components:
                raise InputError(
                    f"means_init has {len(means)} values for {self.n_components} components."
                )
            result = self._run(data, means)
            if best is None or result[0] > best[0]:
                best = result
                self.n_iter_, self.converged_ = self._last
        assert best is not None
        self.lower_bound_ = best[0]
        order = np.argsort(best[2], kind="stable")
        self.weights_ = best[1][order]
        self.means_ = best[2][order][:, None]
        self.covariances_ = best[3][order][:, None, None]
        self.n_features_in_ = 1
        return self

    def _check(self) -> None:
        if self.n_components < 1:
            raise InputError(f"n_components is {self.n_components}; give 1 or more.")
        if self.spread not in ("free", "floor", "noise"):
            raise InputError(f"spread is {self.spread!r}; give 'free', 'floor' or 'noise'.")
        if self.spread != "free" and self.noise is None:
            raise InputError(f"spread {self.spread!r} needs the noise law; give noise=(a, b).")

    def _grouped(self, X: ArrayLike, sample_weight: ArrayLike | None) -> Grouped:
        x = np.asarray(X, dtype=float)
        if x.ndim == 2 and x.shape[1] != 1:
            raise InputError(f"X has {x.shape[1]} features; greys are one.")
        x = x.reshape(-1)
        w = np.ones_like(x) if sample_weight is None else np.asarray(sample_weight, dtype=float)
        if w.shape != x.shape:
            raise InputError(f"sample_weight has shape {w.shape}, X has {len(x)} rows.")
        if not np.all(np.isfinite(x)) or not np.all(np.isfinite(w)) or np.any(w < 0):
            raise InputError("Greys and weights must be finite, weights not negative.")
        keep = w > 0
        if not keep.any():
            raise InputError("There are no greys to fit (all weights are zero).")
        return Grouped(x[keep], w[keep], float(self.bin_width), *self.limits)

    def _run(
        self, data: Grouped, means: NDArray[np.float64]
    ) -> tuple[float, NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
        k = len(means)
        weights = np.full(k, 1.0 / k)
        variances = self._bounded(np.full(k, data.variance / max(k, 1) ** 2), means)
        if k == 1:
            variances = self._bounded(np.full(k, data.variance), means)
        total = data.weight.sum()
        before = -np.inf
        self._last = (self.max_iter, False)
        bound = before
        for step in range(self.max_iter):
            mass = component_log_mass(data, means, variances) + np.log(weights)
            whole = log_sum(mass)
            bound = float(data.weight @ whole / total)
            if bound - before < self.tol and step > 0:
                self._last = (step, True)
                break
            before = bound
            share = np.exp(mass - whole[:, None]) * data.weight[:, None]
            number = share.sum(axis=0) + 1e-300
            first, second = component_moments(data, means, variances)
            new_means = (share * first).sum(axis=0) / number
            spread = (share * (second - 2 * new_means * first + new_means**2)).sum(axis=0) / number
            empty = number < 1e-9 * total
            means = np.where(empty, means, new_means)
            variances = self._bounded(np.where(empty, variances, spread), means)
            weights = np.maximum(number / total, 1e-12)
            weights /= weights.sum()
        return bound, weights, means, variances

    def _bounded(
        self, variances: NDArray[np.float64], means: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        variances = np.maximum(variances, self.reg_covar)
        if self.noise is None or self.spread == "free":
            return variances
        law = np.maximum(self.noise[0] + self.noise[1] * means, self.reg_covar)
        return law if self.spread == "noise" else np.maximum(variances, law)

    def _log_parts(self, X: ArrayLike) -> NDArray[np.float64]:
        if not hasattr(self, "means_"):
            raise InputError("This GreyMixture is not fitted yet; call fit first.")
        x = np.asarray(X, dtype=float).reshape(-1)
        data = Grouped(x, np.ones_like(x), float(self.bin_width), *self.limits)
        mass = component_log_mass(data, self.means_[:, 0], self.covariances_[:, 0, 0])
        return np.asarray(mass + np.log(self.weights_))

    def score_samples(self, X: ArrayLike) -> NDArray[np.float64]:
        """Log-density of each value (log-mass of its bin where bins have a width)."""
        return log_sum(self._log_parts(X))

    def score(self, X: ArrayLike, y: None = None, sample_weight: ArrayLike | None = None) -> float:
        """Mean log-likelihood."""
        logs = self.score_samples(X)
        weight = np.ones_like(logs) if sample_weight is None else np.asarray(sample_weight, float)
        return float(weight @ logs / weight.sum())

    def predict_proba(self, X: ArrayLike) -> NDArray[np.float64]:
        """Probability of each component, shape (n, n_components)."""
        parts = self._log_parts(X)
        return np.asarray(np.exp(parts - log_sum(parts)[:, None]))

    def predict(self, X: ArrayLike) -> NDArray[np.intp]:
        """Most probable component of each value."""
        return np.asarray(np.argmax(self._log_parts(X), axis=1))

    def fit_predict(
        self, X: ArrayLike, y: None = None, sample_weight: ArrayLike | None = None
    ) -> NDArray[np.intp]:
        """Fit, then the most probable component of each value."""
        return self.fit(X, sample_weight=sample_weight).predict(X)

    def parameters(self) -> int:
        """Number of free parameters."""
        return self.n_components * (2 if self.spread == "noise" else 3) - 1

    def bic(self, X: ArrayLike, sample_weight: ArrayLike | None = None) -> float:
        """Schwarz's criterion; lower is better."""
        logs = self.score_samples(X)
        weight = np.ones_like(logs) if sample_weight is None else np.asarray(sample_weight, float)
        return float(-2 * weight @ logs + self.parameters() * np.log(weight.sum()))

    def aic(self, X: ArrayLike, sample_weight: ArrayLike | None = None) -> float:
        """Akaike's criterion; lower is better."""
        logs = self.score_samples(X)
        weight = np.ones_like(logs) if sample_weight is None else np.asarray(sample_weight, float)
        return float(-2 * weight @ logs + 2 * self.parameters())

    def sample(self, n_samples: int = 1) -> tuple[NDArray[np.float64], NDArray[np.intp]]:
        """Draw values (n_samples, 1) and the components they come from."""
        if not hasattr(self, "means_"):
            raise InputError("This GreyMixture is not fitted yet; call fit first.")
        rng = np.random.default_rng(self.random_state)
        which = rng.choice(self.n_components, size=n_samples, p=self.weights_)
        sd = np.sqrt(self.covariances_[which, 0, 0])
        return rng.normal(self.means_[which, 0], sd)[:, None], which


def _same(a: Any, b: Any) -> bool:
    try:
        return bool(np.all(a == b))
    except (TypeError, ValueError):
        return False
