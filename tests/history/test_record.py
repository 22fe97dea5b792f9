"""A revision carries the project's own files and nothing else, and leaves everything else as it was."""

import os
from pathlib import Path

import pytest

from tests.history.repositories import (
    SHEET,
    found,
    git,
    leftovers,
    make_project,
    make_repository,
    save,
    try_to_save,
)
from worksheet.history import record, repository
from worksheet.history.outcome import LeftOut, Person, Refused, Why
from worksheet.history.own import own_files

ALL = [
    "biasbook.toml",
    "evidence/bench/gain.csv",
    "process/example_180.toml",
    "sheets/buffer.toml",
    "sheets/driver.toml",
]


def committed(folder: Path, revision: str = "HEAD") -> list[str]:
    return git(folder, "show", "--name-only", "--no-renames", "--format=", revision).splitlines()


def test_a_repository_is_made_inside_a_project_that_none_encloses(tmp_path: Path) -> None:
    project = make_project(tmp_path / "project")
    (project / "loose.txt").write_text("mine", "utf-8")
    assert repository.find(project) is None
    made = repository.create(project)
    assert isinstance(made, repository.Repository)
    assert (made.prefix, made.top) == ("", project)
    first = save(project, "begin", "bandwidth 5.9 MHz, met")
    assert list(first.paths) == ALL
    assert git(project, "ls-tree", "-r", "--name-only", "HEAD").splitlines() == ALL
    assert git(project, "status", "--porcelain") == "?? loose.txt"
    assert git(project, "log", "--format=%an <%ae>|%B") == (
        "Ada Beispiel <ada@example.org>|begin\n\nbandwidth 5.9 MHz, met"
    )
    assert git(project, "fsck", "--strict") == ""
    assert not list((project / ".git").glob("hooks/*"))
    assert repository.create(project) == found(project), "asked again, it is the same one"


def test_what_is_staged_or_loose_stays_as_it_was(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "blocks/front end")
    save(project, "begin")
    for name in ("staged", "loose", "both", "removed"):
        (top / name).write_text("1", "utf-8")
    git(top, "add", "loose", "both", "removed")
    git(top, "commit", "-q", "-m", "foreign")
    (top / "staged").write_text("2", "utf-8")
    (top / "both").write_text("2", "utf-8")
    git(top, "add", "staged", "both")
    (top / "both").write_text("3", "utf-8")
    (top / "loose").write_text("2", "utf-8")
    git(top, "rm", "-q", "--cached", "removed")
    (top / "new").write_text("n", "utf-8")
    git(top, "add", "-N", "new")
    (project / "sheets/notes.txt").write_text("not ours", "utf-8")
    git(top, "add", "--", "blocks/front end/sheets/notes.txt")
    staged, loose = git(top, "diff", "--cached", "--raw", "--abbrev=40"), git(top, "diff", "--raw", "--abbrev=40")
    untracked = git(top, "status", "--porcelain")

    (project / "sheets/buffer.toml").write_text(SHEET.format(5), "utf-8")
    (project / "sheets/driver.toml").unlink()
    (project / "sheets/mirror.toml").write_text(SHEET.format(1), "utf-8")
    made = save(project, "more current")

    assert list(made.paths) == ["sheets/buffer.toml", "sheets/driver.toml", "sheets/mirror.toml"]
    assert committed(top) == [f"blocks/front end/{path}" for path in made.paths]
    assert git(top, "rev-parse", "HEAD") == made.revision
    assert git(top, "diff", "--cached", "--raw", "--abbrev=40") == staged
    assert git(top, "diff", "--raw", "--abbrev=40") == loose
    assert git(top, "status", "--porcelain") == untracked
    assert git(top, "fsck", "--strict") == ""
    assert leftovers(top) == []
    assert git(top, "reflog", "-1", "--format=%gs") == "record: more current"


