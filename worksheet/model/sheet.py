"""A sheet, a process and a project as plain frozen data, after reading and before anything is computed."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from worksheet.model.formula import Formula


@dataclass(frozen=True, slots=True)
class Value:
    """A number as the user stated it.

    Attributes:
        number: SI value; None where a formula or the solver gives it. [unit of the key]
        formula: Expression that gives the number.
        propose: Left to the solver ("propose").
        numbers: All values of a listed key; one for an ordinary one.
        low, high: Range it may turn out to have. [unit of the key]
        standard_error: One standard deviation. [unit of the key]
        source, trust, note: What the user said about it; "" where nothing.
        checked_by, checked: Who looked it up again, and when.
        unit: Unit as written; matters for own names only.
        text: The value as typed.
        line: Line in its file, counted from 1.
    """

    number: float | None = None
    formula: Formula | None = None
    propose: bool = False
    numbers: tuple[float, ...] = ()
    low: float | None = None
    high: float | None = None
    standard_error: float | None = None
    source: str = ""
    trust: str = ""
    note: str = ""
    checked_by: str = ""
    checked: datetime.date | None = None
    unit: str = ""
    text: str = ""
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True, order=True)
class Condition:
    """One process corner, junction temperature [K] and supply [V]."""

    process: str
    temperature: float
    supply: float


TOLERANCE = 1e-9
"""Of a limit: as far beyond it, a verdict is still met."""


@dataclass(frozen=True, slots=True)
class Target:
    """What is wanted of one metric, or of a figure of the user's own (formula).

    `minimum` and `maximum` are SI values [unit of the metric]; `yield_fraction` is a share of parts [-].
    """

    name: str
    minimum: float | None = None
    maximum: float | None = None
    at: str = "all"
    guard: float = 0.0
    yield_fraction: float | None = None
    formula: Formula | None = None
    unit: str = ""
    id: str = ""
    source: str = ""
    why: str = ""
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True)
class Evidence:
    """What a simulation, an extraction or a bench found for one metric. Numbers in SI units of the metric."""

    metric: str
    value: float
    found_by: str
    low: float | None = None
    high: float | None = None
    spread: float | None = None
    samples: int | None = None
    dated: datetime.date | None = None
    basis: str = ""
    at: Condition | None = None
    by: str = ""
    reference: str = ""
    note: str = ""
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True)
class Waiver:
    """A miss that was accepted. `value` in SI units of the metric: anything worse is missed again."""

    target: str
    by: str
    reason: str
    value: float | None = None
    dated: datetime.date | None = None
    until: datetime.date | None = None
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True)
class Remark:
    """What somebody has to say about a sheet or one of its values (`about`, a dotted key; "" for the sheet)."""

    by: str
    text: str
    about: str = ""
    to: str = ""
    dated: datetime.date | None = None
    settled: datetime.date | None = None
    settled_by: str = ""
    answer: str = ""
    line: int | None = field(default=None, compare=False)

    @property
    def open(self) -> bool:
        """Whether it still wants an answer."""
        return self.settled is None


@dataclass(frozen=True, slots=True)
class Acceptance:
    """Who accepted a sheet, for the inputs that the digest `basis` stands for."""

    by: str
    basis: str
    dated: datetime.date | None = None
    note: str = ""
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True)
class Collision:
    """A key that two sides of a merge changed differently, to be settled. Values as TOML, "" for none."""

    key: str
    base: str = ""
    ours: str = ""
    theirs: str = ""
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True)
class Bias:
    """The current source: "ideal" with its conductance [S] and capacitance [F], or a device by name."""

    device: str = "ideal"
    values: Mapping[str, Value] = field(default_factory=dict)

    @property
    def ideal(self) -> bool:
        """Whether no transistor stands behind it."""
        return self.device == "ideal"


@dataclass(frozen=True, slots=True)
class Solve:
    """How bounds and proposals are found; see sheet_keys.SOLVE_KEYS."""

    keep: str = "geometry"
    inversion_coefficient: float | None = None
    over: str = "all"
    current_allowance: float = 0.05


@dataclass(frozen=True, slots=True)
class Variant:
    """A named set of changed values beside a sheet.

    `changes` maps a key of [assume], [choose] or [own] to its Value; `fingers` a device's name to a whole number.
    """

    name: str
    changes: Mapping[str, Value] = field(default_factory=dict)
    fingers: Mapping[str, int] = field(default_factory=dict)
    note: str = ""
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True)
class Sheet:
    """One circuit block as its file states it.

    `assume`, `own` and `choose` map a key to its Value. `choose` holds design variables only; `fingers` maps a
    device's name ("main", "bias", "cascode") to a whole number. `lines` gives the line of any dotted key.
    """

    name: str
    file: str
    stage: str
    device: str
    title: str = ""
    bulk: str = "rail"
    count: int = 1
    owner: str = ""
    state: str = "draft"
    notes: str = ""
    bias: Bias = Bias()
    assume: Mapping[str, Value] = field(default_factory=dict)
    own: Mapping[str, Value] = field(default_factory=dict)
    choose: Mapping[str, Value] = field(default_factory=dict)
    fingers: Mapping[str, int] = field(default_factory=dict)
    solve: Solve = Solve()
    targets: Mapping[str, Target] = field(default_factory=dict)
    evidence: tuple[Evidence, ...] = ()
    waivers: tuple[Waiver, ...] = ()
    remarks: tuple[Remark, ...] = ()
    acceptances: tuple[Acceptance, ...] = ()
    collisions: tuple[Collision, ...] = ()
    variants: Mapping[str, Variant] = field(default_factory=dict)
    lines: Mapping[str, int] = field(default_factory=dict, compare=False)


@dataclass(frozen=True, slots=True)
class DeviceModel:
    """One transistor type of a process file: `values` maps a parameter of process_keys to its Value."""

    name: str
    polarity: str
    own_well: bool
    values: Mapping[str, Value]

    def number(self, parameter: str) -> float:
        """The parameter's SI value at the reference temperature. [unit of the key]"""
        number = self.values[parameter].number
        assert number is not None  # the reader refuses formulas in a process file
        return number


