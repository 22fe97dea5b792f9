"""What a hand formula holds at its present value although it moves with the unknown, by name."""

from __future__ import annotations

from dataclasses import dataclass

from worksheet.stages.circuit import CAPACITANCES, Circuit
from worksheet.stages.stage import MAIN

_MOVING = " that move"
_NOUNS = {"bias_current": "current", "load_capacitance": "load", "inversion_coefficient": "inversion"}


@dataclass(frozen=True, slots=True)
class Hold:
    """One kind of level that is held: what it is called, the levels' keys, whether the name is a
    plural, and the device that it is about ("" for all).
    """

    name: str
    keys: frozenset[str]
    several: bool = False
    device: str = ""

    def moving_with(self, unknown: str) -> str:
        """What holding it is called as a neglect."""
        return f"{self.name}{_MOVING}{'' if self.several else 's'} with {noun(unknown)}"


def is_moving(neglect: str) -> bool:
    """Whether a neglect is called as something that is held."""
    return _MOVING in neglect


def noun(unknown: str) -> str:
    """What an unknown is called in the name of a neglect."""
    return _NOUNS.get(unknown, unknown.replace("_", " "))


def _of_devices(circuit: Circuit, names: tuple[str, ...], only: str | None = None) -> frozenset[str]:
    devices = [d.name for d in circuit.devices if only is None or d.name == only]
    return frozenset(f"{device}.{name}" for device in devices for name in names)


def couplings(circuit: Circuit) -> Hold:
    """Gate couplings that move with the source voltage."""
    return Hold("gate coupling", _of_devices(circuit, ("gate_coupling",)))


def parasitics(circuit: Circuit) -> Hold:
    """Capacitances of the transistors."""
    return Hold("parasitics", _of_devices(circuit, tuple(name for name, _, _ in CAPACITANCES)), several=True)


def noise_factor(circuit: Circuit) -> Hold:
    """White noise factors."""
    return Hold("noise factor", _of_devices(circuit, ("white_factor",)))


def corner_of_flicker() -> Hold:
    """The frequency up to which flicker noise is counted."""
    return Hold("upper end of flicker noise", frozenset({"noise_until"}))


def inversions(circuit: Circuit) -> list[Hold]:
    """Inversion coefficients, the main device's last."""
    names = [d.name for d in circuit.devices if d.name != MAIN]
    held = ("inversion_coefficient",)
    others = [Hold(f"inversion of {n}", _of_devices(circuit, held, n), device=n) for n in names]
    return [*others, Hold("inversion", _of_devices(circuit, held, MAIN), device=MAIN)]


def drain_couplings(circuit: Circuit) -> Hold:
    """Drain couplings, which fall with length."""
    return Hold("drain coupling", _of_devices(circuit, ("drain_coupling",)))


def ladder(circuit: Circuit) -> list[tuple[Hold, ...]]:
    """Sets of what may be held, from little to much, in the order in which they are tried."""
    base = (couplings(circuit), parasitics(circuit))
    with_noise = (*base, noise_factor(circuit))
    *others, main = inversions(circuit)
    most = (*with_noise, *others, corner_of_flicker())
    sigma = drain_couplings(circuit)
    steps = [
        base,
        with_noise,
        (*with_noise, *others),
        most,
        (*most, sigma),
        (*most, main),
        (couplings(circuit), main, *others),
    ]
    return list(dict.fromkeys(steps))
