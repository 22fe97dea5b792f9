"""Sizes that a sheet leaves out of its current source's transistor and of stacked devices."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from worksheet.model.sheet_keys import GEOMETRY
from worksheet.solver import goals, ranges
from worksheet.solver.subject import Subject, scalar
from worksheet.stages.stage import BIAS, MAIN

HIGHEST_INVERSION = 10.0
"""The current source is made no stronger than this where nothing else limits it."""

LOWEST_INVERSION = 1e-3
RANGE_METRICS = ("output_low", "output_high", "output_swing", "input_low", "input_high")
"""Metrics that the current source's saturation voltage moves."""

_STEPS = 40


def followers(subject: Subject) -> dict[str, str]:
    """Sizes of stacked devices that are left out, and the main device's size that each one takes."""
    stacked = [device for device in subject.circuit.devices if device.name not in (MAIN, BIAS)]
    return {d.key(name): name for d in stacked for name in GEOMETRY if d.key(name) in subject.open_keys}


def starting_values(subject: Subject, names: Sequence[str]) -> dict[str, float]:
    """Numbers to start a search from: sizes near the shortest, inversion 1, one picofarad. [unit of each key]"""
    start: dict[str, float] = {}
    for device in subject.circuit.devices:
        model = subject.model(device)
        for name in GEOMETRY:
            key = device.key(name)
            if key in names:
                low, high = model.number(f"min_{name}"), model.number(f"max_{name}")
                start[key] = float(np.clip(2.0 * low if name == "length" else 10.0 * low, low, high))
    if "load_capacitance" in names:
        start["load_capacitance"] = 1e-12
    if "bias_current" in names:
        known = subject.with_filled(start)
        main = subject.model(subject.stage.transistors[0])
        start["bias_current"] = (
            main.number("specific_current") * scalar(known.value("width")) / scalar(known.value("length"))
        )
    return start


def sizes(subject: Subject) -> dict[str, float]:
    """Left-out sizes of the current source's transistor: the main device's length, and the highest inversion up to 10
    that the targets on ranges allow, at the nominal condition, within the process limits. [m]
    """
    if subject.sheet.bias.ideal:
        return {}
    bias = subject.stage.bias
    model = subject.model(bias)
    found: dict[str, float] = {}
    length_key, width_key = bias.key("length"), bias.key("width")
    if length_key in subject.open_keys:
        main = scalar(subject.value("length"))
        found[length_key] = float(np.clip(main, model.number("min_length"), model.number("max_length")))
    if width_key in subject.open_keys:
        known = subject.with_filled({**found, width_key: model.number("min_width")})
        found[width_key] = _width(known, width_key)
    return found


def _width(subject: Subject, key: str) -> float:
    model = subject.model(subject.stage.bias)
    parameters = subject.inputs.devices[BIAS]
    unit = scalar(subject.value("bias_current")) * scalar(parameters.length) / scalar(parameters.specific_current)
    low, high = np.log(LOWEST_INVERSION), np.log(HIGHEST_INVERSION)
    if not _allowed(subject, key, unit / HIGHEST_INVERSION) and _allowed(subject, key, unit / LOWEST_INVERSION):
        for _ in range(_STEPS):
            middle = 0.5 * (low + high)
            if _allowed(subject, key, unit / float(np.exp(middle))):
                low = middle
            else:
                high = middle
        high = low
    return float(np.clip(unit / np.exp(high), model.number("min_width"), model.number("max_width")))


def _allowed(subject: Subject, key: str, width: float) -> bool:
    """Whether all targets on ranges are met in every condition of `over` with a width of the current source."""
    everywhere = subject.sheet.solve.over == "all"
    vertices = ranges.vertices(subject.sheet) if everywhere else {}
    moved = subject.moved({**vertices, key: width})
    for target in subject.sheet.targets.values():
        if target.name not in RANGE_METRICS or moved.stage.absent_metric(target.name) is not None:
            continue
        measured = goals.measure(moved, target, moved.solution)
        every = everywhere and target.at == "all"
        for side, limit in zip(goals.SIDES, goals.limits(target), strict=True):
            if limit is not None:
                slack = np.atleast_1d(goals.slack(measured, limit, side))
                if np.min(slack if every else slack.reshape(-1)[:1]) < -goals.TOLERANCE:
                    return False
    return True
