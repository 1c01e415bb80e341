"""Single elastic scattering and slowing down of electrons in a material, as look-up tables.

The simulation asks for the same few functions of energy millions of times, so each material is
tabulated once on an axis even in the square root of energy, which is fine where they are steep.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from phaseid.errors import InputError
from phaseid.physics.elements import Floats, as_compositions, atomic_masses, atomic_numbers
from phaseid.physics.stopping import mass_stopping_power

Floats32 = NDArray[np.float32]

CROSS_SECTIONS = ("browning", "rutherford")
NODES = 4096
LOWEST_KEV = 0.1
"""Browning's cross-section is given for 0.1 to 30 keV; slower electrons count as absorbed."""

_AVOGADRO = 6.02214076e23
_REST_KEV = 511.0


@dataclass(frozen=True, eq=False)
class Material:
    """A composition with a density.

    Parameters
    ----------
    mass_fractions : array_like of shape (103,)
    density : float
        g/cm3.

    Raises
    ------
    InputError
        If the density is not positive or the composition empty.
    """

    mass_fractions: Floats
    density: float

    def __post_init__(self) -> None:
        composition = as_compositions(self.mass_fractions)
        if composition.ndim != 1 or not composition.sum() > 0:
            raise InputError("A material to simulate needs one composition that is not empty.")
        if not 0 < self.density < 100:
            raise InputError(
                f"A density of {self.density:g} g/cm3 cannot be used; give a value above 0."
            )
        object.__setattr__(self, "mass_fractions", composition / composition.sum())

    @cached_property
    def elements(self) -> NDArray[np.intp]:
        """Indices (Z - 1) of the elements that are there."""
        return np.flatnonzero(self.mass_fractions)


@dataclass(frozen=True, eq=False)
class Tables:
    """Functions of energy for several materials, each flattened to (materials * nodes,).

    Attributes
    ----------
    per_root : float
        Node of an energy E is ``int(sqrt(E) * per_root)``.
    mean_free_path : ndarray of float32
        um.
    stopping : ndarray of float32
        keV/um.
    reach : ndarray of float32
        Longest path left before the cut-off, in um, the greatest over the materials.
    channel_limit : ndarray of float32, shape (channels - 1, materials * nodes)
        Cumulative probability of the scattering channels but the last.
    channel_peak : ndarray of float32, shape (channels, materials * nodes)
        Reciprocal screening parameter of each channel; 0 scatters isotropically.
    """

    per_root: float
    mean_free_path: Floats32
    stopping: Floats32
    reach: Floats32
    channel_limit: Floats32
    channel_peak: Floats32


def tabulate(
    materials: tuple[Material, ...], energy_keV: float, cross_section: str, cutoff_keV: float
) -> Tables:
    """Tables for `materials` from the cut-off up to the beam energy.

    Parameters
    ----------
    materials : tuple of Material
    energy_keV : float
        Beam energy.
    cross_section : {"browning", "rutherford"}
    cutoff_keV : float
        Electrons below count as absorbed.

    Returns
    -------
    Tables

    References
    ----------
    Browning, Li, Chui, Ye, Pease, Czyzewski & Joy 1994 (total elastic cross-section and the split
    into screened Rutherford and isotropic scattering); screened Rutherford with the screening of
    Bishop and Joy; stopping power of Joy & Luo 1989. Coefficients as printed by later sources.
    """
    if cross_section not in CROSS_SECTIONS:
        raise InputError(
            f"There is no cross-section {cross_section!r}; choose one of "
            f"{', '.join(CROSS_SECTIONS)}."
        )
    root = np.sqrt(energy_keV)
    energy = ((np.arange(NODES) + 0.5) / NODES * root) ** 2
    energy = np.maximum(energy, 0.3 * cutoff_keV)
    paths, stoppings, limits, peaks = [], [], [], []
    channels = 2 if cross_section == "browning" else max(len(m.elements) for m in materials)
    for material in materials:
        inverse, limit, peak = _elastic(material, energy, cross_section, channels)
        paths.append(1e4 / inverse)
        limits.append(limit)
        peaks.append(peak)
        stoppings.append(_stopping(material, energy))
    reach = np.max([_reach(energy, stopping, cutoff_keV) for stopping in stoppings], axis=0)
    return Tables(
        per_root=float(NODES / root),
        mean_free_path=_flat(paths),
        stopping=_flat(stoppings),
        reach=reach.astype(np.float32),
        channel_limit=np.concatenate(limits, axis=1).astype(np.float32),
        channel_peak=np.concatenate(peaks, axis=1).astype(np.float32),
    )


