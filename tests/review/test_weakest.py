"""The weakest assumptions: least trust first, then least room, with what stands beside each value."""

from __future__ import annotations

import datetime
from pathlib import Path

from tests.cli import books
from worksheet.model.keys import TRUST
from worksheet.review.fragility import fragility
from worksheet.review.weakest import Weak, weakest
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)


def found(folder: Path, sheet: str) -> tuple[Weak, ...]:
    workbook = Workbook.read(books.write(folder, sheet))
    result = next(one for one in workbook.review(TODAY).sheets if one.sheet.name == books.BUFFER)
    assert workbook.evaluator is not None
    worst = {one.target.name: one.worst_at for one in result.targets if one.worst_at is not None}
    ranked = fragility(workbook.evaluator, {books.BUFFER: worst})[books.BUFFER]
    return weakest(result.sheet, workbook.project.process, ranked)


def test_least_trust_comes_first_and_least_room_among_equals(tmp_path: Path) -> None:
    rows = found(tmp_path, books.FOLLOWER)
    ample = [one.room is None or one.room > 1.0 for one in rows]
    assert ample == sorted(ample)
    for last in (False, True):
        part = [one for one, is_ample in zip(rows, ample, strict=True) if is_ample is last]
        ranks = [TRUST.index(one.trust) if one.trust else -1 for one in part]
        assert ranks == sorted(ranks)
        for trust in {one.trust for one in part}:
            rooms = [one.room if one.room is not None else float("inf") for one in part if one.trust == trust]
            assert rooms == sorted(rooms)


def test_every_assumption_is_there_and_no_choice(tmp_path: Path) -> None:
    keys = [one.key for one in found(tmp_path, books.FOLLOWER)]
    assert {"assume.load_capacitance", "assume.input_level", "own.line"} <= set(keys)
    assert not any(key.startswith("choose.") for key in keys)
    assert len(set(keys)) == len(keys)


def test_the_room_is_the_least_over_targets_and_conditions(tmp_path: Path) -> None:
    one = next(row for row in found(tmp_path, books.FOLLOWER) if row.key == "assume.load_capacitance")
    assert one.value == 1.2e-12
    assert one.source == "floor plan"
    assert one.room is not None
    assert one.break_value is not None
    assert one.room == abs(one.break_value - 1.2e-12) / 1.2e-12
    assert one.target == "share"
    assert abs(one.break_value - 0.8e-12) < 1e-17  # 0.4 pF/load at most 0.5


def test_who_looked_a_value_up_again_stands_beside_it(tmp_path: Path) -> None:
    checked = 'source = "floor plan", checked_by = "T. Vik", checked = 2026-11-30, trust = "estimate"'
    sheet = books.replaced(books.FOLLOWER, 'source = "floor plan", trust = "estimate"', checked)
    one = next(row for row in found(tmp_path, sheet) if row.key == "assume.load_capacitance")
    assert (one.checked_by, one.checked) == ("T. Vik", datetime.date(2026, 11, 30))
