"""The front of current against area: points that meet all targets and that no other such point beats in both.

Found with the searches that find the recommended and the compact point: the least current, the smallest area, and
between the two the smallest area at each of a row of currents. Free is what is free for those points: bias current and
width whatever is chosen, length and load capacitance where they are left open; everything else is held.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.project.case import Case
from worksheet.solver import needed, plane
from worksheet.solver.propose import NOTHING_FREE, Free, freedoms, gate_area, point, settled_bias
from worksheet.solver.results import Point
from worksheet.solver.search import Found, Search
from worksheet.solver.variables import variables

POINTS = 13
_SAME, _DISTINCT = 1e-6, 1e-3
"""How close a current is held, and how much less area makes another point. [-]"""


@dataclass(frozen=True, eq=False)
class Front:
    """What can be had.

    Attributes:
        points: Not dominated, by growing current and falling area.
        present: Where the sheet stands.
        missed: Targets and limits that the present point misses, over the conditions of the sheet's `over`.
        free: What was free.
        reason: Why there are no points; None where there are.
    """

    points: tuple[Point, ...]
    present: Point
    missed: tuple[str, ...]
    free: tuple[str, ...]
    reason: str | None = None

    @property
    def beats(self) -> Point | None:
        """The point of the front that takes least current among those that beat the present one in both."""
        mine = self.present
        better = (
            p
            for p in self.points
            if p.values["bias_current"] <= mine.values["bias_current"] and p.gate_area <= mine.gate_area
        )
        return next(better, None)


def front(case: Case, points: int = POINTS) -> Front:
    """Find the front of a sheet.

    Args:
        case: The sheet, with a number for everything it leaves open.
        points: At how many currents the smallest area is sought.
    """
    names = freedoms(case)
    trials = needed.trials_of(case)
    present = point(case, {})
    here = {name: present.values[name] for name in ("bias_current", "width")}
    missed = plane.missed_at(trials, here)
    if not names:
        return Front((), present, missed, names, NOTHING_FREE)
    free = Free(case, variables(case), names, settled_bias(case, trials))
    search = Search(trials, free.space())
    least = search.least()
    if not least.feasible:
        return Front((), present, missed, names, "no point meets every target")
    if not free.by_inversion:
        return Front((point(case, free.place(least)),), present, missed, names)

    def area(first: Array, rest: Array) -> Array:
        return np.asarray(np.log(gate_area(case, free.moves(first, rest))))

    smallest = search.least(area, np.inf, least.place)
    ends = [free.place(smallest)] if smallest.feasible else []
    last = max(smallest.place[0] if smallest.feasible else least.place[0], least.place[0])
    for _ in range(2):  # the second time up to where the area stops falling, a process limit mostly
        places = list(_along(search, area, least, float(last), points))
        kept = _undominated([point(case, place) for place in (*(free.place(one) for one in places), *ends)])
        last = np.log(kept[-1].values["bias_current"])
        ends = [{name: one.values[name] for name in names} for one in kept]
    return Front(kept, present, missed, names)


def _along(
    search: Search, area: Callable[[Array, Array], Array], least: Found, last: float, points: int
) -> Iterator[Found]:
    """The smallest area at each of a row of currents, closer to each other where the front is steep."""
    near = least.place
    for share in np.linspace(0.0, 1.0, points) ** 2:
        cap = least.place[0] + share * max(last - least.place[0], 0.0)
        found = search.least(area, cap + _SAME, near)
        if found.feasible and found.place[0] <= cap + 2 * _SAME:
            near = found.place
            yield found


def _undominated(found: list[Point]) -> tuple[Point, ...]:
    """Points by growing current of which each has less area than all before it."""
    kept: list[Point] = []
    for one in sorted(found, key=lambda p: (p.values["bias_current"], p.gate_area)):
        if not kept or one.gate_area < kept[-1].gate_area * (1 - _DISTINCT):
            kept.append(one)
    return tuple(kept)
