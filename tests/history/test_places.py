"""Every kind of place in which git keeps a project, and what is said where it cannot be used."""

import os
from pathlib import Path

import pytest

from tests.history.repositories import SHEET, found, git, leftovers, make_project, make_repository, save, try_to_save
from worksheet.history import program, record, repository, revisions
from worksheet.history.outcome import Refused, Why


def change(project: Path, current: int) -> None:
    (project / "sheets/buffer.toml").write_text(SHEET.format(current), "utf-8")


def test_a_worktree_moves_its_own_branch_alone(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    save(make_project(top / "p"), "begin")
    (top / "staged").write_text("s", "utf-8")
    git(top, "add", "staged")
    git(top, "worktree", "add", "-q", "-b", "trial", "../trial")
    project = tmp_path / "trial/p"
    change(project, 5)
    made = save(project, "in the worktree")
    assert git(top, "rev-parse", "trial", "main").splitlines() == [
        made.revision,
        git(top, "rev-parse", f"{made.revision}^"),
    ]
    assert git(top, "status", "--porcelain") == "A  staged"
    assert git(project, "status", "--porcelain") == ""
    assert leftovers(project) == leftovers(top) == []


def test_a_worktree_of_a_repository_without_files_of_its_own(tmp_path: Path) -> None:
    make_repository(tmp_path / "chip")
    git(tmp_path, "clone", "-q", "--bare", "chip", "chip.git")
    git(tmp_path / "chip.git", "worktree", "add", "-q", "../trial", "main")
    project = make_project(tmp_path / "trial/p")
    save(project, "begin")
    assert git(project, "status", "--porcelain") == ""


def test_a_submodule_records_in_itself(tmp_path: Path) -> None:
    make_repository(tmp_path / "library")
    top = make_repository(tmp_path / "chip")
    git(top, "-c", "protocol.file.allow=always", "submodule", "add", "-q", "../library", "library")
    git(top, "commit", "-q", "-m", "take the library in")
    head = git(top, "rev-parse", "HEAD")
    project = make_project(top / "library/p")
    made = save(project, "begin")
    assert (top / "library/.git").is_file()
    assert git(top / "library", "rev-parse", "HEAD") == made.revision
    assert git(top, "rev-parse", "HEAD") == head
    assert git(top / "library", "status", "--porcelain") == ""
    # And beside the submodule, it is left where it stands.
    beside = make_project(top / "q")
    save(beside, "beside")
    assert git(top, "show", "--name-only", "--format=", "HEAD").splitlines()[0].startswith("q/")
    assert git(top, "status", "--porcelain") == " M library"


def test_a_repository_with_sha_256(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip", "--object-format=sha256")
    project = make_project(top / "p")
    first = save(project, "begin")
    assert len(first.revision) == 64
    assert try_to_save(project, "again") == record.Unchanged()
    change(project, 5)
    (project / "sheets/driver.toml").unlink()
    second = save(project, "more")
    assert second.paths == ("sheets/buffer.toml", "sheets/driver.toml")
    place = found(project)
    listed = revisions.history(place)
    assert isinstance(listed, tuple)
    assert [one.revision for one in listed] == [second.revision, first.revision]
    held = revisions.read_files(place, first.revision)
    assert isinstance(held, revisions.Files)
    assert held.files["sheets/buffer.toml"] == SHEET.format(4).encode()
    assert git(top, "fsck", "--strict") == ""
    assert git(top, "status", "--porcelain") == ""


def test_before_the_first_commit_what_is_staged_stays_staged(tmp_path: Path) -> None:
    top = tmp_path / "chip"
    top.mkdir()
    git(top, "init", "-q", "-b", "main")
    (top / "README").write_text("r", "utf-8")
    git(top, "add", "README")
    project = make_project(top / "p")
    assert revisions.history(found(project)) == ()
    unknown = revisions.resolve(found(project), "HEAD")
    assert isinstance(unknown, Refused)
    save(project, "begin")
    assert git(top, "rev-list", "--count", "main") == "1"
    assert git(top, "status", "--porcelain") == "A  README"
    assert git(top, "fsck", "--strict") == ""


def test_a_clone_without_a_checkout_has_no_index(tmp_path: Path) -> None:
    make_repository(tmp_path / "origin")
    git(tmp_path, "clone", "-q", "--no-checkout", "origin", "chip")
    project = make_project(tmp_path / "chip/p")
    save(project, "begin")
    assert git(project, "ls-tree", "--name-only", "--full-tree", "HEAD").splitlines() == ["README", "p"]


def test_a_detached_head_moves_and_no_branch_does(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    git(top, "checkout", "-q", "--detach")
    project = make_project(top / "p")
    made = save(project, "begin")
    assert git(top, "rev-parse", "HEAD") == made.revision
    assert git(top, "rev-parse", "main") == git(top, "rev-parse", "HEAD^")


def test_a_split_index_stays_whole(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    save(project, "begin")
    git(top, "config", "core.splitIndex", "true")
    git(top, "update-index", "--split-index")
    (top / "staged").write_text("s", "utf-8")
    git(top, "add", "staged")
    assert list((top / ".git").glob("sharedindex.*"))
    change(project, 5)
    save(project, "five")
    assert git(top, "status", "--porcelain") == "A  staged"


def test_a_sparse_checkout_stays_whole(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    for folder in ("far", "near"):
        (top / folder).mkdir()
        (top / folder / "file").write_text("f", "utf-8")
    project = make_project(top / "p")
    git(top, "add", ".")
    git(top, "commit", "-q", "-m", "all")
    git(top, "sparse-checkout", "set", "--cone", "--sparse-index", "near", "p")
    assert not (top / "far").exists()
    change(project, 5)
    made = save(project, "five")
    assert made.paths == ("sheets/buffer.toml",)
    assert git(top, "status", "--porcelain") == ""
    assert git(top, "ls-tree", "-r", "--name-only", "HEAD", "far") == "far/file"
    # A sheet outside the sparse checkout is not there to be seen, and is not taken for deleted.
    git(top, "sparse-checkout", "set", "--cone", "--sparse-index", "near")
    project.mkdir(exist_ok=True)
    (project / "sheets").mkdir(exist_ok=True)
    (project / "sheets/new.toml").write_text(SHEET.format(1), "utf-8")
    made = save(project, "new")
    assert made.paths == ("sheets/new.toml",)
    assert {one.path for one in made.left_out} >= {"sheets/buffer.toml", "biasbook.toml"}


@pytest.mark.parametrize("what", ["merge", "rebase", "cherry-pick", "revert", "am", "bisect"])
def test_something_in_progress_is_said_and_nothing_written(tmp_path: Path, what: str) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    save(project, "begin")
    git(top, "checkout", "-q", "-b", "other")
    (top / "README").write_text("theirs\n", "utf-8")
    git(top, "commit", "-q", "-a", "-m", "theirs")
    git(top, "checkout", "-q", "main")
    (top / "README").write_text("ours\n", "utf-8")
    git(top, "commit", "-q", "-a", "-m", "ours")
    (top / "README").write_text("later\n", "utf-8")
    git(top, "commit", "-q", "-a", "-m", "later")
    commands = {
        "merge": ["merge", "other"],
        "rebase": ["rebase", "other"],
        "cherry-pick": ["cherry-pick", "other"],
        "revert": ["revert", "HEAD~1"],
        "bisect": ["bisect", "start", "HEAD", "HEAD~2"],
    }
    if what == "am":
        (tmp_path / "patch").write_text(git(top, "format-patch", "--stdout", "-1", "other"), "utf-8")
        commands["am"] = ["am", str(tmp_path / "patch")]
    git(top, *commands[what], check=False)
    change(project, 5)
    index, refs, objects = (top / ".git/index").read_bytes(), git(top, "for-each-ref"), git(top, "count-objects")
    refused = try_to_save(project, "x")
    assert isinstance(refused, Refused)
    assert refused.why is Why.BUSY
    assert "in progress" in refused.message
    assert ((top / ".git/index").read_bytes(), git(top, "for-each-ref"), git(top, "count-objects")) == (
        index, refs, objects,
    )  # fmt: skip
    assert leftovers(top) == []


def test_a_conflict_that_is_left_without_a_merge_is_said(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    save(project, "begin")
    change(project, 5)
    git(top, "stash", "-q")
    change(project, 6)
    save(project, "six")
    git(top, "stash", "pop", "-q", check=False)
    assert "<<<<<<<" in (project / "sheets/buffer.toml").read_text("utf-8")
    refused = try_to_save(project, "x")
    assert isinstance(refused, Refused)
    assert refused.why is Why.CONFLICT
    assert "sheets/buffer.toml" in refused.message


def test_a_repository_of_somebody_else_is_refused_with_what_to_do(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    project = make_project(make_repository(tmp_path / "chip") / "p")
    monkeypatch.setitem(program._FIXED, "GIT_TEST_ASSUME_DIFFERENT_OWNER", "1")
    refused = repository.find(project)
    assert isinstance(refused, Refused)
    assert refused.why is Why.UNSAFE
    assert "safe.directory" in refused.message


def test_a_bare_repository_and_a_folder_laid_out_like_one_are_refused(tmp_path: Path) -> None:
    make_repository(tmp_path / "chip")
    git(tmp_path, "clone", "-q", "--bare", "chip", "chip.git")
    for folder in (tmp_path / "chip.git", tmp_path / "chip/.git"):
        refused = repository.find(folder)
        assert isinstance(refused, Refused), folder
        assert refused.why is Why.BARE
    disguised = tmp_path / "chip/p"
    git(tmp_path, "clone", "-q", "--bare", "chip", str(disguised))
    refused = repository.find(make_project(disguised))
    assert isinstance(refused, Refused)
    assert refused.why is Why.BARE


def test_working_files_that_are_kept_elsewhere_are_refused(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    git(top, "config", "core.worktree", str(tmp_path))
    refused = repository.find(make_project(top / "p"))
    assert isinstance(refused, Refused)
    assert "elsewhere" in refused.message


def test_a_broken_repository_is_not_taken_for_none(tmp_path: Path) -> None:
    project = make_project(tmp_path / "p")
    (project / ".git").write_text("gitdir: /nowhere\n", "utf-8")
    refused = repository.find(project)
    assert isinstance(refused, Refused)
    assert refused.why is Why.FAILED
    assert repository.create(project) == refused


def test_a_folder_that_is_not_there(tmp_path: Path) -> None:
    refused = repository.find(tmp_path / "none")
    assert isinstance(refused, Refused)
    assert "none" in refused.message


def test_a_project_reached_through_a_symbolic_link(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    make_project(top / "p")
    (tmp_path / "link").symlink_to(top / "p")
    place = found(tmp_path / "link")
    assert (place.folder, place.prefix) == (top / "p", "p/")
    save(tmp_path / "link", "begin")


@pytest.mark.parametrize("path", ["", "bin:.", "/nonexistent"])
def test_without_a_git_program_that_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, path: str) -> None:
    project = make_project(tmp_path / "p")
    mark = tmp_path / "mark"
    for folder in (project, project / "bin"):
        folder.mkdir(exist_ok=True)
        (folder / "git").write_text(f"#!/bin/sh\ntouch {mark}\n", "utf-8")
        (folder / "git").chmod(0o755)
    monkeypatch.chdir(project)
    monkeypatch.setenv("PATH", path)
    for refused in (repository.find(project), repository.create(project)):
        assert isinstance(refused, Refused)
        assert refused.why is Why.NO_PROGRAM
    assert not mark.exists(), "a program that lies in the project is not git"


def test_a_git_that_hangs_is_stopped(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    project = make_project(tmp_path / "p")
    (tmp_path / "bin").mkdir()
    (tmp_path / "bin/git").write_text("#!/bin/sh\nexec sleep 60\n", "utf-8")
    (tmp_path / "bin/git").chmod(0o755)
    monkeypatch.setenv("PATH", f"{tmp_path / 'bin'}{os.pathsep}{os.environ['PATH']}")
    monkeypatch.setattr(program, "SECONDS", 0.05)
    refused = repository.find(project)
    assert isinstance(refused, Refused)
    assert refused.why is Why.TIMEOUT


def test_the_environment_of_a_hook_does_not_lead_elsewhere(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    other = make_repository(tmp_path / "other")
    head = git(other, "rev-parse", "HEAD")
    top = make_repository(tmp_path / "chip")
    project = make_project(top / "p")
    with monkeypatch.context() as patched:
        patched.setenv("GIT_DIR", str(other / ".git"))
        patched.setenv("GIT_WORK_TREE", str(other))
        patched.setenv("GIT_INDEX_FILE", str(other / ".git/index"))
        patched.setenv("GIT_OBJECT_DIRECTORY", str(other / ".git/objects"))
        patched.setenv("GIT_NAMESPACE", "elsewhere")
        made = save(project, "begin")
    assert git(other, "rev-parse", "HEAD") == head
    assert git(top, "rev-parse", "HEAD") == made.revision
    assert git(top, "fsck", "--strict") == ""
