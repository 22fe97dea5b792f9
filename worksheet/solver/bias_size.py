"""Sizes that a sheet leaves out of its current source's transistor and of stacked devices."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from worksheet.device.arrays import Array, Number
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


@dataclass(frozen=True, eq=False, slots=True)
class BiasSize:
    """How sizes that are left out of the current source's transistor go with the bias current and the main length.

    Attributes:
        length_key, width_key: Their keys, None where a size is stated.
        lengths, widths: Least and greatest that the process allows. [m]
        square_current: I_sq at the nominal condition. [A]
        stated_length: Where it is stated. [m]
        inversion: Inversion coefficient of the transistor, before the limits of its width. [-]
    """

    length_key: str | None
    width_key: str | None
    lengths: tuple[float, float]
    widths: tuple[float, float]
    square_current: float
    stated_length: float
    inversion: float = HIGHEST_INVERSION

    def sizes(self, current: Number, length: Number) -> dict[str, Array]:
        """Sizes for a bias current [A] and a length of the main device [m]. [m]"""
        own = np.clip(length, *self.lengths) if self.length_key is not None else np.asarray(self.stated_length)
        found = {} if self.length_key is None else {self.length_key: np.asarray(own)}
        if self.width_key is not None:
            found[self.width_key] = np.clip(current * own / (self.square_current * self.inversion), *self.widths)
        return found

    def at(self, subject: Subject) -> dict[str, float]:
        """Sizes at a subject's own current and main length. [m]"""
        found = self.sizes(scalar(subject.value("bias_current")), scalar(subject.value("length")))
        return {name: float(value) for name, value in found.items()}

    def allowed(self, subject: Subject) -> BiasSize:
        """The same at the highest inversion that the targets on ranges allow at a subject's values."""
        if self.width_key is None:
            return self
        low, high = np.log(LOWEST_INVERSION), np.log(HIGHEST_INVERSION)
        if not self._allows(subject, high) and self._allows(subject, low):
            for _ in range(_STEPS):
                middle = 0.5 * (low + high)
                low, high = (middle, high) if self._allows(subject, middle) else (low, middle)
            high = low
        return replace(self, inversion=float(np.exp(high)))

    def _allows(self, subject: Subject, inversion: float) -> bool:
        wide = replace(self, inversion=float(np.exp(inversion)), widths=(0.0, np.inf))
        return _allowed(subject, wide.at(subject))


def of(subject: Subject) -> BiasSize | None:
    """What is left out of the current source's transistor; None where nothing is.

    Source: contract: the main device's length, and the highest inversion up to 10 that the range targets allow, at the
        nominal condition, within the process limits.
    """
    if subject.sheet.bias.ideal:
        return None
    bias = subject.stage.bias
    model = subject.model(bias)
    length, width = (key if (key := bias.key(name)) in subject.open_keys else None for name in ("length", "width"))
    if length is None and width is None:
        return None
    lengths, widths = ((model.number(f"min_{name}"), model.number(f"max_{name}")) for name in ("length", "width"))
    start = {key: ends[0] for key, ends in ((length, lengths), (width, widths)) if key is not None}
    known = subject.with_filled(start)
    stated = scalar(known.value(bias.key("length")))
    return BiasSize(length, width, lengths, widths, scalar(known.inputs.devices[BIAS].specific_current), stated)


def _allowed(subject: Subject, sizes: Mapping[str, float]) -> bool:
    """Whether all targets on ranges are met in every condition of `over` with sizes of the current source. [m]"""
    waived = ranges.waived_targets(subject.sheet)
    everywhere = subject.sheet.solve.over == "all"
    vertices = ranges.vertices(subject.sheet) if everywhere else {}
    moved = subject.moved({**vertices, **sizes})
    for target in subject.sheet.targets.values():
        if (
            target.name not in RANGE_METRICS
            or target.name in waived
            or moved.stage.absent_metric(target.name) is not None
        ):
            continue
        measured = goals.measure(moved, target, moved.solution)
        every = everywhere and target.at == "all"
        for side, limit in zip(goals.SIDES, goals.limits(target), strict=True):
            if limit is not None:
                slack = np.atleast_1d(goals.slack(measured, limit, side))
                if np.min(slack if every else slack.reshape(-1)[:1]) < 0:  # the tolerance is left to what comes after
                    return False
    return True
