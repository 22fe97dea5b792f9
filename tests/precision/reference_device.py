"""One transistor at 50 digits: section 1 of the formula sheet, written down a second time.

Nothing here knows the program. Every function is the formula in its plainest form, in mpmath, so that a slip in the
program's fast and stable forms cannot be shared. Voltages are n-like and in the transistor's own frame: the rail that
its bulk may stand on is 0, and a p-channel transistor is mirrored before it comes here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from mpmath import mp, mpf

DIGITS = 50
BOLTZMANN = "1.380649e-23"
ELEMENTARY_CHARGE = "1.602176634e-19"

Real = Any
"""An mpf. mpmath ships no types."""


def precise() -> None:
    """Sets the working precision; called by everything that starts a computation."""
    mp.dps = DIGITS + 10


def thermal_voltage(temperature: Real) -> Real:
    return mpf(BOLTZMANN) * temperature / mpf(ELEMENTARY_CHARGE)


def charge_from_drive(u: Real) -> Real:
    """q of 2 q + ln q = u."""
    return mp.re(mp.lambertw(2 * mp.exp(u))) / 2


def drive_from_charge(q: Real) -> Real:
    return 2 * q + mp.log(q)


def inversion_from_charge(q: Real, velocity: Real) -> Real:
    return 4 * (q**2 + q) / (2 + velocity + mp.sqrt(4 * (1 + velocity) + velocity**2 * (1 + 2 * q) ** 2))


def charge_from_inversion(i: Real, velocity: Real) -> Real:
    return (mp.sqrt((velocity * i + 1) ** 2 + 4 * i) - 1) / 2


def slope_factor(i: Real, velocity: Real) -> Real:
    """G = g_s U_T / I_D."""
    return (mp.sqrt((velocity * i + 1) ** 2 + 4 * i) - 1) / (i * (velocity * (velocity * i + 1) + 2))


def white_factor(q: Real) -> Real:
    """gamma: share of 4 k T g_s in the drain current's white noise."""
    return (4 * q + 3) / (6 * (q + 1))


def gate_source_factor(q: Real) -> Real:
    """Intrinsic gate-source capacitance over C_ox W L."""
    return q / 3 * (2 * q + 3) / (q + 1) ** 2


@dataclass(frozen=True)
class Transistor:
    """One transistor at one condition, carrying its current."""

    kappa: Real
    threshold: Real
    specific_current: Real
    sigma: Real
    length_modulation: Real
    surface_potential: Real
    velocity: Real
    gate_capacitance: Real
    overlap_capacitance: Real
    junction_capacitance: Real
    flicker: Real
    flicker_exponent: Real
    matching_threshold: Real
    matching_factor: Real
    max_voltage: Real
    width: Real
    length: Real
    current: Real
    temperature: Real

    @property
    def thermal_voltage(self) -> Real:
        return thermal_voltage(self.temperature)

    @property
    def inversion(self) -> Real:
        return self.current / self.specific_current

    @property
    def charge(self) -> Real:
        return charge_from_inversion(self.inversion, self.velocity)

    @property
    def drive_voltage(self) -> Real:
        """U_T u(q)."""
        return self.thermal_voltage * drive_from_charge(self.charge)

    @property
    def saturation_voltage(self) -> Real:
        return self.thermal_voltage * (2 * mp.sqrt(self.inversion + mpf(1) / 4) + 3)

    def kappa_at(self, source_bulk: Real) -> Real:
        if self.surface_potential == 0:
            return self.kappa
        psi = self.surface_potential
        return 1 / (1 + (1 / self.kappa - 1) * mp.sqrt(psi / (psi + source_bulk)))

    def threshold_at(self, source_bulk: Real) -> Real:
        """V_TB: gate-bulk voltage at u = 0 without drain coupling."""
        if self.surface_potential == 0:
            return self.threshold + source_bulk / self.kappa
        psi = self.surface_potential
        body = 2 * (1 / self.kappa - 1) * mp.sqrt(psi)
        return self.threshold + source_bulk + body * (mp.sqrt(psi + source_bulk) - mp.sqrt(psi))

    def gate(self, source: Real, drain: Real, bulk: Real) -> Real:
        """Gate voltage that lets the current flow."""
        gate_bulk = (self.drive_voltage - self.sigma * (drain - bulk)) / self.kappa_at(source - bulk)
        return bulk + self.threshold_at(source - bulk) + gate_bulk

    def source(self, gate: Real, drain: Real, *, bulk_on_source: bool) -> Real:
        """Source voltage that lets the current flow, with the bulk on 0 or on the source."""
        if bulk_on_source:
            reach = self.kappa * (gate - self.threshold) + self.sigma * drain - self.drive_voltage
            return reach / (self.kappa + self.sigma)
        straight = self.kappa * (gate - self.threshold) + self.sigma * drain - self.drive_voltage
        if self.surface_potential == 0:
            return straight

        def excess(source: Real) -> Real:
            return self.gate(source, drain, mpf(0)) - gate

        return mp.findroot(excess, (straight, straight + mpf("0.01")))


