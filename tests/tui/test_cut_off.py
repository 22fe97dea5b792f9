"""Ended in the middle of a write, in a real pseudo-terminal: the sheet is whole, as before or as after."""

from __future__ import annotations

import signal
import tomllib
from pathlib import Path

import pytest

from tests.tui import term as terms
from tests.tui.term import Term

pytestmark = pytest.mark.full

SHEET = "bucket_buffer"
CALLS = ("fsync", "replace")
"""System calls of a write: the new file's content, the swap, the folder's entry."""

CUT = """
import os, signal, sys
real, met = os.{call}, 0
def cut(*arguments, **named):
    global met
    callers = (sys._getframe(1), sys._getframe(2))
    inside = any(one.f_globals["__name__"] == "worksheet.sheetfile.write" for one in callers)
    if inside:
        met += 1
        if met == {at}:
            os.kill(os.getpid(), {signal})
    return real(*arguments, **named)
os.{call} = cut
from worksheet.cli.main import entry
sys.exit(entry())
"""


def content(root: Path) -> bytes:
    return (root / "sheets" / f"{SHEET}.toml").read_bytes()


def stepped(root: Path, home: Path) -> Term:
    """The bias current stepped up; the program ends itself in the write."""
    term = Term(["open", str(root)], home, (80, 24), {})
    term.until("Rain gauge front end")
    term.keys("enter")
    term.until("Targets")
    term.keys("tab")
    term.type("+")
    return term


@pytest.mark.parametrize("ends", [signal.SIGKILL, signal.SIGHUP, signal.SIGTERM])
@pytest.mark.parametrize(("call", "at"), [("fsync", 1), ("replace", 1), ("fsync", 2)])
def test_a_write_that_is_cut_off_leaves_a_whole_sheet(
    root: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, ends: signal.Signals, call: str, at: int
) -> None:
    before = content(root)
    monkeypatch.setattr(terms, "PROGRAM", CUT.format(call=call, at=at, signal=int(ends)))
    term = stepped(root, tmp_path)
    ended = term.ended()
    now = content(root)
    text = tomllib.loads(now.decode())["choose"]["bias_current"]
    if ends is signal.SIGKILL:
        assert ended == 128 + signal.SIGKILL
        assert (now != before) is ((call, at) == ("fsync", 2)), "only the swap itself makes the new sheet the sheet"
    else:
        assert ended == 128 + ends
        assert now != before, "a write that began is finished"
        term.read()
        assert term.settings() == term.before
        assert b"Traceback" not in term.sent
    monkeypatch.undo()
    again = Term(["open", str(root)], tmp_path, (80, 24), {})
    again.until("Rain gauge front end")
    again.keys("enter")
    again.until("Targets")
    assert tomllib.loads(content(root).decode())["choose"]["bias_current"] == text
    again.keys("tab")
    again.type("+")
    again.keys("q")
    assert again.ended() == 0
    assert content(root) != now, "the sheet takes edits again"
    left = [path.name for path in (root / "sheets").iterdir() if not path.name.endswith(".toml")]
    assert len(left) <= (ends is signal.SIGKILL), "a kill may leave the unfinished file, hidden; nothing else does"
