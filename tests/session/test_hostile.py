"""Texts, names and files that nobody should have made: kept as they are, never obeyed, never in the way of the rest."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.session.opened import TODAY, contents, messages, opened, put, stated, typed
from tests.tui.book import SHEETS, write_book
from worksheet.session import fields
from worksheet.session.edits import AddEntry, DeleteSheet, DuplicateSheet, Put, RenameSheet
from worksheet.session.session import Session

TITLES = [
    "\x1b]0;owned\x07\x1b[2J",
    "[@click=app.quit]here[/] [/x] [uA] {curly}",
    "quotes \" ' \"\"\" ''' and a \\ at the end\\",
    "\u202eright to left\u2066\u200b",
    "line\nfeed\r\nand\ttab\x00\x7f",
    "title = 'x'\n[choose]\nwidth = '1 m'",
    "🦉" * 200,
    "#",
    " ",
]


@pytest.mark.parametrize("title", TITLES)
def test_a_text_is_kept_as_it_is_and_taken_back(tmp_path: Path, title: str) -> None:
    session = opened(tmp_path)
    before = contents(session.root)
    for path in (("title",), ("target", "bandwidth", "why"), ("assume", "input_level", "note"), ("evidence", 0, "by")):
        assert typed(session, "bucket_buffer", path, title).accepted
        assert stated(session.snapshot(), "bucket_buffer", *path) == title
    entry = {"metric": "power", "value": "7 uW", "found_by": "measurement", "reference": title}
    assert put(session, "bucket_buffer", AddEntry("evidence", entry)).accepted
    assert session.apply(DuplicateSheet("bucket_buffer", "second")).accepted
    assert stated(session.snapshot(), "second", "title") == title
    assert session.review(session.snapshot(), TODAY).problems == ()
    while session.snapshot().undo:
        assert session.undo().accepted
    assert contents(session.root) == before


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(text=st.text(max_size=30), path=st.sampled_from([("choose", "width"), ("count",), ("title",), ("state",)]))
def test_no_text_makes_typing_fail(tmp_path_factory: pytest.TempPathFactory, text: str, path: tuple[str, ...]) -> None:
    session = Session(write_book(tmp_path_factory.mktemp("book")))
    place = fields.place(session.snapshot(), "bucket_buffer", path)
    assert place is not None
    fields.complete(place, text)
    outcome = typed(session, "bucket_buffer", path, text)
    assert outcome.accepted or outcome.problems
    assert session.snapshot().project.problems == ()


def test_half_a_character_is_refused(tmp_path: Path) -> None:
    session = opened(tmp_path)
    before = contents(session.root)
    assert put(session, "sun_gate", Put(("title",), "\ud800")).problems
    assert contents(session.root) == before


@pytest.mark.parametrize("name", [b"\x1b[2J", b"\xff\xfe", b"a b", b"class", b"[red]", b"-rf"])
def test_a_file_with_a_name_that_cannot_be_one_can_be_renamed_or_taken_out(tmp_path: Path, name: bytes) -> None:
    session = opened(tmp_path)
    path = Path(os.fsdecode(os.fsencode(session.root / "sheets") + b"/" + name + b".toml"))
    path.write_text(SHEETS["sun_gate"], "utf-8")
    assert session.refresh()
    (bad,) = session.snapshot().project.bad
    assert len(session.snapshot().problems_of(bad)) == 1
    renamed = session.apply(RenameSheet(bad, "moon_gate"))
    assert renamed.accepted, messages(renamed)
    assert session.snapshot().project.problems == ()
    assert session.undo().accepted
    assert session.apply(DeleteSheet(bad)).accepted
    assert session.undo().accepted
    assert path.read_text("utf-8") == SHEETS["sun_gate"]


def test_what_is_no_file_hides_no_sheet(tmp_path: Path) -> None:
    session = opened(tmp_path)
    folder = session.root / "sheets"
    (folder / "folder.toml").mkdir()
    os.mkfifo(folder / "pipe.toml")
    (folder / "out.toml").symlink_to(tmp_path / "elsewhere.toml")
    (tmp_path / "elsewhere.toml").write_text(SHEETS["sun_gate"], "utf-8")
    (folder / "loop.toml").symlink_to(folder / "loop.toml")
    (folder / "binary.toml").write_bytes(bytes(range(256)))
    (folder / "huge.toml").write_bytes(b"#" * 2_000_001)
    (folder / "deep.toml").write_text("x = " + "[" * 5_000, "utf-8")
    assert session.refresh()
    assert len(session.snapshot().project.sheets) == len(SHEETS)
    assert set(session.snapshot().project.bad) == {"folder", "pipe", "out", "loop", "binary", "huge", "deep"}
    assert typed(session, "sun_gate", ("choose", "width"), "12 um").accepted
    for name in session.snapshot().project.bad:
        assert session.snapshot().problems_of(name)
        assert typed_title(session, name)
        assert session.apply(RenameSheet(name, "renamed")).problems or name in ("binary", "deep")
    assert (tmp_path / "elsewhere.toml").read_text("utf-8") == SHEETS["sun_gate"]


def typed_title(session: Session, sheet: str) -> bool:
    """Whether a title for a sheet that cannot be read is refused."""
    return bool(put(session, sheet, Put(("title",), "x")).problems)


@pytest.mark.parametrize("mark", ["", "\ufeff"])
def test_line_ends_and_mark_of_a_file_stay(tmp_path: Path, mark: str) -> None:
    session = opened(tmp_path)
    path = session.root / "sheets" / "sun_gate.toml"
    before = (mark + SHEETS["sun_gate"].replace("\n", "\r\n")).encode()
    path.write_bytes(before)
    session.refresh()
    assert typed(session, "sun_gate", ("choose", "width"), "12 um").accepted
    assert path.read_bytes() == before.replace(b'"10 um"', b'"12 um"')
    assert typed(session, "sun_gate", ("notes",), "two\nlines").accepted
    assert b"\n" not in path.read_bytes().replace(b"\r\n", b"")
    assert session.undo().accepted
    assert session.undo().accepted
    assert path.read_bytes() == before
