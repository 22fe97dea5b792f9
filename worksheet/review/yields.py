"""Yield at the nominal condition: mismatch drawn per device by Pelgrom's law, and spread of fitted parameters.

A sample moves the threshold and the current factor of each transistor against its intended value, and every process
parameter for which the process file states a standard error. The stage's current is set by its current source, so a
bias transistor's mismatch moves that current by the exact device law, its gate held. Levels and linked sheets are held.
Draws come from numpy's PCG64 in one fixed order and are evaluated part by part, so a seed gives the same samples on any
machine, whatever the size of the parts.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from statistics import NormalDist
from typing import Any

import numpy as np

from worksheet.device import bulk, charge, mismatch
from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.engine.validity import shortfalls
from worksheet.model import metrics
from worksheet.model.sheet import TOLERANCE, Target
from worksheet.project.case import Case
from worksheet.project.evaluate import Evaluator
from worksheet.review.inputs import inputs_of
from worksheet.review.judge import judge
from worksheet.solver import goals
from worksheet.solver.trials import Mask
from worksheet.stages.stage import BIAS

CONFIDENCE = 0.95
"""Of the interval beside a yield."""

_PART = 8_192
"""Samples that are evaluated at once: as many as keep the arrays in the processor's cache."""

_THRESHOLD, _FACTOR, _PARAMETER = "threshold", "factor", "parameter"


@dataclass(frozen=True, slots=True)
class Part:
    """What a device (by its name in the stage) or a process parameter contributes to the variance of a target. [-]"""

    owner: str
    share: float


@dataclass(frozen=True, slots=True)
class Yield:
    """A share of samples that meet, with its 95 % interval [-], and what the target's variance is made of."""

    share: float
    low: float
    high: float
    parts: tuple[Part, ...] = ()


@dataclass(frozen=True)
class Yields:
    """Yield of each target, and of all together."""

    targets: Mapping[str, Yield]
    every: Yield | None


@dataclass(frozen=True, eq=False, slots=True)
class Spread:
    """One thing that varies: threshold [V] or current factor [-] of a device, or a process parameter [its unit].

    Attributes:
        owner: The device's name in the stage, or the parameter's qualified name.
        kind: "threshold", "factor" or "parameter".
        intended: Its intended value; of a device's the change from it, 0.
        deviation: One standard deviation.
    """

    owner: str
    kind: str
    intended: float
    deviation: float


def yields(evaluator: Evaluator, name: str, samples: int, seed: int) -> Yields:
    """Yield of a sheet's targets over samples at the nominal condition.

    Args:
        evaluator: The project.
        name: The sheet.
        samples: How many.
        seed: Of the random numbers.
    Returns: Yields; invalid samples count as missed
    """
    case = evaluator.over(name, evaluator.case(name).conditions.only_nominal())
    spreads = spreads_of(case)
    drawn = draws(len(spreads), samples, seed)
    targets = [t for t in case.sheet.targets.values() if not _of_yield(t)]
    met = {target.name: 0 for target in targets}
    every = 0
    for start in range(0, samples, _PART):
        part = deviated(case, spreads, drawn[:, start : start + _PART])
        count = min(_PART, samples - start)
        valid = _valid(part, count)
        together = valid.copy()
        for target in targets:
            good = valid & _met(target, goals.measure(part, target, part.solution), count)
            together &= good
            met[target.name] += int(np.count_nonzero(good))
        every += int(np.count_nonzero(together))
    parts = _parts(case, spreads)
    found = {
        name: _closed_form(case, target, parts[name]) if _of_yield(target) else wilson(met[name], samples, parts[name])
        for name, target in case.sheet.targets.items()
    }
    return Yields(found, wilson(every, samples) if found else None)


def _of_yield(target: Target) -> bool:
    metric = metrics.find(target.name)
    return metric is not None and bool(metric.of_yield)


def _valid(case: Case, count: int) -> Mask:
    valid = np.ones(count, dtype=np.bool_)
    for shortfall in shortfalls(case.solution):
        valid &= ~np.broadcast_to(shortfall.broken, (count, 1))[:, 0]
    return valid


def wilson(met: int, samples: int, parts: tuple[Part, ...] = ()) -> Yield:
    """A share with Wilson's interval.

    Args:
        met, samples: Counts.
        parts: What the variance is made of.
    Returns: Yield
    Source: E. B. Wilson, J. Am. Statistical Association 22 (1927) 209-212; from memory.
    """
    z = NormalDist().inv_cdf(0.5 + CONFIDENCE / 2)
    share = met / samples
    scale = 1 + z * z / samples
    middle = (share + z * z / (2 * samples)) / scale
    half = z / scale * np.sqrt(share * (1 - share) / samples + z * z / (4 * samples * samples))
    return Yield(share, max(0.0, float(middle - half)), min(1.0, float(middle + half)), parts)


def spreads_of(case: Case) -> tuple[Spread, ...]:
    """Everything that varies from part to part, in the order of the draws."""
    found = [
        Spread(item.move, _PARAMETER, item.value, item.standard_error)
        for item in inputs_of(case)
        if item.standard_error and item.name.startswith("process.")
    ]
    for device in case.circuit.devices:
        p = case.inputs.devices[device.name]
        of_threshold = mismatch.single_deviation(p.matching_threshold, p.width, p.length)
        of_factor = mismatch.single_deviation(p.matching_factor, p.width, p.length)
        found.append(Spread(device.name, _THRESHOLD, 0.0, float(of_threshold.reshape(-1)[0])))
        found.append(Spread(device.name, _FACTOR, 0.0, float(of_factor.reshape(-1)[0])))
    return tuple(found)


