"""What git answers, and what is answered where something cannot be done: values with a kind and a reason.

Kept apart so that a front end can tell "there is no git" from "say who you are" without reading a message, and so that
nothing that goes wrong in a repository becomes a traceback.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum


class Why(Enum):
    """The kinds of refusal; what to do about each stands in the message."""

    NO_PROGRAM = "no git program"
    UNSAFE = "the repository belongs to somebody else"
    BARE = "a repository without working files"
    BUSY = "a merge or the like is in progress"
    LOCKED = "another program holds the index"
    NO_IDENTITY = "nobody is named as the author"
    CONFLICT = "a file of the project has an unsettled conflict"
    UNKNOWN = "there is no such revision"
    TIMEOUT = "git took too long"
    FAILED = "git failed"


ADVICE = {
    Why.NO_PROGRAM: "There is no git program on this machine; everything but revisions works. Install git.",
    Why.UNSAFE: "git refuses a repository whose files belong to another user. If you trust it: git config --global"
    " --add safe.directory FOLDER",
    Why.BARE: "The project lies in a repository that has no working files; move it to an ordinary one.",
    Why.NO_IDENTITY: "git does not know who records. Give a name and an e-mail address, or set them once:"
    " git config --global user.name NAME and git config --global user.email ADDRESS",
}
"""What to say where git's own words would not help."""

IN_PROGRESS = {
    "rebase-merge": ("A rebase", "git rebase --continue", "git rebase --abort"),
    "rebase-apply": ("A rebase or the application of a patch", "git rebase --continue", "git rebase --abort"),
    "MERGE_HEAD": ("A merge", "git commit", "git merge --abort"),
    "CHERRY_PICK_HEAD": ("A cherry-pick", "git cherry-pick --continue", "git cherry-pick --abort"),
    "REVERT_HEAD": ("A revert", "git revert --continue", "git revert --abort"),
    "sequencer": ("A series of cherry-picks or reverts", "git cherry-pick --continue", "git cherry-pick --abort"),
    "BISECT_LOG": ("A bisection", "git bisect good or git bisect bad", "git bisect reset"),
}
"""By the file or the name that gives it away: what is in progress, how to finish it and how to end it."""


@dataclass(frozen=True, slots=True)
class Refused:
    """What was asked was not done, and nothing was changed.

    Attributes:
        why: For programs.
        message: For people: what happened, the likely cause, what to try.
    """

    why: Why
    message: str

    def __str__(self) -> str:
        return self.message


class RefusedError(Exception):
    """Carries a Refused from the call of git that met it up to the function that returns it."""

    def __init__(self, why: Why, message: str) -> None:
        super().__init__(message)
        self.refused = Refused(why, message)


@dataclass(frozen=True, slots=True)
class LeftOut:
    """A file that was passed over, and why. `path` is relative to the project."""

    path: str
    reason: str


@dataclass(frozen=True, slots=True)
class Person:
    """Who records: a name and an e-mail address, as git keeps them with each revision."""

    name: str
    email: str

    def problem(self) -> str | None:
        """Say why git could not keep it, or None."""
        for what, text in (("name", self.name), ("e-mail address", self.email)):
            if not text.strip(" .,:;\"'"):
                return f"The {what} of whoever records is empty."
            if any(character in "<>" or not character.isprintable() for character in text):
                return f"The {what} of whoever records holds a character that git cannot keep: {text!r}."
        return None


@dataclass(frozen=True, slots=True)
class Entry:
    """One file of a revision: its mode ("100644"), kind ("blob", "commit") and id, and its size in bytes."""

    mode: str
    kind: str
    id: str
    size: int


@dataclass(frozen=True, slots=True)
class Head:
    """Where the repository stands.

    Attributes:
        commit, tree: None before the first revision.
        busy: What is in progress and how to end it, None where nothing is.
    """

    commit: str | None
    tree: str | None
    busy: str | None
