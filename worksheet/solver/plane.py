"""Where all targets hold over two variables at once: every constraint at the corners of a grid of cells.

What a map of the window is drawn from. A constraint's boundary runs through every cell whose corners disagree about
it, so a cell of the grid is as fine as the map can be wrong.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import needed
from worksheet.solver.subject import Subject
from worksheet.solver.trials import Constraint, Mask, Trials, holds
from worksheet.solver.variables import Variable, variables

_CHUNK = 2048
_LEAST_DECADES, _MOST_DECADES = 1.5, 6.0
_ROOM = 0.3
"""Decades beyond the outermost bound."""


@dataclass(frozen=True, slots=True)
class Span:
    """A stretch of one variable's axis, both ends positive. [unit of the variable]"""

    low: float
    high: float

    @property
    def decades(self) -> float:
        """Its length. [decades]"""
        return float(np.log10(self.high / self.low))

    def edges(self, cells: int) -> Array:
        """Ends of equal steps in the logarithm, shape (cells + 1,)."""
        return np.geomspace(self.low, self.high, cells + 1)

    def cell(self, value: float, cells: int) -> int | None:
        """The step that a value lies in, None where it lies outside."""
        if not self.low <= value <= self.high:
            return None
        return min(int(np.log(value / self.low) / np.log(self.high / self.low) * cells), cells - 1)

    def closer(self, centre: float, factor: float) -> Span:
        """The same stretch around a value, `factor` times as long in the logarithm."""
        half = 0.5 * factor * np.log(self.high / self.low)
        return Span(float(centre * np.exp(-half)), float(centre * np.exp(half)))


@dataclass(frozen=True, eq=False)
class Plane:
    """Constraints over two variables.

    Attributes:
        x, y: The variables, with where they stand.
        x_span, y_span: What is looked at of each.
        constraints: What has to hold.
        met: Where each does, shape (constraints, y cells + 1, x cells + 1), at the corners of the cells.
    """

    x: Variable
    y: Variable
    x_span: Span
    y_span: Span
    constraints: tuple[Constraint, ...]
    met: Mask

    @property
    def crossed(self) -> Mask:
        """Cells that a constraint's boundary runs through, shape (constraints, y cells, x cells)."""
        corners = _corners(self.met)
        return np.asarray(np.any(corners, axis=0) & ~np.all(corners, axis=0))

    @property
    def holds(self) -> Mask:
        """Cells in which everything holds at every corner, shape (y cells, x cells)."""
        return np.asarray(np.all(_corners(np.all(self.met, axis=0)), axis=0))

    @property
    def binding(self) -> Mask:
        """Of the crossed cells, those where the constraint bounds the region in which all the others hold."""
        found = np.zeros_like(self.crossed)
        for k in range(len(self.constraints)):
            others = np.all(np.delete(self.met, k, axis=0), axis=0)
            found[k] = self.crossed[k] & np.any(_corners(others), axis=0)
        return found


def _corners(met: Mask) -> Mask:
    """The four corners of every cell along a new first axis."""
    return np.stack([met[..., :-1, :-1], met[..., :-1, 1:], met[..., 1:, :-1], met[..., 1:, 1:]])


def around(trials: Trials, name: str, bounds: Mapping[str, tuple[float, ...]]) -> Span:
    """A stretch that shows where a variable stands and every bound near it.

    Args:
        trials: The sheet's constraints.
        name: The variable.
        bounds: Known bounds by variable. [unit of the variable]
    """
    variable = variables(trials.subject)[name]
    present = variable.present if variable.present > 0 else variable.low * 1e6
    near = [b for b in bounds.get(name, ()) if b > 0 and abs(np.log10(b / present)) < _MOST_DECADES / 2]
    low, high = (float(f([present, *near])) for f in (min, max))
    low, high = low / 10**_ROOM, high * 10**_ROOM
    short = _LEAST_DECADES - float(np.log10(high / low))
    if short > 0:
        low, high = low / 10 ** (short / 2), high * 10 ** (short / 2)
    return Span(low, high)


def plane(
    trials: Trials, x: str, x_span: Span, x_cells: int, y: str, y_span: Span, y_cells: int
) -> Plane:  # fmt: skip
    """Look at every constraint at the corners of a grid.

    Args:
        trials: The sheet's constraints.
        x, y: Two design variables.
        x_span, y_span: What is looked at of each.
        x_cells, y_cells: Number of cells along each.
    Returns: Plane. With keep "inversion" the width goes with the bias current, as in its window; the ends of a range
        go with its value.
    """
    subject = trials.subject
    known = variables(subject)
    xs, ys = np.meshgrid(x_span.edges(x_cells), y_span.edges(y_cells))
    lines = [needed.line_of(subject, known[name])[0] for name in (x, y)]
    flat = (xs.reshape(-1), ys.reshape(-1))
    met = []
    for start in range(0, len(flat[0]), _CHUNK):
        moves: dict[str, Array] = {}
        for line, values in zip(lines, flat, strict=True):
            moved = line(values[start : start + _CHUNK])
            moves.update({name: trials.with_range(name, v) for name, v in moved.items()})
        met.append(holds(trials.constraints, trials.clear(moves).slack))
    shape = (len(trials.constraints), y_cells + 1, x_cells + 1)
    return Plane(known[x], known[y], x_span, y_span, trials.constraints, np.concatenate(met, axis=1).reshape(shape))


def missed_at(trials: Trials, values: Mapping[str, float]) -> tuple[str, ...]:
    """Names of the constraints that do not hold at one place. Values by design variable. [unit of the variable]"""
    subject: Subject = trials.subject
    known = variables(subject)
    moves: dict[str, Array] = {}
    for name, value in values.items():
        moved = needed.line_of(subject, known[name])[0](np.array([value]))
        moves.update({key: trials.with_range(key, v) for key, v in moved.items()})
    met = holds(trials.constraints, trials.clear(moves).slack)[:, 0]
    return tuple(dict.fromkeys(c.name for c, ok in zip(trials.constraints, met, strict=True) if not ok))
