"""Usual oxidation states, for finding formulas whose charges cannot balance."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from phaseid.physics.elements import SYMBOLS, atomic_masses

Floats = NDArray[np.float64]

# Lowest and highest usual state in oxides, halides and salts; textbook inorganic chemistry, from memory.
# Elements that are not listed are metals taken as 1 to 4.
_STATES: dict[str, tuple[float, float]] = {
    "H": (1, 1), "Li": (1, 1), "Na": (1, 1), "K": (1, 1), "Rb": (1, 1), "Cs": (1, 1),
    "Be": (2, 2), "Mg": (2, 2), "Ca": (2, 2), "Sr": (2, 2), "Ba": (2, 2), "Ra": (2, 2),
    "B": (3, 3), "Al": (3, 3), "Ga": (1, 3), "In": (1, 3), "Tl": (1, 3), "Sc": (3, 3),
    "C": (-4, 4), "Si": (-4, 4), "Ge": (2, 4), "Sn": (2, 4), "Pb": (2, 4),
    "N": (-3, 5), "P": (-3, 5), "As": (-3, 5), "Sb": (-3, 5), "Bi": (2, 5),
    "O": (-2, -2), "S": (-2, 6), "Se": (-2, 6), "Te": (-2, 6),
    "F": (-1, -1), "Cl": (-1, -1), "Br": (-1, 5), "I": (-1, 7),
    "Ti": (2, 4), "V": (2, 5), "Cr": (2, 6), "Mn": (2, 7), "Fe": (2, 3), "Co": (2, 4), "Ni": (2, 4),
    "Cu": (1, 3), "Zn": (2, 2), "Zr": (4, 4), "Nb": (2, 5), "Mo": (2, 6), "Hf": (4, 4), "Ta": (2, 5),
    "W": (2, 6), "Re": (3, 7), "Ag": (0, 2), "Cd": (2, 2), "Hg": (1, 2), "Au": (1, 3),
    "Pd": (2, 4), "Pt": (2, 4), "Ru": (2, 8), "Rh": (1, 4), "Os": (2, 8), "Ir": (1, 4),
    "Y": (3, 3), "La": (3, 3), "Ce": (3, 4), "Pr": (3, 4), "Nd": (3, 3), "Sm": (2, 3), "Eu": (2, 3),
    "Gd": (3, 3), "Tb": (3, 4), "Dy": (3, 3), "Ho": (3, 3), "Er": (3, 3), "Tm": (3, 3),
    "Yb": (2, 3), "Lu": (3, 3), "Th": (4, 4), "U": (4, 6), "Np": (3, 6), "Pu": (3, 6), "Am": (3, 4),
}  # fmt: skip
_LOW = np.array([_STATES.get(s, (1, 4))[0] for s in SYMBOLS], dtype=float)
_HIGH = np.array([_STATES.get(s, (1, 4))[1] for s in SYMBOLS], dtype=float)
_SALT_FORMERS = [SYMBOLS.index(s) for s in ("O", "F", "Cl")]
_OXYGEN, _CARBON, _HYDROGEN = (SYMBOLS.index(s) for s in ("O", "C", "H"))
# Vacancies and rounding of published formulas; per atom.
TOLERANCE = 0.03


def imbalance(mass_fractions: Floats) -> float:
    """Charge per atom that no choice of usual states removes; 0 where it can balance.

    Parameters
    ----------
    mass_fractions : ndarray of shape (103,)

    Returns
    -------
    float
        0 also for metals, sulphides, carbides, nitrides, intermetallics and organic matter, where
        oxidation states say little: everything without oxygen, fluorine or chlorine, and everything
        that is mostly carbon and hydrogen.
    """
    atoms = mass_fractions / atomic_masses()
    atoms = atoms / atoms.sum()
    if atoms[_SALT_FORMERS].sum() < 0.2 or atoms[_CARBON] + atoms[_HYDROGEN] > 0.6:
        return 0.0
    lowest, highest = float(atoms @ _LOW), float(atoms @ _HIGH)
    if lowest > 0:
        return lowest
    return -min(highest, 0.0)
