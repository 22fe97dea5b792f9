"""What else a sheet could be, for both front ends: its variants, a sweep, the front of current against area."""

from __future__ import annotations

import datetime
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, TypeVar

from worksheet.model.problem import Problem
from worksheet.model.sheet import Condition, Sheet, Value, Variant
from worksheet.model.sheet_keys import VARIANT
from worksheet.model.text import clean, nearest
from worksheet.project.case import Case, CaseError
from worksheet.project.evaluate import Evaluator
from worksheet.project.variants import key_of_fingers, table_of
from worksheet.review import swept
from worksheet.review.chained import ChainReview
from worksheet.review.front import Front, front
from worksheet.review.results import Review
from worksheet.review.review import solve as solve_points
from worksheet.review.sweep import DEFAULT_POINTS, Sweep, grid, sweep, wanted
from worksheet.review.swept import Axis
from worksheet.review.variants import SideBySide, side_by_side
from worksheet.session import needs
from worksheet.session.edits import ChangeSheet, Put, TakeOut
from worksheet.session.needs import shown_input
from worksheet.solver import needed
from worksheet.solver.propose import following
from worksheet.solver.results import Point
from worksheet.solver.snap import snapped

if TYPE_CHECKING:
    from worksheet.review.failing import Failing
    from worksheet.session.session import Session
    from worksheet.session.snapshot import Snapshot

Found = TypeVar("Found")
CHOOSE = "choose"
ASKED = "command line"
"""What problems with a question, not with a file, are said of."""


@dataclass(frozen=True, slots=True)
class SweepAsked:
    """A sweep as a user asks for it.

    Attributes:
        of: Name of what is swept.
        low, high: Ends as typed; None for a decade either way.
        points: How many.
        logarithmic: Equal ratios instead of equal steps.
        metrics: Metrics or figures; all targets where empty.
        decades: How far either way of the present value an end lies that is not given.
    """

    of: str
    low: str | None = None
    high: str | None = None
    points: int = DEFAULT_POINTS
    logarithmic: bool = False
    metrics: tuple[str, ...] = ()
    decades: float = 1.0


def opened(path: Path) -> tuple[Evaluator, str] | list[Problem]:
    """The project of a sheet and the sheet's name, or everything that is wrong with it.

    Args:
        path: PROJECT/sheets/NAME.toml.
    """
    found = needs.opened(path)
    return found if isinstance(found, list) else found[1:]


def solved(evaluator: Evaluator, name: str) -> Case | list[Problem]:
    """A sheet with numbers for everything, or why there are none."""
    points, problems = solve_points(evaluator, name)
    return problems if points is None else points.case


def variants_of(evaluator: Evaluator, name: str, today: datetime.date) -> SideBySide | list[Problem]:
    """A sheet and its variants, or why it cannot be reviewed as it stands."""
    found = side_by_side(evaluator, name, today)
    first = found.columns[0]
    return list(first.problems) if first.review is None else found


def front_of(evaluator: Evaluator, name: str) -> Front | list[Problem]:
    """The front of a sheet, or why it cannot be looked for."""
    case = solved(evaluator, name)
    if isinstance(case, list):
        return case
    try:
        return front(case)
    except CaseError as error:
        return [error.problem]


def sweep_of(evaluator: Evaluator, name: str, asked: SweepAsked) -> Sweep | list[Problem]:
    """A sweep of a sheet, or what is wrong with it or with the question."""
    case = solved(evaluator, name)
    if isinstance(case, list):
        return case
    key = "of"
    try:
        axis = swept.find(case, asked.of)
        key = "metric"
        curves = wanted(case, asked.metrics)
        key = "from"
        low = None if asked.low is None else axis.read(asked.low)
        key = "to"
        high = None if asked.high is None else axis.read(asked.high)
        key = "points"
        values = grid(axis, low, high, asked.points, logarithmic=asked.logarithmic, decades=asked.decades)
        return sweep(case, axis, values, curves, logarithmic=asked.logarithmic)
    except (LookupError, ValueError) as error:
        said = error.args[0] if error.args else str(error)
        return [Problem(ASKED, None, key, str(said))]
    except CaseError as error:
        return [error.problem]


def sweepable(evaluator: Evaluator, name: str) -> list[Axis] | list[Problem]:
    """Everything of a sheet that can be swept."""
    case = solved(evaluator, name)
    return case if isinstance(case, list) else list(swept.axes(case).values())


