"""A whole review meeting in a real terminal: two missed targets, stale evidence, a waiver past its date."""

from __future__ import annotations

import datetime
import os
import shutil
import subprocess
import tomllib
from pathlib import Path
from typing import Any

import pytest

from tests.paths import TOP
from tests.tui.term import Term, running

pytestmark = pytest.mark.full

PAST = "\nuntil = 2026-02-01\n"


@pytest.fixture
def root(tmp_path: Path) -> Path:
    """The sample in a repository: two targets missed, evidence stale, and its waiver past its date."""
    root = tmp_path / "tide_gauge"
    shutil.copytree(TOP / "sample_projects" / "tide_gauge", root)
    sheet = root / "sheets" / "wake_comparator.toml"
    text = sheet.read_text("utf-8")
    at = text.index("\n", text.index("[[waiver]]"))
    sheet.write_text(text[:at] + PAST + text[at + 1 :], "utf-8")
    git(root, "init", "-q")
    (tmp_path / ".gitconfig").write_text("[user]\nname = M. Sandoe\nemail = sandoe@example.org\n", "utf-8")
    git(root, "add", ".")
    git(root, "commit", "-q", "-m", "before the meeting")
    return root


def git(root: Path, *arguments: str) -> str:
    environment = {"PATH": os.environ["PATH"], "HOME": str(root.parent), "GIT_CONFIG_NOSYSTEM": "1"}
    done = subprocess.run(
        ["git", *arguments],
        cwd=root,
        env=environment,
        capture_output=True,
        text=True,
        check=True,
        stdin=subprocess.DEVNULL,
    )
    return done.stdout


def stated(root: Path, sheet: str) -> dict[str, Any]:
    return tomllib.loads((root / "sheets" / f"{sheet}.toml").read_text("utf-8"))


def only(term: Term, kind: str) -> None:
    """Show one kind of thing, with the cursor on the first."""
    term.keys("k")
    term.until("type to search")
    term.type(kind)
    term.keys("enter")
    term.until(f"only {kind}:")
    term.read(quiet=0.4)


def fill(term: Term, *texts: str) -> None:
    for text in texts:
        if text:
            term.type(text)
        term.keys("enter")
    term.read(quiet=0.8)


@pytest.mark.parametrize("size", [(80, 24), (120, 40)])
def test_decisions_land_in_the_sheets_the_revision_and_the_minutes(root: Path, size: tuple[int, int]) -> None:
    with running(root, home=root.parent, size=size) as term:
        term.until("wake_comparator")
        term.read(quiet=1.0)
        term.keys("g")
        term.until("to decide in")
        only(term, "missed")
        term.until("converter_driver")
        term.keys("b")  # send it back to its owner
        term.until("Send converter_driver back")
        fill(term, "", "", "Ask for 3 pF.")
        only(term, "missed")
        term.until("pressure_input")
        while "▶ pressure_input" not in term.text:
            term.keys("down")
        term.keys("w")
        term.until("Waive dc_gain")
        fill(term, "", "the filter has room", "", "2030-06-30")
        only(term, "waiver ended")
        term.until("wake_comparator")
        term.keys("w")
        term.until("Waive offset_limit")
        fill(term, "", "trimmed on the quay again", "", "2030-01-31")
        only(term, "stale evidence")
        term.until("electrode_buffer")
        term.keys("b")
        term.keys("enter", "\x15")
        fill(term, "Lab", "Run it again.")
        only(term, "not accepted")
        term.until("mux_driver")
        while "▶ mux_driver" not in term.text:
            term.keys("down")
        term.keys("a")
        term.until("Accept mux_driver")
        fill(term, "", "no objection")
        term.read(quiet=1.5)
        term.keys("m")
        term.until("Present")
        fill(term, "M. Sandoe, R. Achterberg", "")
        term.until("recorded")
        term.keys("q")
        assert term.ended() == 0
    today = datetime.datetime.now().astimezone().date()
    waiver = stated(root, "pressure_input")["waiver"][-1]
    assert (waiver["by"], waiver["until"], waiver["dated"]) == ("M. Sandoe", datetime.date(2030, 6, 30), today)
    waiver = stated(root, "wake_comparator")["waiver"][-1]
    assert (waiver["reason"], waiver["until"]) == ("trimmed on the quay again", datetime.date(2030, 1, 31))
    assert stated(root, "converter_driver")["remark"][-1]["text"] == "Ask for 3 pF."
    remark = stated(root, "electrode_buffer")["remark"][-1]
    assert (remark["to"], remark["about"]) == ("Lab", "target.bandwidth")
    assert stated(root, "mux_driver")["state"] == "accepted"
    assert git(root, "log", "-1", "--format=%s").startswith("Review meeting of")
    changed = git(root, "show", "--name-only", "--format=").split()
    minutes = next(name for name in changed if name.startswith("evidence/minutes/"))
    assert {
        f"sheets/{name}.toml" for name in ("converter_driver", "electrode_buffer", "mux_driver", "pressure_input")
    } < {*changed}
    page = git(root, "show", f"HEAD:{minutes}")
    for word in ("Ask for 3 pF.", "the filter has room", "Run it again.", "no objection", "R. Achterberg", "accepted"):
        assert word in page
    assert git(root, "status", "--porcelain") == ""