def browning_cross_section(z: ArrayLike, energy_keV: ArrayLike) -> Floats:
    """Total elastic cross-section in cm2 per atom, 0.1 to 30 keV (Browning et al. 1994)."""
    number = np.asarray(z, dtype=np.float64)
    energy = np.asarray(energy_keV, dtype=np.float64)
    power = number**1.7
    value: Floats = (3.0e-18 * power) / (
        energy + 0.005 * power * np.sqrt(energy) + 0.0007 * number**2 / np.sqrt(energy)
    )
    return value


def rutherford_cross_section(z: ArrayLike, energy_keV: ArrayLike) -> Floats:
    """Screened Rutherford cross-section in cm2 per atom."""
    number = np.asarray(z, dtype=np.float64)
    energy = np.asarray(energy_keV, dtype=np.float64)
    alpha = rutherford_screening(number, energy)
    relativistic = ((energy + _REST_KEV) / (energy + 2 * _REST_KEV)) ** 2
    value: Floats = (
        5.21e-21 * (number / energy) ** 2 * 4 * np.pi / (alpha * (1 + alpha)) * relativistic
    )
    return value


def rutherford_screening(z: ArrayLike, energy_keV: ArrayLike) -> Floats:
    """Screening parameter ``3.4e-3 Z^0.67 / E`` (Bishop, Joy)."""
    value: Floats = (
        3.4e-3 * np.asarray(z, dtype=np.float64) ** 0.67 / np.asarray(energy_keV, dtype=np.float64)
    )
    return value


def browning_rutherford_share(z: ArrayLike, energy_keV: ArrayLike) -> Floats:
    """Share of collisions that scatter by the Rutherford law, the rest isotropically."""
    number = np.asarray(z, dtype=np.float64)
    energy = np.asarray(energy_keV, dtype=np.float64)
    ratio = 300.0 * energy / number + number**3 / (3.0e5 * energy)
    share: Floats = ratio / (1.0 + ratio)
    return share


def _elastic(
    material: Material, energy: Floats, cross_section: str, channels: int
) -> tuple[Floats, Floats, Floats]:
    """Inverse mean free path in 1/cm, cumulative limits and peaks of the channels."""
    present = material.elements
    z = atomic_numbers()[present][:, None]
    atoms = (
        material.density
        * _AVOGADRO
        * (material.mass_fractions[present] / atomic_masses()[present])[:, None]
    )
    if cross_section == "browning":
        partial = atoms * browning_cross_section(z, energy)
        total = partial.sum(axis=0)
        share = (partial * browning_rutherford_share(z, energy)).sum(axis=0) / total
        # Browning's Rutherford part has one screening for all elements: two channels suffice.
        return total, share[None], np.stack([energy / 7.0e-3, np.zeros_like(energy)])
    partial = atoms * rutherford_cross_section(z, energy)
    total = partial.sum(axis=0)
    limit = np.ones((channels - 1, len(energy)))
    limit[: len(present) - 1] = np.cumsum(partial / total, axis=0)[:-1]
    peak = np.zeros((channels, len(energy)))
    peak[: len(present)] = 1.0 / rutherford_screening(z, energy)
    return total, limit, peak


def _stopping(material: Material, energy: Floats) -> Floats:
    """keV per um."""
    present = material.elements
    composition = np.zeros((1, len(material.mass_fractions)))
    composition[0, present] = material.mass_fractions[present]
    return mass_stopping_power(composition, energy) * material.density * 1e-4


def _reach(energy: Floats, stopping: Floats, cutoff_keV: float) -> Floats:
    """Path in um over which an electron slows down to the cut-off (with a margin)."""
    slices = np.diff(energy, prepend=0.0) / stopping
    slices[energy < cutoff_keV] = 0.0
    path: Floats = np.cumsum(slices) * 1.02
    return path


def _flat(rows: list[Floats]) -> Floats32:
    return np.concatenate(rows).astype(np.float32)
