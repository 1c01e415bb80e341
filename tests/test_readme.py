"""What the README shows is run."""

from __future__ import annotations

import json
import re

from .conftest import ROOT

README = (ROOT / "README.md").read_text(encoding="utf-8")


def test_python_example_names_the_phases_of_the_shipped_scene(monkeypatch, capsys):
    (code,) = re.findall(r"```python\n(.+?)```", README, re.DOTALL)
    monkeypatch.chdir(ROOT)
    space: dict = {}
    exec(compile(code, "README.md", "exec"), space)
    lines = capsys.readouterr().out.strip().splitlines()
    assert len(lines) == 6
    assert "Ferrite" in lines[-1]
    truth = json.loads((ROOT / "examples/shaft/truth.json").read_text(encoding="utf-8"))
    clusters = space["analysis"].clusters
    for phase in truth["phases"]:
        near = min(clusters, key=lambda c: abs(c.grey_mean - phase["grey"]))
        assert abs(near.grey_mean - phase["grey"]) < 1.0
    # The truth's eta formula is not the tool's default; all the same it must stay among the candidates.
    ranking = space["analysis"].ranking
    names = list(ranking.question.candidates.names)
    for phase, name in (
        ("Corundum", "Corundum"),
        ("Grossite", "Grossite"),
        ("Manganese sulphide", "Manganese sulphide inclusion"),
    ):
        grey = next(p["grey"] for p in truth["phases"] if p["phase"] == phase)
        cluster = min(clusters, key=lambda c: abs(c.grey_mean - grey))
        probability = ranking.probability[cluster.observation]
        assert probability[names.index(name)] > 0.02
        assert (probability > probability[names.index(name)]).sum() < 8


def test_commands_of_the_readme_exist():
    from phaseid.cli.main import COMMANDS

    used = set(re.findall(r"^phaseid (\w+)", README, re.MULTILINE))
    assert used <= set(COMMANDS)
    assert {"candidates", "triage", "report", "predict", "separate", "database"} <= used