def draws(count: int, samples: int, seed: int) -> Array:
    """Standard normal numbers, shape (count, samples); all samples of one spread before those of the next."""
    return np.random.Generator(np.random.PCG64(seed)).standard_normal((count, samples))


def deviated(case: Case, spreads: Sequence[Spread], deviations: Array) -> Case:
    """The case off its intended values, samples along a first axis.

    Levels are those of the intended values: what was not assumed is stated.

    Args:
        case: The sheet at one condition.
        spreads: What varies.
        deviations: By how many standard deviations, shape (spreads, samples).
    """
    held = _levels(case)
    thresholds: dict[str, Array] = {}
    factors: dict[str, Array] = {}
    for spread, row in zip(spreads, deviations, strict=True):
        moved = (spread.deviation * row)[:, None]
        if spread.kind == _PARAMETER:
            held[spread.owner] = spread.intended + moved
        elif spread.kind == _THRESHOLD:
            thresholds[spread.owner] = moved
        else:
            factors[spread.owner] = 1.0 + moved
    if BIAS in thresholds:
        held["bias_current"] = _current(case, thresholds[BIAS], factors[BIAS])
    return case.moved(held).mismatched(thresholds, factors)


def _parts(case: Case, spreads: Sequence[Spread]) -> dict[str, tuple[Part, ...]]:
    """What the variance of each target is made of, to first order: each spread one standard deviation up and down."""
    count = len(spreads)
    moved = deviated(case, spreads, np.concatenate([np.eye(count), -np.eye(count)], axis=1))
    found: dict[str, tuple[Part, ...]] = {}
    for name, target in case.sheet.targets.items():
        metric = metrics.find(name)
        if metric is not None and "offset" in (name, metric.of_yield):
            found[name] = _shares(_of_offset(case))
            continue
        values = np.broadcast_to(goals.measure(moved, target, moved.solution).values, (2 * count, 1))[:, 0]
        change = (values[:count] - values[count:]) / 2.0
        found[name] = _shares((s.owner, float(c * c)) for s, c in zip(spreads, change, strict=True))
    return found


def _of_offset(case: Case) -> Iterator[tuple[str, float]]:
    """What each transistor adds to the square of the offset, in closed form. [V^2]"""
    solution: Any = case.solution  # of plain arrays where the protocol has arrays or symbols
    for device in solution.transistors:
        yield device.name, float(np.reshape(metrics.offset_variance(solution, device), -1)[0])


def _shares(variances: Iterator[tuple[str, float]]) -> tuple[Part, ...]:
    """Shares of a whole, the greatest first; none where nothing varies or a number does not exist."""
    sums: dict[str, float] = {}
    for owner, variance in variances:
        sums[owner] = sums.get(owner, 0.0) + variance
    total = sum(sums.values())
    if not 0.0 < total < np.inf:
        return ()
    return tuple(Part(owner, part / total) for owner, part in sorted(sums.items(), key=lambda item: -item[1]))


def _levels(case: Case) -> dict[str, Array]:
    """Levels of the intended values, stated so that samples hold them. [V]"""
    levels = case.solution.levels
    if case.stage.holds_input:
        key = "output_level" if case.stated("output_level") is not None else "input_level"
        return {key: levels.turn(levels.output if key == "output_level" else levels.input)}
    found = {"output_level": levels.turn(levels.output)}
    if "input_level" in case.stage.levels:
        found["input_level"] = levels.turn(levels.input)
    return found


def _current(case: Case, shift: Array, factor: Array) -> Array:
    """Bias current of a mismatched current source whose gate and output stand still. [A]"""
    p, inputs = case.inputs.devices[BIAS], case.inputs
    kappa = bulk.coupling(p, 0.0)
    drive = case.solution.levels.drives[BIAS] - kappa * shift / inputs.thermal
    i = charge.inversion_from_charge(charge.charge_from_drive(drive), p.velocity)
    moved = np.asarray(p.specific * factor * i)
    return np.asarray(case.value("bias_current") * moved / inputs.current)


def _met(target: Target, measured: Measured, samples: int) -> Mask:
    """Which samples meet a target, judged one by one."""
    values = np.broadcast_to(measured.values, (samples, 1))[:, 0]
    reasons = None if measured.reasons is None else np.broadcast_to(measured.reasons, (samples, 1))[:, 0]
    met = np.ones(samples, dtype=bool)
    for side, limit in zip(goals.SIDES, goals.limits(target), strict=True):
        if limit is not None:
            slack = goals.slack(Measured(values, reasons), limit, side)
            met &= slack >= -(TOLERANCE if limit else 0.0)
    return met


def _closed_form(case: Case, target: Target, parts: tuple[Part, ...]) -> Yield:
    """Share of parts whose offset lies within the limit: the normal law, exact."""
    offset = float(np.ravel(case.solution["offset"])[0])
    limit = goals.limits(target)[1]
    if limit is None or offset <= 0:
        met = judge(target, goals.measure(case, target, case.solution), np.ones(1, dtype=bool)).verdict == "met"
        return Yield(float(met), float(met), float(met), parts)
    share = 2 * NormalDist().cdf(limit / offset) - 1
    return Yield(share, share, share, parts)
