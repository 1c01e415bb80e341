"""Evidence about what a cluster is: elements in its X-ray spectrum, and the user's word.

Each function returns likelihoods per composition variant; pieces of evidence multiply.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.candidates import CandidateSet
from phaseid.physics.elements import ELEMENT_COUNT, SYMBOLS, atomic_number

Floats = NDArray[np.float64]

# Chance that an analyst reports an element that is not in the phase (neighbouring phase inside the
# X-ray volume, an overlapping line) or overlooks one far above the limit. Common practice.
FALSE_REPORT = 0.02
# Width of the transition from invisible to visible, in ln(mass fraction). Common practice.
TRANSITION = 0.6
# Errors of a quick quantification, and the chance that it is of something else. Common practice.
CONTENT_RELATIVE = 0.10
CONTENT_ABSOLUTE = 0.01
TOTAL_SD = 0.15
WRONG_CONTENT = 1e-3


def detection_limits(energy_keV: float = 20.0) -> Floats:
    """Mass fraction at which an element is seen in half of the quick spectra.

    Parameters
    ----------
    energy_keV : float
        Beam energy.

    Returns
    -------
    ndarray of shape (103,)
        Index Z - 1; infinity for an element that gives no usable line.

    Notes
    -----
    Common practice for an energy-dispersive spectrum of about a minute: about 0.2 % for Na and heavier,
    1 % for F, 2 % for O and N, 5 % for C (which is also on every surface), 10 % for B; H to Be not at
    all. An element whose lowest useful line needs more than the beam energy over 1.5 is not seen; line
    energies from Moseley's law (1914) with the usual screening constants.
    """
    z = np.arange(1, ELEMENT_COUNT + 1, dtype=float)
    limits = np.full(ELEMENT_COUNT, 0.002)
    for symbol, limit in {
        "B": 0.10,
        "C": 0.05,
        "N": 0.02,
        "O": 0.02,
        "F": 0.01,
        "Ne": 0.01,
    }.items():
        limits[atomic_number(symbol) - 1] = limit
    limits[:4] = np.inf
    k_line = 0.0102 * (z - 1.0) ** 2
    l_line = 0.0102 * (5 / 27) * (z - 7.4) ** 2
    m_line = 0.0102 * (7 / 108) * np.maximum(z - 20.0, 0.0) ** 2
    lowest = np.where(z < 30, k_line, np.where(z < 62, l_line, m_line))
    limits[lowest * 1.5 > energy_keV] = np.inf
    return limits


def visibility(candidates: CandidateSet, energy_keV: float = 20.0) -> Floats:
    """Probability that each element is reported in a quick spectrum of each row.

    Parameters
    ----------
    candidates : CandidateSet
        R rows.
    energy_keV : float

    Returns
    -------
    ndarray of shape (R, 103)
    """
    from scipy.special import ndtr

    limits = detection_limits(energy_keV)
    content = candidates.mass_fractions.astype(float)
    with np.errstate(divide="ignore"):
        height = (np.log(content) - np.log(limits)) / TRANSITION
    seen = ndtr(np.nan_to_num(height, nan=-np.inf, neginf=-np.inf))
    return np.asarray(FALSE_REPORT + (1 - 2 * FALSE_REPORT) * seen)


def elements_evidence(
    visible: Floats, seen: Iterable[str] = (), unseen: Iterable[str] = ()
) -> Floats:
    """Likelihood of a spectrum's report under each row.

    Parameters
    ----------
    visible : ndarray of shape (R, 103)
        From `visibility`.
    seen, unseen : iterable of str
        Symbols found, and looked for and not found.

    Returns
    -------
    ndarray of shape (R,)

    Raises
    ------
    InputError
        If a symbol is not an element.
    """
    likelihood = np.ones(len(visible))
    for symbol in seen:
        likelihood = likelihood * visible[:, atomic_number(symbol) - 1]
    for symbol in unseen:
        likelihood = likelihood * (1.0 - visible[:, atomic_number(symbol) - 1])
    return likelihood


def content_evidence(candidates: CandidateSet, content: Mapping[str, float]) -> Floats:
    """Likelihood of a quick quantification under each row.

    Parameters
    ----------
    candidates : CandidateSet
        R rows.
    content : mapping of str to float
        Mass per cent of each element that was quantified; the total need not be 100, and elements that
        are not named say nothing.

    Returns
    -------
    ndarray of shape (R,)
        Relative to a perfect agreement.

    Raises
    ------
    InputError
        If a symbol is not an element.

    Notes
    -----
    Common practice for a standardless quantification: each value is good to 10 % of itself and one mass
    per cent, the total to 15 %. The common factor is integrated out (a Gaussian with the total's prior).
    """
    columns = [atomic_number(symbol) - 1 for symbol in content]
    measured = np.array([v / 100.0 for v in content.values()])
    weight = 1.0 / (CONTENT_RELATIVE * measured) ** 2
    weight = 1.0 / (1.0 / weight + CONTENT_ABSOLUTE**2)
    true = candidates.mass_fractions[:, columns].astype(float)
    prior = TOTAL_SD**-2.0
    factor = (true @ (weight * measured) + prior) / (true**2 @ weight + prior)
    gap = measured - factor[:, None] * true
    misfit = gap**2 @ weight + prior * (factor - 1.0) ** 2
    return np.asarray(WRONG_CONTENT + (1.0 - WRONG_CONTENT) * np.exp(-0.5 * misfit))


def none_likelihood(candidates: CandidateSet, likelihood: Floats) -> float:
    """Likelihood of the same report for a phase that is in no database: the mean over all phases."""
    return float(candidates.by_phase(candidates.share * likelihood).mean())


def element_names(indices: Iterable[int]) -> list[str]:
    """Symbols of column indices."""
    return [SYMBOLS[i] for i in indices]
