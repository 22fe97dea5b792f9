"""Many brackets drawn together at once, each on the change of one constraint between met and not met."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import goals
from worksheet.solver.trials import Index, Mask

_ROUNDS = 80
_CLOSE = 2e-13
_MET_BY = 2e-9
_PROBE = 1e-8


def refined(
    look: Callable[[Array], tuple[Array, Index]], low: Array, high: Array, rising: Mask
) -> tuple[Array, Array, Array, Array]:
    """Both ends of every bracket drawn together by false position on the slack (Illinois), bisection where it stalls.

    Args:
        look: Slack (zero or more where met) and worst point at one place for each bracket.
        low, high: Ends of the brackets, met at one and not at the other.
        rising: Whether it is met at the high end.
    Returns: low, high, and the slack at both; the met end is within rounding of the change
    """
    gap_low, gap_high = look(low)[0], look(high)[0]
    plain_low, plain_high = gap_low, gap_high
    last = np.zeros(len(low))
    for k in range(_ROUNDS):
        met_end, met_gap = np.where(rising, high, low), np.where(rising, gap_high, gap_low)
        width = high - low
        near = np.abs(met_gap) <= _MET_BY
        done = (near & (width <= 2 * _PROBE)) | (width <= _CLOSE * np.maximum(1.0, np.abs(low)))
        if done.all():
            break
        with np.errstate(all="ignore"):
            middle = (low * plain_high - high * plain_low) / (plain_high - plain_low)
        middle = np.where(near, met_end + np.where(rising, -_PROBE, _PROBE), middle)
        stuck = ~np.isfinite(middle) | (middle <= low) | (middle >= high) | (k % 5 == 4)
        stuck |= np.maximum(np.abs(gap_low), np.abs(gap_high)) >= 0.5 * goals.FAR
        middle = np.where(done, met_end, np.where(stuck, 0.5 * (low + high), middle))
        gap = look(middle)[0]
        above = (gap >= 0) == rising
        to_high, to_low = above & ~done, ~above & ~done
        plain_low = np.where(to_low, gap, np.where(to_high & (last > 0), plain_low / 2, plain_low))
        plain_high = np.where(to_high, gap, np.where(to_low & (last < 0), plain_high / 2, plain_high))
        low, gap_low = np.where(to_low, middle, low), np.where(to_low, gap, gap_low)
        high, gap_high = np.where(to_high, middle, high), np.where(to_high, gap, gap_high)
        last = np.where(done, last, np.where(above, 1.0, -1.0))
    return low, high, gap_low, gap_high
