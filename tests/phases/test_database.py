"""Database files: what is read, and how every fault is told."""

from __future__ import annotations

import pytest

from phaseid.errors import InputError
from phaseid.phases.catalogue import merge
from phaseid.phases.checks import check
from phaseid.phases.compositions import cache_folder
from phaseid.phases.contexts import Context, ContextTree
from phaseid.phases.database import DatabaseError, load
from phaseid.phases.importing import preview, read_sheet
from phaseid.phases.kept import load_kept
from phaseid.phases.oxidation import imbalance, valence_needed
from phaseid.phases.records import Phase
from phaseid.phases.writing import append_phase, to_yaml, write_database
from phaseid.physics.elements import from_atoms

GOOD = """schema: phaseid-database/1
name: mine
phases:
  - name: Nickel oxide
    formula: NiO
    density: [6.6, 6.9]
    crystal_system: cubic
    contexts: {steel: common}
    source: from memory
  - name: Country NO
    formula: Fe{1-x}S
    ranges: {x: [0, 1.7e-1]}
    contexts: {steel: rare}
    hazard: "Careful: follow local rules."
    source: from memory
"""


def write(tmp_path, text, name="mine.yaml"):
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    return path


def test_reads_what_is_written(tmp_path):
    database = load(write(tmp_path, GOOD))
    first, second = database.phases
    assert first.density_range == (6.6, 6.9)
    assert first.location.endswith("mine.yaml:4")
    # Scalars are text: NO is no boolean, and 1.7e-1 is a number where one is wanted.
    assert second.name == "Country NO"
    assert second.ranges == {"x": (0.0, 0.17)}
    assert second.hazard == "Careful: follow local rules."


@pytest.mark.parametrize(
    ("old", "new", "line", "word"),
    [
        ("formula: NiO", "formula: NiQq", 5, "no element"),
        ("density: [6.6, 6.9]", "density: [6.9, 6.6]", 6, "lower end first"),
        ("density: [6.6, 6.9]", "density: heavy", 6, "must be a number"),
        ("density: [6.6, 6.9]", "density: 660", 6, "no density"),
        ("crystal_system: cubic", "crystal_system: round", 7, "use one of cubic"),
        ("contexts: {steel: common}", "contexts: {steel: often}", 8, "abundance"),
        ("contexts: {steel: common}", "contexts: [steel]", 8, "must name contexts"),
        ("    source: from memory\n  - name: C", "  - name: C", 4, "'source' is missing"),
        ("crystal_system: cubic", "colour: green", 7, "no field 'colour'"),
        ("    density:", "    formula: NiO\n    density:", 6, "stands twice"),
        ("name: Country NO", "name: nickel OXIDE", 10, "stands twice"),
        ("formula: NiO", "formula: &a NiO", 5, "anchors"),
        ("formula: NiO", "formula: !!python/object:os.system NiO", 5, "tags"),
        ("ranges: {x: [0, 1.7e-1]}", "ranges: {z: [0, 1]}", 11, "no variable"),
    ],
)
def test_faults_name_file_line_and_remedy(tmp_path, old, new, line, word):
    assert old in GOOD
    with pytest.raises(InputError) as raised:
        load(write(tmp_path, GOOD.replace(old, new, 1)))
    message = str(raised.value)
    assert "mine.yaml" in message
    assert f"line {line}" in message
    assert word in message


def test_all_faults_are_collected(tmp_path):
    text = GOOD.replace("NiO", "Qq").replace("steel: rare", "steel: never")
    with pytest.raises(DatabaseError) as raised:
        load(write(tmp_path, text))
    assert len(raised.value.faults) == 2
    assert "1 more" in str(raised.value)


@pytest.mark.parametrize(
    "text",
    [
        "",
        "just text",
        "schema: phaseid-database/99\nphases: []\n",
        "schema: [phaseid-database/1]\n",
        "phases: []\n",
        "schema: phaseid-database/1\n",
        "schema: phaseid-database/1\nphases: {a: b}\n",
        "schema: phaseid-database/1\nphases: [1, 2]\n",
        "a: [unclosed",
        "? [complex, key]\n: value\n",
        "schema: phaseid-database/1\nphases:\n" + "  " + "[" * 4000,
        "\x00\x01",
    ],
)
def test_hostile_or_wrong_files_are_refused_in_one_sentence(tmp_path, text):
    with pytest.raises(InputError) as raised:
        load(write(tmp_path, text))
    assert "\n" not in str(raised.value)
    assert "Traceback" not in str(raised.value)


