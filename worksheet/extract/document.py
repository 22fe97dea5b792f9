"""An extraction as plain data in the contract's shape: SI base units, null with its reason where no number is."""

from __future__ import annotations

from typing import Any

from worksheet.extract.data import ByLength, Estimate, Extraction, Hand, Reading, RegionError, Span
from worksheet.extract.estimates import OFFSETS

SCHEMA = 1
Plain = dict[str, Any]


def document(result: Extraction) -> Plain:
    """The JSON document of `biasbook extract`.

    Args:
        result: What was extracted.

    Returns: `device`, `fit` and `warnings` as the contract has them, and beside them reading, correlations, trusted
        ranges, errors by region, textbook values and fits by length.
    """
    return {
        "schema": SCHEMA,
        "polarity": result.polarity,
        "device": {name: _estimate(one) for name, one in result.estimates.items() if name not in OFFSETS},
        "offsets": {name: _estimate(result.estimates[name]) for name in OFFSETS},
        "reference_temperature": result.reference_temperature,
        "fit": {
            "points": result.points,
            "left_out": sum(one.count for one in result.left_out),
            "rms_log_error": result.rms_log_error,
            "inversion_low": result.inversion_span.low,
            "inversion_high": result.inversion_span.high,
            "core_rms_log_error": result.core_log_error,
            "zero_source_rms_log_error": result.zero_source_log_error,
            "core_points": result.core_points,
            "core_left_out": result.core_left_out,
            "poor": result.poor,
            "left_out_for": [{"reason": x.reason, "count": x.count, "detail": x.detail} for x in result.left_out],
        },
        "correlations": [
            {"first": first, "second": second, "value": value} for (first, second), value in result.correlations.items()
        ],
        "trusted": {
            name: _span(getattr(result.trust, name))
            for name in ("inversion", "length", "width", "source", "drain", "temperature")
        },
        "regions": [_region(one) for one in result.regions],
        "hand": [_hand(one) for one in result.hand],
        "by_length": [_by_length(one) for one in result.by_length],
        "limits": list(result.limits),
        "reading": [_reading(one) for one in result.readings],
        "warnings": list(result.warnings),
        "problems": [],
    }


def _estimate(one: Estimate) -> Plain:
    plain: Plain = {"value": one.value, "standard_error": one.standard_error, "unit": one.unit}
    if one.reason:
        plain["reason"] = one.reason
    return plain


def _span(one: Span | None) -> Plain | None:
    return None if one is None else {"low": one.low, "high": one.high}


def _region(one: RegionError) -> Plain:
    return {
        "region": one.region,
        "saturated": one.saturated,
        "points": one.points,
        "current": one.current,
        "transconductance": one.transconductance,
        "drain_conductance": one.drain_conductance,
    }


def _hand(one: Hand) -> Plain:
    return {
        "name": one.name,
        "value": one.value,
        "unit": one.unit,
        "of_fit": one.fitted,
        "length": one.length,
        "method" if one.value is not None else "reason": one.method,
    }


def _by_length(one: ByLength) -> Plain:
    return {
        "length": one.length,
        "rms_log_error": one.rms_log_error,
        "device": {name: _estimate(each) for name, each in one.estimates.items() if name not in OFFSETS},
    }


def _reading(one: Reading) -> Plain:
    return {
        "file": one.file,
        "sha256": one.digest,
        "rows": one.rows,
        "kept": one.kept,
        "delimiter": one.delimiter,
        "columns": list(one.mapping),
        "ignored": list(one.ignored),
        "guessed": one.guessed,
        "notes": list(one.notes),
    }
