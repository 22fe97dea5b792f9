"""A proposal brought to what can be drawn and typed: sizes on the grid, the rest to few digits, all still valid."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import product

import numpy as np

from worksheet.model.sheet_keys import GEOMETRY
from worksheet.solver.bias_size import BiasSize
from worksheet.solver.propose import Free
from worksheet.solver.search import Search
from worksheet.solver.subject import Subject, scalar
from worksheet.solver.trials import Trials, holds
from worksheet.solver.variables import Variable, variables

_DIGITS = 4
_STEPS = 3


def snapped(trials: Trials, proposal: Mapping[str, float], bias: BiasSize | None = None) -> dict[str, float]:
    """A proposal with its sizes on the grid and its other values to four digits, moved to the safe side.

    Args:
        trials: The sheet's constraints.
        proposal: Values by key. [unit of each key]
        bias: What sizes go by that the sheet leaves out of its current source's transistor; None for no such sizes.
    Returns: values that meet everything where such are near, else the plainly rounded proposal; the least current of
        the candidates, then the least area
    """
    every = variables(trials.subject)
    sizes = {
        name: _grid_points(trials.subject, every[name], value) for name, value in proposal.items() if every[name].grid
    }
    rest = {name: value for name, value in proposal.items() if name not in sizes}
    best: tuple[float, float] | None = None
    chosen = {name: points[0] for name, points in sizes.items()} | {n: _rounded(v, up=None) for n, v in rest.items()}
    for point in product(*sizes.values()):
        candidate = dict(zip(sizes, point, strict=True))
        found = _completed(trials, candidate, rest, bias)
        if found is None:
            continue
        rank = (found.get("bias_current", 0.0), float(np.prod(list(point))))
        if best is None or rank < best:
            best, chosen = rank, found
    return chosen


def _grid_points(subject: Subject, variable: Variable, value: float) -> list[float]:
    """Grid points around a size, nearest first, within its limits; for several fingers, of each finger. [m]"""
    assert variable.grid is not None  # asked for sizes only
    owner = next((d for d in subject.circuit.devices if variable.name in {d.key(n) for n in GEOMETRY}), None)
    units = subject.sheet.fingers.get(owner.name, 1) if owner is not None and variable.name == owner.key("width") else 1
    step = variable.grid * units
    near = round(value / step)
    points = [(near + k) * step for k in sorted(range(-_STEPS, _STEPS + 1), key=abs)]
    inside = [p for p in points if variable.low * (1 - 1e-9) <= p <= variable.high * (1 + 1e-9)]
    return [float(f"{p:.12g}") for p in inside] or [value]


def _completed(
    trials: Trials, sizes: Mapping[str, float], rest: Mapping[str, float], bias: BiasSize | None
) -> dict[str, float] | None:  # fmt: skip
    """Sizes with the other values moved as little as needed to meet everything, None where that is not possible."""
    exact = {**sizes, **rest}
    for up in (None, True, False):
        rounded = {**sizes, **{name: _rounded(value, up) for name, value in rest.items()}}
        if _meets(trials, rounded, bias):
            return rounded
    if _meets(trials, exact, bias):
        return exact
    if "bias_current" not in rest:
        return None
    held = Trials(
        trials.subject.moved({n: v for n, v in exact.items() if n != "bias_current"}),
        trials.over,
        trials.vertices,
        trials.waived,
    )
    found = Search(held, Free(held.subject, variables(held.subject), ("bias_current",), bias).space()).least()
    if not found.feasible:
        return None
    current = float(np.exp(found.place[0]))
    for candidate in (_rounded(current, up=True), current):
        if _meets(trials, {**exact, "bias_current": candidate}, bias):
            return {**exact, "bias_current": candidate}
    return None


def _meets(trials: Trials, values: Mapping[str, float], bias: BiasSize | None) -> bool:
    if bias is not None:
        current, length = (values.get(n, scalar(trials.subject.value(n))) for n in ("bias_current", "length"))
        values = {**values, **{name: float(size) for name, size in bias.sizes(current, length).items()}}
    moves = {name: np.array([value]) for name, value in values.items()}
    return bool(holds(trials.constraints, trials.clear(moves).slack).all())


def _rounded(value: float, up: bool | None) -> float:
    """A value to four significant digits: nearest, or up, or down."""
    if value == 0:
        return 0.0
    unit = 10.0 ** (np.floor(np.log10(abs(value))) - _DIGITS + 1)
    law = np.round if up is None else np.ceil if up else np.floor
    return float(f"{law(value / unit) * unit:.{_DIGITS - 1}e}")
