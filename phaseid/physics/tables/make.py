"""Simulate the tables that ship: ``python -m phaseid.physics.tables.make NAME... [--electrons N]``.

Takes some ten minutes on two cores for all of them.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np

from phaseid.files import write_text
from phaseid.physics.detector import Detector
from phaseid.physics.elements import Floats, pure
from phaseid.physics.exits import Exits
from phaseid.physics.range_laws import kanaya_okayama_um
from phaseid.physics.tables import NAMES
from phaseid.physics.trajectories import (
    Bulk,
    Film,
    Inclusion,
    Material,
    Start,
    simulate,
)

Arrays = dict[str, Floats]

# Handbook densities in g/cm3; they cancel wherever lengths are in units of the range.
_DENSITY = {"C": 1.8, "Al": 2.70, "Cr": 7.19, "Fe": 7.87, "Cu": 8.96, "Ag": 10.49, "Au": 19.3}
_DENSITY |= {"Be": 1.85, "Ti": 4.51, "U": 19.05}
_NUMBER = {"Be": 4, "C": 6, "Al": 13, "Ti": 22, "Cr": 24, "Fe": 26, "Cu": 29, "Ag": 47, "Au": 79}
_NUMBER |= {"U": 92}
_ENERGY = Detector("ideal")
_REACH = (0.25, 0.5, 1.0)
_FEATURES = ("Al", "Cu", "Ag")
_FEATURE_KEV = 10.0


def coats(electrons: int) -> Arrays:
    """Share of the substrate that a coat hides, for numbers and for energies.

    ``eta' = eta + hidden (eta_coat - eta)``, and the same for eta times mean energy. Least squares
    over substrates from C to Au; `left_out` is the root mean square of what the form misses, over
    the coated value. Thin films get four times the electrons, as they change little.
    """
    materials = ["C", "Al", "Cr", "Ag", "Au"]
    substrates = ["C", "Al", "Ag", "Au"]
    relative = np.array([0.01, 0.02, 0.04, 0.07, 0.12, 0.2, 0.35, 0.6])
    energies = np.array([5.0, 20.0])
    hidden = np.zeros((len(energies), len(materials), len(relative), 2))
    left_out = np.zeros(hidden.shape)
    for e, energy in enumerate(energies):
        bare = np.array([_pair(_run(Bulk(_bulk(s)), energy, 4 * electrons)) for s in materials])
        for c, coat in enumerate(materials):
            full = float(kanaya_okayama_um(pure(coat), _DENSITY[coat], energy))
            others = [s for s in substrates if s != coat]
            before = np.array([bare[materials.index(s)] for s in others])
            towards = bare[c] - before
            for x, part in enumerate(relative):
                number = electrons * (4 if part < 0.05 else 1)
                films = [Film(_bulk(coat), part * full, _bulk(s)) for s in others]
                after = np.array([_pair(_run(film, energy, number)) for film in films])
                # Errors are in proportion to the root of the signal.
                weight = 1.0 / before
                share = (weight * towards * (after - before)).sum(0) / (weight * towards**2).sum(0)
                hidden[e, c, x] = share
                missed = (before + share * towards - after) / after
                left_out[e, c, x] = np.sqrt((missed**2).mean(0))
            _say(f"coats: {energy:g} keV {coat} {hidden[e, c, :, 1].round(3)}")
    return {
        "energy_keV": energies,
        "atomic_number": np.array([float(_NUMBER[m]) for m in materials]),
        "thickness_over_range": relative,
        "hidden": hidden,
        "left_out": left_out,
    }


def tilts(electrons: int) -> Arrays:
    """Exponent p in ``eta(phi) = eta(0)^p`` by atomic number and tilt, 10 and 20 keV averaged."""
    materials = ["C", "Al", "Fe", "Ag", "Au", "U"]
    degrees = np.array([0.0, 15.0, 30.0, 45.0, 60.0, 70.0, 80.0])
    energies = (10.0, 20.0)
    exponent = np.zeros((len(materials), len(degrees), len(energies)))
    for m, name in enumerate(materials):
        for e, energy in enumerate(energies):
            values = [_run(Bulk(_bulk(name)), Start(energy, t), electrons).eta for t in degrees]
            exponent[m, :, e] = np.log(values) / np.log(values[0])
        _say(f"tilts: {name} {exponent[m].mean(-1).round(3)}")
    return {
        "atomic_number": np.array([float(_NUMBER[m]) for m in materials]),
        "tilt_deg": degrees,
        "exponent": exponent.mean(axis=-1),
        "energy_spread": np.abs(exponent[..., 0] - exponent[..., 1]),
    }


def depths(electrons: int) -> Arrays:
    """Depths and exit radii, over the Kanaya-Okayama range, that shares of the electrons keep to."""
    materials = ["Be", "C", "Al", "Ti", "Fe", "Ag", "Au", "U"]
    shares = np.array([0.5, 0.75, 0.9, 0.95, 0.99])
    energies = np.array([5.0, 10.0, 20.0, 30.0])
    depth = np.zeros((len(materials), len(shares), len(energies)))
    radius = np.zeros(depth.shape)
    for m, name in enumerate(materials):
        for e, energy in enumerate(energies):
            found = _run(Bulk(_bulk(name)), energy, electrons)
            full = float(kanaya_okayama_um(pure(name), _DENSITY[name], energy))
            depth[m, :, e] = found.depth_quantile_um(shares) / full
            radius[m, :, e] = found.radius_quantile_um(shares) / full
        _say(f"depths: {name} {depth[m, 2].round(3)} {radius[m, 2].round(3)}")
    return {
        "atomic_number": np.array([float(_NUMBER[m]) for m in materials]),
        "share": shares,
        "energy_keV": energies,
        "depth": np.moveaxis(depth, -1, 0),
        "radius": np.moveaxis(radius, -1, 0),
    }


def features(electrons: int) -> Arrays:
    """What a small feature in a matrix shows: its own share f, and the relief r of its density.

    ``S = (S_matrix + f (S_feature - S_matrix)) (1 + r)`` by the ratio of the ranges, feature over
    matrix, and by diameter over the shorter of the two. r comes from a feature of the matrix's own
    composition at another density (Cu): a loose feature is a pit to the electrons and shows
    dark, a dense one a bump. f is then the mean of a light feature in a heavy matrix (Al in Ag) and
    the reverse, weighted by the contrast; `pair_difference` is what is left between the two. Part
    of a sphere that reaches a quarter, half or the whole of the visible diameter below the surface;
    beam at the centre or spread evenly over the disc.
    """
    sizes = np.array([0.1, 0.2, 0.3, 0.45, 0.7, 1.0, 1.5, 2.5, 4.0])
    ratios = np.array([0.25, 0.5, 1.0, 2.0, 4.0])
    bare = {s: _pair(_run(Bulk(_bulk(s)), _FEATURE_KEV, 4 * electrons))[1] for s in _FEATURES}
    relief = np.zeros((len(ratios), len(sizes), len(_REACH), 2))
    share, difference = np.zeros(relief.shape), np.zeros(relief.shape)
    for r, ratio in enumerate(ratios):
        if ratio != 1.0:
            relief[r] = _feature_signals("Cu", "Cu", ratio, sizes, electrons) / bare["Cu"] - 1
        light = _feature_signals("Al", "Ag", ratio, sizes, electrons) / (1 + relief[r])
        heavy = _feature_signals("Ag", "Al", ratio, sizes, electrons) / (1 + relief[r])
        step = bare["Ag"] - bare["Al"]
        of_light, of_heavy = (bare["Ag"] - light) / step, (heavy - bare["Al"]) / step
        share[r], difference[r] = (of_light + of_heavy) / 2, np.abs(of_light - of_heavy)
        _say(f"features: x{ratio:g} share {share[r, :, 1, 0].round(3)}")
        _say(f"   relief {relief[r, :, 1, 0].round(3)} pairs {difference[r, :, 1, 0].round(3)}")
    return {
        "ratio": ratios,
        "diameter_over_shorter_range": sizes,
        "share": share,
        "relief": relief,
        "pair_difference": difference,
    }


def _feature_signals(
    inside: str, outside: str, ratio: float, sizes: Floats, electrons: int
) -> Floats:
    """Signals of shape (sizes, reach of the feature, width of the beam)."""
    of_feature = float(kanaya_okayama_um(pure(inside), _DENSITY[inside], _FEATURE_KEV))
    of_matrix = float(kanaya_okayama_um(pure(outside), _DENSITY[outside], _FEATURE_KEV))
    # Ranges go with one over the density: thin or pack the matrix to the wanted ratio.
    matrix = Material(pure(outside), _DENSITY[outside] * of_matrix * ratio / of_feature)
    shorter = min(of_feature, of_feature / ratio)
    signals = np.zeros((len(sizes), len(_REACH), 2))
    for d, diameter in enumerate(sizes * shorter):
        for k, reach in enumerate(_REACH):
            seen, below = diameter / 2, diameter * reach
            radius = (seen**2 + below**2) / (2 * below)
            sample = Inclusion(_bulk(inside), matrix, radius, below - radius)
            for spread in (0, 1):
                beam = Start(_FEATURE_KEV, diameter_um=diameter * spread)
                signals[d, k, spread] = _pair(_run(sample, beam, electrons))[1]
    return signals


MAKERS: dict[str, Callable[[int], Arrays]] = {
    "coats": coats,
    "tilts": tilts,
    "depths": depths,
    "features": features,
}


def main(arguments: list[str] | None = None) -> None:
    """Make the named tables and write them beside this module."""
    parser = argparse.ArgumentParser(description="Simulate the tables that ship.")
    parser.add_argument(
        "names", nargs="*", choices=[*NAMES, []], help="which; all if none is named"
    )
    parser.add_argument("--electrons", type=int, default=131_072, help="per simulation")
    options = parser.parse_args(arguments)
    for name in options.names or NAMES:
        arrays = MAKERS[name](options.electrons)
        content = {
            "what": " ".join((MAKERS[name].__doc__ or "").split()),
            "electrons_each": options.electrons,
            "arrays": {key: _rounded(values) for key, values in arrays.items()},
        }
        path = Path(__file__).with_name(f"{name}.json")
        write_text(path, json.dumps(content, indent=None, separators=(",", ":")) + "\n")


def _run(sample: Bulk | Film | Inclusion, start: Start | float, electrons: int) -> Exits:
    return simulate(sample, start, electrons=electrons, seed=20)


def _bulk(symbol: str) -> Material:
    return Material(pure(symbol), _DENSITY[symbol])


def _pair(found: Exits) -> tuple[float, float]:
    """Electrons and energy that come back, per incident electron."""
    return found.eta, found.signal(_ENERGY)[0]


def _rounded(values: Floats) -> list[float]:
    rounded: list[float] = np.asarray(values).round(4).tolist()
    return rounded


def _say(text: str) -> None:
    sys.stderr.write(text + "\n")


if __name__ == "__main__":
    main()
