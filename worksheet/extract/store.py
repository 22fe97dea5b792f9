"""What an extraction says in a process file: statements for one device, and the range it was fitted over.

Statements are pairs of a dotted path and a value; writing them into the text, in place, is the business of the layer
that owns the files.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterator
from dataclasses import dataclass

from worksheet.extract.data import Estimate, Extraction, Span
from worksheet.extract.estimates import OFFSETS
from worksheet.model.fitted_keys import FITTED
from worksheet.model.keys import Key, Kind
from worksheet.model.process_keys import DEVICE
from worksheet.model.quantity import format_input
from worksheet.model.sheet import DeviceModel, Process
from worksheet.model.text import clean

Path = tuple[str, ...]
Stated = str | float | datetime.date
Statement = tuple[Path, Stated | None]
"""Where, and what to state there; None takes the key out."""

DIGITS, ERROR_DIGITS = 6, 3
"""Significant digits of a value and of a standard error that are written."""

_SHORT_DIGEST = 12
_BESIDE_COUPLING = ("drain_coupling_length", "drain_coupling_exponent")


@dataclass(frozen=True, slots=True)
class Stating:
    """What goes into the process file.

    Attributes:
        statements: About parameters, in their order.
        fitted: Keys of the range it was fitted over; None takes a key out.
        written: Parameters that get a new value.
        kept: Parameters that stay as they stand, a sentence each.
        obstacles: Why nothing can be written, a sentence each.
    """

    statements: tuple[Statement, ...]
    fitted: dict[str, Stated | None]
    written: tuple[str, ...]
    kept: tuple[str, ...]
    obstacles: tuple[str, ...]


def stating(result: Extraction, process: Process, device: DeviceModel, *, dated: datetime.date, trust: str) -> Stating:
    """Turn an extraction into statements about a device of a process file.

    Args:
        result: The extraction.
        process: The process file as it stands.
        device: The device in it.
        dated: The day of the fit.
        trust: How far its values are to be trusted, one of keys.TRUST.
    """
    obstacles = list(_obstacles(result, device))
    if obstacles:
        return Stating((), {}, (), (), tuple(obstacles))
    moved, kept = _at_reference(result, process, device)
    source = _source(result, dated)
    statements: list[Statement] = []
    written = []
    for key in DEVICE.keys:
        estimate = moved.get(key.name)
        if estimate is None:
            continue
        if estimate.value is None:
            kept.append(f"{key.name} stays as it stands: {estimate.reason}.")
            continue
        if not estimate.fitted and key.name not in _BESIDE_COUPLING and not _stands(device, key.name):
            continue
        written.append(key.name)
        statements += _parameter(("device", device.name, key.name), key, estimate, source, trust, device)
    return Stating(tuple(statements), dict(_range(result, dated)), tuple(written), tuple(kept), ())


def _obstacles(result: Extraction, device: DeviceModel) -> Iterator[str]:
    """What stands against writing at all."""
    if device.polarity != result.polarity:
        yield f"Found the device {device.name} of polarity {device.polarity}, expected {result.polarity} as the table."
    if not result.rows.sized:
        yield "Found a table without width and length, expected both: a process file states the current per square."
    if result.poor:
        yield "Found a poor fit, expected one that follows the table: nothing of it is written."


def _stands(device: DeviceModel, name: str) -> bool:
    """Whether the file states a value other than 0 for an optional parameter."""
    return bool(name in device.values and device.values[name].number)


def _at_reference(result: Extraction, process: Process, device: DeviceModel) -> tuple[dict[str, Estimate], list[str]]:
    """The estimates at the process file's reference temperature, and what to say about the way there."""
    found = {name: one for name, one in result.estimates.items() if name not in OFFSETS}
    own, wanted = result.reference_temperature, process.reference_temperature
    if found["drain_coupling"].value is None:
        for name in _BESIDE_COUPLING:
            found[name] = Estimate(None, None, found[name].unit, "the drain coupling was not fitted")
    if abs(own - wanted) < 1e-6:
        return found, []
    drift = _else(found["threshold_drift"], device.number("threshold_drift"))
    exponent = _else(found["mobility_exponent"], device.number("mobility_exponent"))
    threshold, current = found["threshold"], found["specific_current"]
    if threshold.value is not None:
        found["threshold"] = Estimate(
            threshold.value + drift * (own - wanted), threshold.standard_error, threshold.unit, threshold.reason
        )
    if current.value is not None:
        factor = (wanted / own) ** (2.0 - exponent)
        error = None if current.standard_error is None else current.standard_error * factor
        found["specific_current"] = Estimate(current.value * factor, error, current.unit, current.reason)
    said = (
        f"threshold and specific_current were moved from {own:.2f} K to the reference temperature {wanted:.2f} K with "
        f"a drift of {1e3 * drift:.3g} mV/K and a mobility exponent of {exponent:.3g}."
    )
    return found, [said]


