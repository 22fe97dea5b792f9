"""Revisions are read as git itself tells them, and what is foreign in them does no harm."""

import subprocess
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.history.repositories import SHEET, found, git, make_project, make_repository, save
from worksheet.history import revisions
from worksheet.history.outcome import Refused, Why
from worksheet.history.own import is_own, own_files


def listed(project: Path, path: str | None = None, **options: int) -> tuple[revisions.Revision, ...]:
    one = revisions.history(found(project), path, limit=options.get("limit"))
    assert isinstance(one, tuple), one
    return one


def read(project: Path, revision: str, *, evidence: bool = False) -> revisions.Files:
    one = revisions.read_files(found(project), revision, evidence=evidence)
    assert isinstance(one, revisions.Files), one
    return one


def change(project: Path, sheet: str, current: int) -> None:
    (project / f"sheets/{sheet}.toml").write_text(SHEET.format(current), "utf-8")


def test_history_agrees_with_git(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "blocks/p")
    monkeypatch.setenv("GIT_AUTHOR_DATE", "2026-11-02T09:31:00+02:00")
    save(project, "begin")
    change(project, "buffer", 5)
    save(project, "five\n\nmore of it", "buffer: bandwidth 5.9 MHz to 7.2 MHz")
    (top / "README").write_text("foreign\n", "utf-8")
    git(top, "commit", "-q", "-a", "-m", "foreign")
    (project / "sheets/readme.txt").write_text("none of ours", "utf-8")
    git(top, "add", ".")
    git(top, "commit", "-q", "-m", "beside")
    change(project, "driver", 6)
    (project / "sheets/buffer.toml").rename(project / "sheets/renamed.toml")
    save(project, "six")

    whole = listed(project)
    assert [one.note for one in whole] == ["six", "five", "begin"]
    told = git(top, "log", "--format=%H %aI %an", "--", *(f"blocks/p/{part}" for part in ("sheets", "biasbook.toml")))
    own = [line for line in told.splitlines() if "beside" not in git(top, "show", "-s", "--format=%s", line[:40])]
    assert [f"{one.revision} {one.dated} {one.by}" for one in whole] == own
    assert whole[1].body == "more of it\n\nbuffer: bandwidth 5.9 MHz to 7.2 MHz"
    assert whole[0].dated == "2026-11-02T09:31:00+02:00"
    assert whole[0].paths == ("sheets/buffer.toml", "sheets/driver.toml", "sheets/renamed.toml")
    assert [one.note for one in listed(project, "sheets/driver.toml")] == ["six", "begin"]
    assert [one.note for one in listed(project, limit=1)] == ["six"]
    assert listed(project, "sheets/none.toml") == ()


def test_a_project_at_the_top_of_a_history_without_merges(tmp_path: Path) -> None:
    """All of it is asked for then, and what is foreign is left out here; a merge brings git's own choice back."""
    project = make_project(make_repository(tmp_path / "p"))
    save(project, "begin")
    (project / ("a" * 40)).write_text("named like a revision\n", "utf-8")
    git(project, "add", "a" * 40)
    git(project, "commit", "-q", "--allow-empty-message", "-m", "")
    change(project, "buffer", 5)
    save(project, "five")
    git(project, "commit", "-q", "--allow-empty", "-m", "nothing")
    whole = listed(project)
    assert [(one.note, one.paths) for one in whole] == [
        ("five", ("sheets/buffer.toml",)),
        ("begin", tuple(own_files(project))),
    ]
    git(project, "checkout", "-q", "-b", "side", "HEAD~3")
    git(project, "commit", "-q", "--allow-empty", "-m", "aside")
    git(project, "merge", "-q", "-m", "both", "main")
    told = git(project, "log", "--format=%H", "--", "biasbook.toml", "process", "sheets", "evidence")
    assert [one.revision for one in listed(project)] == told.split() == [one.revision for one in whole]


