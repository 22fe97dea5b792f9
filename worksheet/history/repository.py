"""What git is asked, in this one file: where a repository is, what it holds, and what is put into it.

How the program is run, and what a repository that came from anybody must not make it do, stands in program. What the
calls mean together is told elsewhere: lock and record write, revisions read.
"""

from __future__ import annotations

import os
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from types import MappingProxyType

from worksheet.history import program
from worksheet.history.outcome import ADVICE, IN_PROGRESS, Entry, Head, Person, Refused, RefusedError, Why
from worksheet.model.text import clean

_NONE_ENCLOSES = "not a git repository (or any"
_ID = re.compile(r"[0-9a-f]{40}(?:[0-9a-f]{24})?")
_NAME = re.compile(r"[^\s:\\?*\[\x00-\x20\x7f-]((?!\.\.|\^[!@-])[^\s:\\?*\[\x00-\x20\x7f])*")


@dataclass(frozen=True, slots=True)
class Repository:
    """The repository that encloses a project.

    Attributes:
        top: Top of the working files.
        git_folder: What git keeps for this working tree; the index lies in it.
        prefix: From the top to the project, "" or ending in a slash.
        algorithm: "sha1" or "sha256".
        settings: What git is configured to, the last of repeated keys.
    """

    top: Path
    git_folder: Path
    prefix: str
    algorithm: str
    settings: Mapping[str, str] = field(default_factory=dict, repr=False)

    @property
    def folder(self) -> Path:
        """The project."""
        return self.top / self.prefix

    @property
    def index(self) -> Path:
        """The user's index; need not exist."""
        return Path(os.path.realpath(self.git_folder / "index"))

    @property
    def no_id(self) -> str:
        """Stands for "nothing there" in place of an id."""
        return "0" * (64 if self.algorithm == "sha256" else 40)

    def run(
        self, *arguments: str, stdin: bytes = b"", index: Path | None = None, person: Person | None = None,
        also_fails: Sequence[int] = (), keep: Sequence[int] = (),
    ) -> bytes:  # fmt: skip
        """Run one git command at the top of the working files; what it printed. See program.run."""
        hooks = _configured_hooks(self.settings)
        environment = {"GIT_CONFIG_COUNT": str(len(hooks))}
        for number, hook in enumerate(hooks):
            environment |= {f"GIT_CONFIG_KEY_{number}": f"hook.{hook}.enabled", f"GIT_CONFIG_VALUE_{number}": "false"}
        if index is not None:
            environment["GIT_INDEX_FILE"] = str(index)
        if person is not None:
            for role in ("AUTHOR", "COMMITTER"):
                environment |= {f"GIT_{role}_NAME": person.name, f"GIT_{role}_EMAIL": person.email}
        return program.run(self.top, arguments, stdin, environment, also_fails, keep)

    # What stands

    def head(self) -> Head:
        """The present revision, and whether something is in progress that a revision would spoil."""
        asked = ("HEAD", "HEAD^{tree}", "MERGE_HEAD", "CHERRY_PICK_HEAD", "REVERT_HEAD")
        output = self.run("cat-file", "--batch-check", stdin="".join(f"{name}\n" for name in asked).encode())
        found = {
            name: line.split()[0] for name, line in zip(asked, output.decode().splitlines(), strict=True)
            if _ID.match(line)
        }  # fmt: skip
        for name, (what, proceed, end) in IN_PROGRESS.items():
            if name in found or (self.git_folder / name).exists():
                busy = f"{what} is in progress in this repository: finish it ({proceed}) or end it ({end}) first."
                return Head(found.get("HEAD"), found.get("HEAD^{tree}"), busy)
        return Head(found.get("HEAD"), found.get("HEAD^{tree}"), None)

    def resolve(self, name: str) -> str | None:
        """The full id of the commit that a name stands for, None where there is none.

        Args:
            name: A hash or a prefix of one, a branch, a tag, HEAD~1.
        """
        if not _NAME.fullmatch(name):
            return None
        try:
            found = self.run("rev-parse", "--verify", "--quiet", f"{name}^{{commit}}").decode().strip()
        except RefusedError as error:
            if error.refused.why is Why.FAILED:
                return None
            raise
        return found if _ID.fullmatch(found) else None

    def tree(self, revision: str, parts: Iterable[str]) -> dict[str, Entry]:
        """The entries of a revision below the given parts of the project, by path relative to the project.

        Args:
            revision: A full id.
            parts: Files or folders, relative to the project.
        """
        wanted = [self.prefix + part for part in parts]
        output = self.run("ls-tree", "-z", "-r", "-l", "--full-tree", revision, "--", *wanted)
        entries = {}
        for line in filter(None, output.split(b"\0")):
            facts, _, path = line.partition(b"\t")
            mode, kind, name, size = facts.decode().split()
            shown = os.fsdecode(path).removeprefix(self.prefix)
            entries[shown] = Entry(mode, kind, name, int(size) if size.isdecimal() else 0)
        return entries

    def objects(self, names: Iterable[str]) -> list[tuple[str, bytes] | None]:
        """The kind and the content of each object, through one call; None for one that is not there.

        Args:
            names: Full ids, or "REVISION:path from the top of the working files" without a line break.
        """
        asked = list(names)
        output = self.run("cat-file", "--batch", stdin=b"".join(os.fsencode(name) + b"\n" for name in asked))
        found: list[tuple[str, bytes] | None] = []
        place = 0
        for _ in asked:
            end = output.index(b"\n", place)
            facts = output[place:end].split(b" ")
            place = end + 1
            if len(facts) == 3 and facts[2].isdigit():
                size = int(facts[2])
                found.append((facts[1].decode(), output[place : place + size]))
                place += size + 1
            else:
                found.append(None)
        return found

    def names(self) -> list[str]:
        """Branches and tags, as they are called; branches of other places too."""
        found = self.run("for-each-ref", "--format=%(refname:short)", "refs/heads", "refs/tags", "refs/remotes")
        return [name for name in found.decode("utf-8", "replace").split("\n") if _NAME.fullmatch(name)]

    def is_linear(self, revision: str) -> bool:
        """Whether no merge leads to a revision.

        Args:
            revision: A full id.
        """
        return not self.run("rev-list", "--min-parents=2", "--max-count=1", revision)

    def log(self, revision: str, parts: Iterable[str], layout: str, limit: int | None) -> bytes:
        """The commits that touched the parts of the project, newest first, each with the paths that it changed.

        Of a merge these are the paths that differ from every parent.

        Args:
            revision: A full id.
            parts: Files or folders, relative to the project; none for all that the repository holds.
            layout: What is printed of each, in git's placeholders.
            limit: At most so many.
        """
        most = () if limit is None else (f"--max-count={limit}",)
        wanted = [self.prefix + part for part in parts]
        return self.run(
            "log", "-z", "-c", "--name-only", "--no-renames", "--no-ext-diff", "--no-textconv", "--no-show-signature",
            "--no-color", f"--format=tformat:{layout}", *most, revision, "--", *wanted,
        )  # fmt: skip

    def identity(self) -> Person:
        """Who records, as git is configured.

        Raises: RefusedError, where git does not know.
        """
        name, _, rest = self.run("var", "GIT_COMMITTER_IDENT").decode("utf-8", "replace").partition(" <")
        return Person(name, rest.partition(">")[0])

    def index_tags(self, parts: Iterable[str]) -> dict[str, str]:
        """What the index says of the files below parts of the project: "M" unmerged, "S" or lower case: left alone."""
        output = self.run("ls-files", "-z", "-s", "-v", "--", *(self.prefix + part for part in parts))
        tags = {}
        for line in filter(None, output.split(b"\0")):
            facts, _, path = line.partition(b"\t")
            tag, *_, stage = facts.decode().split()
            tags[os.fsdecode(path).removeprefix(self.prefix)] = tag if stage == "0" else "M"
        return tags

    def attributes(self, paths: Iterable[str]) -> dict[str, dict[str, str]]:
        """How git is told to convert each file of the project, by path and attribute."""
        asked = ("filter", "ident", "working-tree-encoding", "text", "eol")
        stdin = b"".join(os.fsencode(self.prefix + path) + b"\0" for path in paths)
        parts = self.run("check-attr", "-z", "--stdin", *asked, stdin=stdin).split(b"\0")[:-1]
        found: dict[str, dict[str, str]] = {}
        for path, name, value in zip(parts[::3], parts[1::3], parts[2::3], strict=True):
            found.setdefault(os.fsdecode(path).removeprefix(self.prefix), {})[name.decode()] = value.decode()
        return found

    def ignored(self, paths: Iterable[str]) -> set[str]:
        """Those files of the project that git is told to ignore and does not hold yet."""
        place = (
            f"./{self.prefix}"  # check-ignore takes no literal paths, and reads a colon in front as more than a name
        )
        stdin = b"".join(os.fsencode(place + path) + b"\0" for path in paths)
        output = self.run("--no-literal-pathspecs", "check-ignore", "-z", "--stdin", stdin=stdin, also_fails=(1,))
        return {os.fsdecode(path).removeprefix(place) for path in output.split(b"\0") if path}

    # What is written; nothing here touches a working file, the index or a branch but `move_head`

    def store(self, files: Iterable[Path]) -> list[str]:
        """Put files into the object store as they are, unfiltered; their ids."""
        stdin = b"".join(os.fsencode(file) + b"\n" for file in files)
        return self.run("hash-object", "-w", "--no-filters", "--stdin-paths", stdin=stdin).decode().split()

    def put(self, index: Path, changes: Mapping[str, tuple[str, str] | None], base: str | None = None) -> None:
        """Enter files of the project into an index that is not the user's.

        Args:
            index: The file; made where there is none.
            changes: Mode and id by path relative to the project; None for a file that is gone.
            base: A tree that the index holds first, in place of what it held.
        """
        if base is not None:
            self.run("read-tree", base, index=index)
        ordered = sorted(changes.items(), key=lambda change: change[1] is not None)  # a folder may follow a file
        stdin = b"".join(
            f"{mode} {name}\t".encode() + os.fsencode(self.prefix + path) + b"\0"
            for path, (mode, name) in ((path, entry or ("0", self.no_id)) for path, entry in ordered)
        )
        self.run("update-index", "-z", "--index-info", stdin=stdin, index=index)

    def commit(self, index: Path, parent: str | None, message: str, person: Person | None) -> str:
        """Store an index as a commit; its id. No branch moves."""
        tree = self.run("write-tree", index=index).decode().strip()
        parents = () if parent is None else ("-p", parent)
        text = message.encode("utf-8", "replace")
        arguments = ("commit-tree", "--no-gpg-sign", tree, *parents, "-F", "-")
        return self.run(*arguments, stdin=text, person=person).decode().strip()

    def move_head(self, new: str, old: str | None, why: str, person: Person | None, keep: Sequence[int] = ()) -> None:
        """Move the present branch (or a detached HEAD) to a commit, if it still stands at the old one."""
        self.run("update-ref", "-m", why, "HEAD", new, old or self.no_id, person=person, keep=keep)


