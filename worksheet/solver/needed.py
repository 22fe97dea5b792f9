"""Everything that solve says of one sheet: windows, recommended and compact point, conflict."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import conflict, propose, ranges, self_loading
from worksheet.solver import windows as window
from worksheet.solver.results import Conflict, Solved, Window
from worksheet.solver.subject import Subject, scalar
from worksheet.solver.trials import Trials, holds
from worksheet.solver.variables import INVERSION, Variable, inversion, on_request, square_current, variables
from worksheet.solver.windows import Axis


def trials_of(subject: Subject, over: str | None = None) -> Trials:
    """The constraints of a sheet over the conditions of its `over`, or of the one given."""
    sheet = subject.sheet
    return Trials(subject, over or sheet.solve.over, ranges.worst_points(subject), ranges.waived_targets(sheet))


def solve(
    subject: Subject, over: str | None = None, early: Callable[[Mapping[str, Window]], None] | None = None
) -> Solved:
    """What is needed of one sheet.

    Args:
        subject: The sheet, with a number for everything it leaves open.
        over: "all" or "nominal"; the sheet's own where None.
        early: Told the windows before points are looked for, which takes some ten times as long.
    Returns: Solved
    """
    trials = trials_of(subject, over)
    needed = windows(trials)
    if early is not None:
        early(needed)
    best = propose.optimum(subject, trials)
    present = _present_meets(trials)
    none_to_find = best.recommended is None and best.reason in (propose.NO_BOUND, propose.NOTHING_FREE)
    feasible = best.recommended is not None or (none_to_find and present)
    found: Conflict | None = None
    if not feasible and not none_to_find:
        found = conflict.conflict(trials, best.free)
    elif not feasible:
        found = conflict.at_present(trials, best.free, needed)
    return Solved(
        sheet=subject.sheet.name,
        over=trials.over,
        feasible=feasible,
        reason=best.reason,
        needed=needed,
        recommended=best.recommended,
        compact=best.compact,
        conflict=found,
        proposed={name: scalar(subject.value(name)) for name in subject.open_keys},
        self_loading=_self_loading(trials),
    )


def windows(trials: Trials) -> Mapping[str, Window]:
    """The window of every design variable that some target bounds, with the others held."""
    axes = [axis_of(trials.subject, variable) for variable in variables(trials.subject).values()]
    followed = [axis for axis in axes if _alone(trials, axis.variable.name)]
    plain = [axis for axis in axes if axis not in followed]
    batches = [plain, *([axis] for axis in followed)] if plain else [[axis] for axis in followed]
    found = {w.name: w for batch in batches for w in window.windows(trials, batch) if w is not None}
    return {axis.variable.name: found[axis.variable.name] for axis in axes if axis.variable.name in found}


def _self_loading(trials: Trials) -> Mapping[str, Mapping[str, float]]:
    """What would help targets that no current meets at the inversion that is kept."""
    subject = trials.subject
    if subject.sheet.solve.keep != "inversion":
        return {}
    axis = axis_of(subject, variables(subject)["bias_current"])
    return self_loading.helped(trials, axis.line(axis.places()), kept_inversion(subject))


def kept_inversion(subject: Subject) -> float:
    """The inversion coefficient that is kept while the bias current is back-computed. [-]"""
    return subject.sheet.solve.inversion_coefficient or inversion(subject)


def _alone(trials: Trials, name: str) -> bool:
    """Whether a variable must not be held while others move: it follows a formula, or has ends of a range."""
    stated = trials.subject.stated(name)
    return name in trials.vertices or (stated is not None and stated.formula is not None)


def axis_of(subject: Subject, variable: Variable) -> Axis:
    """A variable's axis: what moves along it, how far it goes, and for the bias current what is kept."""
    return Axis(variable, *line_of(subject, variable))


def line_of(
    subject: Subject, variable: Variable
) -> tuple[Callable[[Array], Mapping[str, Array]], tuple[float, float], str]:
    """The moves along a variable's axis, how far it goes, and for the bias current what is kept."""

    def alone(values: Array) -> Mapping[str, Array]:
        return {variable.name: values}

    if variable.name == INVERSION.name:
        return _by_inversion(subject)
    if variable.name != "bias_current":
        return alone, (variable.low, variable.high), ""
    if subject.sheet.solve.keep != "inversion":
        return alone, (variable.low, variable.high), "geometry"
    per_width = scalar(subject.value("length")) / (square_current(subject) * kept_inversion(subject))

    def with_width(values: Array) -> Mapping[str, Array]:
        return {"bias_current": values, "width": values * per_width}

    width = variables(subject)["width"]
    return with_width, (width.low / per_width, width.high / per_width), "inversion"


def _by_inversion(subject: Subject) -> tuple[Callable[[Array], Mapping[str, Array]], tuple[float, float], str]:
    """The axis of the inversion coefficient: current and length held, the width follows."""
    times = scalar(subject.value("bias_current")) * scalar(subject.value("length")) / square_current(subject)

    def with_width(values: Array) -> Mapping[str, Array]:
        return {"width": times / values}

    width = variables(subject)["width"]
    return with_width, (times / width.high, times / width.low), ""


def window_of(trials: Trials, name: str) -> Window | None:
    """The window of one design variable, or on request of the inversion coefficient, an assumption or an own name.

    Raises: KeyError where the sheet has nothing of that name.
    """
    variable = variables(trials.subject).get(name) or on_request(trials.subject, name)
    if variable is None:
        raise KeyError(name)
    return window.windows(trials, [axis_of(trials.subject, variable)])[0]


def _present_meets(trials: Trials) -> bool:
    """Whether the sheet as it stands meets everything."""
    name = "bias_current"
    cleared = trials.clear({name: np.array([scalar(trials.subject.value(name))])})
    return bool(holds(trials.constraints, cleared.slack).all())
