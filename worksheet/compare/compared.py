"""Two reviewed projects laid side by side by meaning: what was stated, and what that did to every result."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace

from worksheet.compare import inputs
from worksheet.compare.cause import Cause, Causes
from worksheet.compare.inputs import Moved
from worksheet.model.sheet import TOLERANCE
from worksheet.project.case import CaseError
from worksheet.project.discover import Project
from worksheet.project.evaluate import Evaluator
from worksheet.review.results import Review, SheetReview
from worksheet.solver import goals, needed
from worksheet.solver.results import Window

_SAME = TOLERANCE
"""Relative: nearer than this two results are one, as for a verdict; what is proposed is searched for."""

MOST_DEEP = 30
"""Sheets up to which causes and needs are worked out unasked."""

NEEDED = ("bias_current", "load_capacitance")
"""Design variables whose needs are compared."""


@dataclass(frozen=True, slots=True)
class Result:
    """One metric or target before and after. Numbers in `unit`, None where there is none.

    Attributes:
        metric: Its key, or the name of a figure.
        unit: SI unit.
        old, new: At the nominal condition. [unit]
        old_verdict, new_verdict: Of the target on it, None where there is none.
        old_margin, new_margin: Of the target at its worst condition. [-]
        cause: The movement shared out among the inputs that changed; None where that was not asked for, or where one of
            the two numbers does not exist.
    """

    metric: str
    unit: str
    old: float | None
    new: float | None
    old_verdict: str | None
    new_verdict: str | None
    old_margin: float | None = None
    new_margin: float | None = None
    cause: Cause | None = None


@dataclass(frozen=True, slots=True)
class Need:
    """One end of what is needed of a design variable, before and after; None for no end. [unit]"""

    variable: str
    side: str
    unit: str
    old: float | None
    new: float | None
    old_set_by: str
    new_set_by: str


@dataclass(frozen=True, slots=True)
class SheetChange:
    """One sheet before and after: "added", "removed", "changed", or "affected" by something outside its file.

    Attributes:
        sheet, status: The sheet.
        inputs: What its file states differently.
        results: Metrics and targets that moved.
        through: The ways on which it was reached: "process", "conditions", "sheet NAME".
        needed: Ends of the needed bias current and load capacitance that moved; empty where that was not asked for.
    """

    sheet: str
    status: str
    inputs: tuple[Moved, ...]
    results: tuple[Result, ...]
    through: tuple[str, ...] = ()
    needed: tuple[Need, ...] = ()


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
    """A project and its review; `evaluator` of the project, None where it cannot be evaluated."""

    project: Project
    review: Review
    evaluator: Evaluator | None = None


def compare(old: State, new: State, deep: bool | None = None) -> Comparison:
    """Lay two states of a project side by side.

    Args:
        old, new: Both reviewed.
        deep: Whether causes and needs are wanted too; None for yes, unless more than MOST_DEEP sheets moved.
    Returns: Comparison
    """
    sheets = [change for name in _names(old, new) if (change := _sheet(old, new, name)) is not None]
    causes = Causes((old.project, old.review), (new.project, new.review))
    sheets = [replace(one, through=_through(old, new, causes, one)) for one in sheets]
    if deep or (deep is None and len(sheets) <= MOST_DEEP):
        sheets = [_deep(old, new, causes, one) for one in sheets]
    return Comparison(
        project=inputs.moved(_project(old), _project(new)),
        process=inputs.moved(_process(old), _process(new)),
        sheets=tuple(sheets),
    )


def _through(old: State, new: State, causes: Causes, change: SheetChange) -> tuple[str, ...]:
    """On which ways from outside its file a sheet was reached."""
    if not change.results:
        return ()
    ways = []
    for key in causes.players(change.sheet):
        head = key.partition(".")[0]
        if head in ("process", "conditions") or key.startswith("sheet "):
            ways.append(key if key.startswith("sheet ") else head)
    return tuple(dict.fromkeys((*ways, *_around_nominal(old, new, change))))


def _around_nominal(old: State, new: State, change: SheetChange) -> Iterator[str]:
    """Ways on which only other conditions than the nominal one were reached: worst cases move, and margins."""
    name = change.sheet
    if old.evaluator is None or new.evaluator is None or not {name} <= old.project.sheets.keys() & new.project.sheets:
        return
    before, after = (state.evaluator.conditions(name).conditions for state in (old, new) if state.evaluator)
    own = {f"assume.{key}" for key in ("temperature", "supply")}
    if set(before) != set(after) and not own & {moved.key for moved in change.inputs}:
        yield "conditions"
    then, now = ({} if state.project.process is None else state.project.process.corners for state in (old, new))
    if any(then.get(at.process) != now.get(at.process) for at in {*before, *after}):
        yield "process"


def _deep(old: State, new: State, causes: Causes, change: SheetChange) -> SheetChange:
    """A sheet's change with the causes of what moved, and with what is needed now and was before."""
    if not {change.sheet} <= old.project.sheets.keys() & new.project.sheets:
        return change
    moved = {
        r.metric: r.new - r.old for r in change.results if r.old is not None and r.new is not None and r.new != r.old
    }
    shared = causes.of(change.sheet, moved) if moved else {}
    results = tuple(replace(one, cause=shared.get(one.metric)) for one in change.results)
    return replace(change, results=results, needed=tuple(_needs(old, new, change.sheet)))


