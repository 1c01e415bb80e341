"""All phases at given conditions, the disk cache, contexts, look-up."""

from __future__ import annotations

import os
import subprocess
import sys

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.phases.compositions import cache_folder, compositions, work_out
from phaseid.phases.contexts import BELOW, Context, ContextTree
from phaseid.phases.lookup import Filters, listing, look_up, to_frame
from phaseid.phases.records import UNLISTED, Phase
from phaseid.phases.table import build
from phaseid.physics.conditions import Conditions
from phaseid.physics.elements import from_atoms
from phaseid.physics.signals import eta

PHASES = (
    Phase(
        "Olivine",
        "(Mg{x}Fe{1-x})2SiO4",
        "from memory",
        density_range=(3.3, 4.4),
        contexts={"rock": "abundant"},
    ),
    Phase(
        "Gold",
        "Au",
        "from memory",
        ("Aurum",),
        density_range=(19.3, 19.3),
        contexts={"rock/ore": "rare"},
    ),
    Phase("Resin", "C21H25ClO5", "from memory", contexts={"preparation": "common"}),
)
TREE = ContextTree(
    [
        Context("rock/ore/vein", "Vein"),
        Context("rock", "Rock", weights={"Gold": 0.5}),
        Context("steel", "Steel"),
        Context("preparation", "Preparation"),
    ]
)


def test_columns_agree_with_the_physics():
    table = build(PHASES, Conditions(energy_keV=15.0), cached=False)
    assert table.eta[1] == pytest.approx(float(eta(from_atoms({"Au": 1}), 15.0)))
    assert table.mean_atomic_number_min[0] == pytest.approx(10.58, abs=0.01)
    assert table.mean_atomic_number_max[0] == pytest.approx(18.69, abs=0.01)
    assert table.variable.tolist() == [True, False, False]
    assert np.isnan(table.range_um[2])
    # Kanaya & Okayama 1972: gold at 20 keV 0.86 um (Goldstein et al., table of ranges, from memory).
    at20 = build(PHASES, Conditions(energy_keV=20.0), cached=False)
    assert at20.range_um[1] == pytest.approx(0.86, abs=0.03)
    assert list(table.to_pandas()["name"]) == ["Olivine", "Gold", "Resin"]


def test_cache_is_used_rebuilt_and_never_in_the_way(monkeypatch):
    first = compositions(PHASES)
    files = list(cache_folder().glob("compositions-*.npz"))
    assert files
    with monkeypatch.context() as patch:
        patch.setattr("phaseid.phases.compositions.work_out", None)
        np.testing.assert_array_equal(compositions(PHASES).mass_fractions, first.mass_fractions)
    for file in cache_folder().glob("compositions-*.npz"):
        file.write_bytes(b"broken")
    np.testing.assert_array_equal(compositions(PHASES).mass_fractions, first.mass_fractions)
    monkeypatch.setenv("PHASEID_CACHE", "/proc/no-such-place")
    np.testing.assert_array_equal(
        compositions(PHASES).mass_fractions, work_out(PHASES).mass_fractions
    )


def test_context_weights_are_inherited_down_and_weakly_up():
    assert TREE.weights(["rock"], PHASES)[0] == 1.0
    assert TREE.weights(["rock/ore/vein"], PHASES)[0] == 1.0
    assert TREE.weights(["steel"], PHASES)[0] == UNLISTED
    # A weight of the context itself stands above the database's word.
    assert TREE.weights(["rock"], PHASES)[1] == 0.5
    plain = ContextTree([Context("rock/ore", "Ore")])
    assert plain.weights(["rock"], PHASES)[1] == pytest.approx(BELOW * 0.03)
    assert TREE.weights(["steel"], PHASES)[2] == 0.01
    assert TREE.weights([], PHASES).tolist() == [1, 1, 1]
    assert TREE.weights(["steel", "rock"], PHASES)[0] == 1.0


def test_contexts_are_found_by_unique_last_part():
    assert TREE.resolve("vein").path == "rock/ore/vein"
    with pytest.raises(InputError, match="Did you mean rock/ore/vein"):
        TREE.resolve("veins")
    twice = ContextTree([Context("a/x", "X"), Context("b/x", "X")])
    with pytest.raises(InputError, match="a/x or b/x"):
        twice.resolve("x")


