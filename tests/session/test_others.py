"""A book that others write at the same time, and a disk that does not do as it is told."""

from __future__ import annotations

import contextlib
import os
import shutil
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from tests.session.opened import contents, messages, opened, stated, typed
from tests.tui.book import SHEETS, write_book
from worksheet.session.edits import ChangeSheet, DeleteSheet, NewSheet, Put, RenameSheet
from worksheet.session.session import Session
from worksheet.sheetfile.read import parse_sheet

BUCKET = "sheets/bucket_buffer.toml"


def _rightful(root: Path) -> None:
    """Every sheet on the disk is whole, and nothing else lies about."""
    for path in sorted((root / "sheets").iterdir()):
        assert path.suffix == ".toml", path
        sheet, problems = parse_sheet(path.read_bytes(), path.stem, path.name)
        assert sheet is not None, problems


def test_two_sessions_over_one_folder_lose_nothing(tmp_path: Path) -> None:
    root = write_book(tmp_path / "book")
    keys = {"width": "um", "bias_current": "uA"}
    last: dict[str, str] = {}
    wrong: list[str] = []

    def work(key: str, unit: str) -> None:
        session = Session(root)
        for number in range(40):
            text = f"{5 + number / 10:g} {unit}"
            done = typed(session, "bucket_buffer", ("choose", key), text)
            if done.accepted:
                last[key] = text
            else:
                wrong.append(messages(done))
            if number % 10 == 9:
                assert session.undo().accepted
                assert session.redo().accepted

    threads = [threading.Thread(target=work, args=one) for one in keys.items()]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(60)
    _rightful(root)
    session = Session(root)
    assert not wrong
    for key, text in last.items():
        assert stated(session.snapshot(), "bucket_buffer", "choose", key) == text


_COLLEAGUE = """
import os, sys, time
from pathlib import Path
path, stop = Path(sys.argv[1]), Path(sys.argv[2])
number = 0
while not stop.exists():
    text = path.read_text("utf-8")
    lines = [l if not l.startswith("title = ") else f'title = "turn {number}"' for l in text.split("\\n")]
    beside = path.with_name("..colleague")
    beside.write_text("\\n".join(lines), "utf-8")
    if path.read_text("utf-8") == text:
        os.replace(beside, path)
    number += 1
    time.sleep(0.1)
"""


@contextmanager
def _colleague(path: Path, stop: Path) -> Iterator[None]:
    """Another process that puts a new title into a sheet ten times a second."""
    process = subprocess.Popen([sys.executable, "-c", _COLLEAGUE, str(path), str(stop)])
    try:
        yield
    finally:
        stop.touch()
        assert process.wait(20) == 0
        path.with_name("..colleague").unlink(missing_ok=True)


@pytest.mark.full
def test_another_process_rewriting_the_sheet_ten_times_a_second(tmp_path: Path) -> None:
    session = opened(tmp_path)
    path = session.root / BUCKET
    with _colleague(path, tmp_path / "stop"):
        turns = set()
        end = time.monotonic() + 2.5
        number = 0
        while time.monotonic() < end:
            number += 1
            done = typed(session, "bucket_buffer", ("choose", "bias_current"), f"{4 + number / 100:g} uA")
            assert done.accepted, messages(done)
            session.refresh()
            turns.add(stated(session.snapshot(), "bucket_buffer", "title"))
            assert session.snapshot().project.problems == ()
    assert len(turns) > 8, "their titles are taken in as they come"
    _rightful(session.root)
    session.refresh()
    while session.snapshot().undo:
        assert session.undo().accepted
    text = path.read_text("utf-8")
    assert 'bias_current = "4 uA"    # to be revisited' in text
    assert 'title = "turn ' in text


def test_a_collision_is_a_question_and_either_answer_holds(tmp_path: Path) -> None:
    session = opened(tmp_path)
    path = session.root / BUCKET
    place = ("choose", "width")
    path.write_text(path.read_text("utf-8").replace('"20 um"', '"24 um"'), "utf-8")
    mine = ChangeSheet("bucket_buffer", (Put(place, "30 um"),), "width", {place: "20 um"})
    asked = session.apply(mine)
    assert asked.collision is not None
    assert (asked.collision.path, asked.collision.found) == (place, "24 um")
    assert stated(session.snapshot(), "bucket_buffer", *place) == "24 um"
    assert session.apply(ChangeSheet("bucket_buffer", mine.pieces, "width")).accepted
    assert stated(session.snapshot(), "bucket_buffer", *place) == "30 um"
    assert session.undo().accepted
    assert stated(session.snapshot(), "bucket_buffer", *place) == "24 um"


@pytest.mark.parametrize("change", ["evidence", "target", "rename", "formula"])
def test_undo_leaves_what_others_did_beside_it(tmp_path: Path, change: str) -> None:
    session = opened(tmp_path)
    path = session.root / "sheets" / "supply_sense.toml"
    if change == "evidence":
        place, text = ("waiver", 0, "by"), "S. Ito"
        done = typed(session, "supply_sense", place, text)
    elif change == "target":
        piece = Put(("target", "power"), {"max": "9 uW"})
        done = session.apply(ChangeSheet("supply_sense", (piece,), "target"))
    elif change == "rename":
        done = session.apply(RenameSheet("drip_amplifier", "drop_amplifier"))
    else:
        done = typed(session, "supply_sense", ("assume", "load_capacitance"), "1 pF")
    assert done.accepted, messages(done)
    before = SHEETS["supply_sense"].encode()
    path.write_text("# theirs\n" + path.read_text("utf-8").replace('length = "0.3 um"', 'length = "0.35 um"'), "utf-8")
    back = session.undo()
    assert back.accepted, messages(back)
    expected = before.replace(b'length = "0.3 um"', b'length = "0.35 um"')
    assert path.read_bytes() == b"# theirs\n" + expected or change == "evidence"
    assert session.snapshot().project.problems == ()
    assert session.redo().accepted


