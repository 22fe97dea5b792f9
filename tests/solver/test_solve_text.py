"""What solve says in a terminal of 80 columns: all of it readable, nothing silent."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tests.bench.solve_speed import case_of
from tests.paths import TOP
from tests.support import run
from worksheet.solver import needed
from worksheet.solver.variables import square_current

SHEETS = TOP / "sample_projects" / "tide_gauge" / "sheets"


FEW = ("electrode_buffer",)
EVERY = [
    pytest.param(path.stem, marks=() if path.stem in FEW else pytest.mark.full)
    for path in sorted(SHEETS.glob("*.toml"))
]


@pytest.mark.parametrize("sheet", EVERY)
def test_no_line_is_too_wide_and_no_name_is_torn(sheet: str) -> None:
    said = run("solve", str(SHEETS / f"{sheet}.toml")).out
    assert max(map(len, said.splitlines())) <= 80
    document = json.loads(run("solve", str(SHEETS / f"{sheet}.toml"), "--json").out)
    for window in document["needed"].values():
        for bound in window["bounds"]:
            formula = bound["formula"] or (bound["hand"] or {}).get("formula") or ""
            for word in formula.replace("*", " ").replace("(", " ").replace(")", " ").replace("/", " ").split():
                assert word in said, (bound["target"], word)


@pytest.mark.parametrize(
    ("sheet", "asked", "words"),
    [
        ("electrode_buffer", ("--of", "noise_from"), "no target sets a bound on noise_from"),
        ("electrode_buffer", ("--for", "dc_gain", "--of", "length"), "dc_gain sets no bound on length"),
        ("pressure_input", ("--for", "dc_gain", "--of", "bias_current"), "dc_gain is missed at every value"),
        ("mux_driver", ("--for", "slew_rate", "--of", "hold"), "Own name hold: now 2 pF"),
        ("converter_driver", (), "unity_gain_frequency, wanted 4 MHz: 3."),
    ],
)
def test_what_was_asked_for_is_answered(sheet: str, asked: tuple[str, ...], words: str) -> None:
    assert words in " ".join(run("solve", str(SHEETS / f"{sheet}.toml"), *asked).out.split())


def test_only_what_can_be_moved_is_offered() -> None:
    done = run("solve", str(SHEETS / "wake_comparator.toml"), "--of", "supply")
    assert done.status == 2
    offered = done.err.split("expected one of: ")[1]
    assert "supply" not in offered
    assert "bias_current" in offered


def test_where_no_current_is_enough_it_is_said_what_would_be(tmp_path: Path) -> None:
    """Physics, section 4: the smallest inversion coefficient, or the largest length, with a positive bracket."""
    keep = {"keep": "inversion", "inversion_coefficient": 1.0, "over": "nominal"}
    target = {"unity_gain_frequency": {"min": 3e9}}
    case = case_of(tmp_path / "book", "common-source", target=target, solve=keep)
    enough = needed.solve(case).self_loading["unity_gain_frequency"]
    for name, other in (("inversion_coefficient", 0.995), ("length", 1.005)):
        for factor, reached in ((1.0, True), (other, False)):
            ic = enough[name] * factor if name == "inversion_coefficient" else 1.0
            length = enough[name] * factor if name == "length" else 5e-7
            best = 0.0
            for k in range(401):
                width = 1e-2 * 10 ** (-k / 100)
                current = width * square_current(case) * ic / length
                moved = case.moved({"bias_current": current, "length": length, "width": width})
                best = max(best, float(moved.solution["unity_gain_frequency"].reshape(-1)[0]))
            assert (best >= 3e9 * (1 - 1e-6)) == reached, (name, factor, best)
    said = " ".join(run("solve", str(tmp_path / "book" / "sheets" / "drawn.toml")).out.split())
    assert "no current is enough for unity_gain_frequency" in said


def test_what_makes_it_reachable_is_nearest_to_what_is_chosen(tmp_path: Path) -> None:
    """The largest length with which everything can be met, where the chosen one is too long."""
    target = {"unity_gain_frequency": {"min": 2e7}, "power": {"max": 1.2e-5}}
    case = case_of(
        tmp_path, "common-source", target=target, choose={"bias_current": 4e-6, "width": 2e-5, "length": 4e-6}
    )
    found = needed.solve(case, "nominal").conflict
    assert found is not None
    length = found.reachable_with["length"]
    assert length < 4e-6
    for factor, feasible in ((0.999, True), (1.002, False)):
        assert needed.solve(case.moved({"length": length * factor}), "nominal").feasible == feasible
    assert set(found.wanted) == set(found.targets)
    assert found.wanted["power"] == 1.2e-5


def test_windows_are_told_before_points_and_are_those_of_the_result(tmp_path: Path) -> None:
    told: list[object] = []
    case = case_of(tmp_path / "book", "common-source", target={"dc_gain": {"min": 20.0}, "power": {"max": 1e-3}})
    solved = needed.solve(case, early=told.append)
    assert solved.needed
    assert told == [solved.needed]


@pytest.mark.parametrize(
    "key",
    ["dc_gain", *(pytest.param(one, marks=pytest.mark.full) for one in ("main.transconductance", "load_capacitance"))],
)
def test_the_algebra_of_one_number_is_told_on_request(key: str) -> None:
    """Text and document say the value of the review, and where every number put in came from."""
    path = str(SHEETS / "pressure_input.toml")
    document = json.loads(run("solve", path, "--why", key, "--json").out)
    text = run("solve", path, "--why", key).out
    review = json.loads(run("review", str(SHEETS.parent), "--json").out)
    sheet = next(one for one in review["sheets"] if one["sheet"] == "pressure_input")
    known = {**{k: m["value"] for k, m in sheet["metrics"].items()}, "load_capacitance": 1.5e-12}
    known["main.transconductance"] = sheet["operating_point"]["main"]["transconductance"]
    assert document["value"] == pytest.approx(known[key], rel=1e-9)
    assert max(map(len, text.splitlines())) <= 80
    said = " ".join(text.split())
    for given in document["given"]:
        assert given["symbol"] in said
        assert (given["from"] or given["key"]) in said
    assert "pressure_input.toml:" in said or "quay_180.toml:" in said


def test_a_number_that_there_is_none_of_has_a_suggestion() -> None:
    done = run("solve", str(SHEETS / "pressure_input.toml"), "--why", "dcgain")
    assert done.status == 2
    assert "did you mean dc_gain?" in done.err
