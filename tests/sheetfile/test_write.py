"""Files are written whole or not at all, over nothing but what was read, and never outside the project."""

import os
import stat
from pathlib import Path

import pytest

from tests.sheetfile.texts import SHEET, line_of, written
from worksheet.sheetfile import source
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.paths import inside
from worksheet.sheetfile.read import read_sheet
from worksheet.sheetfile.write import ChangedOnDiskError, create, remove, rename_sheet, save

NEW = SHEET.replace("20 um", "30 um")


def others(folder: Path, *known: str) -> list[str]:
    """What lies in a folder besides the known names: nothing half-written may be left."""
    return sorted({path.name for path in folder.iterdir()} - set(known))


@pytest.mark.parametrize("mode", [0o600, 0o644, 0o664, 0o755])
def test_save_replaces_the_text_and_keeps_the_mode(tmp_path: Path, mode: int) -> None:
    path = written(tmp_path, "a.toml", SHEET)
    path.chmod(mode)
    assert save(path, read=SHEET.encode(), new=NEW, root=tmp_path) == NEW.encode()
    assert path.read_bytes() == NEW.encode()
    assert stat.S_IMODE(path.stat().st_mode) == mode
    assert others(tmp_path, "a.toml") == []


def test_save_chains_on_what_it_returns(tmp_path: Path) -> None:
    path = written(tmp_path, "a.toml", SHEET)
    after = save(path, read=SHEET.encode(), new=NEW, root=tmp_path)
    assert save(path, read=after, new=SHEET, root=tmp_path) == SHEET.encode()


def test_save_of_the_same_text_leaves_the_file_alone(tmp_path: Path) -> None:
    path = written(tmp_path, "a.toml", SHEET)
    before = path.stat()
    save(path, read=SHEET.encode(), new=SHEET, root=tmp_path)
    assert (path.stat().st_ino, path.stat().st_mtime_ns) == (before.st_ino, before.st_mtime_ns)


@pytest.mark.parametrize("now", ["", SHEET + "# a colleague's line\n"])
def test_save_refuses_a_file_that_changed(tmp_path: Path, now: str) -> None:
    path = written(tmp_path, "a.toml", now)
    with pytest.raises(ChangedOnDiskError, match=r"a\.toml was changed"):
        save(path, read=SHEET.encode(), new=NEW, root=tmp_path)
    assert path.read_text() == now
    assert others(tmp_path, "a.toml") == []


def test_save_refuses_a_file_that_is_gone(tmp_path: Path) -> None:
    with pytest.raises(ChangedOnDiskError):
        save(tmp_path / "a.toml", read=SHEET.encode(), new=NEW, root=tmp_path)
    assert others(tmp_path) == []