def transistor(
    device: dict[str, Any],
    changes: dict[str, Any],
    *,
    reference_temperature: float,
    temperature: float,
    width: float,
    length: float,
    current: Real,
) -> Transistor:
    """A device of the process file at a corner, a temperature and a size."""

    def parameter(key: str, default: float | None = None) -> Real:
        return mpf(device[key] if default is None else device.get(key, default))

    def change(key: str, default: float) -> Real:
        return mpf(changes.get(key, default))

    warm, cold = mpf(temperature), mpf(reference_temperature)
    capacitance = change("capacitance_factor", 1.0)
    per_square = (
        parameter("specific_current")
        * change("specific_current_factor", 1.0)
        * (warm / cold) ** (2 - parameter("mobility_exponent"))
    )
    shape = (parameter("drain_coupling_length") / mpf(length)) ** parameter("drain_coupling_exponent")
    return Transistor(
        kappa=parameter("kappa") + change("kappa_shift", 0.0),
        threshold=parameter("threshold")
        + change("threshold_shift", 0.0)
        - parameter("threshold_drift") * (warm - cold),
        specific_current=per_square * mpf(width) / mpf(length),
        sigma=parameter("drain_coupling") * change("drain_coupling_factor", 1.0) * shape,
        length_modulation=parameter("length_modulation", 0.0),
        surface_potential=parameter("surface_potential", 0.0),
        velocity=parameter("velocity_length", 0.0) / mpf(length),
        gate_capacitance=parameter("gate_capacitance") * capacitance,
        overlap_capacitance=parameter("overlap_capacitance") * capacitance,
        junction_capacitance=parameter("junction_capacitance") * capacitance,
        flicker=parameter("flicker"),
        flicker_exponent=parameter("flicker_exponent"),
        matching_threshold=parameter("matching_threshold"),
        matching_factor=parameter("matching_factor"),
        max_voltage=parameter("max_voltage"),
        width=mpf(width),
        length=mpf(length),
        current=current,
        temperature=warm,
    )


@dataclass(frozen=True)
class Point:
    """A transistor between its terminal voltages, and all that follows from them."""

    device: Transistor
    gate: Real
    source: Real
    drain: Real
    bulk: Real
    margin: Real

    @property
    def kappa(self) -> Real:
        return self.device.kappa_at(self.source - self.bulk)

    @property
    def source_conductance(self) -> Real:
        part = self.device
        return part.current * slope_factor(part.inversion, part.velocity) / part.thermal_voltage

    @property
    def transconductance(self) -> Real:
        return self.kappa * self.source_conductance

    @property
    def drain_conductance(self) -> Real:
        part = self.device
        return part.sigma * self.source_conductance + part.length_modulation * part.current / part.length

    @property
    def bulk_conductance(self) -> Real:
        return self.source_conductance - self.transconductance - self.drain_conductance

    @property
    def channel_capacitance(self) -> Real:
        """c_gsi."""
        part = self.device
        return part.gate_capacitance * part.width * part.length * gate_source_factor(part.charge)

    @property
    def gate_source(self) -> Real:
        return self.channel_capacitance + self.device.overlap_capacitance * self.device.width

    @property
    def gate_drain(self) -> Real:
        return self.device.overlap_capacitance * self.device.width

    @property
    def gate_bulk(self) -> Real:
        part = self.device
        whole = part.gate_capacitance * part.width * part.length
        return (1 - self.kappa) * (whole - self.channel_capacitance)

    @property
    def source_bulk(self) -> Real:
        part = self.device
        return part.junction_capacitance * part.width + (1 / self.kappa - 1) * self.channel_capacitance

    @property
    def drain_bulk(self) -> Real:
        return self.device.junction_capacitance * self.device.width

    @property
    def white_noise(self) -> Real:
        """Drain-current density. [A^2/Hz]"""
        part = self.device
        return 4 * mpf(BOLTZMANN) * part.temperature * white_factor(part.charge) * self.source_conductance

    @property
    def flicker_noise(self) -> Real:
        """Drain-current density at 1 Hz. [A^2/Hz]"""
        part = self.device
        if part.flicker == 0:
            return mpf(0)
        return self.transconductance**2 * part.flicker / (part.gate_capacitance * part.width * part.length)

    @property
    def mismatch(self) -> Real:
        """Variance of the drain current of this one device. [A^2]"""
        part = self.device
        variance = (self.transconductance * part.matching_threshold) ** 2 + (part.current * part.matching_factor) ** 2
        return variance / (2 * part.width * part.length)

    @property
    def headroom(self) -> Real:
        return self.drain - self.source - self.device.saturation_voltage - self.margin

    @property
    def greatest_voltage(self) -> Real:
        """Between any two of the four terminals."""
        nodes = (self.gate, self.source, self.drain, self.bulk)
        return max(nodes) - min(nodes)

    def reverse_shares(self) -> tuple[Real, Real]:
        """q_d/(sigma q_s): with kappa taken at the drain, as exchanging the ends asks for, and held at the source."""
        part = self.device
        gate, source, drain = self.gate - self.bulk, self.source - self.bulk, self.drain - self.bulk
        exchanged = part.kappa_at(drain) * (gate - part.threshold_at(drain)) + part.sigma * source
        held = part.drive_voltage - (1 + part.sigma) * (drain - source)
        below = part.sigma * part.charge
        first, second = (charge_from_drive(drive / part.thermal_voltage) / below for drive in (exchanged, held))
        return first, second
