"""What one sheet needs, for both front ends: solved once, its algebra on request, and the proposal taken over."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from worksheet.model.keys import Key
from worksheet.model.problem import Problem
from worksheet.model.quantity import format_input
from worksheet.model.text import nearest
from worksheet.project.case import Case, CaseError
from worksheet.project.evaluate import Evaluator
from worksheet.review.review import solve as solve_points
from worksheet.session.workbook import Workbook, project_of_sheet
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.edit import SetValue, apply
from worksheet.sheetfile.write import save
from worksheet.solver import goals, needed
from worksheet.solver.propose import following, freedoms
from worksheet.solver.results import Bound, Solved, Window
from worksheet.solver.snap import snapped
from worksheet.solver.variables import INVERSION, on_request, variables


@dataclass(frozen=True, eq=False)
class Needs:
    """A sheet and what it needs.

    Attributes:
        root: The project folder.
        case: The sheet over its conditions.
        solved: What is needed, narrowed to a target or an unknown where one was named.
        asked: The target and the unknown that were named, None for all.
    """

    root: Path
    case: Case
    solved: Solved
    asked: tuple[str | None, str | None] = (None, None)

    @classmethod
    def of(
        cls, path: Path, over: str | None = None, target: str | None = None, unknown: str | None = None
    ) -> Needs | list[Problem]:
        """Solve a sheet of a project, or say everything that is wrong with it.

        Args:
            path: PROJECT/sheets/NAME.toml.
            over: "all" or "nominal"; the sheet's own where None.
            target: Only bounds of this target.
            unknown: Only the window of this design variable, inversion coefficient, assumption or own name.
        """
        found = opened(path)
        if isinstance(found, list):
            return found
        root, evaluator, name = found
        return cls._solved(root, evaluator, name, over, target, unknown)

    @classmethod
    def at(
        cls,
        root: Path,
        evaluator: Evaluator,
        name: str,
        unknown: str | None = None,
        early: Callable[[Mapping[str, Window]], None] | None = None,
    ) -> Needs | list[Problem]:
        """Solve a sheet of a state that is evaluated already, or say why it cannot be; `unknown` as in `of`.

        `early` is told the windows as soon as they are found, before the proposal is.
        """
        return cls._solved(root, evaluator, name, None, None, unknown, early)

    @classmethod
    def _solved(
        cls,
        root: Path,
        evaluator: Evaluator,
        name: str,
        over: str | None,
        target: str | None,
        unknown: str | None,
        early: Callable[[Mapping[str, Window]], None] | None = None,
    ) -> Needs | list[Problem]:
        points, found = solve_points(evaluator, name)
        return found if points is None else cls._narrowed(root, points.case, over, target, unknown, early)

    @classmethod
    def _narrowed(
        cls,
        root: Path,
        case: Case,
        over: str | None,
        target: str | None,
        unknown: str | None,
        early: Callable[[Mapping[str, Window]], None] | None = None,
    ) -> Needs | list[Problem]:
        if target is not None and target not in case.sheet.targets:
            return [_unknown(case, "target", target, list(case.sheet.targets))]
        try:
            extra = needed.window_of(needed.trials_of(case, over), unknown) if unknown is not None else None
        except KeyError:
            assumed = (k.name for k in case.stage.assumption_keys(case.sheet.bulk))
            names = [*variables(case), INVERSION.name, *assumed, *case.sheet.own]
            known = [n for n in names if n in variables(case) or on_request(case, n) is not None]
            return [_unknown(case, "unknown", str(unknown), known)]
        except CaseError as error:
            return [error.problem]
        solved = needed.solve(case, over, early)
        windows = dict(solved.needed) if unknown is None else {} if extra is None else {unknown: extra}
        if target is not None:
            windows = {
                n: replace(w, bounds=tuple(b for b in w.bounds if b.target == target)) for n, w in windows.items()
            }
            windows = {n: w for n, w in windows.items() if w.bounds or unknown is not None}
        return cls(root, case, replace(solved, needed=windows), (target, unknown))

    @property
    def title(self) -> str:
        """The sheet's title."""
        return self.case.sheet.title

    @property
    def keys(self) -> Mapping[str, Key]:
        """Descriptions of everything that has a window, by name."""
        found = {
            key.name: key
            for key in self.case.stage.design_keys(self.case.sheet.bias.ideal)
            if key.dimension is not None
        }
        for name in self.solved.needed:
            variable = None if name in found else on_request(self.case, name)
            if variable is not None:
                found[name] = variable.key
        return found

    def proposal(self) -> dict[str, float]:
        """What taking over would write: the recommended point's free values, on the grid and still valid. [SI]"""
        point = self.solved.recommended
        if point is None:
            return {}
        trials = needed.trials_of(self.case, self.solved.over)
        bias = following(self.case, point.values)
        return snapped(trials, {name: point.values[name] for name in freedoms(self.case)}, bias)

    def take(self) -> list[Problem]:
        """Write the proposal into the sheet's file, or say why that cannot be."""
        sheet = self.case.sheet
        values = self.proposal()
        if not values:
            return [Problem(sheet.file, None, "", f"nothing to take over: {self.solved.reason}")]
        path = self.root / sheet.file
        edits = [SetValue(("choose", name), shown_input(self.keys[name], value)) for name, value in values.items()]
        try:
            content = path.read_bytes()
            save(path, read=content, new=apply(content.decode("utf-8"), edits), root=self.root)
        except (OSError, WriteRefusedError) as error:
            return [Problem(sheet.file, None, "choose", f"nothing was written: {error}")]
        return []

    def hand(self, window: Window, bound: Bound) -> dict[str, Any]:
        """Method, formula and hand value of a bound, by the algebra.

        Returns: "method", "formula" and "hand" (None for a closed form) as in the contract's solve document
        """
        from worksheet.solver.hand import hand_bound

        low, high = goals.limits(self.case.sheet.targets[bound.target])
        limit = low if bound.limit == "min" else high
        assert limit is not None  # a bound belongs to a limit that exists
        found = hand_bound(self.case, bound.target, bound.side, limit, window.name, bound.point)
        if found is None:
            return {"method": "numeric", "formula": None, "hand": None}
        beside = {"where": list(found.where), "dropped": [str(d) for d in found.dropped]}
        if found.exact:
            return {"method": "closed form", "formula": found.formula, "hand": None, **beside}
        effects = {e.name: e.share for e in found.effects if e.name in found.neglects}
        hand = {"formula": found.formula, "value": found.value, "neglects": list(found.neglects), "effects": effects}
        return {"method": "numeric", "formula": None, "hand": hand, **beside}


