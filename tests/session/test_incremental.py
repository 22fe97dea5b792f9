"""What is worked out again after a change is what the change reaches, and the outcome is that of a book read anew."""

from __future__ import annotations

import dataclasses
import datetime
import random
import tempfile
from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from tests.session.opened import TODAY, contents, opened, put, typed
from tests.support import write_project
from tests.tui.book import PROJECT, SHEETS, write_book
from worksheet.review.results import Review, SheetReview
from worksheet.session.edits import (
    AddEntry,
    ChangeSheet,
    DeleteSheet,
    DuplicateSheet,
    Put,
    RenameSheet,
    Request,
    TakeOut,
)
from worksheet.session.session import Session
from worksheet.session.starter import process_text
from worksheet.session.workbook import Workbook


def _reviews(session: Session, today: datetime.date = TODAY) -> dict[str, SheetReview]:
    return {one.sheet.name: one for one in session.review(session.snapshot(), today).sheets}


def _kept(before: dict[str, SheetReview], after: dict[str, SheetReview]) -> set[str]:
    return {name for name, one in after.items() if before.get(name) is one}


def test_only_what_a_change_reaches_is_worked_out_again(tmp_path: Path) -> None:
    session = opened(tmp_path)
    first = _reviews(session)
    assert _kept(first, _reviews(session)) == set(SHEETS)
    assert typed(session, "sun_gate", ("choose", "width"), "12 um").accepted
    second = _reviews(session)
    assert _kept(first, second) == set(SHEETS) - {"sun_gate"}
    assert typed(session, "drip_amplifier", ("choose", "width"), "31 um").accepted
    third = _reviews(session)
    assert _kept(second, third) == set(SHEETS) - {"drip_amplifier", "supply_sense"}
    assert third["supply_sense"].metrics["bandwidth"] != second["supply_sense"].metrics["bandwidth"]


def test_a_refused_change_costs_nothing(tmp_path: Path) -> None:
    session = opened(tmp_path)
    first = _reviews(session)
    assert not typed(session, "sun_gate", ("choose", "width"), "0.1 um").accepted
    assert _kept(first, _reviews(session)) == set(SHEETS)


def test_the_process_file_conditions_and_the_day_reach_every_sheet(tmp_path: Path) -> None:
    session = opened(tmp_path)
    first = _reviews(session)
    for file, old, new in (
        ("process/my_process.toml", 'threshold = "0.45 V"', 'threshold = "0.44 V"'),
        ("biasbook.toml", '"85 °C"', '"95 °C"'),
    ):
        path = session.root / file
        path.write_text(path.read_text("utf-8").replace(old, new, 1), "utf-8")
        assert session.refresh()
        second = _reviews(session)
        assert _kept(first, second) == set()
        first = second
    assert _kept(first, _reviews(session, TODAY + datetime.timedelta(days=1))) == set()


def test_a_line_that_moves_is_told_anew(tmp_path: Path) -> None:
    """A level sought in an empty range has a line, which moves when a comment is put above it."""
    session = opened(tmp_path)
    path = session.root / "sheets" / "level_divider.toml"
    text = path.read_text("utf-8").replace('bias_current = "1 uA"', 'bias_current = "40 mA"')
    for lines in (text, "# a comment\n" + text, "\n\n\n" + text):
        path.write_text(lines, "utf-8")
        session.refresh()
        assert session.review(session.snapshot(), TODAY).problems == Workbook.read(session.root).review(TODAY).problems


FEW = ("bucket_buffer", "drip_amplifier", "supply_sense", "level_divider")
"""Sheets of the smaller book of the random changes; one takes a value from another."""


def _small_book(folder: Path) -> Path:
    conditions = (
        ('["-40 °C", "27 °C", "85 °C"]', '["27 °C", "85 °C"]'),
        ('["1.71 V", "1.8 V", "1.89 V"]', '"1.8 V"'),
        ('["typical", "slow", "fast"]', '["typical", "slow"]'),
    )
    project = PROJECT
    for many, few in conditions:
        project = project.replace(many, few)
    return write_project(folder, project, process_text(), {name: SHEETS[name] for name in FEW})


@st.composite
def requests(draw: st.DrawFn) -> Request:
    """A change that has a fair chance of being accepted."""
    sheet = draw(st.sampled_from([*FEW, "copied"]))
    sizes = {"width": ["6 um", "25 um"], "length": ["0.4 um", "1 um"], "bias_current": ["3 uA", "0.5 mA"]}
    size = draw(st.sampled_from(sorted(sizes)))
    text = draw(st.sampled_from(sizes[size]))
    link = draw(st.sampled_from(["0.1*drip_amplifier.input_capacitance + 1e-13", "supply_sense.load_capacitance/2"]))
    made: list[Request] = [
        ChangeSheet(sheet, (Put(("choose", size), text),), ""),
        ChangeSheet(sheet, (Put(("assume", "load_capacitance", "formula"), link),), ""),
        ChangeSheet(sheet, (Put(("assume", "load_capacitance"), "0.7 pF"),), ""),
        ChangeSheet(sheet, (Put(("notes",), "a note\nof\nlines"), Put(("count",), 3)), ""),
        ChangeSheet(sheet, (TakeOut(("choose", size)),), ""),
        ChangeSheet(sheet, (Put(("target", "bandwidth"), {"min": "4 MHz"}),), ""),
        ChangeSheet(sheet, (TakeOut(("target", "bandwidth")),), ""),
        ChangeSheet(
            sheet,
            (AddEntry("waiver", {"target": "bandwidth", "by": "x", "reason": "y", "until": TODAY}),),
            "",
        ),
        DuplicateSheet(sheet, "copied"),
        RenameSheet("drip_amplifier", "drop_amplifier"),
        DeleteSheet("copied"),
    ]
    return draw(st.sampled_from(made))


def _comparable(review: Review) -> Review:
    """A review without what no two readings share: the order of problems that different sheets have."""
    return dataclasses.replace(review, problems=tuple(sorted(review.problems, key=str)))


@settings(max_examples=30)
@given(st.lists(requests(), min_size=1, max_size=6), st.randoms(use_true_random=False))
def test_incremental_and_full_results_are_the_same(made: list[Request], rng: random.Random) -> None:
    with tempfile.TemporaryDirectory() as folder:
        root = _small_book(Path(folder) / "book")
        session = Session(root)
        for request in made:
            outcome = session.apply(request) if rng.random() < 0.9 else session.undo()
            if outcome.accepted:
                incremental = session.review(session.snapshot(), TODAY)
                whole = Workbook.read(root).review(TODAY)
                assert _comparable(incremental) == _comparable(whole)
                lines = [[one.sheet.lines for one in review.sheets] for review in (incremental, whole)]
                assert lines[0] == lines[1]


def test_a_step_keeps_what_differs_and_not_the_text(tmp_path: Path) -> None:
    session = opened(tmp_path)
    text = "a line of a long note\n" * 10_000
    assert put(session, "sun_gate", Put(("notes",), text)).accepted
    for number in range(5):
        assert put(session, "sun_gate", Put(("notes",), text + str(number))).accepted
        assert typed(session, "sun_gate", ("choose", "width"), f"{11 + number} um").accepted
    kept = [len(patch.old) + len(patch.new) for step in session._undo[1:] for patch in step.patches]
    assert max(kept) < 20
    assert sum(len(repr(step.moved)) for step in session._undo) < 2_000
    while session.snapshot().undo:
        assert session.undo().accepted
    assert contents(session.root) == contents(write_book(tmp_path / "again"))
