"""The way in: tables of current in, parameters with their errors, ranges and reservations out."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract import judge
from worksheet.extract.choose import distinct, ratios
from worksheet.extract.data import ByLength, Estimate, Extraction, Mask, Reading, Rows, Span
from worksheet.extract.estimates import correlations, estimates
from worksheet.extract.fit import starting
from worksheet.extract.hand import hand_values
from worksheet.extract.header import Stated
from worksheet.extract.law import Reference, forward_inversion, log_current
from worksheet.extract.lengths import each_alone, exponent
from worksheet.extract.orient import falling, orient
from worksheet.extract.reservations import reservations
from worksheet.extract.screen import (
    DEFECTS,
    FITTED_RANGE,
    MOST_LEFT_OUT,
    REASONS,
    SERIES_RESISTANCE,
    Screened,
    code,
    counts,
    screen,
)
from worksheet.extract.span import CORE_HIGH, CORE_LOW, GOOD_OVER_ALL, NEAR_ZERO, Spanned, core_error, inversion, span
from worksheet.extract.table import CAPACITY, read_table
from worksheet.model.problem import Problem

LEAST_ROWS = 12
"""Fewest rows that are fitted."""

ROOM = 300.15
"""Of several temperatures the one nearest to this is the reference, unless one is stated. [K]"""

_SIZES = {"width": "w", "length": "l", "temperature": "temperature"}


@dataclass(frozen=True, slots=True)
class Request:
    """What is asked of a fit, besides the tables.

    Attributes:
        polarity: "n" or "p".
        width, length: One for all files or one a file; empty where columns say it. [m]
        temperature: The same. [K]
        columns: Columns that the user named, by quantity.
        fixed: Quantities that have one value in all files. [SI]
        reference_temperature: At which the parameters are to hold; None for that of the table nearest to 27 °C. [K]
        reference_length: At which they hold where lengths differ; None for the shortest. [m]
        keep: Reasons for leaving rows out that are overruled.
        most_left_out: Share of the rows that may be left out for a defect. [-]
        capacity: Most rows that are kept of one file.
    """

    polarity: str = "n"
    width: Sequence[float] = ()
    length: Sequence[float] = ()
    temperature: Sequence[float] = ()
    columns: Mapping[str, Stated] | None = None
    fixed: Mapping[str, float] | None = None
    reference_temperature: float | None = None
    reference_length: float | None = None
    keep: Collection[str] = ()
    most_left_out: float = MOST_LEFT_OUT
    capacity: int = CAPACITY


@dataclass(frozen=True, eq=False, slots=True)
class _Fit:
    """A fit seen from all rows."""

    found: Spanned
    used: Mask
    reference: Reference
    estimates: dict[str, Estimate]
    by_length: tuple[ByLength, ...]
    warnings: tuple[str, ...]


def extract_parameters(
    paths: Sequence[Path], request: Request, *, shown: Sequence[str] | None = None
) -> tuple[Extraction | None, list[Problem]]:
    """Read tables and fit one device.

    Args:
        paths: One file or several, a geometry, temperature or bias each.
        request: What is asked.
        shown: What messages call the files; None for their paths.

    Returns: the extraction and no problem, or None and every problem.
    """
    names = list(shown) if shown is not None else [str(path) for path in paths]
    rows, readings, problems = read_rows(paths, names, request)
    if rows is None or problems:
        return None, problems
    return extract_from_rows(rows, request, readings)


def extract_from_rows(
    rows: Rows, request: Request, readings: tuple[Reading, ...] = ()
) -> tuple[Extraction | None, list[Problem]]:
    """Fit one device to rows that were read already.

    Args:
        rows: The points, mirrored to n.
        request: What is asked; sizes and columns are not looked at.
        readings: How they were read.

    Returns: the extraction and no problem, or None and every problem.
    """
    file = readings[0].file if readings else "table"
    screened = screen(rows, keep=request.keep, most=request.most_left_out)
    left = int(screened.kept.sum())
    if left < LEAST_ROWS:
        why = "; ".join(f"{one.count} {one.reason}" for one in counts(rows, screened)) or "none left out"
        message = f"Found {left} rows of {len(rows)} that speak of the channel ({why}), expected {LEAST_ROWS} or more."
        return None, [Problem(file, None, "", message)]
    fit = _fit(rows, screened, request)
    return _judged(rows, screened, fit, request, readings), []


def read_rows(
    paths: Sequence[Path], names: Sequence[str], request: Request
) -> tuple[Rows | None, tuple[Reading, ...], list[Problem]]:
    """Read tables as one set of rows.

    Args:
        paths: The files.
        names: What messages call them.
        request: Columns, sizes and what else is asked.

    Returns: the rows, how each file was read, and no problem; or None and every problem.
    """
    problems = [
        Problem(
            "command line",
            None,
            key,
            f"Found {len(given)} values, expected one, or one for each of {len(paths)} files.",
        )
        for key in _SIZES
        if len(given := getattr(request, key)) not in {0, 1, len(paths)}
    ]
    if problems:
        return None, (), problems
    parts, readings = [], []
    for place, (path, name) in enumerate(zip(paths, names, strict=True)):
        table, found = read_table(path, shown=name, stated=request.columns or {}, capacity=request.capacity)
        problems += found
        if table is None:
            continue
        fixed = dict(request.fixed or {})
        for key, column in _SIZES.items():
            given = getattr(request, key)
            if given:
                fixed[column] = given[place if len(given) > 1 else 0]
        oriented, found = orient(table.values, fixed, polarity=request.polarity, shown=name)
        problems += found
        if oriented is not None:
            parts.append(oriented.rows)
            reading = replace(
                table.reading,
                guessed=table.reading.guessed or oriented.assumed,
                notes=(*table.reading.notes, *oriented.notes),
            )
            readings.append(reading)
    if problems or not parts:
        return None, (), problems
    rows = Rows(*(np.concatenate([getattr(part, name) for part in parts]) for name in Rows.__dataclass_fields__))
    sized = np.isfinite(rows.width) & np.isfinite(rows.length)
    if sized.any() and not sized.all():
        message = "Found width and length for some files and not for others, expected them for all or for none."
        problems.append(Problem("command line", None, "length", message))
    wrong = falling(rows, names[0]) if not problems else None
    return (None if problems else rows), tuple(readings), [*problems, *([wrong] if wrong else [])]


def _fit(rows: Rows, screened: Screened, request: Request) -> _Fit:
    """Fit what was not screened out, all lengths together or each alone."""
    kept = rows.take(screened.kept)
    allowance = _allowance(rows, screened, request.most_left_out)
    temperature, warnings = _reference_temperature(kept, request)
    known = bool(np.isfinite(kept.length).all())
    shortest = float(kept.length.min()) if known else 1.0
    length, more = _reference_length(kept, request, shortest) if known else (1.0, [])
    reference = Reference(temperature, length)
    several = ratios(kept.length) > 1
    start = starting(kept, reference)
    found = span(kept, start, reference, keep=request.keep, most=allowance, narrowing=not several)
    by_length: tuple[ByLength, ...] = ()
    inside = found.inside
    laws: dict[str, Estimate] = {}
    if several and _misses(found, kept, reference):
        fits = each_alone(kept, temperature, keep=request.keep, most=allowance)
        chosen = min(fits, key=lambda one: abs(np.log(one.length / length)), default=None)
        if chosen is not None:
            found, reference = chosen.found, Reference(temperature, chosen.length)
            inside = np.zeros(len(kept), dtype=bool)
            inside[chosen.member] = chosen.found.inside
            by_length = tuple(one.summary for one in fits)
            laws["drain_coupling_exponent"] = exponent(fits)
            more.append(
                f"One set of parameters does not describe all lengths; the parameters are those of L = "
                f"{chosen.length:.3g} m, and the other lengths stand beside them."
            )
    used = np.zeros(len(rows), dtype=bool)
    used[screened.kept] = inside
    part = rows.take(used)
    level = inversion(found.values, part, reference)
    table = estimates(found.choice, part, (float(level.min()), float(level.max())), reference)
    return _Fit(found, used, reference, {**table, **laws}, by_length, (*warnings, *more))


def _misses(found: Spanned, kept: Rows, reference: Reference) -> bool:
    """Whether a fit of several lengths misses some of them."""
    error = core_error(found.values, kept.take(found.inside), reference)
    return error is not None and error > GOOD_OVER_ALL


def _allowance(rows: Rows, screened: Screened, most: float) -> float:
    """Share of the kept rows that may still be left out for a defect."""
    gone = int(np.isin(screened.reason, [code(one) for one in DEFECTS]).sum())
    left = max(int(screened.kept.sum()), 1)
    return max(most * len(rows) - gone, 0.0) / left


def _reference_temperature(kept: Rows, request: Request) -> tuple[float, list[str]]:
    """Where the parameters are stated, and what to say about it."""
    several = distinct(kept.temperature, 2.0) > 1
    measured = np.unique(kept.temperature)
    nearest = float(measured[np.argmin(np.abs(measured - (request.reference_temperature or ROOM)))])
    wanted = request.reference_temperature
    if wanted is None or several:
        return (nearest if wanted is None else wanted), []
    if abs(wanted - nearest) <= 2.0:
        return nearest, []
    return nearest, [
        f"The table was taken at {nearest:.2f} K alone; the parameters hold there and not at {wanted:.2f} K."
    ]


def _reference_length(kept: Rows, request: Request, shortest: float) -> tuple[float, list[str]]:
    """The length at which the parameters are stated, and what to say about it."""
    wanted = request.reference_length
    if wanted is None:
        return shortest, []
    if ratios(kept.length) < 2 and abs(np.log(wanted / shortest)) > 0.01:
        return shortest, [f"The table has the length {shortest:.3g} m alone; the drain coupling holds there."]
    return wanted, []


def _judged(rows: Rows, screened: Screened, fit: _Fit, request: Request, readings: tuple[Reading, ...]) -> Extraction:
    """The fit with everything that is said about it."""
    values, reference = fit.found.values, fit.reference
    fitted = np.exp(np.maximum(log_current(values, rows, reference), -690.0))
    level = inversion(values, rows, reference)
    source_end = np.asarray(forward_inversion(values, rows, reference))
    saturated = rows.across >= rows.thermal * (2.0 * np.sqrt(source_end + 0.25) + 3.0)
    used = rows.take(fit.used)
    error = np.log(fitted[fit.used] / used.current)
    final = _reasons(rows, screened, fit, level, fitted)
    found = judge.regions(
        used,
        fitted[fit.used],
        np.where(saturated, level, source_end)[fit.used],
        saturated[fit.used],
        _noise(rows, fit.used, error),
    )
    rms = float(np.sqrt(np.mean(error**2)))
    core = core_error(values, used, reference)
    lowest = used.take(np.abs(used.source) <= NEAR_ZERO)
    velocity = fit.estimates["velocity_length"].fitted
    in_core = (level >= CORE_LOW) & (level <= CORE_HIGH)
    result = Extraction(
        polarity=request.polarity,
        readings=readings,
        rows=rows,
        used=fit.used,
        fitted=fitted,
        inversion=level,
        estimates=fit.estimates,
        correlations=correlations(fit.found.choice),
        reference_temperature=reference.temperature,
        reference_length=reference.length if np.isfinite(rows.length).all() else None,
        points=int(fit.used.sum()),
        left_out=counts(rows, final),
        rms_log_error=rms,
        core_log_error=core,
        zero_source_log_error=core_error(values, lowest, reference) if len(lowest) else None,
        core_points=int(in_core.sum()),
        core_left_out=int((in_core & ~fit.used).sum()),
        inversion_span=Span(float(level[fit.used].min()), float(level[fit.used].max())),
        trust=judge.trust(used, level[fit.used], error),
        regions=found,
        hand=hand_values(rows, fitted, screened.kept),
        by_length=fit.by_length,
        limits=judge.limits(found, velocity=velocity),
        poor=rms > GOOD_OVER_ALL or (core is not None and core > GOOD_OVER_ALL),
    )
    said = reservations(result, fit.found, fit.warnings, capped=screened.capped, most=request.most_left_out)
    return replace(result, warnings=said)


def _noise(rows: Rows, used: Mask, error: Array) -> float:
    """Standard deviation of a single current's logarithm, from how neighbours on a curve scatter about each other."""
    part = rows.take(used)
    order = np.lexsort((part.gate, part.drain, part.source, part.temperature, np.nan_to_num(part.length)))
    second = np.diff(error[order], n=2)
    return float(np.median(np.abs(second)) * 1.4826 / np.sqrt(6.0)) if len(second) else 0.0


def _reasons(rows: Rows, screened: Screened, fit: _Fit, level: Array, fitted: Array) -> Screened:
    """Every row that the fit did not use, with why."""
    reason = screened.reason.copy()
    beyond = screened.kept & ~fit.used
    reason[beyond] = code(FITTED_RANGE)
    behind = rows.current < 0.95 * fitted
    reached = rows.source <= fit.found.highest_source + 1e-3
    reason[beyond & (level > fit.found.high) & behind & reached] = code(SERIES_RESISTANCE)
    return Screened(reason, screened.capped)


REASONS_BY_OPTION = {name.replace(" ", "-"): name for name in REASONS}
"""Reasons as they are spelled on a command line."""
