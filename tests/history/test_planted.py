"""Whatever a received repository names to be run leaves a mark when it runs; none is left."""

import itertools
import shlex
from pathlib import Path

import pytest

from tests.history.repositories import SHEET, found, git, make_project, make_repository, save, try_to_save
from worksheet.history import program, record, repository, revisions
from worksheet.history.outcome import Refused

HOOKS = (
    "pre-commit", "prepare-commit-msg", "commit-msg", "post-commit", "post-index-change", "reference-transaction",
    "post-checkout", "pre-auto-gc", "post-rewrite", "fsmonitor-watchman", "applypatch-msg", "post-merge",
)  # fmt: skip


def plant(top: Path, marks: Path) -> None:
    """Plant a program in every place that we know of."""
    numbers = itertools.count()

    def program(kind: str) -> str:
        file = marks.parent / f"planted-{next(numbers)}"
        file.write_text(f"#!/bin/sh\necho {shlex.quote(kind)} >> {marks}\ncat\n", "utf-8")
        file.chmod(0o755)
        return str(file)

    kept = Path(git(top, "rev-parse", "--absolute-git-dir"))
    for folder in (kept / "hooks", top / "hooks"):
        folder.mkdir(exist_ok=True)
        for hook in HOOKS:
            (folder / hook).write_text(f"#!/bin/sh\necho {hook} >> {marks}\n", "utf-8")
            (folder / hook).chmod(0o755)
    settings = {
        "core.hooksPath": str(top / "hooks"),
        "core.fsmonitor": program("fsmonitor"),
        "core.pager": program("pager"),
        "pager.log": program("pager.log"),
        "core.editor": program("editor"),
        "core.sshCommand": program("ssh"),
        "core.askPass": program("askpass"),
        "core.gitProxy": program("proxy"),
        "core.alternateRefsCommand": program("alternates"),
        "sequence.editor": program("sequence editor"),
        "diff.external": program("external diff"),
        "diff.planted.command": program("diff driver"),
        "diff.planted.textconv": program("textconv"),
        "merge.planted.driver": program("merge driver"),
        "filter.planted.clean": program("clean"),
        "filter.planted.smudge": program("smudge"),
        "filter.planted.process": program("process"),
        "filter.planted.required": "true",
        "gpg.program": program("gpg"),
        "gpg.ssh.program": program("ssh signature"),
        "gpg.x509.program": program("x509"),
        "gpg.format": "openpgp",
        "user.signingKey": "0",
        "commit.gpgSign": "true",
        "tag.gpgSign": "true",
        "log.showSignature": "true",
        "log.follow": "true",
        "credential.helper": program("credential"),
        "hook.planted.command": program("configured hook"),
        "hook.planted.event": "reference-transaction",
        "hook.odd=name.command": program("configured hook of an odd name"),
        "gc.auto": "1",
        "maintenance.auto": "true",
        "trace2.eventTarget": str(marks),
        **{
            f"alias.{name}": f"!{program(f'alias {name}')}"
            for name in ("log", "rev-parse", "ls-tree", "update-index", "commit-tree", "cat-file")
        },
    }
    for key, value in settings.items():
        git(top, "config", key, value)
    for place in (top / ".gitattributes", kept / "info/attributes"):
        place.parent.mkdir(exist_ok=True)
        place.write_text("* diff=planted merge=planted\nREADME filter=planted\n*.raw filter=planted\n", "utf-8")


def everything(project: Path) -> None:
    """Call all that speaks to git."""
    assert isinstance(repository.create(project), repository.Repository)
    place = found(project)
    first = save(project, "first")
    (project / "sheets/buffer.toml").write_text(SHEET.format(5), "utf-8")
    (project / "sheets/driver.toml").unlink()
    files = ("sheets/buffer.toml", "biasbook.toml")
    assert record.unrecorded(place, files, ("sheets/driver.toml",)) != ((), ())
    second = save(project, "second")
    listed = revisions.history(place)
    assert isinstance(listed, tuple)
    assert [one.revision for one in listed][:2] == [second.revision, first.revision]
    assert revisions.history(place, "sheets/buffer.toml")
    assert revisions.resolve(place, "HEAD~1") == first.revision
    held = revisions.read_files(place, first.revision, evidence=True)
    assert isinstance(held, revisions.Files)
    assert len(held.files) == 5
    assert revisions.read_versions(place, "sheets/driver.toml", [second.revision, first.revision]) == (
        None,
        SHEET.format(9).encode(),
    )