@dataclass(frozen=True, slots=True)
class Process:
    """A process file. `corners[corner][device][change]` is an SI value; "typical" has none.

    `fitted[device]` maps a key of fitted_keys.FITTED to its SI value, text or date, for devices that were fitted.
    """

    name: str
    file: str
    title: str
    reference_temperature: float
    devices: Mapping[str, DeviceModel]
    corners: Mapping[str, Mapping[str, Mapping[str, float]]]
    fitted: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    lines: Mapping[str, int] = field(default_factory=dict, compare=False)


@dataclass(frozen=True, slots=True)
class Chain:
    """A signal path through sheets, in the order of the signal. `targets` maps a key of CHAIN_METRICS to its limits."""

    name: str
    sheets: tuple[str, ...]
    title: str = ""
    settling_tolerance: float = 1e-3
    targets: Mapping[str, Target] = field(default_factory=dict)
    line: int | None = field(default=None, compare=False)


@dataclass(frozen=True, slots=True)
class ProjectFile:
    """biasbook.toml: `processes`, `temperatures` [K] and `supplies` [V] span the conditions; `budgets` in SI units.

    `requirements` maps the number of a requirement to what it says.
    """

    file: str
    title: str
    owner: str
    process: str
    processes: tuple[str, ...]
    temperatures: tuple[float, ...]
    supplies: tuple[float, ...]
    nominal: Condition
    budgets: Mapping[str, float]
    requirements: Mapping[str, str] = field(default_factory=dict)
    chains: Mapping[str, Chain] = field(default_factory=dict)
    lines: Mapping[str, int] = field(default_factory=dict, compare=False)
