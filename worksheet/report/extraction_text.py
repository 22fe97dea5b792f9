"""An extraction as a designer reads it in a terminal of 80 columns, from the rows that every format shares."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.extract.data import Estimate, Extraction, Span
from worksheet.model import dimension as dim
from worksheet.model.dimension import Dimension
from worksheet.model.process_keys import DEVICE
from worksheet.model.quantity import format_quantity
from worksheet.model.text import clean
from worksheet.report import wording
from worksheet.report.table import Column, Table, lines, wrapped

_DIMENSIONS = {key.name: key.dimension for key in DEVICE.keys if key.dimension is not None}
_TRUSTED: tuple[tuple[str, str, Dimension], ...] = (
    ("inversion coefficient", "inversion", dim.NUMBER),
    ("length", "length", dim.LENGTH),
    ("width", "width", dim.LENGTH),
    ("source-bulk voltage", "source", dim.VOLTAGE),
    ("drain-source voltage", "drain", dim.VOLTAGE),
    ("temperature", "temperature", dim.TEMPERATURE),
)
_SLOPE = "V/decade"


def text(result: Extraction, width: int) -> Iterator[str]:
    """Lines of an extraction, no wider than `width` columns where words allow it."""
    yield from wrapped(_heading(result), width)
    for one in result.readings:
        read = ", ".join(one.mapping)
        how = "guessed" if one.guessed else "read"
        yield from wrapped(f"{one.file}: {one.rows} rows, {one.delimiter}-separated, {how}: {read}", width, "  ")
    yield ""
    yield from lines(parameters(result), width, "  ")
    if result.by_length:
        yield ""
        yield "Each length by itself"
        yield from lines(lengths(result), width, "  ")
    yield ""
    yield from wrapped(_fit(result), width)
    if result.left_out:
        yield ""
        yield "Left out"
        for item in result.left_out:
            yield from wrapped(f"{item.count} rows, {item.reason}: {item.detail}", width, "  ")
    yield ""
    yield "Trusted"
    yield from lines(trusted(result), width, "  ")
    yield ""
    yield "Error of the fit, rms"
    yield from lines(errors(result), width, "  ")
    yield ""
    yield "Textbook methods, on the table and on the fit"
    yield from lines(hand(result), width, "  ")
    for each in result.hand:
        yield from wrapped(f"{each.title}: {each.method}", width, "  ")
    if result.warnings:
        yield ""
        for warning in result.warnings:
            yield from wrapped(f"- {warning}", width)
    yield ""
    yield from wrapped(wording.STANDING, width)


def parameters(result: Extraction) -> Table:
    """The parameters, with their errors."""
    columns = (
        Column("parameter"),
        Column("value", right=True),
        Column("standard error", right=True),
        Column("relative", right=True),
        Column("remark", flexible=True),
    )
    rows = tuple(_parameter(name, one) for name, one in result.estimates.items())
    return Table(columns, rows)


def lengths(result: Extraction) -> Table:
    """The main parameters of each length by itself."""
    shown = ("kappa", "threshold", "specific_current", "drain_coupling")
    columns = (Column("length"), *(Column(name, right=True) for name in shown), Column("rms", right=True))
    rows = tuple(
        (
            format_quantity(one.length, dim.LENGTH),
            *(_number(name, one.estimates[name].value) for name in shown),
            percent(one.rms_log_error),
        )
        for one in result.by_length
    )
    return Table(columns, rows)


def trusted(result: Extraction) -> Table:
    """Where the fit may be trusted."""
    columns = (Column("over"), Column("from", right=True), Column("to", right=True))
    rows = []
    for title, name, dimension in _TRUSTED:
        span: Span | None = getattr(result.trust, name)
        ends = ("-", "-") if span is None else tuple(format_quantity(x, dimension, 3) for x in (span.low, span.high))
        rows.append((title, *ends))
    return Table(columns, tuple(rows))


def errors(result: Extraction) -> Table:
    """Errors by region."""
    columns = (
        Column("region"),
        Column("rows", right=True),
        Column("current", right=True),
        Column("transconductance", right=True),
        Column("output conductance", right=True),
    )
    rows = tuple(
        (
            f"{one.region}, {'saturated' if one.saturated else 'unsaturated'}",
            str(one.points),
            percent(one.current),
            percent(one.transconductance),
            percent(one.drain_conductance),
        )
        for one in result.regions
        if one.points
    )
    return Table(columns, rows)


def hand(result: Extraction) -> Table:
    """Values of textbook methods."""
    columns = (
        Column("method", flexible=True),
        Column("length"),
        Column("table", right=True),
        Column("fit", right=True),
    )
    rows = tuple(
        (
            one.title,
            "-" if one.length is None else format_quantity(one.length, dim.LENGTH),
            _of_unit(one.value, one.unit),
            _of_unit(one.fitted, one.unit),
        )
        for one in result.hand
    )
    return Table(columns, rows)


def percent(log_error: float | None) -> str:
    """An rms error of a logarithm as a percentage."""
    return "-" if log_error is None else f"{100.0 * log_error:.3g} %"


def _heading(result: Extraction) -> str:
    files = ", ".join(clean(one.file) for one in result.readings)
    temperature = format_quantity(result.reference_temperature, dim.TEMPERATURE, 5)
    return f"{result.polarity}-channel device from {files}, parameters at {temperature}"


def _fit(result: Extraction) -> str:
    left = sum(one.count for one in result.left_out)
    span = result.inversion_span
    off = f"current off by {percent(result.rms_log_error)} rms over inversion {span.low:.2g} to {span.high:.2g}"
    parts = [f"{result.points} rows fitted, {left} left out; {off}"]
    if result.core_log_error is not None:
        share = f"{result.core_left_out} of its {result.core_points} rows left out"
        parts.append(f"{percent(result.core_log_error)} between 0.001 and 10 ({share})")
    if result.zero_source_log_error is not None:
        parts.append(f"{percent(result.zero_source_log_error)} there at zero source voltage")
    return ", ".join(parts) + ("; a poor fit" if result.poor else "")


def _parameter(name: str, one: Estimate) -> tuple[str, ...]:
    error = one.standard_error
    relative = "-" if not error or not one.value else f"{100.0 * error / abs(one.value):.2g} %"
    return name, _number(name, one.value), "-" if error is None else _number(name, error, 2), relative, one.reason


def _number(name: str, value: float | None, digits: int = 4) -> str:
    return "-" if value is None else format_quantity(value, _DIMENSIONS.get(name, dim.LENGTH), digits)


def _of_unit(value: float | None, unit: str) -> str:
    if value is not None and unit == _SLOPE:
        return f"{1e3 * value:.4g} mV/decade"
    if value is not None and unit == "V/V":
        return f"{1e3 * value:.3g} mV/V"
    return wording.number(value, unit)
