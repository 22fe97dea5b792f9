"""Yield at the nominal condition: mismatch drawn per device by Pelgrom's law, and spread of fitted parameters.

A sample moves the threshold and the current factor of each transistor against its intended value. The stage's current
is set by its current source, so a bias transistor's mismatch moves that current by the exact device law, its gate held.
Levels and linked sheets are held. Draws come from numpy's PCG64 in one fixed order, so a seed gives the same samples on
any machine.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np

from worksheet.device import bulk, charge, mismatch
from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.engine.validity import shortfalls
from worksheet.model import metrics
from worksheet.model.sheet import Target
from worksheet.project.case import Case
from worksheet.project.evaluate import Evaluator
from worksheet.review.inputs import inputs_of
from worksheet.review.judge import judge
from worksheet.solver import goals
from worksheet.solver.trials import Mask
from worksheet.stages.stage import BIAS

CONFIDENCE = 0.95
"""Of the interval beside a yield."""


@dataclass(frozen=True, slots=True)
class Yield:
    """A share of samples that meet, with its 95 % interval. [-]"""

    share: float
    low: float
    high: float


@dataclass(frozen=True)
class Yields:
    """Yield of each target, and of all together."""

    targets: Mapping[str, Yield]
    every: Yield | None


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
    moved = sampled(case, samples, seed)
    solution = moved.solution
    valid = np.ones(samples, dtype=bool)
    for shortfall in shortfalls(solution):
        valid &= ~np.broadcast_to(shortfall.broken, (samples, 1))[:, 0]
    everything = valid.copy()
    found: dict[str, Yield] = {}
    for target in case.sheet.targets.values():
        metric = metrics.find(target.name)
        if metric is not None and metric.of_yield:
            found[target.name] = _closed_form(case, target)
            continue
        met = valid & _met(target, goals.measure(moved, target, solution), samples)
        everything &= met
        found[target.name] = wilson(int(met.sum()), samples)
    return Yields(found, wilson(int(everything.sum()), samples) if found else None)


def wilson(met: int, samples: int) -> Yield:
    """A share with Wilson's interval.

    Args:
        met, samples: Counts.
    Returns: Yield
    Source: E. B. Wilson, J. Am. Statistical Association 22 (1927) 209-212; from memory.
    """
    z = NormalDist().inv_cdf(0.5 + CONFIDENCE / 2)
    share = met / samples
    scale = 1 + z * z / samples
    middle = (share + z * z / (2 * samples)) / scale
    half = z / scale * np.sqrt(share * (1 - share) / samples + z * z / (4 * samples * samples))
    return Yield(share, max(0.0, float(middle - half)), min(1.0, float(middle + half)))


def sampled(case: Case, samples: int, seed: int) -> Case:
    """The case with mismatch and parameter spread drawn, samples along a first axis.

    Levels are those of the intended values: what was not assumed is stated.
    """
    draws = np.random.Generator(np.random.PCG64(seed))
    moves: dict[str, Array] = {}
    for item in inputs_of(case):
        if item.standard_error:
            moves[item.move] = item.value + item.standard_error * draws.standard_normal((samples, 1))
    thresholds: dict[str, Array] = {}
    factors: dict[str, Array] = {}
    for device in case.circuit.devices:
        p = case.inputs.devices[device.name]
        of_threshold = mismatch.single_deviation(p.matching_threshold, p.width, p.length)
        of_factor = mismatch.single_deviation(p.matching_factor, p.width, p.length)
        thresholds[device.name] = of_threshold * draws.standard_normal((samples, 1))
        factors[device.name] = 1.0 + of_factor * draws.standard_normal((samples, 1))
    held = {**moves, **_levels(case)}
    if BIAS in thresholds:
        held["bias_current"] = _current(case, thresholds[BIAS], factors[BIAS])
    return case.moved(held).mismatched(thresholds, factors)


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
            met &= slack >= -(goals.TOLERANCE if limit else 0.0)
    return met


def _closed_form(case: Case, target: Target) -> Yield:
    """Share of parts whose offset lies within the limit: the normal law, exact."""
    offset = float(np.ravel(case.solution["offset"])[0])
    limit = goals.limits(target)[1]
    if limit is None or offset <= 0:
        met = judge(target, goals.measure(case, target, case.solution), np.ones(1, dtype=bool)).verdict == "met"
        return Yield(float(met), float(met), float(met))
    share = 2 * NormalDist().cdf(limit / offset) - 1
    return Yield(share, share, share)
