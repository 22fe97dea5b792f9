"""By how much every constraint is cleared over two variables at once: what smooth boundaries are drawn from.

Where a map in cells only asks whether a constraint holds at the corners, a picture follows the line along which its
slack is 0, so a coarse grid is enough.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import needed
from worksheet.solver.plane import Span
from worksheet.solver.trials import Constraint, Mask, Trials, holds
from worksheet.solver.variables import Variable, variables

_FAR = 0.5
"""Slack beyond this is drawn as this: what lies far from a boundary does not bend it."""


@dataclass(frozen=True, eq=False)
class Relief:
    """Slack of constraints over two variables.

    Attributes:
        x, y: The variables, with where they stand.
        across, up: Places, shapes (columns,) and (rows,). [unit of each variable]
        constraints: What has to hold.
        slack: 0 on a boundary, positive where cleared, within +-0.5; shape (constraints, rows, columns). [-] or [V]
        met: Where each holds, same shape.
    """

    x: Variable
    y: Variable
    across: Array
    up: Array
    constraints: tuple[Constraint, ...]
    slack: Array
    met: Mask


def relief(trials: Trials, x: str, x_span: Span, y: str, y_span: Span, cells: tuple[int, int]) -> Relief:
    """Look at every constraint over a grid.

    Args:
        trials: The sheet's constraints.
        x, y: Two design variables.
        x_span, y_span: What is looked at of each.
        cells: Steps along each.
    Returns: Relief. With keep "inversion" the width goes with the bias current, as in its window.
    """
    subject = trials.subject
    known = variables(subject)
    across, up = x_span.edges(cells[0]), y_span.edges(cells[1])
    moves: dict[str, Array] = {}
    for name, values in zip((x, y), np.meshgrid(across, up), strict=True):
        moves.update(needed.line_of(subject, known[name])[0](values.reshape(-1)))
    slack = trials.clear(moves).slack
    shape = (len(trials.constraints), len(up), len(across))
    shown = np.clip(np.where(np.isnan(slack), -_FAR, slack), -_FAR, _FAR).reshape(shape)
    met = np.asarray(holds(trials.constraints, slack)).reshape(shape)
    return Relief(known[x], known[y], across, up, trials.constraints, shown, met)
