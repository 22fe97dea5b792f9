"""What was being typed when the end came: kept outside the project, offered once nobody holds it."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

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
