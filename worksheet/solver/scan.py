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
    slack = np.clip(slack, -FARTHEST, FARTHEST)  # nothing can be interpolated towards infinity
    slack = slack.reshape(-1, rows, count)
    grid = np.linspace(0, count - 1, (count - 1) * FINER + 1)
    base = np.minimum(grid.astype(int), count - 2)
    share = grid - base
    between = slack[..., base] * (1 - share) + slack[..., base + 1] * share
    least = np.min(between, axis=0)
    fine = samples[:, base] * (1 - share) + samples[:, base + 1] * share
    good = least >= 0
    any_good = good.any(axis=1)
    k = np.where(any_good, np.argmax(good, axis=1), np.argmax(least, axis=1))
    each, before = np.arange(rows), np.maximum(k - 1, 0)
    here, short = np.maximum(between[:, each, k], 0.0), between[:, each, before]
    back = np.where(short < 0, here / np.where(short < 0, here - short, 1.0), 1.0).min(axis=0)
    first = fine[each, k] - np.where(any_good & (k > 0), back, 0.0) * (fine[each, k] - fine[each, before])
    return first, np.where(any_good, 0.0, least[each, k]), any_good & (k == 0)