def test_nothing_changed_is_said_and_nothing_written(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    save(project, "begin")
    index = (tmp_path / "chip/.git/index").read_bytes()
    os.utime(project / "sheets/buffer.toml", (1, 1))
    assert try_to_save(project, "again") == record.Unchanged()
    assert (tmp_path / "chip/.git/index").read_bytes() == index
    assert git(project, "rev-list", "--count", "HEAD") == "2"
    assert record.unrecorded(found(project), own_files(project)) == ((), ())
    (project / "sheets/buffer.toml").write_text(SHEET.format(5), "utf-8")
    assert record.unrecorded(found(project), own_files(project)) == (("sheets/buffer.toml",), ())


def test_a_staged_version_of_a_sheet_gives_way_to_the_sheet_as_it_stands(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    save(project, "begin")
    (project / "sheets/buffer.toml").write_text(SHEET.format(5), "utf-8")
    git(project, "add", "sheets/buffer.toml")
    (project / "sheets/buffer.toml").write_text(SHEET.format(6), "utf-8")
    save(project, "six")
    assert git(project, "show", "HEAD:p/sheets/buffer.toml") == SHEET.format(6).rstrip("\n")
    assert git(project, "status", "--porcelain") == ""


def test_a_folder_may_take_the_place_of_a_file_and_a_file_that_of_a_folder(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    (project / "evidence/run").write_text("1", "utf-8")
    save(project, "begin")
    (project / "evidence/run").unlink()
    (project / "evidence/run").mkdir()
    (project / "evidence/run/log").write_text("2", "utf-8")
    (project / "evidence/bench/gain.csv").unlink()
    (project / "evidence/bench").rmdir()
    (project / "evidence/bench").write_text("3", "utf-8")
    save(project, "moved about")
    listed = git(project, "ls-tree", "-r", "--name-only", "HEAD", "evidence").splitlines()
    assert listed == ["evidence/bench", "evidence/run/log"]
    assert git(project, "status", "--porcelain") == ""
    assert git(project, "fsck", "--strict") == ""


def test_strange_names_and_bytes_come_through(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / 'spaß "dir"')
    names = ["tab\there", "line\nbreak", 'quo"te', "back\\slash", "*?[a]", ":(top)x", "-n", os.fsdecode(b"latin-\xe9")]
    for name in names:
        (project / "evidence" / name).write_bytes(b"\0\r\n\xff" + os.fsencode(name))
    made = save(project, "-n: \N{GREEK SMALL LETTER MU} and \udce9")
    assert {f"evidence/{name}" for name in names} <= set(made.paths)
    assert git(project, "status", "--porcelain") == ""
    assert git(project, "log", "-1", "--format=%s") == "-n: μ and ?"


def test_a_mode_is_kept(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    (project / "evidence/run.sh").write_text("#!/bin/sh\n", "utf-8")
    (project / "evidence/run.sh").chmod(0o755)
    save(project, "begin")
    assert git(project, "ls-tree", "HEAD", "evidence/run.sh").startswith("100755")
    (project / "evidence/run.sh").write_text("#!/bin/sh\ntrue\n", "utf-8")
    save(project, "more")
    assert git(project, "ls-tree", "HEAD", "evidence/run.sh").startswith("100755")


def test_only_ordinary_files_of_the_project_itself(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    outside = tmp_path / "outside"
    outside.mkdir()
    (outside / "secret").write_text("secret", "utf-8")
    (project / "evidence/link").symlink_to(outside / "secret")
    (project / "evidence/away").symlink_to(outside)
    make_repository(project / "evidence/nested")
    os.mkfifo(project / "evidence/pipe")
    (project / "evidence/.hidden").write_text("h", "utf-8")
    (project / "sheets/.#buffer.toml").write_text("lock of an editor", "utf-8")
    (project / "sheets/deeper").mkdir()
    (project / "sheets/deeper/a.toml").write_text("", "utf-8")
    assert list(own_files(project)) == ALL
    asked = [
        "evidence/link", "evidence/away/secret", "evidence/nested/README", "evidence/pipe", "evidence/.hidden",
        "../README", "evidence/../../README", "sheets/deeper/a.toml", "evidence/none", "/etc/passwd",
    ]  # fmt: skip
    made = record.record(found(project), [*asked, "sheets/buffer.toml"], note="x")
    assert isinstance(made, record.Recorded)
    assert made.paths == ("sheets/buffer.toml",)
    reasons = {one.path: one.reason for one in made.left_out}
    assert set(reasons) == set(asked)
    assert reasons["evidence/link"] == "it is a symbolic link"
    assert reasons["evidence/away/secret"] == "it lies behind a symbolic link"
    assert reasons["evidence/nested/README"] == "it lies in a repository of its own"
    assert reasons["evidence/pipe"] == "it is no ordinary file"
    assert committed(project) == ["p/sheets/buffer.toml"]


def test_what_git_is_told_to_ignore_or_to_leave_alone_is_left_out_and_named(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    save(project, "begin")
    (project / "evidence/raw.dat").write_text("raw", "utf-8")
    (project / ".gitignore").write_text("*.dat\nbuffer.toml\n", "utf-8")
    (project / "sheets/buffer.toml").write_text(SHEET.format(5), "utf-8")
    (project / "sheets/driver.toml").write_text(SHEET.format(5), "utf-8")
    git(project, "update-index", "--assume-unchanged", "sheets/driver.toml")
    git(project, "update-index", "--skip-worktree", "biasbook.toml")
    (project / "biasbook.toml").unlink()
    made = save(project, "x")
    assert made.paths == ("sheets/buffer.toml",), "a file that git holds is not ignored"
    assert {one.path: one.reason.split(" (")[0] for one in made.left_out} == {
        "evidence/raw.dat": "git is told to ignore it",
        "sheets/driver.toml": "git is told to leave it alone",
        "biasbook.toml": "git is told to leave it alone",
    }


@pytest.mark.parametrize("told", ["* text=auto", "*.toml text", "*.toml eol=crlf", "autocrlf"])
def test_line_ends_are_stored_as_git_would_store_them(tmp_path: Path, told: str) -> None:
    top = make_repository(tmp_path / "chip")
    if told == "autocrlf":
        git(top, "config", "core.autocrlf", "true")
    else:
        (top / ".gitattributes").write_text(f"{told}\n", "utf-8")
        git(top, "add", ".gitattributes")
    project = make_project(top / "p")
    (project / "sheets/buffer.toml").write_bytes(SHEET.format(4).replace("\n", "\r\n").encode())
    (project / "evidence/bench/gain.csv").write_bytes(b"\0\r\n")
    save(project, "begin")
    assert git(project, "show", "HEAD:p/sheets/buffer.toml") == SHEET.format(4).rstrip("\n")
    assert git(project, "ls-files", "-s", "evidence").split()[1] == git(
        project, "hash-object", "--no-filters", "evidence/bench/gain.csv"
    )
    assert git(project, "status", "--porcelain") == ("" if told == "autocrlf" else "A  .gitattributes")
    assert try_to_save(project, "again") == record.Unchanged()


def test_without_being_told_line_ends_stay(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    (project / "sheets/buffer.toml").write_bytes(b"a = 1\r\n")
    save(project, "begin")
    assert git(project, "cat-file", "-s", "HEAD:p/sheets/buffer.toml") == "7"
    (project.parent / ".gitattributes").write_text("* text=auto\n", "utf-8")
    (project / "sheets/buffer.toml").write_bytes(b"a = 2\r\n")
    save(project, "git leaves returns that it holds already")
    assert git(project, "cat-file", "-s", "HEAD:p/sheets/buffer.toml") == "7"
    assert git(project, "status", "--porcelain") == "?? .gitattributes"


def test_a_file_that_a_program_would_convert_is_left_out(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    (project.parent / ".gitattributes").write_text(
        "*.raw filter=large\n*.id ident\n*.u16 working-tree-encoding=UTF-16\n", "utf-8"
    )
    for name in ("a.raw", "a.id", "a.u16"):
        (project / "evidence" / name).write_text("x", "utf-8")
    made = save(project, "begin")
    assert {one.path: one.reason.partition("(")[2].partition(")")[0] for one in made.left_out} == {
        "evidence/a.raw": "filter",
        "evidence/a.id": "ident",
        "evidence/a.u16": "working-tree-encoding",
    }


def test_a_note_of_several_lines_and_an_empty_one(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    empty = try_to_save(project, " \n")
    assert isinstance(empty, Refused)
    save(project, "first line\nsecond line\n", "digest\0 here")
    assert git(project, "log", "-1", "--format=%B") == "first line\n\nsecond line\n\ndigest here"


def test_a_missing_identity_is_asked_for_and_one_is_taken(tmp_path: Path, home: Path) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    (home / ".gitconfig").unlink()
    before = git(top, "rev-parse", "HEAD")
    refused = try_to_save(project, "x")
    assert isinstance(refused, Refused)
    assert refused.why is Why.NO_IDENTITY
    assert "user.email" in refused.message
    assert git(top, "rev-parse", "HEAD") == before
    assert leftovers(top) == []
    for person in (Person("", "a@example.org"), Person("A", "<a>"), Person("A\nB", "a@example.org")):
        wrong = try_to_save(project, "x", person=person)
        assert isinstance(wrong, Refused)
        assert wrong.why is Why.NO_IDENTITY
    made = try_to_save(project, "x", person=Person("Grace Muster", "grace@example.org"))
    assert isinstance(made, record.Recorded)
    assert git(top, "log", "-1", "--format=%an %ae %cn %ce") == (
        "Grace Muster grace@example.org Grace Muster grace@example.org"
    )


def test_an_index_that_another_program_holds_is_waited_for_and_then_said(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    lock = tmp_path / "chip/.git/index.lock"
    lock.write_bytes(b"")
    refused = try_to_save(project, "x")
    assert isinstance(refused, Refused)
    assert refused.why is Why.LOCKED
    assert str(lock) in refused.message
    assert lock.read_bytes() == b"", "a lock that is not ours stays"
    lock.unlink()
    assert leftovers(tmp_path / "chip") == []
    save(project, "x")


def test_a_branch_that_moves_meanwhile_is_built_upon(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    original = repository.Repository.move_head
    moved: list[str] = []

    def late(self: repository.Repository, new: str, *arguments: object, **others: object) -> None:
        if not moved:
            tree = git(top, "rev-parse", "HEAD^{tree}")
            commit = git(top, "commit-tree", tree, "-p", "HEAD", "-m", "from elsewhere")
            git(top, "update-ref", "HEAD", commit)
            moved.append(commit)
        original(self, new, *arguments, **others)  # type: ignore[arg-type]

    monkeypatch.setattr(repository.Repository, "move_head", late)
    made = save(project, "x")
    assert git(top, "rev-parse", f"{made.revision}^") == moved[0]
    assert git(top, "status", "--porcelain") == ""


def test_a_branch_that_cannot_be_moved_leaves_everything_as_it_was(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    (top / "staged").write_text("s", "utf-8")
    git(top, "add", "staged")
    index, head = (top / ".git/index").read_bytes(), git(top, "rev-parse", "HEAD")
    lock = top / ".git/refs/heads/main.lock"
    lock.write_bytes(b"")
    refused = try_to_save(project, "x")
    assert isinstance(refused, Refused)
    assert refused.why is Why.FAILED
    assert (top / ".git/index").read_bytes() == index
    assert git(top, "rev-parse", "HEAD") == head
    lock.unlink()
    assert leftovers(top) == []


def test_the_reasons_are_sorted_and_whole(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    made = record.record(found(project), ["sheets/buffer.toml", "README"], ["LICENSE"], note="x")
    assert isinstance(made, record.Recorded)
    reason = "it is none of the project's own files"
    assert made.left_out == (LeftOut("LICENSE", reason), LeftOut("README", reason))
