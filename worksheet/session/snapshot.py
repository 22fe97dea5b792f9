"""The frozen picture of a book at one revision, which is all that a front end is given."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from worksheet.compare.conflict import Conflict, split
from worksheet.model.problem import Problem
from worksheet.project.discover import SHEETS, Project
from worksheet.session.reading import data_of


@dataclass(frozen=True, eq=False)
class Snapshot:
    """A book at one revision.

    Attributes:
        revision: Counts up with every state; results that belong to another one are out of date.
        project: As its files state it.
        contents: Bytes of every file that was read, by path within the project.
        undo, redo: What would be taken back or made again next, in words; "" for nothing.
        read_only: Whether nothing may be changed.
        away: Whether the folder is gone; the rest is as it was last seen.
    """

    revision: int
    project: Project
    contents: Mapping[str, bytes]
    undo: str = ""
    redo: str = ""
    read_only: bool = False
    away: bool = False
    _data: dict[str, dict[str, Any]] = field(default_factory=dict, repr=False)

    @property
    def names(self) -> tuple[str, ...]:
        """Every sheet, readable or not, in the order of the alphabet."""
        return tuple(sorted({*self.project.sheets, *self.project.bad}))

    def data(self, name: str) -> Mapping[str, Any]:
        """A sheet's plain TOML data, values as typed; empty where there is none. Read on the first call."""
        if name not in self._data:
            shown = file_of(name)
            content = self.contents.get(shown)
            self._data[name] = {} if content is None else data_of(content, shown)
        return self._data[name]

    def sides(self, name: str) -> Conflict | None:
        """Both sides of a sheet in which a merge left its conflict markers; None for any other sheet."""
        try:
            return split(self.contents.get(file_of(name), b"").decode("utf-8"))
        except UnicodeDecodeError:
            return None

    def problems_of(self, name: str) -> tuple[Problem, ...]:
        """What is wrong with one sheet."""
        shown = file_of(name)
        return tuple(problem for problem in self.project.problems if problem.file == shown)


def file_of(name: str) -> str:
    """Path of a sheet within its project."""
    return f"{SHEETS}/{name}.toml"