def test_expanding_yaml_is_refused_at_once(tmp_path):
    levels = "".join(f"l{n}: &l{n} [{', '.join([f'*l{n - 1}'] * 9)}]\n" for n in range(1, 30))
    text = "schema: phaseid-database/1\nl0: &l0 [x, x]\n" + levels
    with pytest.raises(InputError, match="anchors and aliases"):
        load(write(tmp_path, text))


def test_missing_file_and_binary_file(tmp_path):
    with pytest.raises(InputError, match="Cannot read"):
        load(tmp_path / "none.yaml")
    (tmp_path / "binary.yaml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(InputError, match="UTF-8"):
        load(tmp_path / "binary.yaml")


def test_later_database_corrects_an_earlier_one(tmp_path):
    first = load(write(tmp_path, GOOD))
    second = load(
        write(tmp_path, GOOD.replace("6.6", "6.7").replace("name: mine", "name: lab"), "lab.yaml")
    )
    catalogue = merge([first, second])
    assert len(catalogue.phases) == 2
    assert catalogue.find("nickel  OXIDE").density_range == (6.7, 6.9)
    assert len(catalogue.replaced) == 2
    assert catalogue.find("nio").name == "Nickel oxide"
    with pytest.raises(InputError, match="Did you mean Nickel oxide"):
        catalogue.find("Nickel oxid")


def test_checks_find_what_is_wrong(tmp_path):
    text = """schema: phaseid-database/1
name: bad
phases:
  - {name: A, formula: Mg2SiO5, contexts: {steel: rare}, source: from memory}
  - {name: B, formula: Fe2O3, density: 12, contexts: {steel: rare}, source: from memory}
  - {name: C, formula: PbS, contexts: {steel: rare}, source: from memory}
  - {name: D, formula: NiS, contexts: {nowhere: rare}, hazard: Careful., source: from memory}
  - {name: E, formula: MgO, other_names: [A], contexts: {steel: rare}, source: from memory}
  - {name: F, formula: SiO2, crystal_system: trigonal, contexts: {steel: rare}, source: from memory}
"""
    tree = ContextTree([Context("steel", "Steel"), Context("glass", "Glass")])
    found = check(load(write(tmp_path, text)).phases, tree)
    told = {(f.phase, f.kind): f.message for f in found}
    assert "cannot balance" in told["A", "fault"]
    assert "per atom" in told["B", "fault"]
    assert "holds Pb" in told["C", "fault"]
    assert "nowhere" in told["D", "fault"]
    assert "other name 'A'" in told["E", "fault"]
    assert "crystalline silica" in told["F", "fault"]
    assert "no phase is listed" in told["glass", "remark"]


def test_charges_of_known_minerals_balance():
    for formula in (
        {"Mg": 2, "Si": 1, "O": 4},
        {"Fe": 3, "O": 4},
        {"Ca": 5, "P": 3, "O": 13, "H": 1},
    ):
        assert imbalance(from_atoms(formula)) == pytest.approx(0, abs=1e-9)
    assert imbalance(from_atoms({"Mg": 2, "Si": 1, "O": 5})) > 0.1
    assert imbalance(from_atoms({"Fe": 1, "S": 2})) == 0  # sulphides are excepted


def test_sheet_is_previewed_and_written_only_when_clean(tmp_path):
    tree = ContextTree([Context("steel", "Steel")])
    catalogue = merge([load(write(tmp_path, GOOD))])
    sheet = tmp_path / "phases.csv"
    sheet.write_text(
        "Phase;Composition;Density (g/cm3);Context;Range\n"
        "Lab carbide;(Fe{x}Cr{1-x})7C3;6,9-7.1;steel:common;x:0-0.6\n"
        "Nickel oxide;NiO;6.7;steel;\n"
        "Wrong;Qq;1;steel;\n"
        "Far;FeO;1;moon;\n",
        encoding="utf-8",
    )
    found = preview(read_sheet(sheet), catalogue, tree, "lab")
    assert [p.name for p in found.phases] == ["Lab carbide", "Nickel oxide"]
    assert found.phases[0].density_range == (6.9, 7.1)
    assert [(r.row, r.name) for r in found.refused] == [(4, "Wrong"), (5, "Far")]
    assert found.replaces == ("Nickel oxide",)
    write_database(tmp_path / "lab.yaml", "lab", found.phases)
    again = load(tmp_path / "lab.yaml")
    assert [p.formula for p in again.phases] == [p.formula for p in found.phases]
    assert again.phases[0].ranges == {"x": (0.0, 0.6)}


def test_sheet_as_xlsx(tmp_path):
    import openpyxl

    book = openpyxl.Workbook()
    book.active.append(["name", "formula", "density"])
    book.active.append(["Lab oxide", "Fe3O4", 5.2])
    book.save(tmp_path / "sheet.xlsx")
    assert read_sheet(tmp_path / "sheet.xlsx") == [
        {"name": "Lab oxide", "formula": "Fe3O4", "density": "5.2"}
    ]


def test_written_yaml_repeats_values_instead_of_aliasing(tmp_path):
    phases = load(write(tmp_path, GOOD)).phases
    text = to_yaml("x", [phases[0], phases[0]])
    assert "&" not in text
    assert "*" not in text


def test_kept_records_equal_read_ones_and_follow_the_file(tmp_path, monkeypatch):
    path = write(tmp_path, GOOD)
    read, first = load(path), load_kept(path)
    assert first == read
    with monkeypatch.context() as patch:
        patch.setattr("phaseid.phases.kept.load", None)
        assert load_kept(path) == read  # from the cache, to the last field
    path.write_text(GOOD.replace("6.6", "6.5"), encoding="utf-8")
    assert load_kept(path).phases[0].density_range == (6.5, 6.9)
    for file in cache_folder().glob("database-*.json"):
        file.write_text("{broken", encoding="utf-8")
    assert load_kept(path).phases[0].density_range == (6.5, 6.9)


def test_a_phase_is_added_below_what_is_there(tmp_path):
    text = "# our own\n" + GOOD.replace("name: mine", "name: mine\ntitle: Ours  # keep")
    path = write(tmp_path, text)
    phase = Phase("Lab carbide", "(Cr{x}Fe{1-x})7C3", "own", ranges={"x": (0.1, 0.4)},
                  density_range=(6.9, 7.1), contexts={"steel": "common"})  # fmt: skip
    assert append_phase(path, phase) == 3
    assert path.read_text(encoding="utf-8").startswith(text)
    again = load(path).phases[2]
    assert (again.name, again.ranges, again.density_range) == (
        "Lab carbide", {"x": (0.1, 0.4)}, (6.9, 7.1),
    )  # fmt: skip
    before = path.read_bytes()
    with pytest.raises(InputError, match="already has"):
        append_phase(path, phase)
    assert path.read_bytes() == before
    assert append_phase(tmp_path / "new.yaml", phase) == 1
    assert load(tmp_path / "new.yaml").name == "new"


@pytest.mark.parametrize(
    "text",
    [
        "schema: phaseid-database/1\nphases: []\n",
        "schema: phaseid-database/1\nphases:\n- {name: A, formula: MgO, contexts: {steel: rare}, source: me}\n",
    ],
)
def test_a_phase_is_added_whatever_the_layout(tmp_path, text):
    path = write(tmp_path, text)
    count = len(load(path).phases)
    phase = Phase("B", "CaO", "own", contexts={"steel": "common"})
    assert append_phase(path, phase) == count + 1
    assert load(path).phases[-1].formula == "CaO"


def test_a_file_nothing_can_be_added_to_is_left_alone(tmp_path):
    path = write(tmp_path, GOOD + "title: at the end\n")
    before = path.read_bytes()
    with pytest.raises(InputError, match="nothing can be added"):
        append_phase(path, Phase("B", "CaO", "own", contexts={"steel": "common"}))
    assert path.read_bytes() == before


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (b"", "empty"),
        (b"a,b\n1,2\n", "no column 'name'"),
        (b"name,formula\nx\0y,FeO\n", "not a text file"),
        (b'name,formula\n"' + b"x" * 200_000 + b'",FeO\n', "no CSV"),
    ],
)
def test_sheets_that_cannot_be_read(tmp_path, content, word):
    path = tmp_path / "sheet.csv"
    path.write_bytes(content)
    with pytest.raises(InputError, match=word):
        read_sheet(path)


