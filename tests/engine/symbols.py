"""Drawn sheets in the algebra: the numbers of every level at a condition, to hold against the numeric engine."""

from __future__ import annotations

import math
import random
from pathlib import Path

from tests.precision.draw import draw
from tests.solver.drawn import case_of, every_metric
from worksheet.engine.symbolic.point import Point
from worksheet.model import operating
from worksheet.model.metrics import Reason
from worksheet.project.case import Case
from worksheet.solver.present import Present
from worksheet.solver.stated import at

RELATIVE = 1e-9
VOLT = 1e-9
"""Voltages are differences that may come out near zero: held to a nanovolt."""

NOISES = {"output_noise", "input_noise", "offset", "offset_limit"}
"""Voltages that are no differences."""


def drawn(kind: tuple[str, str, str], seed: object, folder: Path) -> Case | None:
    """A random sheet of a kind, None where it cannot be evaluated or no level keeps its devices saturated."""
    case = case_of(folder, draw(random.Random(f"{kind}{seed}"), *kind, want_invalid=False))
    return None if case is None or (case.solution.levels.empty > 0).any() else case


def point(case: Case, index: int) -> Point:
    """The algebra of a case at a condition, with what the sheet states kept in it."""
    return Present(case, index, keep_stated=True).point


def close(found: float | None, wanted: float, voltage: bool, relative: float = RELATIVE) -> bool:
    allowed = relative * abs(wanted) + (VOLT if voltage else 0.0)
    return found is not None and abs(found - wanted) <= allowed


def differences(case: Case, index: int, relative: float = RELATIVE) -> tuple[int, list[str]]:
    """How many numbers were compared at a condition, and every one in which the two engines differ."""
    symbols, wrong, count = point(case, index), [], 0
    for key in every_metric(case):
        measured = case.solution.measure(key)
        wanted = at(measured.values, index)
        if math.isnan(wanted) or (key == "peaking" and not case.solution.measure("dc_gain").complete):
            continue  # the algebra need not know that a number is missing; the numeric engine says why
        count += 1
        found = symbols.number(key)
        if not close(found, wanted, symbols.algebra.word(key).unit == "V" and key not in NOISES, relative):
            wrong.append(f"{key}: {found!r}, numeric {wanted!r}")
    for device in case.circuit.devices:
        for value in operating.OPERATING_POINT:
            wanted = at(getattr(case.solution.devices[device.name], value.key), index)
            if not math.isfinite(wanted):
                continue
            count += 1
            found = symbols.number(f"{device.name}.{value.key}")
            if not close(found, wanted, value.dimension.unit == "V", relative):
                wrong.append(f"{device.name}.{value.key}: {found!r}, numeric {wanted!r}")
    return count, wrong


def missing(case: Case, key: str, index: int) -> Reason:
    """Why a metric is missing at a condition; NONE where it is there."""
    measured = case.solution.measure(key)
    place = () if measured.values.ndim == 0 else (min(index, measured.values.shape[-1] - 1),)
    return measured.reason(place)
