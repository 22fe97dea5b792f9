"""Repositories made for the tests, with the git program as a user would use it."""

import os
import subprocess
from pathlib import Path

import pytest

from worksheet.history import outcome, record, repository
from worksheet.history.own import own_files

SHEET = 'schema = 1\nstage = "source-follower"\n[choose]\nbias_current = "{} uA"\n'


def git(folder: Path, *arguments: str, check: bool = True, **environment: str) -> str:
    """What git printed, without the line end."""
    done = subprocess.run(
        ["git", *arguments],
        cwd=folder,
        env=os.environ | environment,
        capture_output=True,
        text=True,
        errors="surrogateescape",
        stdin=subprocess.DEVNULL,
        check=False,
    )
    assert not check or done.returncode == 0, f"git {arguments}: {done.stderr}"
    return done.stdout.rstrip("\n")


def signed(monkeypatch: pytest.MonkeyPatch, home: Path, name: str = "M. Roe") -> None:
    """Work as somebody whom git knows, in a home of one's own."""
    monkeypatch.setenv("HOME", str(home))
    monkeypatch.setenv("GIT_CEILING_DIRECTORIES", str(home))
    for who in ("AUTHOR", "COMMITTER"):
        monkeypatch.setenv(f"GIT_{who}_NAME", name)
        monkeypatch.setenv(f"GIT_{who}_EMAIL", f"{name.rsplit(maxsplit=1)[-1].lower()}@example.org")


def make_project(folder: Path) -> Path:
    """A project of one process file, two sheets and one file of evidence."""
    for part in ("process", "sheets", "evidence/bench"):
        (folder / part).mkdir(parents=True)
    (folder / "biasbook.toml").write_text('schema = 1\ntitle = "Front end"\n', "utf-8")
    (folder / "process/example_180.toml").write_text("schema = 1\n", "utf-8")
    (folder / "sheets/buffer.toml").write_text(SHEET.format(4), "utf-8")
    (folder / "sheets/driver.toml").write_text(SHEET.format(9), "utf-8")
    (folder / "evidence/bench/gain.csv").write_bytes(b"f,gain\n1e3,0.7\n")
    return folder


def make_repository(folder: Path, *options: str) -> Path:
    """A repository with one commit of a file that is not ours."""
    folder.mkdir(parents=True, exist_ok=True)
    git(folder, "init", "-q", "-b", "main", *options)
    (folder / "README").write_text("a chip\n", "utf-8")
    git(folder, "add", "README")
    git(folder, "commit", "-q", "-m", "begin")
    return folder


def found(folder: Path) -> repository.Repository:
    """The repository that encloses a folder."""
    one = repository.find(folder)
    assert isinstance(one, repository.Repository), one
    return one


def save(folder: Path, note: str, body: str = "") -> record.Recorded:
    """Record a project as it stands; it must have changed."""
    made = try_to_save(folder, note, body)
    assert isinstance(made, record.Recorded), made
    return made


def try_to_save(
    folder: Path, note: str, body: str = "", person: outcome.Person | None = None
) -> record.Recorded | record.Unchanged | outcome.Refused:
    """Record a project as it stands."""
    place = found(folder)
    files = own_files(folder)
    deleted = record.gone(place, files)
    assert isinstance(deleted, tuple), deleted
    return record.record(place, files, deleted, note=note, body=body, person=person)


def leftovers(folder: Path) -> list[Path]:
    """What a record should not leave behind in a repository."""
    kept = Path(git(folder, "rev-parse", "--absolute-git-dir"))
    return [*kept.glob("biasbook-*"), *kept.glob("*.lock")]
