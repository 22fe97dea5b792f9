"""A record that is killed at any moment leaves repository, index and files whole, and the next one goes through."""

import os
import random
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.history.repositories import SHEET, found, git, leftovers, make_project, make_repository, save, try_to_save
from tests.paths import TOP
from worksheet.history import record, revisions

STEPS = 60  # more than a record has


def prepare(tmp_path: Path) -> tuple[Path, Path]:
    """A project in a repository of somebody who has something staged and something loose."""
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    save(project, "begin")
    (top / "staged").write_text("s", "utf-8")
    git(top, "add", "staged")
    (top / "README").write_text("loose\n", "utf-8")
    return top, project


def start(project: Path, step: int, note: str) -> subprocess.Popen[bytes]:
    return subprocess.Popen(
        [sys.executable, str(TOP / "tests/history/cut_off.py"), str(project), str(step), note],
        env=os.environ | {"PYTHONPATH": str(TOP)},
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
    )


def head_sheet(top: Path) -> str:
    return git(top, "show", "HEAD:p/sheets/buffer.toml")


def look(top: Path, project: Path, current: int, before: str) -> bool:
    """Assert that all is whole; whether the record was made."""
    assert git(top, "fsck", "--strict", "--connectivity-only", "--no-dangling") == ""
    assert (project / "sheets/buffer.toml").read_text("utf-8") == SHEET.format(current), "files are never touched"
    made = head_sheet(top) == SHEET.format(current).rstrip("\n")
    assert made or head_sheet(top) == before
    states = set(git(top, "status", "--porcelain").splitlines())
    assert states - {"M  p/sheets/buffer.toml"} == ({"A  staged", " M README"} | (
        set() if made or "M  p/sheets/buffer.toml" in states else {" M p/sheets/buffer.toml"}
    ))  # fmt: skip
    assert not (made and "M  p/sheets/buffer.toml" in states), "what was recorded is never staged to be taken back"
    return made


def mend(top: Path, project: Path, current: int) -> None:
    """Assert that the next record goes through, and that nothing is left of the one that was killed."""
    after = try_to_save(project, f"after {current}")
    assert isinstance(after, record.Recorded | record.Unchanged), after
    lock = top / ".git/index.lock"
    if isinstance(after, record.Unchanged) and lock.exists():
        # Nothing to record, so the lock was not asked for; whatever comes next clears it away.
        (project / "sheets/driver.toml").write_text(SHEET.format(current), "utf-8")
        cleared = save(project, "driver")
        assert cleared.remarks == ("A record that had been cut off earlier was cleared away.",)
    assert head_sheet(top) == SHEET.format(current).rstrip("\n")
    assert sorted(git(top, "status", "--porcelain").splitlines()) == [" M README", "A  staged"]


def kill_at(top: Path, project: Path, step: int) -> tuple[int, bool]:
    """Kill a record at a step, look, and record again; its exit status, and whether it was made."""
    (project / "sheets/buffer.toml").write_text(SHEET.format(step + 4), "utf-8")
    before = head_sheet(top)
    with start(project, step, f"try {step}") as running:
        status = running.wait(60)
    made = look(top, project, step + 4, before)
    mend(top, project, step + 4)
    return status, made


@pytest.mark.full
def test_killed_at_twenty_steps(tmp_path: Path) -> None:
    top, project = prepare(tmp_path)
    found_made = []
    for step in range(10, 50, 2):
        status, made = kill_at(top, project, step)
        assert status == -signal.SIGKILL
        found_made.append(made)
    assert found_made == sorted(found_made)
    assert set(found_made) == {False, True}


@pytest.mark.full
def test_killed_at_every_step(tmp_path: Path) -> None:
    top, project = prepare(tmp_path)
    outcomes = []
    for step in range(1, STEPS + 1):
        outcomes.append(kill_at(top, project, step))
        if outcomes[-1][0] == 0:
            break
    assert outcomes[-1][0] == 0, "a record has more steps than were tried"
    assert {status for status, _ in outcomes[:-1]} == {-signal.SIGKILL}
    assert len(outcomes) > 30
    for folder in (top / ".git").glob("biasbook-record-*"):
        os.utime(folder, (1, 1))
    (project / "sheets/buffer.toml").write_text(SHEET.format(1), "utf-8")
    save(project, "last")
    assert leftovers(top) == []
    assert git(top, "fsck", "--strict", "--no-dangling") == ""


@pytest.mark.full
def test_killed_two_hundred_times_at_any_moment(tmp_path: Path) -> None:
    """Kills from outside, counted only where they came after the record had begun and before it had ended."""
    top, project = prepare(tmp_path)
    draw = random.Random(7)
    made = killed = number = 0
    while killed < 200:
        number += 1
        assert number < 2000
        (project / "sheets/buffer.toml").write_text(SHEET.format(number + 5), "utf-8")
        before = head_sheet(top)
        with start(project, -1, f"try {number}") as running:
            assert running.stdout is not None
            assert running.stdout.readline() == b"begins\n"
            time.sleep(draw.uniform(0.0, 0.1))
            running.kill()
            landed = running.wait(60) == -signal.SIGKILL
        time.sleep(0.02)  # a call of git that was under way may still end
        there = look(top, project, number + 5, before)
        mend(top, project, number + 5)
        killed += landed
        made += landed and there
    print(f"killed {killed} times within {number} records; {made} of the killed ones had moved the branch")
    listed = revisions.history(found(project))
    assert isinstance(listed, tuple)
    assert len(listed) > 200
    assert git(top, "fsck", "--strict", "--no-dangling") == ""
