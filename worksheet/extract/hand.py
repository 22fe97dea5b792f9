"""Textbook values read off the curves without a fit: thresholds, weak-inversion slope, drain coupling, efficiency.

They stand beside the fitted parameters because they are what designers and process manuals quote; the same method is
applied to the fitted curves, so that a difference shows the fit and not the definition. Methods: Tsividis and McAndrew
2011 (constant current, extrapolation at maximum slope in the linear region less V_DS/2); weak-inversion slope and
drain coupling by gate-voltage shift at constant current are common practice.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Hand, Index, Mask, Rows
from worksheet.extract.screen import groups

CONSTANT_CURRENT = 1e-7
"""Current per W/L at which the constant-current threshold is read. [A]"""

_LINEAR = 0.15
_LEAST_POINTS = 6
_RISE = 1e-3
_WINDOW, _WIDE = 0.06, 0.12
_LN10 = float(np.log(10.0))
_NONE = "the table holds no curve for it"


@dataclass(frozen=True, eq=False, slots=True)
class _Curve:
    """One transfer curve in rising gate voltage."""

    gate: Array
    current: Array
    fitted: Array
    source: float
    across: float


def hand_values(rows: Rows, fitted: Array, kept: Mask) -> tuple[Hand, ...]:
    """Textbook values of every length, at its lowest source voltage.

    Args:
        rows: Every row.
        fitted: Current of the fitted law. [A], shape (rows,)
        kept: Rows that are not noise, leakage or breakdown.
    """
    found: list[Hand] = []
    usable = np.flatnonzero(kept & (rows.current > 0.0))
    some = rows.take(usable)
    for group in groups((some.width, some.length)):
        temperature = float(np.median(some.temperature[group]))
        away = np.abs(some.temperature[group] - temperature)
        near = group[away <= away.min() + 1.0]
        part = some.take(near)
        lowest = np.flatnonzero(np.abs(part.source - part.source[np.argmin(np.abs(part.source))]) < 5e-3)
        found += _of_device(part.take(lowest), fitted[usable][near][lowest])
    return tuple(found)


def _of_device(rows: Rows, fitted: Array) -> list[Hand]:
    """The values of one device at one source voltage."""
    length = float(rows.length[0]) if np.isfinite(rows.length[0]) else None
    width = float(rows.width[0]) if np.isfinite(rows.width[0]) else None
    curves = sorted(filter(_rises, _curves(rows, fitted)), key=lambda one: one.across)
    linear = curves[0] if curves and curves[0].across <= _LINEAR else None
    top = curves[-1] if curves else None
    return [
        _constant_current(curves, width, length),
        _maximum_slope(linear, length),
        _weak_slope(curves, length),
        _coupling(curves, width, length),
        _efficiency(top, length),
    ]


def _curves(rows: Rows, fitted: Array) -> list[_Curve]:
    """Transfer curves with enough points."""
    found = []
    for group in groups((rows.across,)):
        curve = group[np.argsort(rows.gate[group], kind="stable")]
        if len(curve) >= _LEAST_POINTS and np.ptp(rows.gate[curve]) > _WINDOW:
            place: Index = curve
            found.append(
                _Curve(
                    rows.gate[place],
                    rows.current[place],
                    fitted[place],
                    float(rows.source[place[0]]),
                    float(rows.across[place[0]]),
                )
            )
    return found


def _rises(curve: _Curve) -> bool:
    """Whether the current grows with the gate somewhere, in the table and in the fit: every method needs that."""
    reach = float(np.ptp(curve.gate))
    sides = (curve.current, curve.fitted)
    return all(float(np.max(slopes(curve.gate, side)[1])) * reach > _RISE * float(np.max(side)) for side in sides)


def _constant_current(curves: list[_Curve], width: float | None, length: float | None) -> Hand:
    name, title = "constant_current_threshold", "threshold at constant current"
    if width is None or length is None or not curves:
        reason = _NONE if not curves else "width and length are not known"
        return Hand(name, title, None, "V", reason, length)
    curve, level = curves[0], CONSTANT_CURRENT * width / length
    value, fitted = _gate_at(curve.gate, curve.current, level), _gate_at(curve.gate, curve.fitted, level)
    if value is None:
        return Hand(name, title, None, "V", f"the current does not pass {level:.3g} A", length)
    method = f"gate-source voltage at 100 nA W/L, vs {curve.source:.3g} V, vds {curve.across:.3g} V"
    drawn = None if fitted is None else fitted - curve.source
    return Hand(name, title, value - curve.source, "V", method, length, drawn)


def _maximum_slope(curve: _Curve | None, length: float | None) -> Hand:
    name, title = "maximum_slope_threshold", "threshold at maximum slope"
    if curve is None:
        reason = f"the table holds no curve at a drain-source voltage up to {_LINEAR:g} V"
        return Hand(name, title, None, "V", reason, length)
    value, fitted = _extrapolated(curve, curve.current), _extrapolated(curve, curve.fitted)
    method = f"extrapolated at maximum slope less vds/2, vs {curve.source:.3g} V, vds {curve.across:.3g} V"
    return Hand(name, title, value - curve.source, "V", method, length, fitted - curve.source)


def _weak_slope(curves: list[_Curve], length: float | None) -> Hand:
    name, title = "weak_inversion_slope", "weak-inversion slope"
    if not curves:
        return Hand(name, title, None, "V/decade", _NONE, length)
    curve = curves[0]
    value, fitted = _steepest(curve.gate, curve.current), _steepest(curve.gate, curve.fitted)
    method = f"least gate voltage for a decade of current, vs {curve.source:.3g} V, vds {curve.across:.3g} V"
    return Hand(name, title, _LN10 / value, "V/decade", method, length, _LN10 / fitted)


def _coupling(curves: list[_Curve], width: float | None, length: float | None) -> Hand:
    name, title = "threshold_shift_per_drain_voltage", "threshold shift per drain voltage"
    if len(curves) < 2 or width is None or length is None:
        reason = "width and length are not known" if len(curves) > 1 else "the table holds one drain voltage only"
        return Hand(name, title, None, "V/V", reason, length)
    low, high, level = curves[0], curves[-1], CONSTANT_CURRENT * width / length
    apart = high.across - low.across
    shifts = []
    for side in ("current", "fitted"):
        ends = [_gate_at(one.gate, getattr(one, side), level) for one in (low, high)]
        shifts.append(None if ends[0] is None or ends[1] is None else (ends[0] - ends[1]) / apart)
    if shifts[0] is None:
        return Hand(name, title, None, "V/V", f"the current does not pass {level:.3g} A", length)
    method = f"gate voltage at 100 nA W/L, vds {low.across:.3g} to {high.across:.3g} V, vs {low.source:.3g} V"
    return Hand(name, title, shifts[0], "V/V", method, length, shifts[1])


def _efficiency(curve: _Curve | None, length: float | None) -> Hand:
    name, title = "peak_transconductance_efficiency", "peak transconductance efficiency"
    if curve is None:
        return Hand(name, title, None, "1/V", _NONE, length)
    method = f"greatest slope of ln(id) against vg, vs {curve.source:.3g} V, vds {curve.across:.3g} V"
    return Hand(
        name, title, _steepest(curve.gate, curve.current), "1/V", method, length, _steepest(curve.gate, curve.fitted)
    )


def _gate_at(gate: Array, current: Array, level: float) -> float | None:
    """Gate voltage at which a rising curve passes a current, on the logarithm. [V]"""
    above = np.flatnonzero(current >= level)
    if not len(above) or above[0] == 0:
        return None
    place = int(above[0])
    low, high = np.log(current[place - 1]), np.log(current[place])
    share = (np.log(level) - low) / (high - low) if high > low else 0.0
    return float(gate[place - 1] + share * (gate[place] - gate[place - 1]))


def _steepest(gate: Array, current: Array) -> float:
    """Greatest slope of ln I. [1/V]"""
    return float(np.max(slopes(gate, np.log(current))[1]))


def _extrapolated(curve: _Curve, current: Array) -> float:
    """Gate voltage at which the tangent at the greatest slope meets zero current, less V_DS/2. [V]"""
    values, tangents = slopes(curve.gate, current, _WIDE)
    place = int(np.argmax(tangents))
    return float(curve.gate[place] - values[place] / tangents[place] - curve.across / 2.0)


def slopes(x: Array, y: Array, window: float = _WINDOW) -> tuple[Array, Array]:
    """Value and slope of a curve at each of its points, by a parabola through the points around it.

    Args:
        x: Rising. [V]
        y: The curve. [any]
        window: Half width of the parabola's window, widened to the next point on either side. [V]
    Returns: smoothed y, and its slope against x, shape of x each
    """
    step = float(np.median(np.diff(x)))
    reach = max(window, 1.05 * step)
    values, tangents = np.empty_like(y), np.empty_like(y)
    for place, here in enumerate(x):
        low, high = int(np.searchsorted(x, here - reach)), int(np.searchsorted(x, here + reach, side="right"))
        around, level = x[low:high] - here, y[low:high]
        degree = min(2, len(np.unique(around)) - 1)
        if degree < 1:
            values[place], tangents[place] = y[place], 0.0
            continue
        powers = np.vander(around / reach, degree + 1, increasing=True)
        parabola = np.linalg.lstsq(powers, level, rcond=None)[0]
        values[place], tangents[place] = parabola[0], parabola[1] / reach
    return values, tangents
