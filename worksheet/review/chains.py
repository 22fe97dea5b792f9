"""A chain of sheets reviewed: gain, bandwidth, noise and settling of the whole path, and what each stage takes.

Everything is reckoned over the project's conditions, at the stated values of every sheet: all stages of a path are at
the same corner and temperature together. A sheet on its own regulator is taken at its own nominal supply there, as in a
link between sheets. Each stage drives the load that its own sheet states; where the input of the next sheet is more
than that, a note says so. A chain of one sheet has that sheet's own numbers (of settling: those of a small step).
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from math import isfinite

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array
from worksheet.device.arrays import Number as Values
from worksheet.engine.cascade import Cascade, link_of
from worksheet.engine.measured import Measured, missing_where
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import shortfalls
from worksheet.model import metrics
from worksheet.model.project_keys import CHAIN_METRICS
from worksheet.model.quantity import format_quantity
from worksheet.model.sheet import Chain, Target
from worksheet.project.case import CaseError
from worksheet.project.conditions import ConditionSet
from worksheet.project.evaluate import Evaluator
from worksheet.review import judge
from worksheet.review.chained import ChainNumber, ChainReview, StageShare
from worksheet.review.results import UNKNOWN, Note, Number, TargetReview

_SLACK = 1e-9
_LOAD = "load_capacitance"


def review_chain(evaluator: Evaluator, chain: Chain, bad: Collection[str]) -> ChainReview:
    """Review one chain.

    Args:
        evaluator: The project.
        chain: What its file states.
        bad: Sheets that have problems, and sheets that have no review.
    """
    missing = [name for name in chain.sheets if name in bad or name not in evaluator.project.sheets]
    if missing:
        there = missing[0] in bad
        said = f"the sheet {missing[0]} has problems of its own" if there else f"there is no sheet {missing[0]}"
        return _unknown(chain, said)
    try:
        path = _Path(evaluator, chain)
        path.solve()
    except CaseError as error:
        return _unknown(chain, error.problem.message)
    return ChainReview(
        chain,
        metrics={key: path.number(key) for key in CHAIN_METRICS},
        targets=tuple(path.target(target) for target in chain.targets.values()),
        stages=tuple(path.shares()),
        invalid=int(np.count_nonzero(~path.valid)),
        notes=tuple(path.notes()),
    )


def _unknown(chain: Chain, reason: str) -> ChainReview:
    targets = tuple(
        TargetReview(
            target, _unit(target.name), None, None, None, {}, 0, None, verdict=UNKNOWN, reason=reason, judged=UNKNOWN
        )
        for target in chain.targets.values()
    )
    return ChainReview(chain, reason, targets=targets)


def _unit(key: str) -> str:
    metric = metrics.find(key)
    assert metric is not None  # CHAIN_METRICS are metrics
    return metric.dimension.unit


@dataclass(frozen=True, eq=False)
class _Stage:
    """A sheet along the path, and how its values are brought to the path's conditions."""

    sheet: str
    solution: NumericSolution
    load: Values
    skip: int  # conditions of its own that come before those of the path

    def pick(self, values: Values) -> Values:
        array = np.asarray(values)
        return array.reshape(()) if array.size == 1 else array[..., self.skip :]

    def metric(self, key: str, count: int) -> Array:
        return np.broadcast_to(np.asarray(self.pick(self.solution[key])), (count,))


