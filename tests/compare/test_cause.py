"""A movement shared out among the inputs that changed: Shapley's values, written here a second time by permutations."""

from __future__ import annotations

import datetime
import math
from itertools import permutations
from pathlib import Path

import pytest

from tests.cli import books
from worksheet.compare.cause import MOST_EXACT, Cause
from worksheet.compare.compared import Comparison, Result, State, compare
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)

CURRENT, WIDTH, LOAD = ('"4 uA"', '"6 uA"'), ('"20 um"', '"30 um"'), ('"1.2 pF"', '"0.9 pF"')
KEYS = {CURRENT: "choose.bias_current", WIDTH: "choose.width", LOAD: "assume.load_capacitance"}


def state(
    folder: Path, sheet: str = books.FOLLOWER, process: str = books.PROCESS, project: str = books.PROJECT
) -> State:
    workbook = Workbook.read(books.write(folder, sheet, process, project))
    assert not workbook.project.problems
    return State(workbook.project, workbook.review(TODAY), workbook.evaluator)


def changed(*pairs: tuple[str, str], text: str = books.FOLLOWER) -> str:
    for old, new in pairs:
        text = books.replaced(text, old, new)
    return text


def result(found: Comparison, metric: str, sheet: str = books.BUFFER) -> Result:
    change = next(one for one in found.sheets if one.sheet == sheet)
    return next(one for one in change.results if one.metric == metric)


def cause(found: Comparison, metric: str, sheet: str = books.BUFFER) -> Cause:
    shared = result(found, metric, sheet).cause
    assert shared is not None
    return shared


def metric_of(one: State, metric: str) -> float:
    value = next(s for s in one.review.sheets if s.sheet.name == books.BUFFER).metrics[metric].value
    assert value is not None
    return value


@pytest.mark.parametrize("metric", ["bandwidth", "settling_time", "output_noise", "power"])
def test_three_inputs_that_interact_share_by_shapley_s_rule(tmp_path: Path, metric: str) -> None:
    every = (CURRENT, WIDTH, LOAD)
    values = {
        chosen: metric_of(state(tmp_path / str(number), changed(*chosen)), metric)
        for number, chosen in enumerate(_subsets(every))
    }
    expected = dict.fromkeys(every, 0.0)
    for order in permutations(every):
        for place, one in enumerate(order):
            before = tuple(x for x in every if x in order[:place])
            after = tuple(x for x in every if x in order[: place + 1])
            expected[one] += (values[after] - values[before]) / math.factorial(3)
    found = compare(state(tmp_path / "old"), state(tmp_path / "new", changed(*every)))
    shared = cause(found, metric)
    whole = values[every] - values[()]
    parts = {part.key: part.part for part in shared.parts}
    for one, part in expected.items():
        assert parts.get(KEYS[one], 0.0) == pytest.approx(part, abs=1e-9 * abs(whole))
    assert math.fsum(parts.values()) + shared.remainder == pytest.approx(whole, rel=1e-9)
    assert abs(shared.remainder) <= 1e-9 * abs(whole)


def _subsets(every: tuple[tuple[str, str], ...]) -> list[tuple[tuple[str, str], ...]]:
    found: list[tuple[tuple[str, str], ...]] = [()]
    for one in every:
        found += [(*chosen, one) for chosen in found]
    return found


def test_current_and_width_interact_and_share_what_arises_from_both(tmp_path: Path) -> None:
    """Power does not depend on the width, gate area not on the current: each has its cause alone."""
    found = compare(state(tmp_path / "old"), state(tmp_path / "new", changed(CURRENT, WIDTH)))
    assert [part.key for part in cause(found, "power").parts] == ["choose.bias_current"]
    assert [part.key for part in cause(found, "gate_area").parts] == ["choose.width"]
    assert {part.key for part in cause(found, "bandwidth").parts} == {"choose.bias_current", "choose.width"}


