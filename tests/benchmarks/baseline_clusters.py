"""What a script of an hour does: smooth, mask strong gradients, fit a mixture with the true number.

It is told the true number of phases, which no user knows, and tries ten starts.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, eq=False)
class Plain:
    """Result of the baseline: ascending means and a label map counting from 1."""

    means: NDArray[np.float64]
    labels: NDArray[np.uint8]


def smoothed_and_calm(image: NDArray[Any]) -> tuple[NDArray[np.float32], NDArray[np.bool_]]:
    """Gaussian smoothing, and the mask of the calmer four fifths of the pixels."""
    from skimage.filters import gaussian, sobel

    smooth = gaussian(image.astype(np.float32), sigma=1.5, preserve_range=True)
    gradient = sobel(smooth)
    return smooth, gradient <= np.quantile(gradient, 0.8)


def mixture(image: NDArray[Any], number: int, starts: int = 10, seed: int = 0) -> Plain:
    """Mixture of the true number of components on the calm pixels."""
    from sklearn.mixture import GaussianMixture

    smooth, calm = smoothed_and_calm(image)
    model = GaussianMixture(number, n_init=starts, random_state=seed)
    model.fit(smooth[calm].reshape(-1, 1))
    order = np.argsort(model.means_[:, 0])
    rank = np.empty(number, dtype=np.uint8)
    rank[order] = np.arange(1, number + 1)
    labels = rank[model.predict(smooth.reshape(-1, 1))].reshape(image.shape)
    return Plain(model.means_[order, 0], labels)


def chosen_number(image: NDArray[Any], most: int = 6, seed: int = 0) -> int:
    """Number of components by the criterion of Schwarz, on a sample of the calm pixels."""
    from sklearn.mixture import GaussianMixture

    smooth, calm = smoothed_and_calm(image)
    rng = np.random.default_rng(seed)
    values = rng.choice(smooth[calm], size=min(20_000, int(calm.sum())), replace=False)
    sample = values.reshape(-1, 1)
    criterion = [
        GaussianMixture(k, n_init=2, random_state=seed).fit(sample).bic(sample)
        for k in range(1, most + 1)
    ]
    return int(np.argmin(criterion)) + 1


def otsu(image: NDArray[Any], number: int) -> Plain:
    """Multi-Otsu thresholds on the smoothed image, with the true number."""
    from skimage.filters import threshold_multiotsu

    smooth, _ = smoothed_and_calm(image)
    if number == 1:
        return Plain(np.array([float(smooth.mean())]), np.ones(image.shape, np.uint8))
    cuts = threshold_multiotsu(smooth, classes=number, nbins=128)
    labels = (np.digitize(smooth, cuts) + 1).astype(np.uint8)
    means = np.array([float(smooth[labels == k].mean()) for k in range(1, number + 1)])
    return Plain(means, labels)
