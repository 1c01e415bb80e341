"""From composition to eta and detector signal, for one formula or for all of them at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.coating import coated, hidden_share
from phaseid.physics.coats import Coat
from phaseid.physics.combining import ByElement, all_combined, combined, ratio
from phaseid.physics.conditions import Conditions
from phaseid.physics.detector import Detector
from phaseid.physics.elemental import (
    DEFAULT_MODEL,
    BackscatterModel,
    elemental_eta,
    get_model,
    models,
)
from phaseid.physics.elements import Floats, as_compositions
from phaseid.physics.mixing import DEFAULT_RULE, CompoundRule, defensible_rules, get_rule
from phaseid.physics.tilting import DEFAULT_TILT_LAW, TiltLaw, tilted_eta

Model = str | BackscatterModel
Rule = str | CompoundRule
Member = tuple[str, str]


def mean_energy_fraction(eta: ArrayLike) -> Floats:
    """Mean energy of the backscattered electrons over the beam energy.

    Parameters
    ----------
    eta : array_like
        Backscatter coefficient.

    Returns
    -------
    ndarray
        ``0.595 + eta / 3.7 + eta^4.55``, at most 1; nearly independent of the beam energy.

    References
    ----------
    Pouchou & Pichoir 1991.
    """
    value = np.asarray(eta, dtype=np.float64)
    fraction: Floats = np.minimum(0.595 + value / 3.7 + value**4.55, 1.0)
    return fraction


def eta(
    mass_fractions: ArrayLike,
    energy_keV: float = 20.0,
    tilt_deg: float = 0.0,
    model: Model = DEFAULT_MODEL,
    rule: Rule = DEFAULT_RULE,
    tilt_law: str | TiltLaw = DEFAULT_TILT_LAW,
) -> Floats:
    """Backscatter coefficient of bare, flat, bulk material.

    Parameters
    ----------
    mass_fractions : array_like of shape (..., 103)
    energy_keV, tilt_deg : float
        Beam energy and angle between beam and surface normal.
    model : str or BackscatterModel
        One of `models`.
    rule : str or CompoundRule
        One of `compound_rules`.
    tilt_law : str or TiltLaw
        One of `tilt_laws`.

    Returns
    -------
    ndarray of shape (...)
        Electrons above 50 eV that come back per electron sent in. Hydrogen and helium count as 0:
        no value is published for them. 0 for an empty composition.

    Raises
    ------
    InputError
        For a composition of the wrong shape or an unknown name.
    """
    by_element = _eta_of_z(model, energy_keV, tilt_deg, tilt_law)
    return combined(as_compositions(mass_fractions), get_rule(rule), energy_keV, by_element)


def signal(
    mass_fractions: ArrayLike,
    energy_keV: float = 20.0,
    tilt_deg: float = 0.0,
    model: Model = DEFAULT_MODEL,
    rule: Rule = DEFAULT_RULE,
    detector: Detector | None = None,
    coat: Coat | None = None,
    tilt_law: str | TiltLaw = DEFAULT_TILT_LAW,
) -> Floats:
    """Detector signal per incident electron, in units of the beam energy.

    Parameters
    ----------
    mass_fractions, energy_keV, tilt_deg, model, rule, tilt_law
        As for `eta`.
    detector : Detector or None
        None is ``Detector()``.
    coat : Coat or None
        Conductive coat on the sample.

    Returns
    -------
    ndarray of shape (...)
        ``sum_i w_i eta_i response_i / E0`` with the rule's weights w: each element's electrons
        leave with the mean energy that belongs to its eta and the detector answers to that. A
        rule that works through a mean atomic number uses eta and energy at that number. 0 when no
        electron comes back (vacuum, a deep pore). The solid angle of an annular detector is not
        in it: at normal incidence it is one factor for all phases and part of the unknown gain.

    Raises
    ------
    InputError
        As for `eta`.
    """
    values: Floats = _signals(
        as_compositions(mass_fractions),
        (get_model(model),),
        (get_rule(rule),),
        _View(energy_keV, tilt_deg, detector or Detector(), coat, tilt_law),
    )[0, 0]
    return values


def signal_ensemble(
    mass_fractions: ArrayLike,
    energy_keV: float = 20.0,
    tilt_deg: float = 0.0,
    detector: Detector | None = None,
    coat: Coat | None = None,
    *,
    elemental: tuple[Model, ...] | None = None,
    rules: tuple[Rule, ...] | None = None,
) -> tuple[Floats, list[Member]]:
    """Signal by every confirmed model and every defensible rule, all phases in one call.

    Parameters
    ----------
    mass_fractions, energy_keV, tilt_deg, detector, coat
        As for `signal`.
    elemental, rules : tuple, optional
        Models and rules to combine; None takes all confirmed models and all defensible rules.

    Returns
    -------
    values : ndarray of shape (members, ...)
        Units of `signal`.
    members : list of (model name, rule name)
        In the order of the first axis, rules varying fastest.
    """
    composition = as_compositions(mass_fractions)
    of_models = tuple(get_model(m) for m in elemental) if elemental is not None else models()
    of_rules = tuple(get_rule(r) for r in rules) if rules is not None else defensible_rules()
    view = _View(energy_keV, tilt_deg, detector or Detector(), coat, DEFAULT_TILT_LAW)
    values = _signals(composition, of_models, of_rules, view)
    members = [(m.name, r.name) for m in of_models for r in of_rules]
    return values.reshape(len(members), *composition.shape[:-1]), members


def signal_of_atomic_number(z: ArrayLike, conditions: Conditions, model: Model) -> Floats:
    """Signal of elements, real or between two, by `model` under `conditions`; shape of `z`."""
    view = _View(
        conditions.energy_keV,
        conditions.tilt_deg,
        conditions.detector,
        conditions.coat,
        DEFAULT_TILT_LAW,
    )
    number = np.asarray(z, dtype=np.float64)
    by_quantity = np.stack([of_z(number) for of_z in view.of_z(model)])
    values: Floats = view.through_coat(by_quantity[:, None, None], (model,))[0, 0]
    return values


def signal_under(mass_fractions: ArrayLike, conditions: Conditions) -> Floats:
    """`signal` with everything taken from `conditions`."""
    return signal(
        mass_fractions,
        conditions.energy_keV,
        conditions.tilt_deg,
        conditions.model,
        conditions.rule,
        conditions.detector,
        conditions.coat,
    )


def eta_ensemble(
    mass_fractions: ArrayLike, energy_keV: float = 20.0, tilt_deg: float = 0.0
) -> tuple[Floats, list[Member]]:
    """As `signal_ensemble`, for the backscatter coefficient."""
    composition = as_compositions(mass_fractions)
    functions = [_eta_of_z(m, energy_keV, tilt_deg, DEFAULT_TILT_LAW) for m in models()]
    values = all_combined(composition, defensible_rules(), energy_keV, functions)
    members = [(m.name, r.name) for m in models() for r in defensible_rules()]
    return values.reshape(len(members), *composition.shape[:-1]), members


def mean_energy_keV(
    mass_fractions: ArrayLike,
    energy_keV: float = 20.0,
    tilt_deg: float = 0.0,
    model: Model = DEFAULT_MODEL,
    rule: Rule = DEFAULT_RULE,
) -> Floats:
    """Mean energy of the electrons that come back, in keV; 0 where none do.

    Parameters
    ----------
    mass_fractions, energy_keV, tilt_deg, model, rule
        As for `eta`.

    Returns
    -------
    ndarray of shape (...)
    """
    everything = Detector("ideal")
    arguments = (mass_fractions, energy_keV, tilt_deg, model, rule)
    carried = signal(*arguments, detector=everything)
    back = eta(*arguments)
    return energy_keV * ratio(carried, back)


def _eta_of_z(
    model: Model, energy_keV: float, tilt_deg: float, tilt_law: str | TiltLaw
) -> ByElement:
    return lambda z: tilted_eta(elemental_eta(z, energy_keV, model), z, tilt_deg, tilt_law)


@dataclass(frozen=True)
class _View:
    """How the sample is looked at; what turns elements into signals."""

    energy_keV: float
    tilt_deg: float
    detector: Detector
    coat: Coat | None
    tilt_law: str | TiltLaw

    def of_z(self, model: Model) -> list[ByElement]:
        """Signal by atomic number; under a coat also eta and the energy carried."""
        eta_of_z = _eta_of_z(model, self.energy_keV, self.tilt_deg, self.tilt_law)

        def signal_of_z(z: Floats) -> Floats:
            back = eta_of_z(z)
            return back * self.detector.mean_response(mean_energy_fraction(back), self.energy_keV)

        def carried_of_z(z: Floats) -> Floats:
            back = eta_of_z(z)
            return back * mean_energy_fraction(back)

        return [signal_of_z] if self.coat is None else [signal_of_z, eta_of_z, carried_of_z]

    def through_coat(self, by_quantity: Floats, of_models: tuple[Model, ...]) -> Floats:
        """Signals of shape (models, rules, ...) from (1 or 3 quantities, models, rules, ...)."""
        bare: Floats = by_quantity[0]
        if self.coat is None:
            return bare
        hidden = hidden_share(self.coat, self.energy_keV, self.tilt_deg)
        through = np.empty_like(bare)
        for row, model in enumerate(of_models):
            eta_0, carried_0 = by_quantity[1, row], by_quantity[2, row]
            coat_eta, coat_carried = self._bulk_coat(self.coat, model)
            eta_1, carried_1 = coated(eta_0, carried_0, coat_eta, coat_carried, hidden)
            # As a ratio, so that a vanishing coat leaves the bare signal exactly.
            change = ratio(self._answer(eta_1, carried_1), self._answer(eta_0, carried_0))
            through[row] = bare[row] * change
        return through

    def _bulk_coat(self, coat: Coat, model: Model) -> tuple[float, float]:
        rule = get_rule(DEFAULT_RULE)
        _, eta_of_z, carried_of_z = self.of_z(model)
        back = combined(coat.mass_fractions, rule, self.energy_keV, eta_of_z)
        carried = combined(coat.mass_fractions, rule, self.energy_keV, carried_of_z)
        return float(back), float(carried)

    def _answer(self, back: Floats, carried: Floats) -> Floats:
        return back * self.detector.mean_response(ratio(carried, back), self.energy_keV)


def _signals(
    composition: Floats,
    of_models: tuple[BackscatterModel, ...],
    of_rules: tuple[CompoundRule, ...],
    view: _View,
) -> Floats:
    """Signals of shape (models, rules, ...)."""
    functions = [view.of_z(model) for model in of_models]
    # Quantity by quantity, so that the first axis can be split again.
    in_turn = [by_model[q] for q in range(len(functions[0])) for by_model in functions]
    values = all_combined(composition, of_rules, view.energy_keV, in_turn)
    return view.through_coat(
        values.reshape(len(functions[0]), len(of_models), *values.shape[1:]), of_models
    )