def test_many_inputs_still_add_up_to_the_whole(tmp_path: Path) -> None:
    process = books.PROCESS
    for old, new in (
        ("kappa = 0.7", "kappa = 0.72"),
        ('threshold = "0.45 V"', 'threshold = "0.43 V"'),
        ('specific_current = "0.6 uA"', 'specific_current = "0.5 uA"'),
        ("drain_coupling = 0.02", "drain_coupling = 0.03"),
        ('gate_capacitance = "8.5', 'gate_capacitance = "9.0'),
        ('overlap_capacitance = "0.35', 'overlap_capacitance = "0.4'),
    ):
        process = books.replaced(process, old, new)
    found = compare(state(tmp_path / "old"), state(tmp_path / "new", changed(CURRENT, WIDTH, LOAD), process))
    shared = cause(found, "bandwidth")
    assert len(shared.parts) > MOST_EXACT
    moved = result(found, "bandwidth")
    assert moved.old is not None
    assert moved.new is not None
    total = math.fsum(part.part for part in shared.parts) + shared.remainder
    assert total == pytest.approx(moved.new - moved.old, rel=1e-9)
    assert abs(shared.remainder) <= 1e-9 * abs(moved.new - moved.old)
    assert "process.nfet.kappa" in {part.key for part in shared.parts}


def test_a_sheet_is_reached_through_process_conditions_and_another_sheet(tmp_path: Path) -> None:
    link = changed(('value = "1.2 pF", source', 'formula = "1e-12 + amplifier.input_capacitance", source'))
    old = state(tmp_path / "old", link)
    process = books.replaced(books.PROCESS, "kappa = 0.7", "kappa = 0.71")
    project = books.replaced(books.PROJECT, 'supply = "1.8 V" }', 'supply = "1.7 V" }')
    new = state(tmp_path / "new", link, process, project)
    found = {one.sheet: one for one in compare(old, new).sheets}
    assert found[books.BUFFER].status == "affected"
    assert set(found[books.BUFFER].through) == {"process", "conditions"}
    folder = tmp_path / "third"
    books.write(folder, link)
    path = folder / "sheets" / f"{books.OTHER}.toml"
    path.write_text(books.replaced(path.read_text("utf-8"), 'width = "20 um"', 'width = "25 um"'), "utf-8")
    workbook = Workbook.read(folder)
    third = State(workbook.project, workbook.review(TODAY), workbook.evaluator)
    found = {one.sheet: one for one in compare(old, third).sheets}
    assert found[books.BUFFER].through == (f"sheet {books.OTHER}",)
    shared = next(one.cause for one in found[books.BUFFER].results if one.metric == "bandwidth")
    assert shared is not None
    assert [part.key for part in shared.parts] == [f"sheet {books.OTHER}"]


def test_a_worst_case_is_reached_through_conditions_and_corners(tmp_path: Path) -> None:
    old = state(tmp_path / "old")
    warmer = state(tmp_path / "warm", project=books.replaced(books.PROJECT, '"0 °C"', '"5 °C"'))
    for found in compare(old, warmer).sheets:
        assert (found.status, found.through) == ("affected", ("conditions",))
    process = books.replaced(books.PROCESS, "specific_current_factor = 0.85", "specific_current_factor = 0.8")
    slower = state(tmp_path / "slow", process=process)
    assert [one.sheet for one in compare(old, slower).sheets]
    for found in compare(old, slower).sheets:
        assert (found.status, found.through) == ("affected", ("process",))
        assert all(one.old == one.new for one in found.results), "nominal numbers stay"


def test_what_is_needed_moves_with_the_load(tmp_path: Path) -> None:
    found = compare(state(tmp_path / "old"), state(tmp_path / "new", changed(LOAD)))
    needs = {(one.variable, one.side): one for one in found.sheets[0].needed}
    low = needs["bias_current", "low"]
    assert low.old is not None
    assert low.new is not None
    assert low.new < low.old
    assert low.old_set_by == low.new_set_by == "bandwidth"


def test_a_structure_that_cannot_be_mixed_says_so(tmp_path: Path) -> None:
    common = books.replaced(books.FOLLOWER, 'stage = "source-follower"', 'stage = "common-source"')
    common = books.replaced(common, 'input_level = { value = "1.1 V", source = "sensor" }\n', "")
    found = compare(state(tmp_path / "old"), state(tmp_path / "new", changed(CURRENT, text=common)))
    moved = [one for one in found.sheets[0].results if one.cause is not None]
    assert len(moved) > 5
    for one in moved:
        assert one.cause is not None
        assert one.old is not None
        assert one.new is not None
        total = math.fsum(part.part for part in one.cause.parts) + one.cause.remainder
        assert total == pytest.approx(one.new - one.old, rel=1e-9)
        assert bool(one.cause.parts) != bool(one.cause.reason)
