"""What a review says, as frozen data: one type a thing, always whole, for every front end and format.

What there are thousands of is a named tuple, which is made in a third of the time.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, NamedTuple

from worksheet.model.problem import Problem
from worksheet.model.sheet import Condition, Sheet, Target

if TYPE_CHECKING:
    from worksheet.review.chained import ChainReview

MET, MISSED, UNKNOWN, WAIVED = "met", "missed", "unknown", "waived"
"""Verdicts."""


class Number(NamedTuple):
    """A number with its unit, or the reason why there is none. `value` in SI units."""

    value: float | None
    unit: str
    reason: str | None = None


class Choice(NamedTuple):
    """A design variable: its number and whether it was "chosen", "assumed" or "proposed". SI units."""

    value: float
    unit: str
    origin: str


class Invalid(NamedTuple):
    """A device or level that does not hold at one condition. `short_by` in `unit`."""

    device: str
    what: str
    short_by: float
    unit: str
    at: Condition


class Note(NamedTuple):
    """A remark of the program beside a number: what it is about, and what to know."""

    about: str
    text: str


class EvidenceVerdict(NamedTuple):
    """One piece of evidence against its target. Numbers in SI units of the metric."""

    value: float
    found_by: str
    stale: bool
    verdict: str


class Breaking(NamedTuple):
    """A condition of a target and its room there: relative, plain for a limit of 0; None where a number is missing."""

    at: Condition
    room: float | None


class Cause(NamedTuple):
    """The single change from the nominal condition and the stated values that costs a target most room.

    Attributes:
        axis: "process", "temperature", "supply" or "range".
        at: The condition with that change.
        moved: With a range: the assumptions at an end of theirs, by name. [unit of the key]
        room: What is left with that change alone.
    """

    axis: str
    at: Condition
    moved: Mapping[str, float]
    room: float | None


@dataclass(frozen=True, slots=True)
class TargetReview:
    """One target against what is achieved. Numbers in SI units of the metric.

    Attributes:
        target: What is wanted.
        unit: Unit of its numbers.
        nominal: At the nominal condition, None where it does not exist.
        worst: Over the valid conditions that the target covers, None where it does not exist.
        worst_at: Where that is.
        worst_with: Assumptions at an end of their range there, by name. [unit of the key]
        invalid: How many conditions (with ranges: points) are not valid.
        margin: (worst - min)/abs(min) or (max - worst)/abs(max), the smaller; None for a limit of 0.
        verdict: MET, MISSED, UNKNOWN or WAIVED.
        reason: Why a number is missing or a verdict is what it is, None where it speaks for itself.
        judged: The verdict before any waiver.
        evidence: What simulations and benches found.
        breaks_first: The conditions with the least room, the least first.
        cause: What costs most room, None where nothing costs any.
    """

    target: Target
    unit: str
    nominal: float | None
    worst: float | None
    worst_at: Condition | None
    worst_with: Mapping[str, float]
    invalid: int
    margin: float | None
    verdict: str
    reason: str | None
    judged: str
    evidence: tuple[EvidenceVerdict, ...] = ()
    breaks_first: tuple[Breaking, ...] = ()
    cause: Cause | None = None


@dataclass(frozen=True)
class SheetReview:
    """One sheet against its targets.

    Attributes:
        sheet: What its file states.
        basis: Digest of everything that can change its results.
        state: How far the block is, as it holds; see review.state.
        state_reason: Why that is not, or not surely, what the sheet states; None where it is.
        choices: Design variables by key.
        operating_point: By device, by key of model.operating; "region" too is there, as text.
        metrics: Nominal, by key.
        validity: What does not hold, and where.
        targets: In the order of the file.
        notes: Remarks of the program.
    """

    sheet: Sheet
    basis: str
    state: str
    state_reason: str | None
    choices: Mapping[str, Choice]
    operating_point: Mapping[str, Mapping[str, float | str | None]]
    metrics: Mapping[str, Number]
    validity: tuple[Invalid, ...]
    targets: tuple[TargetReview, ...]
    notes: tuple[Note, ...]

    @property
    def met(self) -> bool:
        """Whether every target is met or waived."""
        return all(t.verdict in (MET, WAIVED) for t in self.targets)

    def count(self, verdict: str) -> int:
        """How many targets have a verdict."""
        return sum(t.verdict == verdict for t in self.targets)


@dataclass(frozen=True, slots=True)
class BudgetReview:
    """A sum over all sheets against its limit. SI units of the metric."""

    metric: str
    unit: str
    maximum: float
    nominal: float | None
    worst: float | None
    verdict: str


@dataclass(frozen=True)
class Review:
    """A whole project against its targets and budgets.

    `uncovered` maps each requirement that no target's id names to what it says; `chains` are those of the project file.
    """

    title: str
    sheets: tuple[SheetReview, ...] = ()
    budgets: tuple[BudgetReview, ...] = ()
    problems: tuple[Problem, ...] = ()
    conditions: int = 0
    nominal: Condition | None = None
    bad: tuple[str, ...] = field(default=())
    uncovered: Mapping[str, str] = field(default_factory=dict)
    chains: tuple[ChainReview, ...] = ()

    @property
    def met(self) -> bool:
        """Whether every target is met or waived, every chain's too, every budget met and nothing wrong."""
        blocks = all(s.met for s in self.sheets) and all(c.met for c in self.chains)
        return not self.problems and blocks and all(b.verdict == MET for b in self.budgets)
