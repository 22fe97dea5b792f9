"""Two reviewed projects laid side by side by meaning: what was stated, and what that did to every result."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from worksheet.compare import inputs
from worksheet.compare.inputs import Moved
from worksheet.project.discover import Project
from worksheet.review.results import Review, SheetReview

_SAME = 1e-12
"""Relative: nearer than this two results are one."""


@dataclass(frozen=True, slots=True)
class Result:
    """One metric or target before and after. Numbers in `unit`, None where there is none."""

    metric: str
    unit: str
    old: float | None
    new: float | None
    old_verdict: str | None
    new_verdict: str | None


@dataclass(frozen=True, slots=True)
class SheetChange:
    """One sheet before and after: "added", "removed", "changed", or "affected" by something outside its file."""

    sheet: str
    status: str
    inputs: tuple[Moved, ...]
    results: tuple[Result, ...]


@dataclass(frozen=True, slots=True)
class Comparison:
    """Everything that differs between two states of a project."""

    project: tuple[Moved, ...]
    process: tuple[Moved, ...]
    sheets: tuple[SheetChange, ...]

    @property
    def same(self) -> bool:
        """Whether nothing differs."""
        return not (self.project or self.process or self.sheets)


@dataclass(frozen=True, eq=False, slots=True)
class State:
    """A project and its review."""

    project: Project
    review: Review


def compare(old: State, new: State) -> Comparison:
    """Lay two states of a project side by side.

    Args:
        old, new: Both reviewed.
    Returns: Comparison
    """
    return Comparison(
        project=inputs.moved(_project(old), _project(new)),
        process=inputs.moved(_process(old), _process(new)),
        sheets=tuple(change for name in _names(old, new) if (change := _sheet(old, new, name)) is not None),
    )


def _project(state: State) -> inputs.Stated:
    return {} if state.project.file is None else inputs.of_project(state.project.file)


def _process(state: State) -> inputs.Stated:
    return {} if state.project.process is None else inputs.of_process(state.project.process)


def _names(old: State, new: State) -> list[str]:
    return sorted({*old.project.sheets, *new.project.sheets})


def _sheet(old: State, new: State, name: str) -> SheetChange | None:
    before, after = old.project.sheets.get(name), new.project.sheets.get(name)
    stated = inputs.moved(
        {} if before is None else inputs.of_sheet(before), {} if after is None else inputs.of_sheet(after)
    )
    results = _results(_reviewed(old, name), _reviewed(new, name))
    if before is None or after is None:
        return SheetChange(name, "added" if before is None else "removed", stated, results)
    if not stated and not results:
        return None
    return SheetChange(name, "changed" if stated else "affected", stated, results)


def _reviewed(state: State, name: str) -> SheetReview | None:
    return next((s for s in state.review.sheets if s.sheet.name == name), None)


def _results(old: SheetReview | None, new: SheetReview | None) -> tuple[Result, ...]:
    before, after = _numbers(old), _numbers(new)
    found = []
    for name in [*after, *(n for n in before if n not in after)]:
        one, other = before.get(name), after.get(name)
        if _differ(one, other):
            unit = (other or one or ("", None, None))[0]
            found.append(
                Result(
                    name,
                    unit,
                    None if one is None else one[1],
                    None if other is None else other[1],
                    None if one is None else one[2],
                    None if other is None else other[2],
                )
            )
    return tuple(found)


_Entry = tuple[str, float | None, str | None]
"""(unit, nominal value, verdict of the target or None)"""


def _numbers(review: SheetReview | None) -> Mapping[str, _Entry]:
    if review is None:
        return {}
    verdicts = {t.target.name: t for t in review.targets}
    found: dict[str, _Entry] = {
        name: (n.unit, n.value, verdicts[name].verdict if name in verdicts else None)
        for name, n in review.metrics.items()
    }
    for name, target in verdicts.items():
        found.setdefault(name, (target.unit, target.nominal, target.verdict))
    return found


def _differ(one: _Entry | None, other: _Entry | None) -> bool:
    if one is None or other is None:
        return True
    (_, a, verdict), (_, b, verdict_now) = one, other
    if verdict != verdict_now or (a is None) != (b is None):
        return True
    return a is not None and b is not None and abs(a - b) > _SAME * max(abs(a), abs(b))
