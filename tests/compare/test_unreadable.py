"""Sheets that can be read at one of two states only, and the units of what is compared."""

from __future__ import annotations

import datetime
from pathlib import Path

from tests.cli import books
from worksheet.compare.compared import State, compare
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)
SPOILT = books.replaced(books.FOLLOWER, '"4 uA"', '"4 kHz"')


def state(folder: Path, sheet: str = books.FOLLOWER, project: str = books.PROJECT) -> State:
    workbook = Workbook.read(books.write(folder, sheet, project=project))
    return State(workbook.project, workbook.review(TODAY), workbook.evaluator)


def test_a_sheet_that_cannot_be_read_is_neither_added_nor_removed(tmp_path: Path) -> None:
    good, bad = state(tmp_path / "good"), state(tmp_path / "bad", SPOILT)
    (there,) = [one for one in compare(good, bad).sheets if one.sheet == books.BUFFER]
    assert there.status == "changed"
    assert {one.new for one in there.results} == {None}
    (back,) = [one for one in compare(bad, good).sheets if one.sheet == books.BUFFER]
    assert back.status == "changed"
    assert {one.old for one in back.results} == {None}
    assert compare(bad, bad).same


def test_a_sheet_whose_file_goes_is_removed_readable_or_not(tmp_path: Path) -> None:
    bad, gone = state(tmp_path / "bad", SPOILT), tmp_path / "gone"
    books.write(gone)
    (gone / "sheets" / f"{books.BUFFER}.toml").unlink()
    workbook = Workbook.read(gone)
    without = State(workbook.project, workbook.review(TODAY), workbook.evaluator)
    assert [one.status for one in compare(bad, without).sheets] == ["removed"]
    assert [one.status for one in compare(without, bad).sheets] == ["added"]


def test_limits_are_compared_in_the_units_of_their_metrics(tmp_path: Path) -> None:
    raised = books.replaced(books.FOLLOWER, 'min = "5 MHz"', 'min = "6 MHz"')
    wider = books.replaced(books.PROJECT, "100 uA", "300 uA")
    found = compare(state(tmp_path / "old"), state(tmp_path / "new", raised, wider))
    assert [(one.key, one.old, one.new, one.unit) for one in found.project] == [
        ("budget.supply_current.max", 1e-4, 3e-4, "A")
    ]
    (moved,) = found.sheets[0].inputs
    assert (moved.key, moved.old, moved.new, moved.unit) == ("target.bandwidth.min", 5e6, 6e6, "Hz")
