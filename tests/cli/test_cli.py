"""The command line: documents, exit status, files, bad input in one sentence."""

from __future__ import annotations

import csv
import io
import json
import subprocess
import sys
import time

import numpy as np
import pytest
import tifffile
from PIL import Image

from phaseid.cli.main import COMMANDS, run

from ..conftest import ROOT
from ..session.conftest import scene, scene_greys  # noqa: F401


@pytest.fixture
def call(capsys):
    def called(*arguments):
        status = run([str(a) for a in arguments])
        captured = capsys.readouterr()
        return status, captured.out, captured.err

    return called


def known():
    greys = scene_greys()
    return ["--known", f"{greys[0]:.0f}=Quartz", "--known", f"{greys[2]:.0f}=Magnetite"]


CLUSTER_FIELDS = {
    "id", "grey_mean", "grey_se", "grey_sd", "clipped", "area_fraction", "pixels", "regions",
    "none_of_these", "candidates",
}  # fmt: skip
CANDIDATE_FIELDS = {
    "phase", "formula", "database", "mean_atomic_number", "eta", "predicted_grey",
    "predicted_grey_sd", "probability", "group", "hazard",
}  # fmt: skip


def test_document_has_the_agreed_fields(call, scene):  # noqa: F811
    status, out, err = call(
        "candidates", scene, "--energy", 20, "--coat", "C:10", "--context", "sedimentary",
        *known(), "--dark", 20, "--seen", f"{scene_greys()[1]:.0f}:Ca", "--top", 3, "--json",
    )  # fmt: skip
    assert status == 0, err
    document = json.loads(out)
    assert document["schema"] == "phaseid-candidates/1"
    assert set(document) >= {
        "image",
        "conditions",
        "context",
        "warnings",
        "scale",
        "clusters",
        "advice",
    }
    assert document["image"]["shape"] == [192, 192]
    assert document["conditions"]["coat"] == {"material": "C", "thickness_nm": 10.0}
    assert document["context"] == ["rock/sedimentary"]
    greys = [c["grey_mean"] for c in document["clusters"]]
    assert greys == sorted(greys)
    for cluster in document["clusters"]:
        assert set(cluster) >= CLUSTER_FIELDS
        assert len(cluster["candidates"]) == (1 if cluster["known"] else 3)
        probabilities = [c["probability"] for c in cluster["candidates"]]
        assert probabilities == sorted(probabilities, reverse=True)
        assert sum(probabilities) + cluster["none_of_these"] <= 1 + 1e-6
        for candidate in cluster["candidates"]:
            assert set(candidate) >= CANDIDATE_FIELDS
    for advice in document["advice"]:
        assert advice["cluster"] in {c["id"] for c in document["clusters"]}
        assert advice["expected_bits"] > 0
    scale = document["scale"]
    assert set(scale) >= {"offset", "gain", "offset_se", "gain_se", "references"}
    assert len(scale["references"]) == 3


def test_same_input_same_output(call, scene):  # noqa: F811
    first = call("candidates", scene, "--energy", 20, "--json")
    assert first == call("candidates", scene, "--energy", 20, "--json")


def test_tables_for_people(call, scene):  # noqa: F811
    status, out, _ = call("candidates", scene, "--energy", 20, *known())
    assert status == 0
    for word in (
        "Cluster 1",
        "mean Z",
        "eta",
        "predicted grey",
        "none of these",
        "What to measure next",
    ):
        assert word in out


def test_files_of_one_image(call, scene, tmp_path):  # noqa: F811
    out = tmp_path / "out"
    status, printed, _ = call("candidates", scene, "--energy", 20, "--out", out, "--json", *known())
    assert status == 0
    assert json.loads((out / "candidates.json").read_text(encoding="utf-8")) == json.loads(printed)
    rows = list(csv.DictReader(io.StringIO((out / "candidates.csv").read_text(encoding="utf-8"))))
    assert len(rows) == sum(len(c["candidates"]) for c in json.loads(printed)["clusters"])
    labels = tifffile.imread(out / "labels.tif")
    assert labels.shape == (192, 192)
    for cluster in json.loads(printed)["clusters"]:
        assert np.count_nonzero(labels == cluster["id"]) == cluster["pixels"]
    with Image.open(out / "figure.png") as figure:
        assert min(figure.size) > 800
    assert not list(out.glob(".*.tmp")) + [
        p for p in out.iterdir() if p.name.startswith(".candidates")
    ]


