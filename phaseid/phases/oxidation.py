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
    "Cu": (1, 3), "Zn": (2, 2), "Zr": (3, 4), "Nb": (2, 5), "Mo": (2, 6), "Hf": (3, 4), "Ta": (2, 5),
    "W": (2, 6), "Re": (3, 7), "Ag": (0, 2), "Cd": (2, 2), "Hg": (1, 2), "Au": (1, 3),
    "Pd": (2, 4), "Pt": (2, 4), "Ru": (2, 8), "Rh": (1, 4), "Os": (2, 8), "Ir": (1, 4),
    "Y": (3, 3), "La": (3, 3), "Ce": (3, 4), "Pr": (3, 4), "Nd": (3, 3), "Sm": (2, 3), "Eu": (2, 3),
    "Gd": (3, 3), "Tb": (3, 4), "Dy": (3, 3), "Ho": (3, 3), "Er": (3, 3), "Tm": (3, 3),
    "Yb": (2, 3), "Lu": (3, 3), "Th": (4, 4), "U": (4, 6), "Np": (3, 6), "Pu": (3, 6), "Am": (3, 4),
}  # fmt: skip
_LOW = np.array([_STATES.get(s, (1, 4))[0] for s in SYMBOLS], dtype=float)
_HIGH = np.array([_STATES.get(s, (1, 4))[1] for s in SYMBOLS], dtype=float)
_Z = {symbol: i for i, symbol in enumerate(SYMBOLS)}
_SALT_FORMERS = [_Z[s] for s in ("O", "F", "Cl")]
_NONMETALS = [
    _Z[s] for s in ("H", "B", "C", "N", "Si", "P", "S", "As", "Se", "Te", "Br", "I", "F", "Cl")
]
_PEROVSKITE = [_Z[s] for s in ("Sr", "Ba", "La")]
_DISSOLVING = [_Z[s] for s in ("Ti", "Zr", "Hf", "V", "Nb", "Ta")]
# Vacancies and rounding of published formulas; per atom.
TOLERANCE = 0.03
# Oxygen dissolved in a metal: alpha titanium takes up 34 at% (Murray and Wriedt 1987, from memory).
_DISSOLVED = 0.35


def imbalance(mass_fractions: Floats) -> float:
    """Charge per atom that no choice of usual states removes; 0 where it can balance.

    Parameters
    ----------
    mass_fractions : ndarray of shape (103,)

    Returns
    -------
    float
        0 also where oxidation states say little: metals, sulphides, carbides, nitrides, intermetallics
        (everything with less than a fifth of oxygen, fluorine and chlorine together), oxygen dissolved
        in metals, and organic matter (mostly carbon and hydrogen). Iron may be tetravalent beside
        strontium, barium or lanthanum, as in perovskites.
    """
    atoms = mass_fractions / atomic_masses()
    atoms = atoms / atoms.sum()
    salt = atoms[_SALT_FORMERS].sum()
    if salt < 0.2 or atoms[_Z["C"]] + atoms[_Z["H"]] > 0.6:
        return 0.0
    if salt < _DISSOLVED and atoms[_DISSOLVING].sum() > 0.6 and atoms[_NONMETALS].sum() == 0:
        return 0.0
    highest = _HIGH.copy()
    if atoms[_PEROVSKITE].sum() > 0.02:
        highest[_Z["Fe"]] = 4.0
    least, most = float(atoms @ _LOW), float(atoms @ highest)
    if least > 0:
        return least
    return -min(most, 0.0)


def valence_needed(mass_fractions: Floats, symbol: str) -> float:
    """State an element must at least have for the charges to balance.

    Parameters
    ----------
    mass_fractions : ndarray of shape (103,)
    symbol : str

    Returns
    -------
    float
        With all other elements in their highest usual states, lead in 2 and mercury in 2; 0 where the
        element is absent or there is no oxygen.
    """
    atoms = mass_fractions / atomic_masses()
    if atoms[_Z[symbol]] == 0 or atoms[_Z["O"]] == 0:
        return 0.0
    highest = _HIGH.copy()
    highest[[_Z["Pb"], _Z["Hg"]]] = 2.0
    highest[_Z[symbol]] = 0.0
    return -float(atoms @ highest) / float(atoms[_Z[symbol]])
