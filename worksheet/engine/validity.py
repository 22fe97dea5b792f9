"""Where a number stands on ground that does not hold: headroom, rating, ranges, and by how much."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array, Number
from worksheet.engine.solution import NumericSolution
from worksheet.stages.stage import IN

TOLERANCE = 1e-9
"""Shortfalls below this are rounding. [V]"""

REVERSE_SHARE_LIMIT = 0.1
"""Above this the drain conductance is understated by more than a tenth: worth a warning."""


@dataclass(frozen=True, eq=False, slots=True)
class Shortfall:
    """One way in which a device or a level does not hold.

    Attributes:
        device: Name of the transistor, or "input" or "output".
        what: "saturation", "max_voltage" or "range".
        short_by: By how much, over conditions; zero or negative where it holds. [V]
    """

    device: str
    what: str
    short_by: Array

    @property
    def broken(self) -> NDArray[np.bool_]:
        """Where it does not hold."""
        return np.asarray(self.short_by > TOLERANCE, dtype=np.bool_)


def shortfalls(solution: NumericSolution) -> list[Shortfall]:
    """Everything that can fail to hold for a solved circuit.

    Args:
        solution: The solved circuit.
    Returns: one Shortfall a device and kind, whether it is broken anywhere or not
    Source: contract of the review: saturation with its margin, rating between any two terminals, gates and levels
        within the supply, the output within its range, also after an assumed step.
    """
    found = []
    for operating in solution.transistors:
        found.append(Shortfall(operating.name, "saturation", -operating.headroom))
        span = solution.levels.terminals(operating.device).span
        found.append(Shortfall(operating.name, "max_voltage", np.asarray(span - operating.parameters.max_voltage)))
    return found + list(_ranges(solution))


def _ranges(solution: NumericSolution) -> Iterator[Shortfall]:
    levels, supply, step = solution.levels, solution.inputs.supply, solution.inputs.step_size
    for name, gate in levels.gates.items():
        driven = next(d for d in solution.inputs.circuit.devices if d.name == name).gate == IN
        moved = step if driven and step is not None else 0.0
        yield Shortfall(name, "range", _outside(gate, 0.0, supply, moved, moved))
    if levels.input_is_level:
        moved = 0.0 if step is None else step
        yield Shortfall("input", "range", _outside(levels.input, 0.0, supply, moved, moved))
    yield Shortfall("output", "range", _output(solution))


def _output(solution: NumericSolution) -> Array:
    levels, step = solution.levels, solution.inputs.step_size
    still = worst = _outside(levels.output, levels.output_low, levels.output_high, 0.0, 0.0)
    if step is None:
        return still
    for sign in (1.0, -1.0):
        low_moves, high_moves = levels.range_moves(sign * step)
        moved = _output_after(solution, sign * step)
        worst = np.maximum(
            worst, _outside(moved, levels.output_low + low_moves, levels.output_high + high_moves, 0.0, 0.0)
        )
    return np.where(np.asarray(step) > 0, worst, still)


def _output_after(solution: NumericSolution, step: Number) -> Array:
    """Output in the frame after a step at the input: exact for a source output, by DC gain for a drain output. [V]"""
    levels, stage = solution.levels, solution.inputs.circuit.stage
    if not stage.source_output:
        with np.errstate(all="ignore"):
            return np.asarray(levels.output + solution.signed_gain() * step)
    if stage.drive == "gate":
        return levels.output_for_gate(levels.input + step)
    return levels.output_for_gate(levels.gates[stage.transistors[0].name], levels.input + step)


def _outside(value: Number, low: Number, high: Number, down: Number, up: Number) -> Array:
    return np.asarray(np.maximum(low - (value - down), (value + up) - high))