def test_several_images_one_broken(call, scene, tmp_path):  # noqa: F811
    broken = tmp_path / "broken.tif"
    broken.write_bytes(scene.read_bytes()[:2000])
    other = tmp_path / "scene.tif"
    other.write_bytes(scene.read_bytes())
    out = tmp_path / "out"
    status, printed, err = call(
        "candidates", scene, broken, other, "--energy", 20, "--out", out, "--json"
    )
    assert status == 3
    lines = [json.loads(line) for line in printed.splitlines()]
    assert [line["image"]["path"] for line in lines] == [str(scene), str(other)]
    assert "broken.tif" in err
    assert {p.name for p in out.iterdir() if p.is_dir()} == {"scene", "scene-2"}
    # Again, resumed: nothing is worked out twice, and the answer is the same.
    stamp = (out / "scene" / "figure.png").stat().st_mtime_ns
    time.sleep(0.01)
    again = call(
        "candidates", scene, broken, other, "--energy", 20, "--out", out, "--json", "--resume"
    )
    assert again[:2] == (status, printed)
    assert (out / "scene" / "figure.png").stat().st_mtime_ns == stamp
    call("candidates", scene, other, "--energy", 15, "--out", out, "--resume", "--quiet")
    assert (out / "scene" / "figure.png").stat().st_mtime_ns != stamp


def make_bad(tmp_path, kind, scene):  # noqa: F811
    path = tmp_path / f"{kind}.tif"
    if kind == "truncated":
        path.write_bytes(scene.read_bytes()[:500])
    elif kind == "folder":
        path.mkdir()
    elif kind == "text":
        path.write_text("no image", encoding="utf-8")
    elif kind == "colour":
        rng = np.random.default_rng(0)
        Image.fromarray(rng.integers(0, 255, (64, 64, 3), dtype=np.uint8)).save(path)
    elif kind == "black":
        tifffile.imwrite(path, np.zeros((64, 64), np.uint8))
    elif kind == "tiny":
        tifffile.imwrite(path, np.ones((1, 1), np.uint8))
    elif kind == "nan":
        tifffile.imwrite(path, np.full((64, 64), np.nan, np.float32))
    elif kind == "empty":
        path.write_bytes(b"")
    return path


@pytest.mark.parametrize(
    "kind", ["truncated", "folder", "text", "colour", "black", "tiny", "nan", "empty", "missing"]
)
def test_bad_images_get_one_sentence_and_leave_nothing(call, scene, tmp_path, kind):  # noqa: F811
    path = make_bad(tmp_path, kind, scene)
    out = tmp_path / "out"
    status, printed, err = call("candidates", path, "--energy", 20, "--out", out)
    assert status == 2
    assert printed == ""
    assert err.count("\n") == 1
    assert path.name in err
    assert err.rstrip().endswith(".")
    assert not out.exists()


@pytest.mark.parametrize(
    ("options", "word"),
    [
        ([], "--energy"),
        (["--energy", "0.1"], "0.1 keV"),
        (["--energy", "abc"], "abc"),
        (["--energy", "20", "--tilt", "95"], "95"),
        (["--energy", "20", "--coat", "Unobtainium:10"], "Unobtainium"),
        (["--energy", "20", "--coat", "C"], "C"),
        (["--energy", "20", "--detector", "eye"], "eye"),
        (["--energy", "20", "--model", "guess"], "guess"),
        (["--energy", "20", "--context", "moon"], "moon"),
        (["--energy", "20", "--known", "90=Unobtainium"], "Unobtainium"),
        (["--energy", "20", "--known", "Quartz"], "GREY=PHASE"),
        (["--energy", "20", "--known", "nan=Quartz"], "GREY=PHASE"),
        (["--energy", "20", "--known", "9000=Quartz"], "9000"),
        (["--energy", "20", "--seen", "105:Qq"], "Qq"),
        (["--energy", "20", "--database", "/no/such.yaml"], "such.yaml"),
        (["--energy", "20", "--clusters", "0"], "0"),
        (["--energy", "20", "--exclude", "1,2,3"], "--exclude"),
        (["--energy", "20", "--page", "7"], "7"),
        (["--energy", "20", "--known", "105=Au", "--known", "188=Quartz"], "contradicts"),
        (["--wrong"], "--wrong"),
    ],
)
def test_bad_options_get_one_sentence(call, scene, options, word):  # noqa: F811
    status, out, err = call("candidates", scene, *options)
    assert (status, out) == (2, "")
    assert word in err
    assert err.count("\n") == 1
    assert "Traceback" not in err


def test_yaml_bomb_as_database(call, scene, tmp_path):  # noqa: F811
    bomb = tmp_path / "bomb.yaml"
    bomb.write_text(
        "schema: phaseid-database/1\na: &a [x,x]\n"
        + "".join(f"b{n}: &b{n} [*a,*a,*a]\n" for n in range(99)),
        encoding="utf-8",
    )
    status, _, err = call("candidates", scene, "--energy", 20, "--database", bomb)
    assert status == 2
    assert "anchors" in err