def test_merges_tell_what_they_changed_themselves(tmp_path: Path) -> None:
    project = make_project(tmp_path / "p")
    git(project, "init", "-q", "-b", "main")
    (project / "sheets/both.toml").write_text("1\n2\n3\n4\n5\n", "utf-8")
    save(project, "begin")
    git(project, "checkout", "-q", "-b", "side")
    change(project, "buffer", 5)
    (project / "sheets/both.toml").write_text("one\n2\n3\n4\n5\n", "utf-8")
    save(project, "side")
    git(project, "checkout", "-q", "main")
    change(project, "driver", 5)
    (project / "sheets/both.toml").write_text("1\n2\n3\n4\nfive\n", "utf-8")
    save(project, "main")
    git(project, "merge", "-q", "-m", "both", "side")
    git(project, "commit", "-q", "--allow-empty", "-m", "nothing")
    assert {one.note: one.paths for one in listed(project)} == {
        "both": ("sheets/both.toml",),
        "main": ("sheets/both.toml", "sheets/driver.toml"),
        "side": ("sheets/both.toml", "sheets/buffer.toml"),
        "begin": tuple(own_files(project)),
    }
    assert listed(project)[0].note == "both"


def test_foreign_text_does_no_harm(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    project = make_project(tmp_path / "p")
    git(project, "init", "-q", "-b", "main")
    monkeypatch.setenv("GIT_AUTHOR_NAME", "E\x1b[31mvil \u202ename")
    save(project, "note \x1b]0;title\x07 [/x] \u202e", "body\x9b2J\nline\ttab")
    (one,) = listed(project)
    assert one.by == "E\ufffd[31mvil \ufffdname"
    assert one.note == "note \ufffd]0;title\ufffd [/x] \ufffd"
    assert one.body == "body\ufffd2J\nline\ttab"


def test_a_commit_whose_text_is_no_utf_8_or_whose_date_is_none(tmp_path: Path) -> None:
    project = make_project(tmp_path / "p")
    git(project, "init", "-q", "-b", "main")
    save(project, "begin")
    tree = git(project, "rev-parse", "HEAD^{tree}")
    (tmp_path / "commit").write_bytes(
        f"tree {tree}\nauthor X\xe9 <x> 99999999999999999999 +9999\ncommitter X <> none\n\n".encode("latin-1")
        + b"gr\xfc\xdfe"
    )
    odd = git(project, "hash-object", "-t", "commit", "-w", "--literally", str(tmp_path / "commit"))
    git(project, "update-ref", "HEAD", odd)
    (one,) = listed(project)
    assert (one.revision, one.by, one.note) == (odd, "X\ufffd", "gr\ufffd\ufffde")
    assert one.dated == "" or one.dated.startswith(("1970", "2"))


def test_what_a_name_stands_for(tmp_path: Path) -> None:
    project = make_project(tmp_path / "p")
    git(project, "init", "-q", "-b", "main")
    first = save(project, "begin").revision
    git(project, "tag", "-a", "-m", "reviewed", "review/1")
    git(project, "branch", "frontend")
    change(project, "buffer", 5)
    second = save(project, "five").revision
    place = found(project)
    for name in (first, first[:7], "review/1", "frontend", "HEAD~1", "main^", "HEAD^1", "main@{1}"):
        assert revisions.resolve(place, name) == first, name
    assert revisions.resolve(place, "HEAD") == second
    for name in ("HEAD~9", "nothing", first[:7] + "z", "HEAD:sheets", "HEAD^{tree}", "a b", "\n", "0" * 40, "x" * 5000):
        unknown = revisions.resolve(place, name)
        assert isinstance(unknown, Refused), name
        assert unknown.why is Why.UNKNOWN
        assert len(unknown.message) < 300


def test_the_files_of_a_revision(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    (project / "evidence/link").symlink_to("/etc/passwd")
    (project / "sheets/link.toml").symlink_to("/etc/passwd")
    (project / "sheets/notes.txt").write_text("n", "utf-8")
    make_repository(project / "evidence/nested")
    (project / "sheets/large.toml").write_bytes(b"#" * (revisions.LARGEST_TEXT + 1))
    git(top, "-c", "advice.addEmbeddedRepo=false", "add", ".")
    git(top, "commit", "-q", "-m", "by hand")
    first = git(top, "rev-parse", "HEAD")
    held = read(project, first)
    own = ["biasbook.toml", "process/example_180.toml", "sheets/buffer.toml", "sheets/driver.toml"]
    assert sorted(held.files) == own
    assert held.files["sheets/buffer.toml"] == SHEET.format(4).encode()
    assert {one.path: one.reason for one in held.left_out} == {
        "sheets/link.toml": "it is a symbolic link",
        "sheets/large.toml": f"it has {revisions.LARGEST_TEXT + 1} bytes; at most {revisions.LARGEST_TEXT} are read",
    }
    whole = read(project, first, evidence=True)
    assert sorted(whole.files) == sorted([*own, "evidence/bench/gain.csv"])
    assert {one.path for one in whole.left_out} >= {"evidence/link", "evidence/nested", "sheets/link.toml"}
    assert not read(project, git(top, "rev-parse", "HEAD~1")).files
    unknown = revisions.read_files(found(project), "0" * 40)
    assert isinstance(unknown, Refused)


def test_the_files_and_the_versions_of_many_revisions(tmp_path: Path) -> None:
    project = make_project(tmp_path / "p")
    git(project, "init", "-q", "-b", "main")
    save(project, "begin")
    for current in range(5, 9):
        change(project, "buffer", current)
        save(project, str(current))
    (project / "sheets/buffer.toml").unlink()
    save(project, "gone")
    place = found(project)
    all_of_them = [one.revision for one in listed(project)]
    versions = revisions.read_versions(place, "sheets/buffer.toml", all_of_them)
    assert versions == (None, *(SHEET.format(current).encode() for current in (8, 7, 6, 5, 4)))
    many = list(revisions.read_revisions(place, all_of_them))
    assert [one.files.get("sheets/buffer.toml") for one in many if isinstance(one, revisions.Files)] == list(versions)
    first, last = many[0], many[-1]
    assert isinstance(first, revisions.Files)
    assert isinstance(last, revisions.Files)
    assert first.files["sheets/driver.toml"] is last.files["sheets/driver.toml"], "what is shared is read once"


def test_paths_that_are_no_text_come_back_as_they_are(tmp_path: Path) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "a b\tc")
    names = ["\nbegins with a break", "ends\n", "\udce9", "ü"]
    for name in names:
        (project / "evidence" / name).write_text("1", "utf-8")
    save(project, "begin")
    assert set(listed(project)[0].paths) >= {f"evidence/{name}" for name in names}
    assert set(read(project, listed(project)[0].revision, evidence=True).files) >= {
        f"evidence/{name}" for name in names
    }


@given(st.lists(st.tuples(st.text(), st.lists(st.text(min_size=1), max_size=3), st.booleans()), max_size=5))
def test_the_output_of_the_log_is_taken_apart_whatever_it_holds(commits: list[tuple[str, list[str], bool]]) -> None:
    """As git lays it out: fields that each end in a zero byte; a line feed, or for a merge a zero byte; the paths."""

    def safe(text: str) -> str:
        return text.replace("\0", "").encode("utf-8", "replace").decode()

    output, expected = b"", []
    for number, (text, names, merge) in enumerate(commits):
        fields = [f"{number:040x}", "2026-01-01", safe(text), f"{number:040x}", safe(text * 2)]
        kept = [f"sheets/{safe(name)}" for name in names]
        output += b"\0" + "\0".join(fields).encode() + b"\0"
        output += (b"\0" if merge else b"\n") if kept else b""
        output += b"".join(name.encode() + b"\0" for name in kept)
        expected.append((fields, kept))
    assert list(revisions._commits(output)) == expected


@given(st.text())
def test_a_path_that_leaves_the_project_is_never_its_own(path: str) -> None:
    for candidate in (path, f"sheets/{path}", f"evidence/{path}", f"sheets/{path}.toml"):
        if is_own(candidate):
            parts = candidate.split("/")
            assert not {"", ".", "..", ".git"} & set(parts)
            assert parts[0] in {"biasbook.toml", "process", "sheets", "evidence"}


def test_a_shallow_clone_tells_what_it_holds(tmp_path: Path) -> None:
    project = make_project(tmp_path / "p")
    git(project, "init", "-q", "-b", "main")
    save(project, "begin")
    change(project, "buffer", 5)
    save(project, "five")
    subprocess.run(
        ["git", "clone", "-q", "--depth=1", project.as_uri(), tmp_path / "shallow"],
        check=True,
        stdin=subprocess.DEVNULL,
    )
    assert [one.note for one in listed(tmp_path / "shallow")] == ["five"]
    change(tmp_path / "shallow", "buffer", 6)
    save(tmp_path / "shallow", "six")
    assert [one.note for one in listed(tmp_path / "shallow")] == ["six", "five"]
