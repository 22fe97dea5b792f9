"""What a review says of a chain of sheets, as frozen data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from worksheet.model.sheet import Chain, Condition
from worksheet.review.results import MET, WAIVED, Note, Number, TargetReview


@dataclass(frozen=True, slots=True)
class ChainNumber:
    """A quantity of a whole path. SI units.

    Attributes:
        nominal: At the nominal condition.
        low, high: Least and greatest over the valid conditions; None where there is none.
        low_at, high_at: Where those are.
    """

    nominal: Number
    low: float | None = None
    low_at: Condition | None = None
    high: float | None = None
    high_at: Condition | None = None


@dataclass(frozen=True, slots=True)
class StageShare:
    """What one sheet takes of a path, at the nominal condition. None where it cannot be told.

    Attributes:
        sheet: Its name.
        gain: Its gain at DC, with its sign. [V/V]
        input_noise: Its noise alone, referred to the path's input. [V rms]
        noise_share: Its part of the square of the path's noise; the parts add up to 1. [-]
        bandwidth_lost: The part of the bandwidth that the path would have were this sheet infinitely fast, and has not.
        settling_lost: The part of the path's settling time that would be saved were it infinitely fast. [-]
        supply_current: What it draws. [A]
        current_share: Its part of the path's current. [-]
    """

    sheet: str
    gain: float | None
    input_noise: float | None
    noise_share: float | None
    bandwidth_lost: float | None
    settling_lost: float | None
    supply_current: float | None
    current_share: float | None


@dataclass(frozen=True, slots=True)
class ChainReview:
    """One chain against its limits.

    Attributes:
        chain: What the project file states.
        reason: Why it cannot be reckoned; None where it is.
        metrics: By key of project_keys.CHAIN_METRICS.
        targets: As for a sheet, in the order of the file; without evidence, waivers and ranges.
        stages: In the order of the signal.
        invalid: Conditions in which some sheet of the path is not valid.
        notes: Remarks of the program.
    """

    chain: Chain
    reason: str | None = None
    metrics: Mapping[str, ChainNumber] = field(default_factory=dict)
    targets: tuple[TargetReview, ...] = ()
    stages: tuple[StageShare, ...] = ()
    invalid: int = 0
    notes: tuple[Note, ...] = ()

    @property
    def met(self) -> bool:
        """Whether every limit is met."""
        return all(t.verdict in (MET, WAIVED) for t in self.targets)
