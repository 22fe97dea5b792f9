"""`biasbook handoff`: what it writes, what it leaves alone, and how it says what is wrong."""

from __future__ import annotations

import csv
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.books import FOLLOWER, replaced, write
from tests.support import run
from worksheet.sheetfile import write as sheetfile_write

FILES = {"handoff-buffer.html", "handoff-buffer.md", "handoff-buffer.csv", "handoff-buffer-sizes.txt"}
RECORD = "handoff-record.json"


@pytest.fixture
def book(tmp_path: Path) -> Path:
    return write(tmp_path / "book")


def hand(book: Path, into: Path, *more: str) -> tuple[int, str, str]:
    """The hand-off of one small block."""
    return run("handoff", str(book), "-o", str(into), "--sheet", "buffer", *more)


def test_a_block_becomes_a_page_markdown_a_table_and_lines(book: Path, tmp_path: Path) -> None:
    into = tmp_path / "deep" / "out"
    status, out, err = hand(book, into)
    assert (status, err) == (0, "")
    assert {path.name for path in into.iterdir()} == {*FILES, RECORD}
    assert set(out.splitlines()) == {str(into / name) for name in FILES}
    assert set(json.loads((into / RECORD).read_text("utf-8"))["files"]) == FILES
    assert (into / "handoff-buffer.html").read_text("utf-8").startswith("<!DOCTYPE html>")
    assert (into / "handoff-buffer.md").read_text("utf-8").startswith("# Lamp buffer (buffer)")
    assert "buffer_main_width = 2e-05" in (into / "handoff-buffer-sizes.txt").read_text("utf-8").splitlines()
    with (into / "handoff-buffer.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    (limit,) = [row for row in rows if row["row"] == "bandwidth" and row["quantity"] == "wanted min"]
    assert (float(limit["value"]), limit["unit"], limit["text"]) == (5e6, "Hz", "≥ 5 MHz")


def test_the_same_project_gives_the_same_bytes(book: Path, tmp_path: Path) -> None:
    for name in ("first", "second"):
        assert hand(book, tmp_path / name)[0] == 0
    for name in FILES:
        assert (tmp_path / "first" / name).read_bytes() == (tmp_path / "second" / name).read_bytes(), name


def test_nothing_is_written_but_in_the_folder(book: Path, tmp_path: Path) -> None:
    before = {path: path.read_bytes() for path in book.rglob("*") if path.is_file()}
    assert hand(book, tmp_path / "out")[0] == 0
    assert {path: path.read_bytes() for path in book.rglob("*") if path.is_file()} == before
    assert {path.name for path in tmp_path.iterdir()} == {"book", "out"}


def test_a_page_of_ours_is_written_anew(book: Path, tmp_path: Path) -> None:
    into = tmp_path / "out"
    assert hand(book, into)[0] == 0
    write(book, follower=replaced(FOLLOWER, 'title = "Lamp buffer"', 'title = "Mast buffer"'))
    assert hand(book, into)[0] == 0
    assert (into / "handoff-buffer.md").read_text("utf-8").startswith("# Mast buffer")


def test_a_file_that_somebody_changed_stays_and_nothing_else_is_written(book: Path, tmp_path: Path) -> None:
    into = tmp_path / "out"
    assert hand(book, into)[0] == 0
    page = into / "handoff-buffer.md"
    page.write_text(page.read_text("utf-8") + "My own remark.\n", encoding="utf-8")
    before = {path.name: path.read_bytes() for path in into.iterdir()}
    write(book, follower=replaced(FOLLOWER, 'title = "Lamp buffer"', 'title = "Mast buffer"'))
    status, out, err = hand(book, into)
    assert (status, out) == (2, "")
    assert "handoff-buffer.md" in err
    assert "was changed since it was written" in err
    assert {path.name: path.read_bytes() for path in into.iterdir()} == before


@pytest.mark.full
def test_a_hand_off_that_was_cut_off_can_be_made_again(
    book: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    into = tmp_path / "out"
    assert hand(book, into)[0] == 0
    write(book, follower=replaced(FOLLOWER, 'title = "Lamp buffer"', 'title = "Mast buffer"'))
    put = sheetfile_write.put

    def cut_off(path: Path, content: bytes, *, root: Path) -> None:
        if path.suffix == ".csv":
            raise KeyboardInterrupt
        put(path, content, root=root)

    monkeypatch.setattr(sheetfile_write, "put", cut_off)
    assert hand(book, into)[0] == 130
    monkeypatch.undo()
    assert "Mast buffer" in (into / "handoff-buffer.md").read_text("utf-8")
    assert hand(book, into)[0] == 0
    assert "Mast buffer" in (into / "handoff-buffer.html").read_text("utf-8")


def test_a_foreign_file_stays(book: Path, tmp_path: Path) -> None:
    into = tmp_path / "out"
    into.mkdir()
    (into / "handoff-buffer.html").write_text("mine", encoding="utf-8")
    status, _, err = hand(book, into)
    assert status == 2
    assert "no hand-off wrote" in err
    assert [path.name for path in into.iterdir()] == ["handoff-buffer.html"]
    assert (into / "handoff-buffer.html").read_text("utf-8") == "mine"


def test_a_link_is_not_followed_out_of_the_folder(book: Path, tmp_path: Path) -> None:
    into, outside = tmp_path / "out", tmp_path / "outside.html"
    into.mkdir()
    outside.write_text("mine", encoding="utf-8")
    (into / "handoff-buffer.html").symlink_to(outside)
    assert hand(book, into)[0] == 2
    (into / "handoff-buffer.html").unlink()
    (into / "handoff-buffer.html").symlink_to(tmp_path / "nowhere.html")
    assert hand(book, into)[0] == 2
    assert outside.read_text("utf-8") == "mine"
    assert not (tmp_path / "nowhere.html").exists()
    (into / "handoff-buffer.html").unlink()
    (into / RECORD).symlink_to(outside)
    assert hand(book, into)[0] == 2
    assert outside.read_text("utf-8") == "mine"


@pytest.mark.parametrize("content", ["", "[]", "{", '{"schema": 2, "pages": {}, "files": {}}', '{"pages": 3}', "\x00"])
def test_a_record_that_is_none_of_ours_is_bad_input(book: Path, tmp_path: Path, content: str) -> None:
    into = tmp_path / "out"
    into.mkdir()
    (into / RECORD).write_text(content, encoding="utf-8")
    status, out, err = hand(book, into)
    assert (status, out) == (2, "")
    assert RECORD in err
    assert len(err.splitlines()) == 1
    assert (into / RECORD).read_text("utf-8") == content


@pytest.mark.parametrize("output", ["book/biasbook.toml", "book/biasbook.toml/deeper", "bad\x00name"])
def test_a_folder_that_cannot_be_one_is_bad_input(
    book: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, output: str
) -> None:
    monkeypatch.chdir(tmp_path)
    status, out, err = run("handoff", str(book), "-o", output)
    assert (status, out) == (2, "")
    assert len(err.splitlines()) == 1
    assert "Traceback" not in err


def test_bad_arguments_are_bad_input(book: Path, tmp_path: Path) -> None:
    into = str(tmp_path / "out")
    done = run("handoff", str(book), "-o", into, "--sheet", "bufer")
    assert done.status == 2
    assert "did you mean 'buffer'" in done.err
    assert run("handoff", str(book)).status == 2
    assert run("handoff", str(tmp_path), "-o", into).status == 2
    done = run("handoff", str(book), "-o", into, "--since", "HEAD")
    assert done.status == 2
    assert len(done.err.splitlines()) == 1
    assert not (tmp_path / "out").exists()


def test_a_bad_sheet_hides_no_other_and_is_said_on_the_page(book: Path, tmp_path: Path) -> None:
    write(book, follower=replaced(FOLLOWER, 'width = "20 um"', 'width = "20 V"'))
    into = tmp_path / "out"
    done = run("handoff", str(book), "-o", str(into))
    assert done.status == 2
    assert "sheets/buffer.toml" in done.err
    page = (into / "handoff.md").read_text("utf-8")
    assert "Lamp amplifier" in page
    assert "## Problems" in page
    assert "buffer cannot be read" in page.replace("\\", "")
    assert hand(book, tmp_path / "other")[0] == 2
    assert not (tmp_path / "other").exists()


def test_what_moved_since_the_last_hand_off_is_said_with_the_reason(book: Path, tmp_path: Path) -> None:
    into = tmp_path / "out"
    record(book, "first")
    assert hand(book, into)[0] == 0
    assert "first hand-off that is known here" in (into / "handoff-buffer.md").read_text("utf-8")
    write(book, follower=replaced(FOLLOWER, 'bias_current = "4 uA"', 'bias_current = "5 uA"'))
    record(book, "the lamp flickered")
    assert hand(book, into)[0] == 0
    page = (into / "handoff-buffer.md").read_text("utf-8").replace("\\", "")
    moved = page[page.index("## What moved") :]
    assert "| choose.bias_current | 4 µA | 5 µA |" in moved
    assert "the lamp flickered" in moved
    assert "| bandwidth |" in moved


def test_a_hand_off_can_be_held_against_any_revision(book: Path, tmp_path: Path) -> None:
    record(book, "first")
    write(book, follower=replaced(FOLLOWER, 'bias_current = "4 uA"', 'bias_current = "5 uA"'))
    assert hand(book, tmp_path / "out", "--since", "HEAD")[0] == 0
    page = (tmp_path / "out" / "handoff-buffer.md").read_text("utf-8").replace("\\", "")
    assert "| choose.bias_current | 4 µA | 5 µA |" in page
    assert "with changes that are not recorded yet" in page


def record(book: Path, note: str) -> None:
    """A revision of the book."""
    assert run("record", str(book), "-m", note, "--name", "T. Vik", "--email", "t@example.org").status == 0


def test_other_commands_load_no_plotting_library() -> None:
    code = (
        "import sys; from worksheet.cli.main import main; main(['stages']);"
        "sys.exit(any(name.split('.')[0] == 'matplotlib' for name in sys.modules))"
    )
    done = subprocess.run([sys.executable, "-c", code], env={**os.environ}, capture_output=True, check=False)
    assert done.returncode == 0, done.stderr