def _needs(old: State, new: State, name: str) -> Iterator[Need]:
    before, after = _windows(old, name), _windows(new, name)
    for variable in NEEDED:
        for side in goals.SIDES:
            (was, was_by, unit), (now, now_by, unit_now) = _end(before, variable, side), _end(after, variable, side)
            same = was == now or (was is not None and now is not None and abs(was - now) <= _SAME * abs(now))
            if not same:
                yield Need(variable, side, unit or unit_now, was, now, was_by, now_by)


def _windows(state: State, name: str) -> Mapping[str, Window]:
    if state.evaluator is None or name not in state.project.sheets:
        return {}
    try:
        return needed.windows(needed.trials_of(state.evaluator.case(name)))
    except CaseError:
        return {}


def _end(windows: Mapping[str, Window], variable: str, side: str) -> tuple[float | None, str, str]:
    window = windows.get(variable)
    if window is None or window.region is None:
        return None, "", "" if window is None else window.unit
    return getattr(window.region, side), getattr(window.region, f"{side}_set_by") or "", window.unit


def _project(state: State) -> inputs.Stated:
    return {} if state.project.file is None else inputs.of_project(state.project.file)


def _process(state: State) -> inputs.Stated:
    return {} if state.project.process is None else inputs.of_process(state.project.process)


def _names(old: State, new: State) -> list[str]:
    return sorted(_there(old) | _there(new))


def _there(state: State) -> set[str]:
    """Every sheet that has a file, readable or not."""
    return {*state.project.sheets, *state.project.bad}


def _sheet(old: State, new: State, name: str) -> SheetChange | None:
    before, after = old.project.sheets.get(name), new.project.sheets.get(name)
    results = _results(_reviewed(old, name), _reviewed(new, name))
    status = "added" if name not in _there(old) else "removed" if name not in _there(new) else "changed"
    if name in old.project.bad or name in new.project.bad:  # there, but not to be read or not to be reviewed
        nothing = before is None and after is None and status == "changed"
        return None if nothing else SheetChange(name, status, (), results)
    stated = inputs.moved(
        {} if before is None else inputs.of_sheet(before), {} if after is None else inputs.of_sheet(after)
    )
    if status != "changed":
        return SheetChange(name, status, stated, results)
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
            unit = (other or one or ("", None, None, None))[0]
            found.append(
                Result(
                    name,
                    unit,
                    None if one is None else one[1],
                    None if other is None else other[1],
                    None if one is None else one[2],
                    None if other is None else other[2],
                    None if one is None else one[3],
                    None if other is None else other[3],
                )
            )
    return tuple(found)


_Entry = tuple[str, float | None, str | None, float | None]
"""(unit, nominal value, verdict of the target or None, its margin)"""


def _numbers(review: SheetReview | None) -> Mapping[str, _Entry]:
    if review is None:
        return {}
    verdicts = {t.target.name: t for t in review.targets}
    found: dict[str, _Entry] = {
        name: (
            n.unit,
            n.value,
            verdicts[name].verdict if name in verdicts else None,
            verdicts[name].margin if name in verdicts else None,
        )
        for name, n in review.metrics.items()
    }
    for name, target in verdicts.items():
        found.setdefault(name, (target.unit, target.nominal, target.verdict, target.margin))
    return found


def _differ(one: _Entry | None, other: _Entry | None) -> bool:
    if one is None or other is None:
        return True
    (_, a, verdict, margin), (_, b, verdict_now, margin_now) = one, other
    return verdict != verdict_now or _apart(a, b) or _apart(margin, margin_now)


def _apart(one: float | None, other: float | None) -> bool:
    if one is None or other is None:
        return one is not other
    return abs(one - other) > _SAME * max(abs(one), abs(other))