def test_a_sheet_that_is_half_written_is_a_bad_sheet_until_it_is_whole(tmp_path: Path) -> None:
    session = opened(tmp_path)
    path = session.root / BUCKET
    whole = path.read_bytes()
    for length in (0, 10, whole.index(b"1.2 pF") + 2, whole.index(b"2 MHz") + 2, len(whole) - 3):
        path.write_bytes(whole[:length])
        assert session.refresh()
        assert "bucket_buffer" in session.snapshot().project.bad
        assert len(session.snapshot().project.sheets) == len(SHEETS) - 1
    path.write_bytes(whole)
    assert session.refresh()
    assert session.snapshot().project.problems == ()
    assert not session.refresh()


def test_a_folder_that_goes_away_stays_in_sight_and_nothing_is_made_in_its_place(tmp_path: Path) -> None:
    session = opened(tmp_path)
    assert typed(session, "sun_gate", ("choose", "width"), "12 um").accepted
    seen = session.snapshot()
    away = session.root.with_name("away")
    session.root.rename(away)
    assert session.refresh()
    assert session.snapshot().away
    assert session.snapshot().project.sheets == seen.project.sheets
    assert session.snapshot().contents == seen.contents
    for outcome in (
        typed(session, "sun_gate", ("choose", "width"), "13 um"),
        session.apply(NewSheet("another", "cascode", "nfet")),
        session.undo(),
    ):
        assert "folder is gone" in messages(outcome)
    assert not session.root.exists()
    assert not session.refresh(), "nothing spins"
    assert session.copy_to(tmp_path / "kept") == ()
    assert contents(tmp_path / "kept") == contents(away)
    away.rename(session.root)
    assert session.refresh()
    assert not session.snapshot().away
    assert session.snapshot().project.problems == ()
    assert session.undo().accepted
    assert contents(session.root) == contents(write_book(tmp_path / "fresh"))


def test_a_copy_never_takes_the_place_of_anything(tmp_path: Path) -> None:
    session = opened(tmp_path)
    (tmp_path / "full").mkdir()
    (tmp_path / "full" / "biasbook.toml").write_text("mine", "utf-8")
    assert session.copy_to(tmp_path / "full")
    assert (tmp_path / "full" / "biasbook.toml").read_text("utf-8") == "mine"


@contextmanager
def _an_ordinary_user() -> Iterator[None]:
    """The superuser may write everywhere; for a while the tests run as nobody."""
    if os.geteuid() != 0:
        yield
        return
    os.setegid(65534)
    os.seteuid(65534)
    try:
        yield
    finally:
        os.seteuid(0)
        os.setegid(0)


def test_a_folder_for_reading_only_is_a_problem_and_nothing_is_lost() -> None:
    folder = Path(tempfile.mkdtemp())
    try:
        session = opened(folder)
        assert typed(session, "wind_cascode", ("choose", "width"), "12 um").accepted
        before, revision = contents(session.root), session.snapshot().revision
        folder.chmod(0o755)
        for path in (session.root, session.root / "sheets"):
            path.chmod(0o555)
        with _an_ordinary_user():
            for outcome in (
                typed(session, "sun_gate", ("choose", "width"), "12 um"),
                session.apply(NewSheet("another", "cascode", "nfet")),
                session.apply(RenameSheet("drip_amplifier", "drop_amplifier")),
                session.apply(DeleteSheet("sun_gate")),
                session.undo(),
            ):
                assert "cannot be written: permission denied" in messages(outcome)
        assert contents(session.root) == before
        assert session.snapshot().revision == revision
        for path in (session.root, session.root / "sheets"):
            path.chmod(0o755)
        assert session.undo().accepted
    finally:
        shutil.rmtree(folder)


@pytest.mark.full
def test_a_full_disk_refuses_a_change_whole_and_takes_it_once_there_is_room(tmp_path: Path) -> None:
    disk = tmp_path / "disk"
    disk.mkdir()
    mounted = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=160k", "tmpfs", str(disk)], capture_output=True, check=False
    )
    if mounted.returncode:
        pytest.skip("no right to mount a small disk here")
    try:
        session = opened(disk)
        before = contents(session.root)
        filler = disk / "filler"
        with filler.open("wb", buffering=0) as file, contextlib.suppress(OSError):
            while True:
                file.write(b"x" * 4096)
        for outcome in (
            typed(session, "bucket_buffer", ("notes",), "x" * 9_000),
            session.apply(RenameSheet("drip_amplifier", "drop_amplifier")),
        ):
            assert "no space left" in messages(outcome)
        assert contents(session.root) == {**before}
        assert session.snapshot().undo == ""
        filler.unlink()
        assert session.apply(RenameSheet("drip_amplifier", "drop_amplifier")).accepted
        assert session.undo().accepted
        assert contents(session.root) == before
    finally:
        subprocess.run(["umount", "-l", str(disk)], check=True)
