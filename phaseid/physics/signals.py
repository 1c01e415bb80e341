"""From composition to eta and detector signal, for one formula or for all of them at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.coating import coat_terms, coated
from phaseid.physics.coats import Coat
from phaseid.physics.conditions import Conditions
from phaseid.physics.detector import Detector
from phaseid.physics.elemental import (
    DEFAULT_MODEL,
    BackscatterModel,
    elemental_eta,
    get_model,
    models,
)
from phaseid.physics.elements import Floats, as_compositions, atomic_numbers
from phaseid.physics.mixing import DEFAULT_RULE, CompoundRule, defensible_rules, get_rule
from phaseid.physics.tilting import DEFAULT_TILT_LAW, TiltLaw, tilted_eta

Model = str | BackscatterModel
Rule = str | CompoundRule
Member = tuple[str, str]
ByElement = Callable[[Floats], Floats]


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
    return _combined(as_compositions(mass_fractions), get_rule(rule), energy_keV, by_element)


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
    chosen = detector or Detector()
    by_element = _signal_of_z(model, energy_keV, tilt_deg, chosen, tilt_law)
    bare = _combined(as_compositions(mass_fractions), get_rule(rule), energy_keV, by_element)
    return coated(bare, _terms(coat, energy_keV, tilt_deg, chosen, model, tilt_law))


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
    chosen = detector or Detector()
    composition = as_compositions(mass_fractions)
    of_models = tuple(get_model(m) for m in elemental) if elemental is not None else models()
    of_rules = tuple(get_rule(r) for r in rules) if rules is not None else defensible_rules()
    functions = [_signal_of_z(m, energy_keV, tilt_deg, chosen, DEFAULT_TILT_LAW) for m in of_models]
    values = _all_combined(composition, of_rules, energy_keV, functions)
    for index, m in enumerate(of_models):
        terms = _terms(coat, energy_keV, tilt_deg, chosen, m, DEFAULT_TILT_LAW)
        values[index] = coated(values[index], terms)
    members = [(m.name, r.name) for m in of_models for r in of_rules]
    return values.reshape(len(members), *composition.shape[:-1]), members


def signal_of_atomic_number(z: ArrayLike, conditions: Conditions, model: Model) -> Floats:
    """Signal of elements, real or between two, by `model` under `conditions`; shape of `z`."""
    number = np.asarray(z, dtype=np.float64)
    energy, tilt, detector = conditions.energy_keV, conditions.tilt_deg, conditions.detector
    bare = _signal_of_z(model, energy, tilt, detector, DEFAULT_TILT_LAW)(number)
    return coated(bare, _terms(conditions.coat, energy, tilt, detector, model, DEFAULT_TILT_LAW))


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
    values = _all_combined(composition, defensible_rules(), energy_keV, functions)
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
    return energy_keV * _ratio(carried, back)


def _eta_of_z(
    model: Model, energy_keV: float, tilt_deg: float, tilt_law: str | TiltLaw
) -> ByElement:
    return lambda z: tilted_eta(elemental_eta(z, energy_keV, model), z, tilt_deg, tilt_law)


def _signal_of_z(
    model: Model,
    energy_keV: float,
    tilt_deg: float,
    detector: Detector,
    tilt_law: str | TiltLaw,
) -> ByElement:
    eta_of_z = _eta_of_z(model, energy_keV, tilt_deg, tilt_law)

    def signal_of_z(z: Floats) -> Floats:
        back = eta_of_z(z)
        return back * detector.mean_response(mean_energy_fraction(back), energy_keV)

    return signal_of_z


def _combined(
    composition: Floats, rule: CompoundRule, energy_keV: float, of_z: ByElement
) -> Floats:
    values: Floats = _all_combined(composition, (rule,), energy_keV, [of_z])[0, 0]
    return values


def _all_combined(
    composition: Floats,
    rules: tuple[CompoundRule, ...],
    energy_keV: float,
    functions: list[ByElement],
) -> Floats:
    """Values of shape (functions, rules, ...)."""
    shape = composition.shape[:-1]
    composition = composition.reshape(-1, composition.shape[-1])
    values = np.zeros((len(functions), len(rules), len(composition)))
    by_element = np.stack([of_z(atomic_numbers()) for of_z in functions])
    for column, rule in enumerate(rules):
        if rule.weights is not None:
            weight = rule.weights(energy_keV)
            above = (composition @ (weight * by_element).T).T
            values[:, column] = _ratio(above, composition @ weight)
        elif rule.mean is not None:
            filled = composition.sum(axis=-1) > 0
            mean = rule.mean(composition[filled])
            for row, of_z in enumerate(functions):
                values[row, column, filled] = of_z(mean)
    return values.reshape(len(functions), len(rules), *shape)


def _ratio(above: Floats, below: Floats) -> Floats:
    below = np.broadcast_to(below, above.shape)
    return np.divide(above, below, out=np.zeros_like(above), where=below > 0)


def _terms(
    coat: Coat | None,
    energy_keV: float,
    tilt_deg: float,
    detector: Detector,
    model: Model,
    tilt_law: str | TiltLaw,
) -> tuple[float, float] | None:
    if coat is None:
        return None
    bulk = signal(
        coat.mass_fractions, energy_keV, tilt_deg, model, detector=detector, tilt_law=tilt_law
    )
    return coat_terms(coat, energy_keV, tilt_deg, detector, float(bulk))
