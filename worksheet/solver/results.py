"""What solve says, as frozen data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from worksheet.model.sheet import Condition


@dataclass(frozen=True)
class Bound:
    """A place on a variable's axis where a target is just met.

    Attributes:
        target: The target's name.
        side: "low" where the target needs more of the variable, "high" where less.
        limit: Which limit of the target it is: "min" or "max".
        value: Where. [unit of the variable]
        at: The condition in which it binds.
        point: Index of that condition, the nominal one being 0.
        edge: Whether the metric jumps or stops existing there instead of crossing its limit.
        moves_with: What moves along with the variable, by name ("width" when the inversion is kept). [unit of the key]
        valid: Whether every device is saturated there and no voltage passes its rating, in every condition that counts;
            otherwise a review of that value does not judge the target.
    """

    target: str
    side: str
    limit: str
    value: float
    at: Condition
    point: int
    edge: bool = False
    moves_with: Mapping[str, float] = field(default_factory=dict)
    valid: bool = True


@dataclass(frozen=True, slots=True)
class Region:
    """An interval of a variable and what sets its ends; None for an end that nothing sets. [unit of the variable]"""

    low: float | None
    low_set_by: str | None
    high: float | None
    high_set_by: str | None


@dataclass(frozen=True)
class Window:
    """What is needed of one variable with the others held.

    Attributes:
        name, unit: The variable.
        present: Where it stands. [unit]
        region: Where all holds, around or nearest to the present value; None where it is empty.
        also: Further regions.
        bounds: Every crossing of every target.
        cannot_help: Targets that no value of this variable meets.
        keep: For the bias current: "geometry" or "inversion"; "" else.
    """

    name: str
    unit: str
    present: float
    region: Region | None
    also: tuple[Region, ...]
    bounds: tuple[Bound, ...]
    cannot_help: tuple[str, ...]
    keep: str = ""


@dataclass(frozen=True, slots=True)
class Point:
    """A proposed design: values by key, inversion coefficient of the main device, gate area [m^2]. SI units."""

    values: Mapping[str, float]
    inversion_coefficient: float
    gate_area: float


@dataclass(frozen=True)
class Conflict:
    """Targets that exclude each other, or one that cannot be met.

    Attributes:
        variable: The variable on whose axis they do.
        targets: Their names.
        gives_way: Best reachable value of each with the others held; None where there is none. [unit of the target]
        wanted: The limit of each that this value falls short of, guard band counted. [unit of the target]
        reachable_with: A value of another variable that would make it reachable, by name. [unit of the key]
        explain: In words.
    """

    variable: str
    targets: tuple[str, ...]
    gives_way: Mapping[str, float | None]
    reachable_with: Mapping[str, float]
    explain: str
    wanted: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True)
class Solved:
    """Everything that solve says of one sheet.

    Attributes:
        self_loading: Targets for which no current is enough at the inversion that is kept: the smallest inversion
            coefficient, and the largest length, at which one is. [unit of each key]
    """

    sheet: str
    over: str
    feasible: bool
    reason: str | None
    needed: Mapping[str, Window]
    recommended: Point | None
    compact: Point | None
    conflict: Conflict | None
    proposed: Mapping[str, float]
    self_loading: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
