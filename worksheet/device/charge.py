"""The charge equation: terminal drive, normalised charge, normalised current and slope, in all regions of inversion.

Sources: Enz, Krummenacher and Vittoz 1995; Enz and Vittoz, Charge-Based MOS Transistor Modeling, 2006; with
velocity saturation Enz, Chicco and Pezzotta 2017. `velocity` is lambda_c = L_sat/L throughout; it holds in
saturation only. Forms are chosen so that no digits are lost from inversion 1e-9 to 1e6.
"""

from __future__ import annotations

import numpy as np

from worksheet.device.arrays import Array, Number

_LN2 = float(np.log(2.0))
_STEPS = 4


def charge_from_drive(u: Number) -> Array:
    """Solve 2 q + ln q = u for the normalised charge, q = W(2 e^u)/2.

    Args:
        u: Drive of the source or drain end, in thermal voltages. [-], any shape
    Returns: q [-], same shape; 0 where it is below the least double
    Source: Enz and Vittoz 2006; Lambert's W by the iteration of Fritsch, Shafer and Crowley (1973).
    Valid: all u; large u does not overflow.
    """
    return 0.5 * _omega(np.asarray(u, dtype=np.float64) + _LN2)


def log_charge_from_drive(u: Number) -> Array:
    """ln q for a drive u, finite also where q underflows. [-], same shape; see charge_from_drive."""
    u = np.asarray(u, dtype=np.float64)
    return u - 2.0 * charge_from_drive(u)


def _omega(z: Array) -> Array:
    """w with w + ln w = z (Wright's omega), elementwise."""
    low = z < -2.0
    near = np.exp((np.minimum(z, 1.0) - 1.0) * 0.5)
    w = np.where(low, np.exp(np.minimum(z, 0.0)), np.where(z > 1.0, z - np.log(np.maximum(z, 1.0)), near))
    tiny = z < -700.0
    w = np.where(tiny, 1.0, w)
    for _ in range(_STEPS):
        residual = z - w - np.log(w)
        residual = np.where(tiny, 0.0, residual)
        w1 = 1.0 + w
        a = 2.0 * w1 * (w1 + 2.0 * residual / 3.0)
        w = w * (1.0 + residual / w1 * (a - residual) / (a - 2.0 * residual))
    return np.asarray(np.where(tiny, np.exp(np.minimum(z, 0.0)), w))


def drive_from_charge(q: Number) -> Array:
    """u = 2 q + ln q, the drive for a normalised charge. [-], any shape. Source: Enz and Vittoz 2006."""
    return np.asarray(2.0 * np.asarray(q) + np.log(q))


def charge_from_inversion(i: Number, velocity: Number = 0.0) -> Array:
    """Normalised charge at the source end for a normalised current, in saturation.

    Args:
        i: Drain current over specific current (the inversion coefficient). [-], any shape
        velocity: lambda_c = L_sat/L, 0 for the long channel. [-], broadcasts with i
    Returns: q [-]
    Source: Enz et al. 2017, q = (sqrt((lambda_c i + 1)^2 + 4 i) - 1)/2, in a form without cancellation.
    """
    i = np.asarray(i, dtype=np.float64)
    return np.asarray(i * (velocity * velocity * i + 2.0 * velocity + 4.0) / (2.0 * (_root(i, velocity) + 1.0)))


def inversion_from_charge(q: Number, velocity: Number = 0.0) -> Array:
    """Normalised current for a charge at the source end, in saturation; inverse of charge_from_inversion. [-]

    Source: Enz et al. 2017; q^2 + q for the long channel.
    """
    q = np.asarray(q, dtype=np.float64)
    root = np.sqrt(4.0 * (1.0 + velocity) + (velocity * (1.0 + 2.0 * q)) ** 2)
    return np.asarray(4.0 * (q * q + q) / (2.0 + velocity + root))


def slope_factor(i: Number, velocity: Number = 0.0) -> Array:
    """G = g_s U_T/I_D, the source conductance for the current spent: 1 in weak inversion, falling in strong.

    Args:
        i: Inversion coefficient. [-], any shape
        velocity: lambda_c = L_sat/L. [-], broadcasts with i
    Returns: [-]
    Source: EKV v2.6 report eq. 40 for the long channel; Enz et al. 2017 with velocity saturation.
    """
    i = np.asarray(i, dtype=np.float64)
    numerator = velocity * velocity * i + 2.0 * velocity + 4.0
    return np.asarray(numerator / ((_root(i, velocity) + 1.0) * (velocity * (velocity * i + 1.0) + 2.0)))


def _root(i: Array, velocity: Number) -> Array:
    return np.asarray(np.sqrt((velocity * i + 1.0) ** 2 + 4.0 * i))
