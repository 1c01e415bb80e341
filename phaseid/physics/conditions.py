"""The conditions an image was taken under, as far as the signal depends on them."""

from __future__ import annotations

from dataclasses import dataclass, field

from phaseid.errors import InputError
from phaseid.physics.coats import Coat, coat_materials
from phaseid.physics.detector import Detector
from phaseid.physics.elemental import DEFAULT_MODEL, BackscatterModel, get_model
from phaseid.physics.mixing import DEFAULT_RULE, CompoundRule, get_rule

__all__ = ["Coat", "Conditions", "Flag", "coat_materials"]

_LOWEST_KEV, _HIGHEST_KEV = 1.0, 100.0
_LOW_ENERGY_KEV = 5.0


@dataclass(frozen=True)
class Flag:
    """Something the reader of a prediction must know; not an error.

    Attributes
    ----------
    code : str
        Short, stable, lower case with hyphens.
    message : str
        One sentence.
    """

    code: str
    message: str


@dataclass(frozen=True)
class Conditions:
    """Beam, sample tilt, coat, detector, and the formulas to predict with.

    Parameters
    ----------
    energy_keV : float
        Beam energy, 1 to 100.
    tilt_deg : float
        Angle between beam and surface normal, 0 to 80.
    coat : Coat or None
    detector : Detector
    model : str or BackscatterModel
    rule : str or CompoundRule

    Raises
    ------
    InputError
        For a value out of bounds or an unknown name.
    """

    energy_keV: float = 20.0
    tilt_deg: float = 0.0
    coat: Coat | None = None
    detector: Detector = field(default_factory=Detector)
    model: str | BackscatterModel = DEFAULT_MODEL
    rule: str | CompoundRule = DEFAULT_RULE

    def __post_init__(self) -> None:
        if not _LOWEST_KEV <= self.energy_keV <= _HIGHEST_KEV:
            raise InputError(
                f"A beam energy of {self.energy_keV:g} keV cannot be used; give a value from "
                f"{_LOWEST_KEV:g} to {_HIGHEST_KEV:g} keV."
            )
        if not 0 <= self.tilt_deg <= 80:
            raise InputError(
                f"A tilt of {self.tilt_deg:g} degrees cannot be used; give the angle between beam "
                "and surface normal, 0 to 80."
            )
        if self.detector.lowest_energy_keV >= self.energy_keV:
            raise InputError(
                f"The detector threshold of {self.detector.lowest_energy_keV:g} keV leaves no "
                f"signal at a beam energy of {self.energy_keV:g} keV; lower the threshold or give "
                "a higher beam energy."
            )
        get_model(self.model)
        get_rule(self.rule)

    @property
    def flags(self) -> tuple[Flag, ...]:
        """What limits predictions under these conditions, whatever the phase."""
        found: list[Flag] = []
        model = get_model(self.model)
        if self.energy_keV < _LOW_ENERGY_KEV:
            found.append(
                Flag(
                    "low-energy",
                    f"At {self.energy_keV:g} keV contrast between elements compresses and surface "
                    "films decide the signal; predictions below 5 keV are not reliable.",
                )
            )
        if model.energy_range_keV is not None:
            low, high = model.energy_range_keV
            if not low <= self.energy_keV <= high:
                fitted = f"near {low:g} keV" if low == high else f"at {low:g} to {high:g} keV"
                found.append(
                    Flag(
                        "energy-outside-model",
                        f"The model {model.name} was fitted {fitted} and is used at "
                        f"{self.energy_keV:g} keV.",
                    )
                )
        if self.tilt_deg > 60:
            found.append(
                Flag(
                    "steep-tilt",
                    f"At a tilt of {self.tilt_deg:g} degrees the published tilt laws differ from "
                    "simulation by 3 to 7 %.",
                )
            )
        if self.coat is not None and self.coat.material != "C":
            found.append(
                Flag(
                    "metal-coat",
                    f"A coat of {self.coat} hides composition contrast; its correction carries "
                    "the uncertainty of its thickness. Carbon is the usual choice.",
                )
            )
        return tuple(found)
