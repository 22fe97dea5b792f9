"""Where a continuous slack changes sign: brackets along an input's range, and all of them drawn together at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver.trials import Index, Mask

STEPS = np.array([0.0, 0.01, 0.03, 0.06, 0.105, 0.165, 0.24, 0.33, 0.43, 0.54, 0.66, 0.78, 0.89, 1.0])
"""Places to look at between the present value (0) and an end of its range (1), on a logarithmic axis: close ones near
the present value, because the nearest break counts.
"""

_ROUNDS = 80
CLOSE = 1e-12
"""How narrow a bracket is drawn."""


def first_change(met: Mask, exists: Mask) -> Index:
    """The first step over which what is met changes.

    Args:
        met, exists: Over (cases, steps), the present value first.
    Returns: its index, -1 where nothing changes before something cannot exist
    """
    changes = (met[:, 1:] != met[:, :-1]) & np.logical_and.accumulate(exists, axis=1)[:, 1:]
    found: Index = np.where(changes.any(axis=1), changes.argmax(axis=1), -1)
    return found


def drawn(look: Callable[[Index, Array], Array], low: Array, high: Array, close: float = CLOSE) -> Array:
    """Draw brackets together until they are narrow.

    Args:
        look: Slack of some of the brackets at one place each; met where zero or more.
        low, high: Ends, met at one and not at the other.
        close: How narrow.
    Returns: the end of each at which it is met
    Source: T. R. Chandrupatla, Advances in Engineering Software 28 (1997) 145-149: inverse quadratic steps, bisection
        where these cannot be trusted; written from memory.
    """
    every = np.arange(len(low))
    a, b = low.copy(), high.copy()
    f_a, f_b = look(every, a), look(every, b)
    c, f_c, t = a.copy(), f_a.copy(), np.full(len(low), 0.5)
    open_ = every
    for _ in range(_ROUNDS):
        if not len(open_):
            break
        k = open_
        x = a[k] + t[k] * (b[k] - a[k])
        f = look(k, x)
        same = (f >= 0) == (f_a[k] >= 0)
        c[k], f_c[k] = np.where(same, a[k], b[k]), np.where(same, f_a[k], f_b[k])
        b[k], f_b[k] = np.where(same, b[k], a[k]), np.where(same, f_b[k], f_a[k])
        a[k], f_a[k] = x, f
        width = np.abs(b[k] - a[k])
        closest = close / np.maximum(width, 1e-300)
        t[k] = np.clip(_step(a[k], b[k], c[k], f_a[k], f_b[k], f_c[k]), closest, 1.0 - closest)
        open_ = k[(width > 2.5 * close) & (f != 0)]
    return np.where(f_a >= 0, a, b)


def _step(a: Array, b: Array, c: Array, f_a: Array, f_b: Array, f_c: Array) -> Array:
    """How far to go from a towards b, as a share of the way."""
    with np.errstate(all="ignore"):
        xi, phi = (a - b) / (c - b), (f_a - f_b) / (f_c - f_b)
        alpha = (c - a) / (b - a)
        quadratic = f_a / (f_b - f_a) * f_c / (f_b - f_c) + alpha * f_a / (f_c - f_a) * f_b / (f_c - f_b)
        trusted = (phi**2 < xi) & ((1.0 - phi) ** 2 < 1.0 - xi) & np.isfinite(quadratic)
    return np.where(trusted, quadratic, 0.5)