@pytest.mark.parametrize(
    "code",
    [
        "raise RuntimeError('at import')\n",
        "from phaseid.hooks import hookimpl\n@hookimpl\ndef weigh_candidates(situation):\n    raise RuntimeError('in a hook')\n",
        "from phaseid.hooks import hookimpl\n@hookimpl\ndef register_databases():\n    return ['/no/such.yaml']\n",
    ],
)
def test_broken_plugin_is_named_and_skipped(call, scene, tmp_path, monkeypatch, code):  # noqa: F811
    (tmp_path / "mine.py").write_text(code, encoding="utf-8")
    monkeypatch.setenv("PHASEID_PLUGINS", str(tmp_path))
    status, out, _ = call("candidates", scene, "--energy", 20, "--context", "rock", "--json")
    assert status == 0
    codes = [w["code"] for w in json.loads(out)["warnings"]]
    assert "plugin-failed" in codes
    assert call("plugins", "list")[0] == 0


def test_predict(call):
    status, out, _ = call(
        "predict", "Quartz", "wt% Fe74 Cr18 Ni8", "Au", "--energy", 20, "--json", "--density", 19.3
    )
    assert status == 0
    document = json.loads(out)
    assert document["schema"] == "phaseid-predict/1"
    quartz, steel, gold = document["phases"]
    assert quartz["mean_atomic_number"] == pytest.approx(10.80, abs=0.01)
    assert steel["mass_fractions"]["Cr"] == pytest.approx(0.18)
    # Gold at 20 keV: 0.48 to 0.52 between laboratories (Joy 2001, A Database of Electron-Solid Interactions).
    assert 0.47 < gold["eta"] < 0.53
    assert gold["range_um"] == pytest.approx(0.86, abs=0.03)
    assert set(gold) >= {
        "input",
        "formula",
        "eta_sd",
        "signal",
        "mean_energy_keV",
        "information_depth_um",
    }
    assert call("predict", "Fe2O3", "SiO2")[0] == 0


@pytest.mark.parametrize("text", ["Qq2", "(Fe", "", "REE2O3"])
def test_predict_refuses_impossible_formulas(call, text):
    status, out, err = call("predict", text)
    assert (status, out) == (2, "")
    assert err.count("\n") == 1


def test_database_commands(call, tmp_path):
    status, out, _ = call("database", "list", "--json", "--with", "Ca,C,O", "--mean-z", "12.4-12.7")
    assert status == 0
    assert "Calcite" in [p["name"] for p in json.loads(out)["phases"]]
    assert "Respirable" in call("database", "show", "Quartz")[1]
    target = tmp_path / "lab.yaml"
    assert (
        call(
            "database",
            "add",
            target,
            "Lab oxide",
            "Fe{1-x}O",
            "--range",
            "x:0-0.1",
            "--context",
            "steel:common",
        )[0]
        == 0
    )
    assert call("database", "check", target)[0] == 0
    assert call("database", "add", target, "Lab oxide", "FeO")[0] == 2
    assert call("database", "list", "Lab", "--database", target)[1].count("Lab oxide") == 1
    sheet = tmp_path / "s.csv"
    sheet.write_text("name,formula\nGood,Fe2O3\nBad,Qq\n", encoding="utf-8")
    status, _, _ = call("database", "import", sheet, "--to", tmp_path / "new.yaml")
    assert status == 2
    assert not (tmp_path / "new.yaml").exists()


def test_every_command_has_help(call):
    for command in COMMANDS:
        status, out, _ = call(command, "--help")
        assert status == 0
        assert "Usage" in out


HEAVY = ("sklearn", "pandas", "matplotlib", "textual", "scipy", "skimage")


@pytest.mark.parametrize(
    ("arguments", "forbidden"),
    [
        (["--help"], (*HEAVY, "numpy", "pymatgen", "yaml", "rich")),
        (["--version"], (*HEAVY, "numpy", "pymatgen", "yaml", "rich")),
        (["plugins", "list"], (*HEAVY, "pymatgen")),
        (["database", "list", "quartz"], HEAVY),
    ],
)
def test_start_up_loads_only_what_it_needs(arguments, forbidden):
    code = (
        "import sys\nfrom phaseid.cli.main import run\n"
        f"run({arguments!r})\n"
        f"print('LOADED', [m for m in {forbidden!r} if m in sys.modules])"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        check=True,
        cwd=ROOT,
        env={**__import__("os").environ, "PYTHONPATH": f"{ROOT}:{ROOT}/plugins:{ROOT}/databases"},
    )
    assert "LOADED []" in done.stdout