def _else(estimate: Estimate, stated: float) -> float:
    """An estimate's value, or the stated one where there is none."""
    return stated if estimate.value is None else estimate.value


def _source(result: Extraction, dated: datetime.date) -> str:
    """Where a value came from, in one line."""
    files = _joined(f"{_file_name(one.file)} (sha256 {one.digest[:_SHORT_DIGEST]})" for one in result.readings)
    return f"fit of {dated.isoformat()} to {files}"


def _parameter(
    path: Path, key: Key, estimate: Estimate, source: str, trust: str, device: DeviceModel
) -> Iterator[Statement]:
    """The statements of one parameter: value, source, trust, standard error."""
    assert estimate.value is not None  # those without a value stay as they stand
    yield path, _text(estimate.value, key, DIGITS)
    beside = estimate.fitted or key.name in _BESIDE_COUPLING
    yield (*path, "source"), source if beside else f"{source}, left at its default"
    yield (*path, "trust"), trust
    if estimate.standard_error is not None:
        yield (*path, "standard_error"), _text(estimate.standard_error, key, ERROR_DIGITS)
    elif key.name in device.values and device.values[key.name].standard_error is not None:
        yield (*path, "standard_error"), None


def _range(result: Extraction, dated: datetime.date) -> Iterator[tuple[str, Stated | None]]:
    """The keys of [fitted.DEVICE]."""
    trust = result.trust
    ends: dict[str, Stated | None] = {
        "inversion_low": _end(trust.inversion, "low"),
        "inversion_high": _end(trust.inversion, "high"),
        "length_low": _end(trust.length, "low"),
        "length_high": _end(trust.length, "high"),
        "source_voltage_high": _end(trust.source, "high"),
        "drain_voltage_high": _end(trust.drain, "high"),
        "temperature_low": _end(trust.temperature, "low"),
        "temperature_high": _end(trust.temperature, "high"),
        "rms_log_error": result.rms_log_error,
        "dated": dated,
        "files": _joined(_file_name(one.file) for one in result.readings),
        "digest": _joined(one.digest for one in result.readings),
    }
    for key in FITTED.keys:
        value = ends[key.name]
        if isinstance(value, float):
            digits = ERROR_DIGITS if key.dimension is not None and not key.dimension.unit else DIGITS
            yield key.name, _text(value, key, digits)
        else:
            yield key.name, value


def _end(span: Span | None, side: str) -> float | None:
    return None if span is None else float(getattr(span, side))


def _joined(texts: Iterator[str]) -> str:
    return ", ".join(dict.fromkeys(texts))


def _file_name(path: str) -> str:
    """A file's name without its folders, which mean nothing to a colleague; harmless to show."""
    return clean(path.replace("\\", "/").rpartition("/")[2])


def _text(value: float, key: Key, digits: int) -> Stated:
    """A number as the process file writes it: with its unit, or bare where it has none."""
    rounded = float(f"{value:.{digits}g}")
    assert key.kind is Kind.QUANTITY  # only numbers come here
    assert key.dimension is not None
    return format_input(rounded, key.dimension) if key.dimension.unit else rounded
