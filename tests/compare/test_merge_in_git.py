"""Real merges by git, with the merge driver in its place."""

import shlex
import sys
import tomllib
from pathlib import Path

import pytest

from tests.compare.test_merge import BASE, MORE, changed
from tests.history.repositories import git
from tests.paths import TOP
from worksheet.compare import conflict
from worksheet.sheetfile.read import parse_sheet

SHEET = "p/sheets/buffer.toml"


@pytest.fixture
def repository(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A repository with one sheet on two branches, and the driver installed."""
    (tmp_path / "home").mkdir()
    (tmp_path / "home/.gitconfig").write_text("[user]\nname = Ada\nemail = ada@example.org\n", "utf-8")
    monkeypatch.setenv("HOME", str(tmp_path / "home"))
    monkeypatch.setenv("GIT_CONFIG_NOSYSTEM", "1")
    monkeypatch.setenv("PYTHONPATH", str(TOP))
    top = tmp_path / "chip"
    (top / SHEET).parent.mkdir(parents=True)
    git(top, "init", "-q", "-b", "main")
    program = shlex.join([sys.executable, str(TOP / "tests/compare/driver.py")])
    git(top, "config", "merge.value.driver", f"{program} %O %A %B %P")
    (top / ".gitattributes").write_text("*.toml merge=value\n", "utf-8")
    commit(top, BASE)
    git(top, "branch", "side")
    return top


def commit(top: Path, text: str, name: str = SHEET) -> None:
    (top / name).write_text(text, "utf-8")
    git(top, "add", ".")
    git(top, "commit", "-q", "-m", "step")


def sides(top: Path, ours: str, theirs: str) -> None:
    commit(top, ours)
    git(top, "checkout", "-q", "side")
    commit(top, theirs)
    git(top, "checkout", "-q", "main")


def test_neighbouring_values_merge_where_git_alone_would_stop(repository: Path) -> None:
    ours = changed(('"4 uA"', '"5 uA"'), ("\n[[waiver]]", MORE + "\n[[waiver]]"))
    theirs = changed(('"20 um"', '"21 um"'), ("\n[[waiver]]", MORE.replace("bench", "bench 2") + "\n[[waiver]]"))
    sides(repository, ours, theirs)
    git(repository, "-c", "merge.value.driver=false", "merge", "-q", "side", check=False)
    assert git(repository, "ls-files", "-u"), "without the driver this is a conflict"
    git(repository, "merge", "--abort")

    git(repository, "merge", "-q", "-m", "both", "side")
    data = tomllib.loads((repository / SHEET).read_text("utf-8"))
    assert (data["choose"]["bias_current"], data["choose"]["width"]) == ("5 uA", "21 um")
    assert [one["reference"] for one in data["evidence"]] == ["run 1", "bench", "bench 2"]
    assert "# by hand" in (repository / SHEET).read_text("utf-8")
    assert git(repository, "status", "--porcelain") == ""


def test_a_true_collision_stops_the_merge_with_a_sheet_that_can_be_read(repository: Path) -> None:
    sides(repository, changed(('"4 uA"', '"5 uA"')), changed(('"4 uA"', '"6 uA"'), ('"20 um"', '"21 um"')))
    git(repository, "merge", "-q", "side", check=False)
    assert git(repository, "status", "--porcelain") == f"UU {SHEET}"
    sheet, problems = parse_sheet((repository / SHEET).read_bytes(), "buffer", SHEET)
    assert problems == []
    assert sheet is not None
    assert [(one.key, one.ours, one.theirs) for one in sheet.collisions] == [
        ("choose.bias_current", '"5 uA"', '"6 uA"')
    ]
    assert sheet.choose["width"].number == 21e-6


def test_cherry_picks_rebases_and_stashes_go_the_same_way(repository: Path) -> None:
    sides(repository, changed(('"4 uA"', '"5 uA"')), changed(('"20 um"', '"21 um"')))
    git(repository, "cherry-pick", "side")
    git(repository, "checkout", "-q", "side")
    (repository / SHEET).write_text(changed(('"20 um"', '"21 um"'), ('"0.5 um"', '"0.6 um"')), "utf-8")
    git(repository, "stash", "-q")
    git(repository, "rebase", "-q", "main")
    git(repository, "stash", "pop", "-q")
    data = tomllib.loads((repository / SHEET).read_text("utf-8"))
    assert data["choose"] == {"bias_current": "5 uA", "width": "21 um", "length": "0.6 um"}


def test_a_criss_cross_merge(repository: Path) -> None:
    """Here git merges the bases first, with the driver too, and what it gets may hold a collision."""
    sides(repository, changed(('"4 uA"', '"5 uA"')), changed(('"4 uA"', '"6 uA"')))
    ends = git(repository, "rev-parse", "main", "side").splitlines()
    for branch, other, current in (("main", ends[1], "5"), ("side", ends[0], "6")):
        git(repository, "checkout", "-q", branch)
        git(repository, "merge", "-q", other, check=False)
        commit(repository, changed(('"4 uA"', f'"{current} uA"')))
    git(repository, "checkout", "-q", "main")
    git(repository, "merge", "-q", "-m", "cross", "side", check=False)
    text = (repository / SHEET).read_text("utf-8")
    sheet, problems = parse_sheet(text, "buffer", SHEET)
    assert problems == []
    assert sheet is not None
    assert [(one.key, one.ours, one.theirs) for one in sheet.collisions] == [
        ("choose.bias_current", '"5 uA"', '"6 uA"')
    ]


def test_a_file_that_both_added_and_one_that_is_broken(repository: Path) -> None:
    other = "p/sheets/new.toml"
    commit(repository, BASE, other)
    commit(repository, BASE + "broken ours\n")
    git(repository, "checkout", "-q", "side")
    commit(repository, changed(('"4 uA"', '"6 uA"')), other)
    commit(repository, BASE + "# theirs\n")
    git(repository, "checkout", "-q", "main")
    git(repository, "merge", "-q", "side", check=False)
    sheet, _ = parse_sheet((repository / other).read_bytes(), "new", other)
    assert sheet is not None
    assert [one.key for one in sheet.collisions] == ["choose.bias_current"]
    marked = conflict.split((repository / SHEET).read_text("utf-8"))
    assert marked is not None
    assert (marked.ours, marked.theirs) == (BASE + "broken ours\n", BASE + "# theirs\n")
