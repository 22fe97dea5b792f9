"""A stage that loads itself: at an inversion that is kept the width grows with the current, and no current is enough.

What would be: the smallest inversion coefficient at the present length, or the largest length at the present inversion.
"""

from __future__ import annotations

from collections.abc import Collection

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver.propose import INVERSION_RANGE
from worksheet.solver.search import Moves, Search, Space
from worksheet.solver.subject import scalar
from worksheet.solver.trials import Trials, holds
from worksheet.solver.variables import INVERSION, square_current, variables


def helped(trials: Trials, line: Moves, kept: float) -> dict[str, dict[str, float]]:
    """Targets that no current meets at the inversion that is kept, and what would make one enough, where anything does.

    Args:
        trials: The sheet's constraints.
        line: Currents, with the widths that go with them. [unit of each key]
        kept: The inversion coefficient that is kept.
    """
    met = holds(trials.constraints, trials.clear(line).slack)
    never = dict.fromkeys(c.name for c, row in zip(trials.constraints, met, strict=True) if c.target and not row.any())
    found = {name: enough_with(trials, [name], kept) for name in never}
    return {name: help_ for name, help_ in found.items() if help_}


def enough_with(trials: Trials, targets: Collection[str], kept: float) -> dict[str, float]:
    """What makes some current enough for targets that none is enough for.

    Args:
        trials: The sheet's constraints.
        targets: Names of the targets.
        kept: The inversion coefficient that is kept.
    Returns: the smallest inversion coefficient and the largest length, each with the other as it is, where there is one
    Source: physics, section 4: I >= 2 pi f C_L / (G/U_T - 2 pi f c_w L/(I_sq IC)) needs the bracket positive.
    """
    subject, every = trials.subject, variables(trials.subject)
    length, width = every["length"], every["width"]
    wanted = [k for k, c in enumerate(trials.constraints) if c.name in targets]
    squares = square_current(subject)
    lowest = width.low * squares * kept / length.high
    highest = width.high * squares * INVERSION_RANGE[1] / length.low
    currents = (float(np.log(lowest)), float(np.log(highest)))

    def rooms(moves: Moves) -> Array:
        return np.array([np.log(moves["width"] / width.low), np.log(width.high / moves["width"])])

    def by_inversion(first: Array, rest: Array) -> Moves:
        current, present = np.exp(rest[:, 0]), scalar(subject.value("length"))
        return {"bias_current": current, "width": current * present / (squares * np.exp(first))}

    def by_length(first: Array, rest: Array) -> Moves:
        current, shorter = np.exp(rest[:, 0]), np.exp(-first)
        return {"bias_current": current, "length": shorter, "width": current * shorter / (squares * kept)}

    found: dict[str, float] = {}
    upwards = (float(np.log(kept)), float(np.log(max(kept, INVERSION_RANGE[1]))))
    space = Space(upwards, (currents,), by_inversion, lambda f, r: rooms(by_inversion(f, r)))
    smallest = Search(trials, space, wanted).least()
    if smallest.feasible:
        found[INVERSION.name] = float(np.exp(smallest.place[0]))
    if "length" not in subject.sheet.assume:
        spans = (-float(np.log(length.present)), -float(np.log(length.low)))
        space = Space(spans, (currents,), by_length, lambda f, r: rooms(by_length(f, r)))
        largest = Search(trials, space, wanted).least()
        if largest.feasible:
            found[length.name] = float(np.exp(-largest.place[0]))
    return found
