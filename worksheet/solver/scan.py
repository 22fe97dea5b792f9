"""Samples along one coordinate, read as straight lines between them, constraint by constraint."""

from __future__ import annotations

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver.trials import Mask

FINER = 8
"""Parts of the stretch between two samples."""

FARTHEST = 1e12


def read(samples: Array, slack: Array) -> tuple[Array, Array, Mask]:
    """Where everything holds first between samples.

    Args:
        samples: Values of the first coordinate, rising, shape (places, samples).
        slack: Slack of each constraint at them, shape (constraints, places times samples).
    Returns: for each place the least feasible value and 0, or the best one and its negative slack; and whether the
        least one is the first sample already
    """
    rows, count = samples.shape
    each = np.arange(rows)
    slack = np.clip(slack, -FARTHEST, FARTHEST).reshape(-1, rows, count)  # nothing can be interpolated towards infinity
    begins, ends = _stretches(slack[..., :-1], slack[..., 1:])
    good = begins <= ends
    any_good: Mask = np.asarray(good.any(axis=1))
    at = np.argmax(good, axis=1)
    first = samples[each, at] + begins[each, at] * (samples[each, at + 1] - samples[each, at])
    if any_good.all():
        return first, np.zeros(rows), np.asarray((at == 0) & (begins[each, at] <= 0))
    best, least = _best(samples, slack)
    at_end: Mask = np.asarray(any_good & (at == 0) & (begins[each, at] <= 0))
    return np.where(any_good, first, best), np.where(any_good, 0.0, least), at_end


def _stretches(left: Array, right: Array) -> tuple[Array, Array]:
    """From where to where, between neighbouring samples, all constraints hold; begin past end where they do not.

    Args:
        left, right: Slack at both samples, shape (constraints, places, stretches).
    Returns: begin and end as shares of the stretch, shape (places, stretches)
    """
    with np.errstate(all="ignore"):
        crossing = left / (left - right)
    begins = np.where(left >= 0, 0.0, np.where(right >= 0, crossing, 2.0)).max(axis=0)
    ends = np.where(right >= 0, 1.0, np.where(left >= 0, crossing, -1.0)).min(axis=0)
    return np.asarray(begins), np.asarray(ends)


def _best(samples: Array, slack: Array) -> tuple[Array, Array]:
    """Where the least slack is greatest, among the samples and some places between, and that slack."""
    count = samples.shape[1]
    grid = np.linspace(0, count - 1, (count - 1) * FINER + 1)
    base = np.minimum(grid.astype(int), count - 2)
    share = grid - base
    least = np.min(slack[..., base] * (1 - share) + slack[..., base + 1] * share, axis=0)
    fine = samples[:, base] * (1 - share) + samples[:, base + 1] * share
    k, each = np.argmax(least, axis=1), np.arange(len(samples))
    return fine[each, k], np.minimum(least[each, k], -1e-300)
