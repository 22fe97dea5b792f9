"""What the program remarks beside numbers that are right by the model but may mislead."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from worksheet.engine.validity import REVERSE_SHARE_LIMIT
from worksheet.model import dimension as dim
from worksheet.model.quantity import format_quantity
from worksheet.model.sheet_keys import GEOMETRY
from worksheet.project.case import Case
from worksheet.review.fitted_range import outside_fit
from worksheet.review.results import Note
from worksheet.review.solved import Points

_FAR_BEYOND_POLE = 2.0
_ON_GRID = 1e-6


def of_points(points: Points) -> Iterator[Note]:
    """All remarks on a solved sheet."""
    yield from _reverse_shares(points)
    yield from _feed_through(points)
    yield from _off_grid(points.case)
    yield from outside_fit(points.solution, points.case, points.spread)
    if points.case.circuit.driven_through_resistance and points.case.given("step_size") is not None:
        yield Note(
            "settling_time",
            "the step is reckoned at the device's terminal: add the drive resistance's own time constant",
        )


def _reverse_shares(points: Points) -> Iterator[Note]:
    for name, shares in points.solved.reverse_shares.items():
        if shares[points.number] > REVERSE_SHARE_LIMIT:
            spread = points.spread(points.solution.devices[name].reverse_share)
            at = points.condition(int(np.argmax(np.where(np.isfinite(spread), spread, 0.0))))
            yield Note(
                f"{name}.drain_conductance",
                f"understated by up to {shares[points.number]:.0%}: the {name} device is near the edge of saturation "
                f"at {at.process}, "
                f"{format_quantity(at.temperature, dim.TEMPERATURE)}, {format_quantity(at.supply, dim.VOLTAGE)}",
            )


def _feed_through(points: Points) -> Iterator[Note]:
    ratio = points.solved.beyond_pole[points.number]
    if ratio > _FAR_BEYOND_POLE:
        yield Note(
            "bandwidth",
            f"up to {ratio:.2g} times the pole frequency through feed-through; the pole is the safer number",
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
                    shown = [format_quantity(x, dim.LENGTH, digits=9) for x in (chosen.number, grid)]
                    yield Note(key, f"{shown[0]} is off the layout grid of {shown[1]}")