def test_nothing_planted_is_run(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    (project / "evidence/scope.raw").write_text("1", "utf-8")
    marks = tmp_path / "marks"
    # A signed commit, so that showing signatures would have something to check.
    tree = git(top, "rev-parse", "HEAD^{tree}")
    people = "author A <a@b> 1 +0000\ncommitter A <a@b> 1 +0000\n"
    signature = "gpgsig -----BEGIN PGP SIGNATURE-----\n \n -----END PGP SIGNATURE-----\n"
    (tmp_path / "signed").write_text(f"tree {tree}\n{people}{signature}\nsigned\n", "utf-8")
    signed = git(top, "hash-object", "-t", "commit", "-w", str(tmp_path / "signed"))
    git(top, "update-ref", "HEAD", signed)
    plant(top, marks)
    (top / "README").write_text("changed, so that its filter would be asked\n", "utf-8")
    everything(project)
    assert not marks.exists(), marks.read_text("utf-8")
    # The marks are no decoration: what a user runs in the same repository trips them.
    git(top, "status", check=False)
    git(top, "diff", check=False)
    git(top, "show", check=False)
    git(top, "show", "--ext-diff", check=False)
    git(top, "log", "-1", "--format=%H", "--show-signature", signed, check=False)
    git(top, "-c", "commit.gpgSign=false", "commit", "-q", "--allow-empty", "-m", "x", check=False)
    left = set(marks.read_text("utf-8").splitlines())
    assert left >= {"fsmonitor", "gpg", "pre-commit", "reference-transaction"}, left
    assert left & {"clean", "process"}, left
    assert left >= {"textconv", "diff driver"}, left


def test_hooks_that_are_configured_are_switched_off_by_name(tmp_path: Path) -> None:
    """Versions of git from 2.54 on run them; older ones cannot show it, so what is asked of git is looked at."""
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    plant(top, tmp_path / "marks")
    place = found(project)
    output = place.run("config", "--show-scope", "--get-regexp", r"^hook\..*\.enabled$").decode()
    assert output.splitlines() == ["command\thook.odd=name.enabled false", "command\thook.planted.enabled false"]


def test_a_partial_clone_fetches_nothing(tmp_path: Path) -> None:
    """A repository may name a program as its remote and lack an object, so that git would fetch it."""
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    first = save(project, "begin")
    marks = tmp_path / "marks"
    missing = git(top, "rev-parse", "HEAD:p/sheets/buffer.toml")
    (top / ".git/objects" / missing[:2] / missing[2:]).unlink()
    settings = {
        "core.repositoryFormatVersion": "1",
        "extensions.partialClone": "origin",
        "remote.origin.promisor": "true",
        "remote.origin.url": f"ext::sh -c touch% {marks}",
        "protocol.ext.allow": "always",
        "protocol.allow": "always",
    }
    for key, value in settings.items():
        git(top, "config", key, value)
    held = revisions.read_files(found(project), first.revision)
    assert isinstance(held, (revisions.Files, Refused))
    if isinstance(held, revisions.Files):
        assert "sheets/buffer.toml" not in held.files
        assert [one.path for one in held.left_out] == ["sheets/buffer.toml"]
    assert isinstance(revisions.history(found(project)), tuple)
    assert not marks.exists()
    git(top, "cat-file", "-p", missing, check=False)
    assert marks.exists(), "a plain call of git would have run it"


@pytest.mark.parametrize(
    "name", ["--output=marks", "-n1", "--exec=touch", "HEAD:README", ":/begin", "a..b", "^HEAD", ""]
)
def test_a_name_of_a_revision_is_never_an_option(tmp_path: Path, name: str) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    save(project, "begin")
    assert isinstance(revisions.resolve(found(project), name), Refused)
    assert isinstance(revisions.history(found(project), revision=name), Refused)
    assert sorted(path.name for path in top.iterdir()) == [".git", "README", "p"]


def test_what_is_never_used(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """`status` and `diff` run programs and `commit` runs hooks, whatever the settings."""
    asked: list[str] = []
    original = program.run

    def listen(folder: Path, arguments: tuple[str, ...], *rest: object, **others: object) -> bytes:
        asked.append(next(one for one in arguments if not one.startswith("-") and "=" not in one))
        return original(folder, arguments, *rest, **others)  # type: ignore[arg-type]

    monkeypatch.setattr(program, "run", listen)
    project = make_project(make_repository(tmp_path / "chip") / "p")
    everything(project)
    assert isinstance(try_to_save(project, "x"), record.Unchanged)
    alone = make_project(tmp_path / "alone")
    made = repository.create(alone)
    assert isinstance(made, repository.Repository)
    save(alone, "begin")
    assert isinstance(revisions.history(made), tuple)
    assert set(asked) == {
        "rev-parse", "config", "init", "cat-file", "ls-tree", "ls-files", "check-attr", "check-ignore", "var",
        "hash-object", "read-tree", "update-index", "write-tree", "commit-tree", "update-ref", "log", "rev-list",
    }  # fmt: skip