class _Path:
    """A chain over the project's conditions."""

    def __init__(self, evaluator: Evaluator, chain: Chain) -> None:
        self._evaluator, self._chain = evaluator, chain
        self._conditions: ConditionSet = evaluator.shared
        self._known: dict[str, Measured] = {}

    def solve(self) -> None:
        """Find every number that the sheets give. CaseError where a value does not resolve."""
        for stage in self._stages:
            assert stage.solution.devices

    @property
    def _count(self) -> int:
        return len(self._conditions)

    @cached_property
    def _stages(self) -> list[_Stage]:
        every = {name: self._stage(name) for name in dict.fromkeys(self._chain.sheets)}
        return [every[name] for name in self._chain.sheets]

    def _stage(self, name: str) -> _Stage:
        evaluator = self._evaluator
        if evaluator.conditions(name) is self._conditions:
            case, skip = evaluator.case(name), 0
        else:
            case, skip = evaluator.linked(name, self._conditions), 1
        return _Stage(name, case.solution, case.value(_LOAD), skip)

    @cached_property
    def _cascade(self) -> Cascade:
        return Cascade([link_of(stage.solution, stage.pick) for stage in self._stages], self._count)

    @cached_property
    def valid(self) -> NDArray[np.bool_]:
        """Conditions in which every sheet of the path is valid."""
        valid = np.ones(self._count, dtype=np.bool_)
        for stage in self._stages:
            for shortfall in shortfalls(stage.solution):
                valid &= np.asarray(stage.pick(shortfall.broken.astype(np.float64))) == 0
        return valid

    def measured(self, key: str) -> Measured:
        """A quantity of the path over its conditions."""
        if key not in self._known:
            with np.errstate(all="ignore"):
                self._known[key] = self._measure(key)
        return self._known[key]

    def _measure(self, key: str) -> Measured:
        if key == "settling_time":
            return self._cascade.settling_time(self._chain.settling_tolerance)
        own = {
            "dc_gain": self._cascade.dc_gain,
            "bandwidth": self._cascade.bandwidth,
            "output_noise": self._cascade.output_noise,
            "input_noise": self._cascade.input_noise,
        }
        if key in own:
            return own[key]()
        return missing_where(sum((stage.metric(key, self._count) for stage in self._stages), np.zeros(self._count)))

    def number(self, key: str) -> ChainNumber:
        """A quantity at the nominal condition and its extremes."""
        measured = self.measured(key)
        nominal = Number(_number(measured.values[0]), _unit(key), measured.reason((0,)).text or None)
        held = np.where(self.valid, measured.values, np.nan)
        if np.isnan(held).all():
            return ChainNumber(nominal)
        low, high = int(np.nanargmin(held)), int(np.nanargmax(held))
        where = self._conditions.conditions
        return ChainNumber(nominal, float(held[low]), where[low], float(held[high]), where[high])

    def target(self, target: Target) -> TargetReview:
        """A limit on the path judged, by the rules for a sheet's targets."""
        measured = self.measured(target.name)
        every = slice(0, 1) if target.at == "nominal" else slice(None)
        reasons = None if measured.reasons is None else np.broadcast_to(measured.reasons, (self._count,))[every]
        judgement = judge.judge(target, Measured(measured.values[every], reasons), self.valid[every])
        worst = None if judgement.worst is None else _number(measured.values[judgement.worst])
        return TargetReview(
            target=target,
            unit=_unit(target.name),
            nominal=_number(measured.values[0]),
            worst=worst,
            worst_at=None if judgement.worst is None else self._conditions.conditions[judgement.worst],
            worst_with={},
            invalid=judgement.invalid,
            margin=None if worst is None else judge.margin(target, worst),
            verdict=judgement.verdict,
            reason=judgement.reason or measured.reason((0,)).text or None,
            judged=judgement.verdict,
        )

    def shares(self) -> Iterator[StageShare]:
        """What each sheet takes, at the nominal condition."""
        path = self._cascade.first()
        with np.errstate(all="ignore"):
            powers, gain = path.noise_powers()[:, 0], abs(float(path.gain()[0]))
            noise = powers / powers.sum()
        bandwidth = self.measured("bandwidth").values[0]
        settling = self.measured("settling_time").values[0]
        current = self.measured("supply_current").values[0]
        for place, stage in enumerate(self._stages):
            with np.errstate(all="ignore"):
                rest = path.without(place)
                faster = rest.bandwidth()
                without = np.inf if faster.reason((0,)).text == "unlimited" else faster.values[0]
                sooner = rest.settling_time(self._chain.settling_tolerance).values[0]
                own = float(stage.metric("supply_current", self._count)[0])
                yield StageShare(
                    stage.sheet,
                    gain=_number(np.broadcast_to(path.links[place].gain, (1,))[0]),
                    input_noise=_number(np.sqrt(powers[place]) / gain),
                    noise_share=_number(noise[place]),
                    bandwidth_lost=_number(1.0 - bandwidth / without),
                    settling_lost=_number(1.0 - sooner / settling),
                    supply_current=_number(own),
                    current_share=_number(own / current),
                )

    def notes(self) -> Iterator[Note]:
        """Where a stage's stated load is less than the input that it drives."""
        for stage, following in zip(self._stages, self._stages[1:], strict=False):
            load = np.broadcast_to(np.asarray(stage.pick(stage.load)), (self._count,))
            wanted = following.metric("input_capacitance", self._count)
            if np.any(wanted > load * (1 + _SLACK)):
                place = int(np.nanargmax(wanted - load))
                at = self._conditions.conditions[place]
                capacitance = metrics.find("input_capacitance")
                assert capacitance is not None
                need, has = (
                    format_quantity(float(values[place]), capacitance.dimension, 3) for values in (wanted, load)
                )
                yield Note(
                    stage.sheet,
                    f"its load is stated as {has}, but the input of {following.sheet} alone takes {need} at "
                    f"{at.process}, {at.temperature:.4g} K, {at.supply:.4g} V; the numbers of this path are for the "
                    "stated load",
                )


def _number(value: float) -> float | None:
    return float(value) if isfinite(value) else None


def review_chains(evaluator: Evaluator, chains: Mapping[str, Chain], bad: Collection[str]) -> tuple[ChainReview, ...]:
    """Review every chain of a project, in the order of its file; as review_chain."""
    return tuple(review_chain(evaluator, chain, bad) for chain in chains.values())