def test_a_failure_halfway_leaves_the_old_text(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = written(tmp_path, "a.toml", SHEET)

    def full(_descriptor: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(WriteRefusedError, match="no space left"):
        save(path, read=SHEET.encode(), new=NEW, root=tmp_path)
    with pytest.raises(WriteRefusedError, match="no space left"):
        create(tmp_path / "b.toml", NEW, root=tmp_path)
    assert path.read_text() == SHEET
    assert others(tmp_path, "a.toml") == []


def test_a_reader_sees_the_old_text_or_the_new_one(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = written(tmp_path, "a.toml", SHEET)
    seen = []
    flush = os.fsync

    def watch(descriptor: int) -> None:
        seen.append(path.read_text())
        flush(descriptor)

    monkeypatch.setattr(os, "fsync", watch)
    save(path, read=SHEET.encode(), new=NEW, root=tmp_path)
    # Flushed before it is put in its place, and the folder after.
    assert seen == [SHEET, NEW]


def test_a_text_that_no_reader_would_take_is_not_written(tmp_path: Path) -> None:
    path = written(tmp_path, "a.toml", SHEET)
    for new, words in (("#" * (source.LARGEST + 1), "bytes"), ("\ud800", "UTF-8")):
        with pytest.raises(WriteRefusedError, match=words):
            save(path, read=SHEET.encode(), new=new, root=tmp_path)
    assert path.read_text() == SHEET


def test_links_are_followed_inside_the_project_alone(tmp_path: Path) -> None:
    project, elsewhere = tmp_path / "project", tmp_path / "elsewhere"
    for folder in (project / "sheets", project / "shared", elsewhere):
        folder.mkdir(parents=True)
    out = written(elsewhere, "out.toml", SHEET)
    shared = written(project / "shared", "shared.toml", SHEET)
    (project / "sheets" / "out.toml").symlink_to(out)
    (project / "sheets" / "in.toml").symlink_to(Path("../shared/shared.toml"))
    (project / "linked").symlink_to(elsewhere)
    with pytest.raises(WriteRefusedError, match="leads out"):
        save(project / "sheets" / "out.toml", read=SHEET.encode(), new=NEW, root=project)
    with pytest.raises(WriteRefusedError, match="leads out"):
        create(project / "linked" / "new.toml", NEW, root=project)
    assert out.read_text() == SHEET
    assert others(elsewhere, "out.toml") == []
    save(project / "sheets" / "in.toml", read=SHEET.encode(), new=NEW, root=project)
    assert shared.read_text() == NEW
    assert (project / "sheets" / "in.toml").is_symlink()


def test_inside_follows_links_and_survives_loops(tmp_path: Path) -> None:
    (tmp_path / "loop").symlink_to(tmp_path / "loop")
    assert inside(tmp_path, tmp_path / "sheets" / "a.toml")
    assert not inside(tmp_path, tmp_path / ".." / "a.toml")
    assert not inside(tmp_path / "a", tmp_path / "ab")
    with pytest.raises(WriteRefusedError):
        save(tmp_path / "loop", read=b"", new=NEW, root=tmp_path)


def test_create_makes_the_folder_and_never_overwrites(tmp_path: Path) -> None:
    path = tmp_path / "sheets" / "a.toml"
    assert create(path, SHEET, root=tmp_path) == SHEET.encode()
    assert path.read_text() == SHEET
    umask = os.umask(0)
    os.umask(umask)
    assert stat.S_IMODE(path.stat().st_mode) == 0o666 & ~umask
    with pytest.raises(WriteRefusedError, match="exists already"):
        create(path, NEW, root=tmp_path)
    assert path.read_text() == SHEET
    assert others(path.parent, "a.toml") == []


def test_create_on_a_disk_without_second_names(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(1, "Operation not permitted")

    monkeypatch.setattr(os, "link", refuse)
    path = tmp_path / "a.toml"
    create(path, SHEET, root=tmp_path)
    assert path.read_text() == SHEET
    with pytest.raises(WriteRefusedError, match="exists already"):
        create(path, NEW, root=tmp_path)
    assert path.read_text() == SHEET
    assert others(tmp_path, "a.toml") == []


def test_remove_takes_only_what_was_read(tmp_path: Path) -> None:
    path = written(tmp_path, "a.toml", SHEET)
    with pytest.raises(ChangedOnDiskError):
        remove(path, read=NEW.encode(), root=tmp_path)
    assert path.exists()
    remove(path, read=SHEET.encode(), root=tmp_path)
    assert others(tmp_path) == []


def test_rename_moves_the_text_and_never_onto_another_sheet(tmp_path: Path) -> None:
    path = written(tmp_path, "a.toml", SHEET)
    written(tmp_path, "taken.toml", NEW)
    for name, words in (
        ("taken", "exists already"),
        ("min", "function"),
        ("../up", "sheet name"),
        ("class", "sheet name"),
    ):
        with pytest.raises(WriteRefusedError, match=words):
            rename_sheet(path, name, read=SHEET.encode(), root=tmp_path)
    with pytest.raises(ChangedOnDiskError):
        rename_sheet(path, "b", read=NEW.encode(), root=tmp_path)
    assert rename_sheet(path, "b", read=SHEET.encode(), root=tmp_path) == tmp_path / "b.toml"
    assert others(tmp_path, "b.toml", "taken.toml") == []
    sheet, problems = read_sheet(tmp_path / "b.toml", shown="sheets/b.toml")
    assert problems == []
    assert sheet is not None
    assert sheet.name == "b"


def test_what_is_no_ordinary_file_is_a_problem(tmp_path: Path) -> None:
    (tmp_path / "folder.toml").mkdir()
    os.mkfifo(tmp_path / "pipe.toml")
    (tmp_path / "dangling.toml").symlink_to(tmp_path / "nowhere")
    written(tmp_path, "large.toml", b"#" * (source.LARGEST + 1))
    words = {
        "folder": "a folder",
        "pipe": "a pipe",
        "dangling": "no such file",
        "large": "at most 2000000",
        "gone": "no such",
    }
    for name, expected in words.items():
        sheet, problems = read_sheet(tmp_path / f"{name}.toml", shown=f"sheets/{name}.toml")
        assert sheet is None
        (problem,) = problems
        assert problem.file == f"sheets/{name}.toml"
        assert expected in problem.message


def test_bytes_that_are_no_text_are_a_problem_with_a_line(tmp_path: Path) -> None:
    for content, line, words in (
        (SHEET.encode().replace(b"R. Osei", b"R. \xff"), 7, "0xff"),
        (SHEET.encode("utf-16"), 1, "UTF-16"),
        (SHEET.encode("latin-1"), line_of(SHEET, "°C"), "0xb0"),
    ):
        sheet, problems = read_sheet(written(tmp_path, "a.toml", content), shown="a.toml")
        assert sheet is None
        assert (problems[0].line, words in problems[0].message) == (line, True)
