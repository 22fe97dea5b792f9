"""Mismatch by Pelgrom's law: between the two devices of a pair, and of one device against its intended value."""

from __future__ import annotations

import numpy as np

from worksheet.device.arrays import Array, Number


def pair_deviation(coefficient: Number, width: Number, length: Number) -> Array:
    """Standard deviation of the difference between the two devices of a pair.

    Args:
        coefficient: A_VT [V m] or A_beta [m].
        width, length: Size of each device. [m]
    Returns: [V] or [-]
    Source: Pelgrom, Duinmaijer and Welbers 1989.
    """
    return np.asarray(coefficient / np.sqrt(np.asarray(width) * length))


def threshold_deviation(coefficient: Number, width: Number, length: Number) -> Array:
    """Standard deviation of the threshold difference of a pair, A_VT/sqrt(W L). [V]; see pair_deviation."""
    return pair_deviation(coefficient, width, length)


def single_deviation(coefficient: Number, width: Number, length: Number) -> Array:
    """Standard deviation of one device against its intended value. [V] or [-]; see pair_deviation."""
    return np.asarray(pair_deviation(coefficient, width, length) / np.sqrt(2.0))