def at_point(evaluator: Evaluator, name: str, found: Front, point: Point) -> ChangeSheet | list[Problem]:
    """The request that writes a point of a front into the choices, on the layout grid and still valid."""
    case = solved(evaluator, name)
    if isinstance(case, list):
        return case
    keys = {key.name: key for key in case.stage.design_keys(case.sheet.bias.ideal)}
    wanted = {free: point.values[free] for free in found.free}
    values = snapped(needed.trials_of(case), wanted, following(case, point.values))
    pieces = tuple(Put((CHOOSE, free), shown_input(keys[free], value)) for free, value in values.items())
    return ChangeSheet(name, pieces, "point of the front taken over")


def chains_of(review: Review, name: str | None) -> tuple[tuple[ChainReview, ...], tuple[Problem, ...]]:
    """The chains of a review, or the one that is named, and what is wrong."""
    if name is None or any(chain.chain.name == name for chain in review.chains):
        return tuple(chain for chain in review.chains if name in (None, chain.chain.name)), review.problems
    known = [chain.chain.name for chain in review.chains]
    near = nearest(name, known)
    hint = f"did you mean {near}?" if near else f"expected one of {', '.join(known)}." if known else "there is none."
    unknown = Problem(ASKED, None, "chain", f"Found the unknown chain {clean(name)}; {hint}")
    return (), (*review.problems, unknown)


def in_book(
    session: Session, snapshot: Snapshot, name: str, find: Callable[[Evaluator, str], Found | list[Problem]]
) -> Found | list[Problem]:
    """What is found for a sheet of an open book, or why it cannot be looked for."""
    evaluator = session.evaluator(snapshot)
    if evaluator is None or name not in snapshot.project.sheets:
        return list(snapshot.problems_of(name) or snapshot.project.problems)
    return find(evaluator, name)


def failing_of(evaluator: Evaluator, name: str, worst: Mapping[str, Condition]) -> list[Failing] | list[Problem]:
    """What would have to be true for a block to fail, least trust first, then least room.

    Args:
        evaluator: The project.
        name: The sheet.
        worst: The worst condition of each target.
    """
    from worksheet.review.failing import failing
    from worksheet.review.fragility import fragility

    case = solved(evaluator, name)
    if isinstance(case, list):
        return case
    return failing(fragility(evaluator, {name: worst})[name])


def taking(sheet: Sheet, variant: Variant) -> ChangeSheet:
    """The request that makes a sheet what one of its variants says."""
    pieces = [Put((table_of(sheet, key), key), _stated(value)) for key, value in variant.changes.items()]
    pieces += [Put((CHOOSE, key_of_fingers(device)), count) for device, count in variant.fingers.items()]
    return ChangeSheet(sheet.name, tuple(pieces), f"variant {variant.name} taken over")


def keeping(sheet: Sheet, name: str, note: str = "") -> ChangeSheet:
    """The request that keeps what a sheet chooses now as a variant; formulas stay the sheet's own."""
    where = (VARIANT.name, name)
    pieces = [Put((*where, key), _stated(value)) for key, value in sheet.choose.items() if value.formula is None]
    pieces += [Put((*where, key_of_fingers(device)), count) for device, count in sheet.fingers.items()]
    pieces += [Put((*where, "note"), note)] if note else []
    return ChangeSheet(sheet.name, tuple(pieces), f"present choice kept as variant {name}")


def dropping(sheet: Sheet, name: str) -> ChangeSheet:
    """The request that takes a variant out."""
    return ChangeSheet(sheet.name, (TakeOut((VARIANT.name, name)),), f"variant {name} taken out")


def _stated(value: Value) -> object:
    """A value as a file states it, with what stands beside it."""
    numbers = [_number(text) for text in value.text.split(", ")] if len(value.numbers) > 1 else _number(value.text)
    beside = {
        "low": value.low,
        "high": value.high,
        "standard_error": value.standard_error,
        "source": value.source,
        "trust": value.trust,
        "note": value.note,
        "checked_by": value.checked_by,
        "checked": value.checked,
    }
    kept = {key: one for key, one in beside.items() if one not in (None, "")}
    return {"value": numbers, **kept} if kept else numbers


def _number(text: str) -> object:
    """A bare number as a number, anything else as text."""
    try:
        return float(text)
    except ValueError:
        return text
