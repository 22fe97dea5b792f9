"""Physical constants (CODATA 2018, exact) and the thermal voltage."""

from __future__ import annotations

from worksheet.device.arrays import Array, Number

BOLTZMANN = 1.380649e-23
"""k. [J/K]"""

ELEMENTARY_CHARGE = 1.602176634e-19
"""q_e. [C]"""


def thermal_voltage(temperature: Number) -> Array | float:
    """U_T = kT/q_e.

    Args:
        temperature: Absolute temperature. [K], any shape
    Returns: [V], same shape
    Source: CODATA 2018 constants.
    """
    return BOLTZMANN * temperature / ELEMENTARY_CHARGE
