"""What was being typed when the end came: kept outside the project, offered once nobody holds it."""

from __future__ import annotations

import errno
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from tests.paths import TOP
from worksheet.session.recovery import Journal, Typing

TEXT = Typing("sun_gate", "choose.width", "Width", "12.5 u")


def test_a_text_that_is_being_typed_is_not_offered(tmp_path: Path) -> None:
    project = tmp_path / "project"
    project.mkdir()
    first = Journal(tmp_path / "state", project)
    assert first.keep(Typing("sun_gate", "choose.width", "Width", "1"))
    assert first.keep(TEXT)
    assert Journal(tmp_path / "state", project).left() == ()  # somebody is still typing it


def test_an_accepted_text_leaves_nothing(tmp_path: Path) -> None:
    journal = Journal(tmp_path / "state", tmp_path)
    journal.keep(TEXT)
    journal.done()
    assert list((tmp_path / "state").iterdir()) == []
    journal.done()


def test_a_killed_run_leaves_its_last_whole_line(tmp_path: Path) -> None:
    state = tmp_path / "state"
    typed = "Typing('sun_gate', 'choose.width', 'Width', '12.5 u')"
    program = (
        "import os; from pathlib import Path; from worksheet.session.recovery import Journal, Typing; "
        f"Journal(Path({str(state)!r}), Path({str(tmp_path)!r})).keep({typed}); os._exit(9)"
    )
    assert subprocess.run([sys.executable, "-c", program], cwd=TOP, check=False).returncode == 9
    (path,) = state.iterdir()
    path.write_bytes(path.read_bytes() + b'{"sheet": "sun_ga')  # the end came in the middle of a write
    journal = Journal(state, tmp_path)
    (left,) = journal.left()
    assert left.typing == TEXT
    assert Journal(state, tmp_path / "other").left() == ()
    left.forget()
    assert journal.left() == ()


def test_a_folder_that_cannot_be_made_bars_nothing(tmp_path: Path) -> None:
    (tmp_path / "state").write_text("a file")
    assert not Journal(tmp_path / "state", tmp_path).keep(TEXT)


def test_every_line_of_a_form_is_kept_and_forgotten_on_its_own(tmp_path: Path) -> None:
    lines = [
        Typing("sun_gate", f"target.power.{key}", key, text) for key, text in (("max", "8 uW"), ("why", "ni\ud800"))
    ]
    writer = Journal(tmp_path / "state", tmp_path)
    for typing in (Typing("sun_gate", "target.power.max", "max", "8"), *lines):
        assert writer.keep(typing)
    _abandon(writer)
    journal = Journal(tmp_path / "state", tmp_path)
    assert [one.typing for one in journal.left()] == lines
    journal.left()[0].forget()
    assert [one.typing for one in journal.left()] == lines[1:]
    assert [one.typing for one in Journal(tmp_path / "state", tmp_path).left()] == lines[1:]
    journal.left()[0].forget()
    assert list((tmp_path / "state").iterdir()) == []


def test_a_long_text_does_not_grow_with_its_square(tmp_path: Path) -> None:
    writer = Journal(tmp_path / "state", tmp_path)
    text = ""
    for _ in range(100):
        text += "µ" * 500
        assert writer.keep(Typing("sun_gate", "notes", "Notes", text))
    (path,) = (tmp_path / "state").iterdir()
    assert path.stat().st_size < 6 * (6 * len(text) + 65_536)
    assert Journal(tmp_path / "state", tmp_path).left() == ()  # still held, also after it was written anew
    _abandon(writer)
    (left,) = Journal(tmp_path / "state", tmp_path).left()
    assert left.typing.text == text


def test_whatever_stands_in_the_folder_bars_nothing(tmp_path: Path) -> None:
    state = tmp_path / "state"
    writer = Journal(state, tmp_path)
    assert writer.keep(TEXT)
    _abandon(writer)
    (path,) = state.iterdir()
    mark = path.name.split("-")[0]
    for number, content in enumerate((b"\xff\x00", b"[" * 100_000, b'{"a": 1}\n{"sheet": "x"}\n[]\n7\n""', b"")):
        (state / f"{mark}-{number}.typing").write_bytes(content)
    (state / f"{mark}-folder.typing").mkdir()
    (left,) = Journal(state, tmp_path).left()
    assert left.typing == TEXT


def test_a_text_on_a_full_disk_is_not_kept_and_the_next_one_is(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    writer = Journal(tmp_path / "state", tmp_path)
    assert writer.keep(TEXT)
    real = os.write
    monkeypatch.setattr(os, "write", _cut_short(real))
    assert not writer.keep(Typing("sun_gate", "choose.width", "Width", "13 um"))
    monkeypatch.setattr(os, "write", real)
    last = Typing("sun_gate", "choose.width", "Width", "14 um")
    assert writer.keep(last)
    _abandon(writer)
    (left,) = Journal(tmp_path / "state", tmp_path).left()
    assert left.typing == last


def _cut_short(real: Callable[[int, bytes], int]) -> Callable[[int, bytes], int]:
    """A disk with room for seven bytes."""
    room = [7]

    def write(descriptor: int, content: bytes) -> int:
        if not room[0]:
            raise OSError(errno.ENOSPC, "No space left on device")
        written = real(descriptor, bytes(content[: room[0]]))
        room[0] -= written
        return written

    return write


def _abandon(journal: Journal) -> None:
    """As when the program is killed."""
    assert journal._descriptor is not None
    os.close(journal._descriptor)