@pytest.mark.parametrize(
    ("filters", "names"),
    [
        (Filters(text="oliv"), ["Olivine"]),
        (Filters(text="aurum"), ["Gold"]),
        (Filters(with_all=("Mg", "O")), ["Olivine"]),
        (Filters(with_none=("O",)), ["Gold"]),
        (Filters(formula="Fe2SiO4"), ["Olivine"]),
        # Between the compositions that stand for the range.
        (Filters(formula="Mg1.23Fe0.77SiO4"), ["Olivine"]),
        (Filters(formula="Mg1.23Fe0.77Si1.2O4"), []),
        (Filters(mean_atomic_number=(12, 13)), ["Olivine"]),
        (Filters(eta=(0.4, 0.6)), ["Gold"]),
        (Filters(context="ore"), ["Olivine", "Gold"]),
        (Filters(hazard=True), []),
    ],
)
def test_look_up(filters, names):
    table = build(PHASES, Conditions(), cached=False)
    positions = look_up(table, filters, TREE)
    assert [PHASES[i].name for i in positions] == names
    assert len(to_frame(table, positions)) == len(names)


def test_listing_document_has_its_fields():
    table = build(PHASES, Conditions(), cached=False)
    document = listing(table, [0])
    assert document["schema"] == "phaseid-phases/1"
    assert set(document["phases"][0]) >= {
        "name", "other_names", "formula", "database", "density", "elements", "mean_atomic_number",
        "mean_atomic_number_min", "mean_atomic_number_max", "eta", "contexts", "hazard", "source",
    }  # fmt: skip


def test_kept_signals_equal_fresh_ones_and_follow_conditions_and_phases(monkeypatch):
    fresh = build(PHASES, Conditions(energy_keV=17.0), cached=False)
    for _ in range(2):
        kept = build(PHASES, Conditions(energy_keV=17.0))
        np.testing.assert_array_equal(kept.row_signal, fresh.row_signal)
        np.testing.assert_array_equal(kept.row_own_sd, fresh.row_own_sd)
        np.testing.assert_array_equal(kept.eta, fresh.eta)
        assert (kept.relative_sd, kept.length) == (fresh.relative_sd, fresh.length)
    other = build(PHASES, Conditions(energy_keV=12.0))
    assert not np.allclose(other.row_signal, fresh.row_signal)
    fewer = build(PHASES[1:], Conditions(energy_keV=17.0))
    assert fewer.row_signal.shape == fewer.rows.phase.shape
    # The second time nothing is worked out.
    with monkeypatch.context() as patch:
        patch.setattr("phaseid.phases.table._physics", None)
        np.testing.assert_array_equal(
            build(PHASES, Conditions(energy_keV=17.0)).row_signal, fresh.row_signal
        )
    for file in cache_folder().glob("signals-*.npz"):
        file.write_bytes(file.read_bytes()[:200])
    np.testing.assert_array_equal(
        build(PHASES, Conditions(energy_keV=17.0)).row_signal, fresh.row_signal
    )


def test_two_processes_may_start_at_once(tmp_path):
    code = (
        "from phaseid.phases.records import Phase; from phaseid.phases.table import build;"
        "from phaseid.physics.conditions import Conditions;"
        "t = build([Phase('A', '(Mg,Fe)O', 's'), Phase('B', 'Au', 's')], Conditions());"
        "print(t.row_signal.sum())"
    )
    environment = {**os.environ, "PHASEID_CACHE": str(tmp_path)}
    running = [
        subprocess.Popen([sys.executable, "-c", code], env=environment, stdout=subprocess.PIPE)
        for _ in range(2)
    ]
    told = [p.communicate(timeout=60)[0] for p in running]
    assert told[0] == told[1] != b""
    # Both wrote the same files, and nothing half-written is left beside them.
    assert sorted(p.name.split("-")[0] for p in tmp_path.iterdir()) == ["compositions", "signals"]
