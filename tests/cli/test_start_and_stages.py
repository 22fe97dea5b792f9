"""`start` and `stages`: written out from the descriptions, whole, and fit to be used at once."""

from __future__ import annotations

import json
from pathlib import Path
from xml.etree import ElementTree

import pytest

from tests.support import run
from worksheet.model import metrics
from worksheet.model.process_keys import CORNER_CHANGES, DEVICE_PARAMETERS
from worksheet.model.project_keys import PROJECT
from worksheet.stages import catalogue


@pytest.mark.parametrize("stage", catalogue.keys())
def test_a_new_project_reviews_without_a_problem(stage: str, tmp_path: Path) -> None:
    folder = tmp_path / "new"
    done = run("start", str(folder), "--stage", stage)
    assert done.status == 0
    reviewed = run("review", str(folder), "--json")
    document = json.loads(reviewed.out)
    assert document["problems"] == []
    assert [sheet["stage"] for sheet in document["sheets"]] == [stage]
    assert reviewed.status in (0, 1)


def test_the_first_sheet_of_a_new_project_is_met(tmp_path: Path) -> None:
    folder = tmp_path / "new"
    assert run("start", str(folder)).status == 0
    done = run("review", str(folder), "--json")
    (sheet,) = json.loads(done.out)["sheets"]
    assert sheet["validity"] == []
    assert [target["verdict"] for target in sheet["targets"]] == ["met"]
    assert done.status == 0


def test_every_line_of_its_process_file_is_explained(tmp_path: Path) -> None:
    assert run("start", str(tmp_path / "new")).status == 0
    text = (tmp_path / "new" / "process" / "my_process.toml").read_text("utf-8")
    before = ""
    explained: dict[str, str] = {}
    for line in text.splitlines():
        if line.startswith("#"):
            before = f"{before} {line[2:]}".strip()
        else:
            name = line.partition(" = ")[0]
            if " = " in line and before:
                explained.setdefault(name, before)
            before = ""
    for key in (*DEVICE_PARAMETERS, *CORNER_CHANGES):
        said = explained[key.name]
        assert key.help in said
        assert key.where, f"{key.name} does not say where its number is found"
        assert key.where in said
        if key.dimension is not None and key.dimension.unit:
            assert f"[{key.dimension.unit}]" in said


def test_its_project_file_holds_every_key(tmp_path: Path) -> None:
    assert run("start", str(tmp_path / "new")).status == 0
    lines = (tmp_path / "new" / "biasbook.toml").read_text("utf-8").splitlines()
    names = {line.partition(" = ")[0] for line in lines if " = " in line}
    conditions = PROJECT.table("conditions")
    assert conditions is not None
    assert {key.name for key in (*PROJECT.keys, *conditions.keys)} <= names


@pytest.mark.parametrize(
    "stage",
    ["drain-follower", *(pytest.param(one, marks=pytest.mark.full) for one in list(catalogue.keys()) if one[0] != "d")],
)
def test_a_stage_shows_all_its_metrics_and_keys(stage: str) -> None:
    done = run("stages", stage)
    found = catalogue.find(stage)
    assert found is not None
    assert done.status == 0
    assert all(len(line) <= 80 for line in done.out.splitlines())
    shown = set(done.out.replace(",", " ").split())
    for metric in metrics.all_metrics():
        if found.absent_metric(metric.key) is None:
            assert metric.key in shown
    assert {key.name for key in (*found.design_keys(False), *found.assumption_keys("source"))} <= shown


def test_stages_as_data_are_the_catalogue() -> None:
    done = run("stages", "--json")
    document = json.loads(done.out)
    assert done.status == 0
    assert document["schema"] == 1
    assert document["problems"] == []
    assert [stage["stage"] for stage in document["stages"]] == list(catalogue.keys())
    by_key = {stage["stage"]: stage for stage in document["stages"]}
    driven = {key: (stage["driven"], stage["watched"], stage["held"]) for key, stage in by_key.items()}
    assert driven["source-follower"] == ("gate", "source", ["drain"])
    assert driven["common-source"] == ("gate", "drain", ["source"])
    assert driven["common-gate"] == ("source", "drain", ["gate"])
    assert driven["drain-follower"] == ("drain", "source", ["gate"])
    assert "supply_rejection" not in {m["metric"] for m in by_key["drain-follower"]["metrics"]}


@pytest.mark.parametrize("stage", [pytest.param("common-source", marks=pytest.mark.full), "cascode"])
def test_a_stage_comes_with_its_formulas(stage: str) -> None:
    """Every metric in text, LaTeX and MathML, and what it asks of the design variables."""
    (one,) = json.loads(run("stages", stage, "--json").out)["stages"]
    (listed,) = [s for s in json.loads(run("stages", "--json").out)["stages"] if s["stage"] == stage]
    assert one["formulas_hold_for"]
    by_key = {metric["metric"]: metric for metric in one["metrics"]}
    assert list(by_key) == [metric["metric"] for metric in listed["metrics"]]
    for metric in one["metrics"]:
        assert " = " in metric["formula"]
        for latex in metric["latex"]:
            assert latex.count("{") == latex.count("}")
            assert latex.count(r"\left") == latex.count(r"\right")
        assert [ElementTree.fromstring(m).tag for m in metric["mathml"]] == [
            "{http://www.w3.org/1998/Math/MathML}math"
        ] * len(metric["latex"])
    asked = {(key, ask["of"]) for key, metric in by_key.items() for ask in metric["asks"]}
    assert asked >= {("power", "bias_current"), ("dc_gain", "length"), ("offset", "width")}
    (current,) = by_key["power"]["asks"]
    assert (current["formula"], current["neglects"]) == ("power/V_DD", [])


def test_formulas_are_drawn_in_the_signs_that_there_are(monkeypatch: pytest.MonkeyPatch) -> None:
    page = run("stages", "common-gate").out
    assert "         gₛ\n    A₀ = ─────────\n         g_d + g_L\n" in page
    monkeypatch.setenv("LC_ALL", "C")
    plain = run("stages", "common-gate").out
    assert plain.isascii()
    assert "            g_s\n    A_0 = ---------\n          g_d + g_L\n" in plain
    assert max(len(line) for line in (*page.splitlines(), *plain.splitlines())) <= 80


def test_an_unknown_stage_is_refused_with_the_nearest() -> None:
    done = run("stages", "common-sorce", "--json")
    assert done.status == 2
    assert "did you mean 'common-source'?" in done.err
    document = json.loads(done.out)
    assert document["stages"] == []
    assert "common-source" in document["problems"][0]["message"]
    assert run("start", "nowhere", "--stage", "cascade").status == 2
    assert not Path("nowhere").exists()
