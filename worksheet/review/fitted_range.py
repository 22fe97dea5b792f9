"""Remarks on a sheet that uses a device beyond the range its parameters were fitted over ([fitted.NAME])."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.engine.solution import NumericSolution
from worksheet.model import dimension as dim
from worksheet.model.dimension import Dimension
from worksheet.model.quantity import format_quantity
from worksheet.project.case import Case
from worksheet.review.results import Note


@dataclass(frozen=True, slots=True)
class _Side:
    """One limit of a fitted range: its key, what it limits, and what may lie beyond it unnoticed."""

    key: str
    title: str
    quantity: str
    dimension: Dimension
    relative: float = 0.0
    absolute: float = 0.0

    @property
    def upper(self) -> bool:
        """Whether it limits from above."""
        return self.key.endswith("_high")


_SIDES = (
    _Side("inversion_low", "inversion coefficient", "inversion", dim.NUMBER, relative=0.05),
    _Side("inversion_high", "inversion coefficient", "inversion", dim.NUMBER, relative=0.05),
    _Side("length_low", "length", "length", dim.LENGTH, relative=0.01),
    _Side("length_high", "length", "length", dim.LENGTH, relative=0.01),
    _Side("source_voltage_high", "source-bulk voltage", "source", dim.VOLTAGE, absolute=0.05),
    _Side("drain_voltage_high", "drain-source voltage", "drain", dim.VOLTAGE, absolute=0.05),
    _Side("temperature_low", "temperature", "temperature", dim.TEMPERATURE, absolute=5.0),
    _Side("temperature_high", "temperature", "temperature", dim.TEMPERATURE, absolute=5.0),
)


def outside_fit(solution: NumericSolution, case: Case, spread: Callable[[Array], Array]) -> Iterator[Note]:
    """A remark for each limit of a fitted range that a device of the sheet passes in any condition.

    Args:
        solution, case: The solved sheet.
        spread: Brings an array over its points.
    """
    for name, device in solution.devices.items():
        model = case.model(device.device).name
        fitted = case.conditions.process.fitted.get(model, {})
        used: dict[str, Number] = {
            "inversion": device.inversion_coefficient,
            "length": device.length,
            "source": solution.levels.source_bulk(device.device),
            "drain": device.drain_source,
            "temperature": case.conditions.temperature,
        }
        for side in _SIDES:
            if side.key in fitted:
                worst = _beyond(spread(np.asarray(used[side.quantity])), float(fitted[side.key]), side)
                if worst is not None:
                    limit = format_quantity(float(fitted[side.key]), side.dimension)
                    yield Note(
                        f"{name}.{side.key.rpartition('_')[0]}",
                        f"outside the range {model} was fitted over: {side.title} "
                        f"{format_quantity(worst, side.dimension)}, fitted {'up to' if side.upper else 'from'} {limit}",
                    )


def _beyond(values: Array, limit: float, side: _Side) -> float | None:
    """The value that passes a limit furthest, None where none does. [unit of the limit]"""
    known = values[np.isfinite(values)]
    if not len(known):
        return None
    worst = float(known.max() if side.upper else known.min())
    slack = side.relative * abs(limit) + side.absolute
    passed = worst > limit + slack if side.upper else worst < limit - slack
    return worst if passed else None
