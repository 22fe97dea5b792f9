"""Every way in which a run can end or its line can fail, in a real pseudo-terminal: nothing lost or left behind."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.paths import TOP
from tests.tui.term import Term, running

pytestmark = pytest.mark.full

SHEET = "bucket_buffer"
TYPED = "6.25 u"


def begin_to_type(term: Term) -> None:
    """Open the first sheet and type half a bias current."""
    term.until("Rain gauge front end")
    term.keys("enter")
    term.until("Targets")
    term.keys("tab", "enter")
    term.until("Bias current [A]" if "Bias current [A]" in term.text else "Bias current")
    for _ in range(8):
        term.keys("backspace")
    term.type(TYPED)


def content(root: Path) -> bytes:
    return (root / "sheets" / f"{SHEET}.toml").read_bytes()


@pytest.mark.parametrize("number", [signal.SIGHUP, signal.SIGTERM])
def test_a_signal_ends_it_with_the_terminal_as_it_was(root: Path, tmp_path: Path, number: signal.Signals) -> None:
    before = content(root)
    with running(root, home=tmp_path) as term:
        begin_to_type(term)
        term.signal(number)
        assert term.ended() == 128 + number
        term.read()
        assert term.settings() == term.before
        assert b"\x1b[?1049l" in term.sent[-400:]
        assert b"Traceback" not in term.sent
    assert content(root) == before
    typed_is_offered(root, tmp_path)


def test_a_kill_loses_no_character(root: Path, tmp_path: Path) -> None:
    before = content(root)
    with running(root, home=tmp_path) as term:
        begin_to_type(term)
        term.signal(signal.SIGKILL)
        term.ended()
    assert content(root) == before
    typed_is_offered(root, tmp_path)


def test_a_hung_up_line_ends_it(root: Path, tmp_path: Path) -> None:
    before = content(root)
    term = Term(["open", str(root)], tmp_path, (80, 24), {})
    begin_to_type(term)
    os.close(term.descriptor)
    assert term.ended() in (128 + signal.SIGHUP, 0)
    assert content(root) == before
    typed_is_offered(root, tmp_path)


def test_a_hung_up_line_ends_it_where_the_signal_is_ignored(root: Path, tmp_path: Path) -> None:
    """As under nohup: only the watcher sees that the line is gone."""
    code = (
        "import signal, sys; signal.signal(signal.SIGHUP, signal.SIG_IGN);"
        "import worksheet.tui.guard as g; g.SIGNALS = (signal.SIGTERM,);"
        "from worksheet.cli.main import entry; sys.exit(entry())"
    )
    import tests.tui.term as term_module

    kept = term_module.PROGRAM
    term_module.PROGRAM = code
    try:
        term = Term(["open", str(root)], tmp_path, (80, 24), {})
        term.until("Rain gauge front end")
        os.close(term.descriptor)
        assert term.ended() == 128 + signal.SIGHUP
    finally:
        term_module.PROGRAM = kept


def test_a_line_that_nobody_reads_does_not_keep_it(root: Path, tmp_path: Path) -> None:
    with running(root, home=tmp_path) as term:
        term.until("Rain gauge front end")
        for _ in range(300):  # more than the line holds, and nothing is read
            os.write(term.descriptor, b"\x1b[B\x1b[A")
        time.sleep(1.0)
        term.signal(signal.SIGTERM)
        assert term.ended() == 128 + signal.SIGTERM


def test_nothing_is_sent_and_little_is_done_while_idle(root: Path, tmp_path: Path) -> None:
    with running(root, home=tmp_path) as term:
        term.until("Rain gauge front end")
        term.read(quiet=1.5)
        sent, used = len(term.sent), term.seconds_used()
        time.sleep(4.0)
        term.read(quiet=0.1)
        assert len(term.sent) == sent
        assert term.seconds_used() - used < 0.4


def typed_is_offered(root: Path, home: Path) -> None:
    """The next start offers what was being typed, and the field opens with it."""
    with running(root, home=home) as term:
        term.until("typed")
        assert TYPED in term.text
        term.keys("o")
        term.until(TYPED)
        term.type("A")
        term.keys("enter")
        term.read(quiet=0.6)
    assert b'bias_current = "6.25 uA"' in content(root)


def test_stop_and_go_on(root: Path, tmp_path: Path) -> None:
    with running(root, home=tmp_path) as term:
        term.until("Rain gauge front end")
        os.write(term.descriptor, b"\x1a")
        end = time.monotonic() + 10
        while "T" not in Path(f"/proc/{term.pid}/stat").read_text("utf-8").rpartition(")")[2].split()[0]:
            assert time.monotonic() < end
            term.read(quiet=0.05)
        assert term.settings() == term.before
        term.signal(signal.SIGCONT)
        term.read(quiet=0.8)
        term.keys("down")
        term.until("Rain gauge front end")
        assert term.settings() != term.before


def test_every_size_from_the_least_to_a_wall(root: Path, tmp_path: Path) -> None:
    with running(root, home=tmp_path) as term:
        term.until("Rain gauge front end")
        term.keys("enter")
        term.until("Targets")
        for size in ((60, 15), (250, 80), (61, 16), (80, 24), (120, 40), (20, 5), (80, 24)):
            term.resize(size)
            term.read(quiet=0.5)
            term.keys("down")
        assert SHEET in term.text
        term.keys("m")
        term.until("where all targets hold")
        for size in ((60, 15), (250, 80), (80, 24)):
            term.resize(size)
            term.read(quiet=0.8)
        assert "◆" in term.text
        term.keys("q")
        assert term.ended() == 0


@pytest.mark.parametrize("name", ["xterm-256color", "screen", "tmux-256color", "vt220"])
def test_terminals_of_every_kind(root: Path, tmp_path: Path, name: str) -> None:
    with running(root, home=tmp_path, environment={"TERM": name}) as term:
        term.until("bucket_buffer")
        term.keys("enter")
        term.until("Targets")
        term.keys("q")
        assert term.ended() == 0


@pytest.mark.parametrize("environment", [{"NO_COLOR": "1"}, {"LANG": "C", "LC_ALL": "C"}])
def test_no_colour_and_no_unicode(root: Path, tmp_path: Path, environment: dict[str, str]) -> None:
    with running(root, home=tmp_path, environment=environment) as term:
        term.until("bucket_buffer")
        term.keys("enter")
        term.until("Targets")
        if "NO_COLOR" in environment:
            assert b"\x1b[38;" not in term.sent
            assert b"\x1b[48;" not in term.sent
        else:
            assert term.text.isascii()


@pytest.mark.parametrize("environment", [{"TERM": "dumb"}, {"TERM": ""}])
def test_a_terminal_that_cannot_is_refused_with_the_command_that_can(
    root: Path, tmp_path: Path, environment: dict[str, str]
) -> None:
    with running(root, home=tmp_path, environment=environment) as term:
        assert term.ended() == 2
        term.read()
        assert "biasbook review" in term.text


def test_no_terminal_at_all_is_refused(root: Path, tmp_path: Path) -> None:
    code = "import sys; from worksheet.cli.main import entry; sys.exit(entry())"
    done = subprocess.run(
        [sys.executable, "-c", code, "open", str(root)],
        cwd=TOP,
        env={**os.environ, "HOME": str(tmp_path), "TERM": "xterm"},
        stdin=subprocess.DEVNULL,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 2
    assert "biasbook review" in done.stderr
    assert done.stdout == ""
