"""Conductive coats: what they are made of and how dense they are."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from phaseid.errors import InputError
from phaseid.physics.elements import ELEMENT_COUNT, Floats, atomic_number

# Density in g/cm3 and mass fractions. Handbook densities of the metals (from memory); evaporated
# carbon is taken as 1.8, between graphite and soot-like films. The alloys are the usual targets
# (common practice), their densities by volumes of the parts.
_MATERIALS: dict[str, tuple[float, dict[str, float]]] = {
    "C": (1.8, {"C": 1.0}),
    "Au": (19.3, {"Au": 1.0}),
    "Pt": (21.45, {"Pt": 1.0}),
    "Ir": (22.56, {"Ir": 1.0}),
    "Os": (22.59, {"Os": 1.0}),
    "W": (19.25, {"W": 1.0}),
    "Cr": (7.19, {"Cr": 1.0}),
    "Ti": (4.51, {"Ti": 1.0}),
    "Ni": (8.91, {"Ni": 1.0}),
    "Cu": (8.96, {"Cu": 1.0}),
    "Al": (2.70, {"Al": 1.0}),
    "Ag": (10.49, {"Ag": 1.0}),
    "Pd": (12.02, {"Pd": 1.0}),
    "Au-Pd": (15.5, {"Au": 0.6, "Pd": 0.4}),
    "Pt-Pd": (18.5, {"Pt": 0.8, "Pd": 0.2}),
}
_MAX_THICKNESS_NM = 1000.0


@dataclass(frozen=True)
class Coat:
    """A conductive coat.

    Parameters
    ----------
    material : str
        One of `coat_materials`, e.g. ``"C"`` or ``"Au-Pd"``.
    thickness_nm : float
        More than 0 and at most 1000.

    Raises
    ------
    InputError
        For an unknown material or a thickness out of bounds.
    """

    material: str
    thickness_nm: float

    def __post_init__(self) -> None:
        if self.material not in _MATERIALS:
            raise InputError(
                f"There is no coat material {self.material!r}; choose one of "
                f"{', '.join(coat_materials())}."
            )
        if not 0 < self.thickness_nm <= _MAX_THICKNESS_NM:
            raise InputError(
                f"A coat of {self.thickness_nm:g} nm cannot be used; give a thickness above 0 and "
                f"up to {_MAX_THICKNESS_NM:g} nm, or leave the coat out."
            )

    @classmethod
    def parse(cls, text: str) -> Coat:
        """Read ``MATERIAL:NM``, e.g. ``C:15`` or ``Au-Pd:8``; case and ``nm`` are forgiven."""
        material, separator, thickness = text.partition(":")
        number = thickness.strip().lower().removesuffix("nm").strip()
        try:
            thickness_nm = float(number)
        except ValueError:
            separator = ""
        if not separator:
            raise InputError(
                f"The coat {text!r} cannot be read; write material and thickness in nm as C:15."
            )
        wanted = material.strip().lower().replace("/", "-")
        names = {name.lower().replace("-", ""): name for name in _MATERIALS}
        names |= {"carbon": "C", "gold": "Au", "platinum": "Pt", "iridium": "Ir", "chromium": "Cr"}
        return cls(names.get(wanted.replace("-", ""), material.strip()), thickness_nm)

    @property
    def density(self) -> float:
        """Density in g/cm3."""
        return _MATERIALS[self.material][0]

    @property
    def mass_fractions(self) -> Floats:
        """Composition, shape (103,)."""
        composition = np.zeros(ELEMENT_COUNT)
        for symbol, share in _MATERIALS[self.material][1].items():
            composition[atomic_number(symbol) - 1] = share
        return composition

    def __str__(self) -> str:
        return f"{self.material}:{self.thickness_nm:g}"


def coat_materials() -> tuple[str, ...]:
    """Names of the coat materials."""
    return tuple(_MATERIALS)
