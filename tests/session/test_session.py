"""An open book: what is accepted is on disk, what is refused changes nothing, every step has a way back."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from tests.tui.book import write_book
from worksheet.session.edits import (
    AddEntry,
    ChangeSheet,
    DeleteSheet,
    DuplicateSheet,
    NewSheet,
    Put,
    RenameSheet,
    Request,
    TakeOut,
)
from worksheet.session.session import Session

CURRENT = ("choose", "bias_current")


@pytest.fixture
def root(tmp_path: Path) -> Path:
    return write_book(tmp_path / "project")


def _files(root: Path) -> dict[str, bytes]:
    return {str(p.relative_to(root)): p.read_bytes() for p in sorted(root.rglob("*.toml"))}


def _put(value: object, sheet: str = "bucket_buffer", path: tuple[str | int, ...] = CURRENT) -> ChangeSheet:
    return ChangeSheet(sheet, (Put(path, value),), f"{path[-1]} {value}")


REQUESTS: dict[str, Request] = {
    "value": _put("5 uA"),
    "note beside a value": _put("guess", path=("assume", "load_capacitance", "trust")),
    "formula": _put("2*clock_driver.input_capacitance + 1e-12", path=("assume", "load_capacitance", "formula")),
    "target": _put({"min": "1 V/us", "why": "tips"}, path=("target", "slew_rate")),
    "target gone": ChangeSheet("bucket_buffer", (TakeOut(("target", "power")),), "power taken out"),
    "evidence": ChangeSheet(
        "bucket_buffer",
        (AddEntry("evidence", {"metric": "power", "value": "7 uW", "found_by": "measurement"}),),
        "evidence",
    ),
    "waiver gone": ChangeSheet("supply_sense", (TakeOut(("waiver", 0)),), "waiver taken out"),
    "new": NewSheet("gust_buffer", "source-follower", "nfet", "Gust"),
    "copy": DuplicateSheet("sun_gate", "moon_gate"),
    "rename": RenameSheet("drip_amplifier", "drop_amplifier"),
    "delete": DeleteSheet("sun_gate"),
}


@pytest.mark.parametrize("request_", REQUESTS.values(), ids=REQUESTS)
def test_a_change_is_on_disk_at_once_and_undo_returns_every_byte(root: Path, request_: Request) -> None:
    session = Session(root)
    before = _files(root)
    outcome = session.apply(request_)
    assert outcome.accepted, outcome
    after = _files(root)
    assert after != before
    assert {n: c for n, c in session.snapshot().contents.items() if n.startswith("sheets/")} == {
        n: c for n, c in after.items() if n.startswith("sheets/")
    }
    assert not session.snapshot().project.problems
    assert session.undo().accepted
    assert _files(root) == before
    assert session.redo().accepted
    assert _files(root) == after


REFUSED: dict[str, tuple[Request, str]] = {
    "unit": (_put("5 uV"), "choose.bias_current"),
    "unknown metric": (_put({"min": 3}, path=("target", "bandwith")), "target"),
    "unused own name": (_put({"value": "1 V"}, path=("own", "swing")), "own.swing"),
    "loop": (
        _put("2*supply_sense.load_capacitance", "drip_amplifier", ("assume", "load_capacitance", "formula")),
        "load_capacitance",
    ),
    "unknown stage": (NewSheet("another", "source-folower", "nfet"), "stage"),
    "taken name": (NewSheet("sun_gate", "source-follower", "nfet"), "name"),
    "no name": (DuplicateSheet("sun_gate", "../evil"), "name"),
    "used by another": (DeleteSheet("drip_amplifier"), ""),
    "nothing there": (DeleteSheet("nobody"), ""),
}


@pytest.mark.parametrize(("request_", "key"), REFUSED.values(), ids=REFUSED)
def test_what_would_make_a_sheet_invalid_is_refused_and_nothing_is_written(
    root: Path, request_: Request, key: str
) -> None:
    session = Session(root)
    before, revision = _files(root), session.snapshot().revision
    outcome = session.apply(request_)
    assert not outcome.accepted
    assert outcome.problems
    assert any(key in problem.key for problem in outcome.problems), outcome.problems
    assert _files(root) == before
    assert session.snapshot().revision == revision
    assert not session.snapshot().undo


def test_renaming_takes_the_formulas_of_other_sheets_along(root: Path) -> None:
    session = Session(root)
    assert session.apply(RenameSheet("drip_amplifier", "drop_amplifier")).accepted
    text = (root / "sheets" / "supply_sense.toml").read_text("utf-8")
    assert "2*drop_amplifier.input_capacitance" in text
    assert "drip_amplifier" not in text


def test_a_comment_beside_a_changed_value_stays(root: Path) -> None:
    Session(root).apply(_put("5 uA"))
    text = (root / "sheets" / "bucket_buffer.toml").read_text("utf-8")
    assert 'bias_current = "5 uA"    # to be revisited after the layout' in text


def test_what_others_write_is_taken_in_and_survives_a_change_of_ours(root: Path) -> None:
    session = Session(root)
    path = root / "sheets" / "bucket_buffer.toml"
    path.write_text(path.read_text("utf-8").replace('width = "20 um"', 'width = "24 um"'), "utf-8")
    assert session.apply(_put("5 uA")).accepted
    text = path.read_text("utf-8")
    assert 'width = "24 um"' in text
    assert 'bias_current = "5 uA"' in text


def test_a_collision_on_the_same_value_asks_and_writes_nothing(root: Path) -> None:
    session = Session(root)
    path = root / "sheets" / "bucket_buffer.toml"
    theirs = path.read_text("utf-8").replace('"4 uA"', '"6 uA"')
    path.write_text(theirs, "utf-8")
    mine = ChangeSheet("bucket_buffer", (Put(CURRENT, "5 uA"),), "mine", {CURRENT: "4 uA"})
    outcome = session.apply(mine)
    assert outcome.collision is not None
    assert outcome.collision.found == "6 uA"
    assert path.read_text("utf-8") == theirs


def test_undo_leaves_what_others_changed_beside_it(root: Path) -> None:
    session = Session(root)
    session.apply(_put("5 uA"))
    path = root / "sheets" / "bucket_buffer.toml"
    path.write_text(path.read_text("utf-8").replace('width = "20 um"', 'width = "24 um"'), "utf-8")
    assert session.undo().accepted
    text = path.read_text("utf-8")
    assert 'width = "24 um"' in text
    assert 'bias_current = "4 uA"' in text


def test_undo_does_not_overwrite_what_others_put_in_its_place(root: Path) -> None:
    session = Session(root)
    session.apply(_put("5 uA"))
    path = root / "sheets" / "bucket_buffer.toml"
    theirs = path.read_text("utf-8").replace('"5 uA"', '"6 uA"')
    path.write_text(theirs, "utf-8")
    outcome = session.undo()
    assert not outcome.accepted
    assert outcome.problems
    assert path.read_text("utf-8") == theirs


def test_a_book_for_reading_changes_nothing(root: Path) -> None:
    session = Session(root, read_only=True)
    before = _files(root)
    assert session.apply(_put("5 uA")).problems
    assert _files(root) == before


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may write everywhere")
def test_a_folder_that_cannot_be_written_is_a_problem(root: Path) -> None:
    session = Session(root)
    (root / "sheets").chmod(0o555)
    try:
        assert session.apply(_put("5 uA")).problems
    finally:
        (root / "sheets").chmod(0o755)


def test_a_vanished_folder_is_a_problem_and_comes_back(root: Path) -> None:
    session = Session(root)
    away = root.with_name("away")
    root.rename(away)
    assert session.apply(_put("5 uA")).problems
    session.refresh()
    assert session.snapshot().project.problems
    away.rename(root)
    assert session.refresh()
    assert not session.snapshot().project.problems
    assert session.apply(_put("5 uA")).accepted


def test_own_names_left_without_a_formula_are_named(root: Path) -> None:
    session = Session(root)
    outcome = session.apply(ChangeSheet("wind_cascode", (TakeOut(("target", "rate_margin")),), "figure taken out"))
    assert outcome.unused == ("sample_rate",)
    both = (TakeOut(("target", "rate_margin")), TakeOut(("own", "sample_rate")))
    assert session.apply(ChangeSheet("wind_cascode", both, "figure taken out")).accepted