def test_other_files_named_like_sheets_are_refused(tmp_path):
    (tmp_path / "sheet.xlsx").write_bytes(b"no workbook")
    for name, word in (("sheet.xlsx", "not a readable XLSX"), ("none.csv", "no file")):
        with pytest.raises(InputError, match=word):
            read_sheet(tmp_path / name)
    with pytest.raises(InputError, match="no file"):
        read_sheet(tmp_path)


def test_doubts_about_clean_rows_are_told(tmp_path):
    tree = ContextTree([Context("steel", "Steel")])
    rows = [
        {"name": "A", "formula": "PbO", "contexts": "steel"},
        {"name": "B", "formula": "Mg2SiO5", "contexts": "steel"},
        {"name": "C", "formula": "MgO", "contexts": "steel", "density": "3.6"},
    ]
    found = preview(rows, merge([]), tree, "lab")
    assert not found.refused
    assert sorted(d.split(":")[0] for d in found.doubts) == ["A", "B"]
    assert "holds Pb" in found.doubts[0]


@pytest.mark.parametrize(
    ("formula", "system", "name", "word"),
    [
        ("PbCrO4", "monoclinic", "A", "holds Pb"),
        ("BaCrO4", "orthorhombic", "A", "chromium"),
        ("K2Cr2O7", "triclinic", "A", "chromium"),
        ("SiO2", "tetragonal", "A", "crystalline silica"),
        ("SiO2", None, "Quartz dust", "crystalline silica"),
        ("Ca2Mg5Si8O22(OH)2", "monoclinic", "Tremolite", "fibrous"),
        ("(Fe,Ni)9S8", "cubic", "A", "nickel sulphide"),
        ("UO2", "cubic", "A", "holds U"),
        ("wt% SiO2 90 BeO 10", None, "A", "holds Be"),
        ("Cr2O3", "trigonal", "A", None),
        ("CrO2", "tetragonal", "A", None),
        ("FeCr2O4", "cubic", "A", None),
        ("SiO2", "amorphous", "A", None),
        ("NiO", "cubic", "A", None),
    ],
)
def test_what_calls_for_a_caution(formula, system, name, word):
    tree = ContextTree([Context("steel", "Steel")])
    phase = Phase(name, formula, "x", crystal_system=system, contexts={"steel": "rare"})
    told = [f.message for f in check([phase], tree) if "hazard" in f.message]
    assert bool(told) == (word is not None)
    assert word is None or word in told[0]


