"""Noise current of a saturated transistor: white (thermal, shot in weak inversion) and flicker."""

from __future__ import annotations

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.device.constants import BOLTZMANN
from worksheet.device.parameters import Parameters


def white_factor(q: Number) -> Number:
    """gamma = (4 q + 3)/(6 (q + 1)): 1/2 in weak inversion (shot noise), 2/3 in strong. [-]

    Source: Enz and Vittoz 2006, referred to the source conductance.
    """
    return (4.0 * q + 3.0) / (6.0 * (q + 1.0))


def white_density(q: Number, source_conductance: Number, temperature: Number) -> Number:
    """White density of the drain current, 4 k T gamma g_s.

    Args:
        q: Normalised charge at the source end. [-]
        source_conductance: g_s. [S]
        temperature: [K]
    Returns: [A^2/Hz]
    Source: Enz and Vittoz 2006; Tsividis and McAndrew 2011.
    """
    return 4.0 * BOLTZMANN * temperature * white_factor(q) * source_conductance


def flicker_density(parameters: Parameters, transconductance: Array) -> Number:
    """Flicker density of the drain current at 1 Hz, g_m^2 K_F/(C_ox W L 1 Hz). [A^2/Hz]

    It falls as (f/1 Hz)^-alpha_F. Source: Tsividis and McAndrew 2011.
    """
    p = parameters
    if not np.any(p.flicker):
        return 0.0
    density = transconductance**2 * p.flicker / (p.gate_capacitance * p.width * p.length)
    return np.where(np.asarray(p.flicker) == 0.0, 0.0, density)
