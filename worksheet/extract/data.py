"""What extraction hands on: measured rows, estimates with their errors, the fit, its judgement. Plain frozen data.

Every result is one type that is always whole: what could not be found is None with a reason beside it. Rows are kept
as for an n-channel device, bulk-referred, so that one law serves both polarities.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array
from worksheet.device.constants import thermal_voltage

Mask = NDArray[np.bool_]
"""One truth value a row."""

Index = NDArray[np.intp]
"""Positions of rows."""


@dataclass(frozen=True, eq=False, slots=True)
class Rows:
    """Points of drain current, each array of shape (rows,); for a p-channel device mirrored to n.

    Attributes:
        gate, source, drain: V_G, V_S, V_D from the bulk, with the drain at or above the source. [V]
        current: Into the drain; noise may make it negative. [A]
        width, length: W, L; NaN where they are not known. [m]
        temperature: [K]
    """

    gate: Array
    source: Array
    drain: Array
    current: Array
    width: Array
    length: Array
    temperature: Array

    def __len__(self) -> int:
        return len(self.gate)

    def take(self, which: Mask | Index) -> Rows:
        """The rows of a mask or of positions, in that order."""
        return Rows(
            self.gate[which],
            self.source[which],
            self.drain[which],
            self.current[which],
            self.width[which],
            self.length[which],
            self.temperature[which],
        )

    @property
    def thermal(self) -> Array:
        """U_T of each row. [V]"""
        return np.asarray(thermal_voltage(self.temperature))

    @property
    def across(self) -> Array:
        """V_DS of each row. [V]"""
        return self.drain - self.source

    @property
    def sized(self) -> bool:
        """Whether width and length of every row are known."""
        return bool(np.isfinite(self.width).all() and np.isfinite(self.length).all())


@dataclass(frozen=True, slots=True)
class Column:
    """One quantity of a table: the header it was read from and what was done to its numbers.

    Attributes:
        name: The quantity: "vg", "vs", "vd", "vb", "vgs", "vds", "vbs", "vsb", "id", "w", "l", "temperature".
        header: As it stands in the file.
        unit: As it stands in the file or was stated; "" for SI.
        reversed: Whether the sign was turned.
    """

    name: str
    header: str
    unit: str = ""
    reversed: bool = False


@dataclass(frozen=True, slots=True)
class Reading:
    """How one file was read, for the user to confirm.

    Attributes:
        file: As messages call it.
        digest: SHA-256 of the file's bytes.
        rows: How many rows it holds.
        kept: How many of them are kept for the fit; fewer only for very long tables.
        delimiter: What separates its columns, in words.
        columns: What was read from where.
        ignored: Headers that were not read.
        guessed: Whether anything but the contract's own columns was read without being stated.
        notes: What was taken for granted, a sentence each.
    """

    file: str
    digest: str
    rows: int
    kept: int
    delimiter: str
    columns: tuple[Column, ...]
    ignored: tuple[str, ...] = ()
    guessed: bool = False
    notes: tuple[str, ...] = ()

    @property
    def mapping(self) -> tuple[str, ...]:
        """The column mapping as it is stated on a command line: NAME=HEADER or NAME=HEADER:UNIT."""
        return tuple(
            f"{one.name}={'-' if one.reversed else ''}{one.header}{':' + one.unit if one.unit else ''}"
            for one in self.columns
        )


@dataclass(frozen=True, slots=True)
class LeftOut:
    """Rows of one kind that the fit does not use.

    Attributes:
        reason: One of screen.REASONS.
        count: How many.
        detail: Where they lie and how they were recognised, a clause.
    """

    reason: str
    count: int
    detail: str


@dataclass(frozen=True, slots=True)
class Estimate:
    """One parameter.

    Attributes:
        value: SI; None where the data cannot fix it.
        standard_error: One standard deviation; None where value is, and for a parameter left at its default.
        unit: SI unit.
        reason: Why it is None or at its default; "" for a fitted one.
    """

    value: float | None
    standard_error: float | None
    unit: str
    reason: str = ""

    @property
    def fitted(self) -> bool:
        """Whether the number came from the data."""
        return self.value is not None and self.standard_error is not None


@dataclass(frozen=True, slots=True)
class Span:
    """A closed range. [unit of what it is a range of]"""

    low: float
    high: float


@dataclass(frozen=True, slots=True)
class Trust:
    """Where the fit may be trusted; None where no row speaks for it.

    Attributes:
        inversion: Of I_D/I_spec. [-]
        length, width: [m]
        source, drain: V_SB and V_DS. [V]
        temperature: [K]
    """

    inversion: Span | None
    length: Span | None
    width: Span | None
    source: Span | None
    drain: Span | None
    temperature: Span | None


@dataclass(frozen=True, slots=True)
class RegionError:
    """Error of the fit in one region of inversion, over the rows that were used.

    Attributes:
        region: "weak", "moderate" or "strong".
        saturated: Whether of saturated rows or of the others.
        points: Rows with a current.
        current: rms of ln(I_fit/I). [-]; None without rows
        transconductance, drain_conductance: rms of ln of fitted over measured difference quotients. [-]; None
            where there are no two neighbouring rows
    """

    region: str
    saturated: bool
    points: int
    current: float | None
    transconductance: float | None
    drain_conductance: float | None


@dataclass(frozen=True, slots=True)
class Hand:
    """One value of a textbook method, read off the table without a fit.

    Attributes:
        name: Key in JSON.
        title: As a designer calls it.
        value: SI, None where the table does not hold what the method needs.
        unit: SI unit.
        method: How it was read, with the bias it was read at; or why it could not be.
        length: Of the device. [m]; None where unknown
        fitted: The same method applied to the fitted curves. [unit]; None where value is.
    """

    name: str
    title: str
    value: float | None
    unit: str
    method: str
    length: float | None = None
    fitted: float | None = None


@dataclass(frozen=True, slots=True)
class ByLength:
    """A fit of one length alone, where one set of parameters does not hold over all lengths.

    Attributes:
        length: [m]
        estimates: By name.
        rms_log_error: Of ln I_D. [-]
    """

    length: float
    estimates: dict[str, Estimate]
    rms_log_error: float


@dataclass(frozen=True, eq=False, slots=True)
class Extraction:
    """Everything that came out of a table: parameters, fit, judgement. Always whole.

    Attributes:
        polarity: "n" or "p".
        readings: How each file was read.
        rows: Every row that was kept in memory.
        used: Which of them the fit used.
        fitted: Current of the fitted law at every row. [A], shape (rows,)
        inversion: Fitted inversion I_D/I_spec of every row. [-], shape (rows,)
        estimates: Parameters by name of the process file, and the offsets of effective size.
        correlations: Pairs of fitted parameters with the correlation of their errors.
        reference_temperature: At which the parameters hold. [K]
        reference_length: At which drain_coupling holds. [m]; None where lengths are unknown
        points: Rows that the fit used.
        left_out: Rows that it did not, by reason.
        rms_log_error: rms of ln(I_fit/I) over the used rows. [-]
        core_log_error: The same over inversion 0.001 to 10; None without such rows. [-]
        zero_source_log_error: The same at zero source voltage. [-]
        core_points: Rows between inversion 0.001 and 10, by their measured current.
        core_left_out: How many of them the fit does not use.
        inversion_span: Lowest and highest inversion that was used.
        trust, regions, hand, by_length, limits: The judgement; limits are sentences on what the model cannot do here.
        poor: Whether the fit is too poor to build on.
        warnings: Sentences.
    """

    polarity: str
    readings: tuple[Reading, ...]
    rows: Rows
    used: Mask
    fitted: Array
    inversion: Array
    estimates: dict[str, Estimate]
    correlations: dict[tuple[str, str], float]
    reference_temperature: float
    reference_length: float | None
    points: int
    left_out: tuple[LeftOut, ...]
    rms_log_error: float
    core_log_error: float | None
    zero_source_log_error: float | None
    core_points: int
    core_left_out: int
    inversion_span: Span
    trust: Trust
    regions: tuple[RegionError, ...]
    hand: tuple[Hand, ...]
    by_length: tuple[ByLength, ...] = ()
    limits: tuple[str, ...] = ()
    poor: bool = False
    warnings: tuple[str, ...] = field(default=())

    @property
    def residuals(self) -> Array:
        """ln(I/I_fit) of every row; NaN where the current is not above 0. [-], shape (rows,)"""
        safe = np.where(self.rows.current > 0, self.rows.current, np.nan)
        return np.asarray(np.log(safe / self.fitted))
