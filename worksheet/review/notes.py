"""What the program remarks beside numbers that are right by the model but may mislead."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from worksheet.device.arrays import Array
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import REVERSE_SHARE_LIMIT
from worksheet.model import dimension as dim
from worksheet.model.quantity import format_quantity
from worksheet.model.sheet_keys import GEOMETRY
from worksheet.project.case import Case
from worksheet.review.fitted_range import outside_fit
from worksheet.review.results import Note

_FAR_BEYOND_POLE = 2.0
_ON_GRID = 1e-6


def of_points(solution: NumericSolution, case: Case, spread: Callable[[Array], Array]) -> Iterator[Note]:
    """All remarks on a solved sheet.

    Args:
        solution, case: The solved sheet.
        spread: Brings an array over its points.
    """
    yield from _reverse_shares(solution, case, spread)
    yield from _feed_through(solution, spread)
    yield from _off_grid(case)
    yield from outside_fit(solution, case, spread)
    if solution.inputs.circuit.driven_through_resistance and solution.inputs.step_size is not None:
        yield Note(
            "settling_time",
            "the step is reckoned at the device's terminal: add the drive resistance's own time constant",
        )


def _reverse_shares(solution: NumericSolution, case: Case, spread: Callable[[Array], Array]) -> Iterator[Note]:
    for name, device in solution.devices.items():
        shares = spread(device.reverse_share)
        shares = np.where(np.isfinite(shares), shares, 0.0)
        place = int(np.argmax(shares))
        if shares[place] > REVERSE_SHARE_LIMIT:
            at = case.conditions.conditions[place % len(case.conditions)]
            yield Note(
                f"{name}.drain_conductance",
                f"understated by up to {shares[place]:.0%}: the {name} device is near the edge of saturation at "
                f"{at.process}, "
                f"{format_quantity(at.temperature, dim.TEMPERATURE)}, {format_quantity(at.supply, dim.VOLTAGE)}",
            )


def _feed_through(solution: NumericSolution, spread: Callable[[Array], Array]) -> Iterator[Note]:
    with np.errstate(invalid="ignore"):
        ratio = spread(solution["bandwidth"] / solution["pole_frequency"])
    if np.any(ratio > _FAR_BEYOND_POLE):
        yield Note(
            "bandwidth",
            f"up to {np.nanmax(ratio):.2g} times the pole frequency through feed-through; the pole is the safer number",
        )


def _off_grid(case: Case) -> Iterator[Note]:
    for device in case.circuit.devices:
        grid = case.model(device).number("grid")
        for name in GEOMETRY:
            key = device.key(name)
            chosen = case.sheet.choose.get(key)
            if chosen is not None and chosen.number is not None:
                steps = chosen.number / grid
                if abs(steps - round(steps)) > _ON_GRID * max(1.0, steps):
                    shown = [format_quantity(x, dim.LENGTH) for x in (chosen.number, grid)]
                    yield Note(key, f"{shown[0]} is off the layout grid of {shown[1]}")