def find(folder: Path) -> Repository | Refused | None:
    """The repository that encloses a project.

    Args:
        folder: The project.

    Returns: None where there is none; a refusal where there is no git program, or where the repository may not be used.
    """
    try:
        return _find(folder)
    except RefusedError as error:
        return None if _NONE_ENCLOSES in error.refused.message else error.refused


def create(folder: Path) -> Repository | Refused:
    """The repository that encloses a project, made inside it where there is none."""
    found = find(folder)
    if found is not None:
        return found
    try:
        # Without a template no hook of anybody's comes in; the name of the first branch is the user's to set.
        chosen = program.run(folder, ("config", "--get", "init.defaultBranch"), also_fails=(1,))
        branch = () if chosen.strip() else ("-c", "init.defaultBranch=main")
        program.run(folder, (*branch, "init", "--quiet", "--template=", "."))
        return _find(folder)
    except RefusedError as error:
        return error.refused


def _find(folder: Path) -> Repository:
    asked = ("--is-inside-work-tree", "--show-object-format", "--absolute-git-dir", "--show-toplevel", "--show-prefix")
    lines = os.fsdecode(program.run(folder, ("rev-parse", *asked))).split("\n")
    if lines[0] != "true":
        raise RefusedError(Why.BARE, ADVICE[Why.BARE])
    if len(lines) != len(asked) + 1:
        raise RefusedError(Why.FAILED, "The path of the repository holds a line break; git cannot be asked about it.")
    top = Path(lines[3])
    if not (top / ".git").exists() or not (top / lines[4]).samefile(folder):
        raise RefusedError(
            Why.FAILED, f"The repository keeps its working files elsewhere (core.worktree is {clean(str(top))})."
        )
    found = os.fsdecode(program.run(folder, ("config", "--null", "--list"))).split("\0")
    settings = {key: value if line else "true" for key, line, value in (entry.partition("\n") for entry in found)}
    return Repository(top, Path(lines[2]), lines[4], lines[1], MappingProxyType(settings))


def _configured_hooks(settings: Mapping[str, str]) -> list[str]:
    """Names of the hooks that newer versions of git take from their settings rather than from the folder of hooks."""
    names = (key.removeprefix("hook.").rpartition(".")[0] for key in settings if key.startswith("hook."))
    return sorted({name for name in names if name})
