"""Draw what the trajectories and the closed forms give beside what was measured and published.

``python tests/benchmarks/physics_validation.py [--out FILE.png] [--electrons N]``; takes some
minutes. Prints the deviations; the figure is the one the documentation shows. Measured values are
read from the reference table beside the repository, or the few that the tests carry.
"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2]))

from phaseid.files import replacing
from phaseid.physics.backscatter import BackscatterModel, compound_rules, elemental_eta, eta, models
from phaseid.physics.backscatter import tilt_laws as laws
from phaseid.physics.depth import electron_range_um
from phaseid.physics.elements import SYMBOLS, from_atoms, pure
from phaseid.physics.energy import mean_energy_fraction
from phaseid.physics.trajectories import Bulk, Exits, Film, Material, Start, simulate
from tests.physics.measured import PUBLISHED, measured_rows, reference_file

DENSITY = {"Be": 1.85, "B": 2.34, "C": 2.0, "Mg": 1.74, "Al": 2.70, "Si": 2.33, "Ti": 4.51}
DENSITY |= {"Fe": 7.87, "Cu": 8.96, "Ge": 5.32, "Zr": 6.51, "Ag": 10.49, "Ba": 3.5, "Ce": 6.77}
DENSITY |= {"W": 19.25, "Au": 19.3, "Pb": 11.34, "U": 19.05}
COMPOUNDS = {
    "SiO2": ({"Si": 1, "O": 2}, 2.65),
    "Al2O3": ({"Al": 2, "O": 3}, 3.97),
    "CaCO3": ({"Ca": 1, "C": 1, "O": 3}, 2.71),
    "CaSO4(H2O)2": ({"Ca": 1, "S": 1, "O": 6, "H": 4}, 2.32),
    "TiO2": ({"Ti": 1, "O": 2}, 4.25),
    "TiN": ({"Ti": 1, "N": 1}, 5.4),
    "Fe3O4": ({"Fe": 3, "O": 4}, 5.18),
    "FeS2": ({"Fe": 1, "S": 2}, 5.01),
    "Fe3C": ({"Fe": 3, "C": 1}, 7.69),
    "ZrSiO4": ({"Zr": 1, "Si": 1, "O": 4}, 4.65),
    "BaSO4": ({"Ba": 1, "S": 1, "O": 4}, 4.48),
    "CeO2": ({"Ce": 1, "O": 2}, 7.2),
    "WC": ({"W": 1, "C": 1}, 15.6),
    "PbS": ({"Pb": 1, "S": 1}, 7.6),
    "PbCO3": ({"Pb": 1, "C": 1, "O": 3}, 6.5),
    "UO2": ({"U": 1, "O": 2}, 10.97),
}
Axes = Any


def number(symbol: str) -> int:
    return SYMBOLS.index(symbol) + 1


def bulk(symbol: str, start: Start | float, electrons: int) -> Exits:
    return simulate(Bulk(Material(pure(symbol), DENSITY[symbol])), start, electrons=electrons)


def against_measurements(axes: Axes, electrons: int) -> None:
    path = reference_file("eta_measured.csv")
    rows = measured_rows(path) if path else [(s, e, v, f) for s, e, v, f in PUBLISHED]
    print(
        f"measured values: {len(rows)} ({'reference table' if path else 'literals of the tests'})"
    )
    energies = np.array([5.0, 7.5, 10.0, 15.0, 20.0, 25.0, 30.0])
    print("rms deviation from the measured values at 5 to 30 keV, and the spread of laboratories")
    for colour, symbol in zip(("k", "C0", "C1", "C2"), ("C", "Al", "Cu", "Au"), strict=True):
        mine = [row for row in rows if row[0] == symbol and 5 <= row[1] <= 30]
        at = np.array([row[1] for row in mine])
        seen = np.array([row[2] for row in mine])
        simulated = np.array([bulk(symbol, e, electrons).eta for e in energies])
        formula = eta(pure(symbol)[None], 20.0)[0]
        curve = np.array([float(eta(pure(symbol), e)) for e in energies])
        axes.plot(at, seen, "o", ms=3, color=colour, alpha=0.4)
        axes.plot(energies, simulated, "-", color=colour, label=f"{symbol} simulated")
        axes.plot(energies, curve, "--", color=colour, lw=1)
        deviation = seen / np.interp(at, energies, simulated) - 1
        by_formula = seen / np.interp(at, energies, curve) - 1
        laboratories = sorted({row[3] for row in mine})
        means = [
            np.mean([d for d, row in zip(by_formula, mine, strict=True) if row[3] == laboratory])
            for laboratory in laboratories
        ]
        print(
            f"  {symbol:2s} n={len(mine):3d}  simulated: rms {rms(deviation):5.1%} bias "
            f"{-deviation.mean():+5.1%}   August & Wernisch: rms {rms(by_formula):5.1%}   "
            f"laboratories: sd {np.std(means, ddof=1):5.1%} ({len(laboratories)})  "
            f"eta(20 keV) {formula:.3f}"
        )
    axes.set(xlabel="beam energy / keV", ylabel="eta", ylim=(0, 0.62))
    axes.set_title("points: measured; dashed: August & Wernisch")
    axes.legend(fontsize=7, loc="upper center", ncols=4)


def against_elements(axes: Axes, energy_axes: Axes, electrons: int) -> tuple[Any, Any]:
    symbols = list(DENSITY)
    z = np.array([number(s) for s in symbols])
    found = [bulk(s, 20.0, electrons) for s in symbols]
    values = np.array([f.eta for f in found])
    fine = np.linspace(4, 92, 200)
    for model in models():
        axes.plot(fine, elemental_eta(fine, 20.0, model), lw=1, label=model.name)
        ratio = elemental_eta(z, 20.0, model) / values - 1
        print(
            f"  {model.name:22s} over simulated, Be to U: rms {rms(ratio):5.1%}, bias {ratio.mean():+5.1%}"
        )
    axes.plot(z, values, "ko", ms=4, label="simulated")
    axes.set(xlabel="atomic number", ylabel="eta at 20 keV")
    axes.legend(fontsize=6)
    means = np.array([f.mean_energy_fraction for f in found])
    energy_axes.plot(z, means, "ko", ms=4, label="simulated")
    formula = mean_energy_fraction(values)
    energy_axes.plot(z, formula, "-", label="Pouchou & Pichoir 1991")
    energy_axes.set(xlabel="atomic number", ylabel="mean energy of BSE / beam energy")
    energy_axes.legend(fontsize=7)
    print(f"  mean energy, formula over simulated: rms {rms(formula / means - 1):.1%}")
    return z, values


def against_films(axes: Axes, electrons: int) -> None:
    parts = np.array([0.03, 0.06, 0.1, 0.15, 0.2, 0.3, 0.4, 0.5])
    for colour, symbol in zip(("k", "C0", "C1", "C2"), ("C", "Al", "Cu", "Au"), strict=True):
        material = Material(pure(symbol), DENSITY[symbol])
        full = float(electron_range_um(pure(symbol), material.density, 20.0))
        whole = bulk(symbol, 20.0, electrons).eta
        grown = [
            simulate(Film(material, p * full, None), 20.0, electrons=electrons).eta / whole
            for p in parts
        ]
        axes.plot(parts, grown, "o-", ms=3, color=colour, label=symbol)
    axes.axvline(0.5, color="0.7", lw=1)
    axes.set(xlabel="film thickness / Kanaya-Okayama range", ylabel="eta / eta of the bulk")
    axes.set_title("unsupported films; saturation expected before 0.5")
    axes.legend(fontsize=7)


def against_tilt(axes: Axes, electrons: int) -> None:
    degrees = np.array([0.0, 15.0, 30.0, 45.0, 60.0, 70.0])
    fine = np.linspace(0, 70, 71)
    for colour, symbol in zip(("C0", "C1", "C2"), ("Al", "Cu", "Au"), strict=True):
        found = [bulk(symbol, Start(20.0, t), electrons).eta for t in degrees]
        axes.plot(degrees, found, "o", ms=4, color=colour, label=f"{symbol} simulated")
        for law, style in zip(laws()[1:], ("-", "--"), strict=True):
            z = np.array(float(number(symbol)))
            curve = [float(law.tilted(np.array(found[0]), z, t)) for t in fine]
            axes.plot(
                fine, curve, style, color=colour, lw=1, label=law.name if symbol == "Au" else None
            )
            at = np.interp(degrees, fine, curve) / found - 1
            print(
                f"  tilt, {symbol} {law.name:14s} over simulated: {np.round(100 * at, 1)} % at {degrees}"
            )
    axes.set(xlabel="tilt / degrees", ylabel="eta at 20 keV")
    axes.legend(fontsize=7)


def against_compounds(axes: Axes, electrons: int, z: Any, values: Any) -> None:
    scale = values / elemental_eta(z, 20.0)
    order = np.argsort(z)

    def simulated(numbers: Any, energy_keV: float) -> Any:
        correction = np.interp(np.log(numbers), np.log(z[order]), scale[order])
        return elemental_eta(numbers, energy_keV) * correction

    own = BackscatterModel("simulated", simulated, None, (3.0, 103.0), "simulation", "", "trial")
    found = {
        name: simulate(Bulk(Material(from_atoms(a), rho)), 20.0, electrons=2 * electrons).eta
        for name, (a, rho) in COMPOUNDS.items()
    }
    for index, rule in enumerate(compound_rules()):
        ratio = np.array(
            [
                float(eta(from_atoms(COMPOUNDS[n][0]), model=own, rule=rule)) / found[n] - 1
                for n in found
            ]
        )
        worst = list(found)[int(np.argmax(np.abs(ratio)))]
        axes.plot(100 * ratio, np.full(len(ratio), index), "o" if rule.defensible else "x", ms=4)
        print(
            f"  {rule.name:22s} over simulated: rms {rms(ratio):5.1%} bias {ratio.mean():+5.1%} "
            f"worst {worst} {ratio[np.argmax(np.abs(ratio))]:+.1%}"
        )
    axes.axvline(0, color="0.7", lw=1)
    axes.set_yticks(
        range(len(compound_rules())), [rule.name for rule in compound_rules()], fontsize=7
    )
    axes.set(xlabel="rule over simulated eta / %", xlim=(-20, 40))
    axes.set_title(f"{len(found)} compounds; crosses: rules not held defensible")


def rms(values: Any) -> float:
    return float(np.sqrt(np.mean(np.square(values))))


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--out", type=Path, default=Path("physics-validation.png"))
    parser.add_argument("--electrons", type=int, default=32_768, help="per simulation")
    options = parser.parse_args()
    import matplotlib as mpl

    mpl.use("Agg")
    from matplotlib import pyplot as plt

    figure, axes = plt.subplots(2, 3, figsize=(15, 9), layout="constrained")
    against_measurements(axes[0, 0], options.electrons)
    z, values = against_elements(axes[0, 1], axes[0, 2], options.electrons)
    against_films(axes[1, 0], options.electrons)
    against_tilt(axes[1, 1], options.electrons)
    against_compounds(axes[1, 2], options.electrons, z, values)
    with replacing(options.out) as temporary:
        figure.savefig(temporary, dpi=110)
    print(f"written: {options.out}")


if __name__ == "__main__":
    main()
