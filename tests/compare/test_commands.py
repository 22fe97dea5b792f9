"""record, history and compare through the command line: what moved, what that did, and plain git beside them."""

from __future__ import annotations

import json
import subprocess
from pathlib import Path
from typing import Any

import pytest

from tests.support import run


@pytest.fixture
def project(tmp_path: Path) -> Path:
    """A new project with an identity of its own."""
    folder = tmp_path / "book"
    assert run("start", str(folder)).status == 0
    assert run("record", str(folder), "-m", "first", "--name", "A. Designer", "--email", "a@example.org").status == 0
    return folder


def compare(folder: Path, *more: str) -> dict[str, Any]:
    done = run("compare", str(folder), *more, "--json")
    document: dict[str, Any] = json.loads(done.out)
    assert done.status == (0 if document["same"] else 1)
    return document


def edit(path: Path, old: str, new: str) -> None:
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new), encoding="utf-8")


def test_files_as_recorded_are_the_same(project: Path) -> None:
    assert compare(project)["same"]


def test_a_changed_choice_and_what_it_did(project: Path) -> None:
    edit(project / "sheets/first_block.toml", 'bias_current = "4 uA"', 'bias_current = "5 uA"')
    (sheet,) = compare(project)["sheets"]
    assert sheet["status"] == "changed"
    assert sheet["inputs"] == [{"key": "choose.bias_current", "old": 4e-6, "new": 5e-6, "unit": "A"}]
    power = next(r for r in sheet["results"] if r["metric"] == "power")
    assert power["old"] == pytest.approx(4e-6 * 1.8)
    assert power["new"] == pytest.approx(5e-6 * 1.8)
    bandwidth = next(r for r in sheet["results"] if r["metric"] == "bandwidth")
    assert (bandwidth["old_verdict"], bandwidth["new_verdict"]) == ("met", "met")


def test_a_sheet_is_affected_through_the_process(project: Path) -> None:
    edit(project / "process/my_process.toml", "kappa = 0.7", "kappa = 0.68")
    document = compare(project)
    assert {m["key"] for m in document["process"]} == {"device.nfet.kappa", "device.pfet.kappa"}
    (sheet,) = document["sheets"]
    assert sheet["status"] == "affected"
    assert sheet["inputs"] == []
    gain = next(r for r in sheet["results"] if r["metric"] == "dc_gain")
    assert (gain["old"], gain["new"]) == (pytest.approx(0.7), pytest.approx(0.68))


def test_added_and_removed_sheets_between_two_revisions(project: Path) -> None:
    sheet = project / "sheets/first_block.toml"
    sheet.rename(project / "sheets/second_block.toml")
    made = run("record", str(project), "-m", "renamed", "--name", "A. Designer", "--email", "a@example.org")
    assert made.status == 0
    statuses = {s["sheet"]: s["status"] for s in compare(project, "HEAD~1", "HEAD")["sheets"]}
    assert statuses == {"first_block": "removed", "second_block": "added"}


def test_history_says_what_plain_git_says(project: Path) -> None:
    edit(project / "sheets/first_block.toml", 'width = "20 um"', 'width = "30 um"')
    run("record", str(project), "-m", "wider", "--name", "B. Designer", "--email", "b@example.org")
    revisions = json.loads(run("history", str(project), "--json").out)["revisions"]
    log = subprocess.run(
        ["git", "-C", str(project), "log", "--format=%H %an %s"], capture_output=True, text=True, check=True
    ).stdout.splitlines()
    assert [f"{r['revision']} {r['by']} {r['note']}" for r in revisions] == log
    assert [r["sheets"] for r in revisions] == [["first_block"], ["first_block"]]
    body = subprocess.run(
        ["git", "-C", str(project), "log", "-1", "--format=%b"], capture_output=True, text=True, check=True
    ).stdout
    assert "choose.width: 20 µm -> 30 µm" in body


def test_what_cannot_be_asked_is_bad_input(project: Path, tmp_path: Path) -> None:
    assert run("compare", str(project), "no_such_revision").status == 2
    done = run("history", str(tmp_path), "--json")
    assert done.status == 2
    assert "no git repository" in json.loads(done.out)["problems"][0]["message"]
    assert run("record", str(tmp_path / "nowhere"), "-m", "x").status == 2