def test_chromium_states_that_charges_ask_for():
    assert valence_needed(from_atoms({"Ca": 1, "Cr": 1, "O": 4}), "Cr") == pytest.approx(6)
    assert valence_needed(from_atoms({"Cr": 2, "O": 3}), "Cr") == pytest.approx(3)
    assert valence_needed(from_atoms({"Fe": 1}), "Cr") == 0


def test_density_far_from_like_phases_is_a_remark():
    tree = ContextTree([Context("steel", "Steel")])
    phases = []
    # Made so that volumes add: 10 cm3/mol for each atom.
    for n in range(210):
        grams = (24.305 + 15.999 * (1 + n % 5)) / (20.0 + 10 * (n % 5))
        phases.append(
            Phase(f"P{n}", f"MgO{1 + n % 5}", "x", density_range=(grams, grams),
                  contexts={"steel": "rare"})
        )  # fmt: skip
    odd = Phase("Odd", "MgO2", "x", density_range=(3.4, 3.4), contexts={"steel": "rare"})
    found = [f.phase for f in check([*phases, odd], tree) if "is far from" in f.message]
    assert found == ["Odd"]


def test_polymorphs_are_told_from_twins(tmp_path):
    tree = ContextTree([Context("steel", "Steel")])
    common = {"source": "x", "contexts": {"steel": "rare"}, "crystal_system": "tetragonal"}
    phases = [
        Phase("Rutile", "TiO2", density_range=(4.25, 4.25), **common),
        Phase("Anatase", "O2Ti", density_range=(3.88, 3.88), **common),
        Phase("Twin", "Ti2O4", density_range=(4.24, 4.26), **common),
    ]
    assert [f.phase for f in check(phases, tree) if "keep both" in f.message] == ["Twin"]