def opened(path: Path) -> tuple[Path, Evaluator, str] | list[Problem]:
    """The project folder, the evaluator and the name of a sheet, or everything that stands in its way.

    Args:
        path: PROJECT/sheets/NAME.toml.
    """
    place = project_of_sheet(path)
    if isinstance(place, Problem):
        return [place]
    root, name = place
    workbook = Workbook.read(root)
    problems = problems_of(workbook, name)
    if problems or workbook.evaluator is None:
        return problems
    return root, workbook.evaluator, name


def shown_input(key: Key, value: float) -> str:
    """A value as it is typed into a sheet."""
    assert key.dimension is not None  # design variables have one
    return format_input(value, key.dimension)


def problems_of(workbook: Workbook, name: str) -> list[Problem]:
    """What stands in the way of one sheet: its own problems and those of the project's files."""
    project = workbook.project
    if project.file is None or project.process is None:
        return list(project.problems)
    file = f"sheets/{name}.toml"
    own = [p for p in project.problems if p.file == file]
    return own or ([] if name in project.sheets else list(project.problems))


def _unknown(case: Case, what: str, found: str, known: list[str]) -> Problem:
    near = nearest(found, known)
    hint = f"; did you mean {near!r}?" if near else ""
    return Problem(
        case.sheet.file, None, what, f"found {found!r}, expected one of: {', '.join(dict.fromkeys(known))}{hint}"
    )
