"""Where every node stands: a stage's transistors at one condition, its levels, ranges and validity.

A p-channel stage is the mirror image about the supply, so everything here is reckoned in the stage's own frame, in
which the rail of the main device's bulk is 0 and the far rail is the supply. `Bench.ground` turns a voltage of the
frame into one from ground, and back: it is its own inverse.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from mpmath import mp, mpf

from tests.precision.reference_device import Point, Real, Transistor, transistor

SOURCE_OUTPUTS = ("source-follower", "drain-follower")
LEVEL_DRIVEN = ("common-gate", "drain-follower")
SLACK = mpf(10) ** -9


class UndefinedError(ValueError):
    """The sheet does not say enough, or says what cannot be: bad input for the program."""


@dataclass(frozen=True)
class Bench:
    """A sheet's stage at one condition, before its levels are known."""

    stage: str
    polarity: str
    own_bulk: bool
    supply: Real
    temperature: Real
    current: Real
    margin: Real
    main: Transistor
    cascode: Transistor | None
    bias: Transistor | None
    assume: dict[str, float]

    def ground(self, voltage: Real) -> Real:
        return voltage if self.polarity == "n" else self.supply - voltage

    def saturated(self, device: Transistor | None) -> Real:
        """Drain-source voltage that a device wants; an ideal source wants none."""
        return mpf(0) if device is None else device.saturation_voltage + self.margin


@dataclass(frozen=True)
class Levels:
    """Node voltages in the frame. `middle` is a cascode's inner node."""

    input: Real
    output: Real
    gate: Real
    middle: Real | None = None


def bench(process: dict[str, Any], sheet: dict[str, Any], condition: dict[str, Any], nominal: dict[str, Any]) -> Bench:
    assume, choose = sheet.get("assume", {}), sheet["choose"]
    exponent = mpf(assume.get("bias_temperature_exponent", 0.0))
    warmth = mpf(condition["temperature"]) / mpf(nominal["temperature"])
    current = mpf(choose["bias_current"]) * warmth**exponent
    corner = process.get("corner", {}).get(condition["process"], {})

    def build(name: str, width: float, length: float) -> Transistor:
        return transistor(
            process["device"][name],
            corner.get(name, {}),
            reference_temperature=process["reference_temperature"],
            temperature=condition["temperature"],
            width=width,
            length=length,
            current=current,
        )

    name, source = sheet["device"], sheet["bias"]["device"]
    return Bench(
        stage=sheet["stage"],
        polarity=process["device"][name]["polarity"],
        own_bulk=sheet.get("bulk", "rail") == "source",
        supply=mpf(condition["supply"]),
        temperature=mpf(condition["temperature"]),
        current=current,
        margin=mpf(assume.get("saturation_margin", 0.0)),
        main=build(name, choose["width"], choose["length"]),
        cascode=build(name, choose["cascode_width"], choose["cascode_length"]) if sheet["stage"] == "cascode" else None,
        bias=None if source == "ideal" else build(source, choose["bias_width"], choose["bias_length"]),
        assume=assume,
    )


def output_range(b: Bench, input_level: Real) -> tuple[Real, Real]:
    """Limits of the output in the frame."""
    first, source = b.saturated(b.main), b.saturated(b.bias)
    if b.stage == "source-follower":
        lifted = b.main.source(b.supply, b.supply, bulk_on_source=b.own_bulk)
        return source, min(b.supply - first, lifted)
    if b.stage == "drain-follower":
        return source, input_level - first
    low = {"common-source": mpf(0), "common-gate": input_level, "cascode": b.saturated(b.cascode)}[b.stage]
    return low + first, b.supply - source


def input_range(b: Bench, output_level: Real) -> tuple[Real, Real] | None:
    """Limits of the input in the frame, where the stage has them."""
    if b.stage == "source-follower":
        low, high = output_range(b, mpf(0))
        return follower_gate(b, low), follower_gate(b, high)
    if b.stage == "common-gate":
        return mpf(0), output_level - b.saturated(b.main)
    if b.stage == "drain-follower":
        return output_level + b.saturated(b.main), b.supply
    return None


def follower_gate(b: Bench, output: Real) -> Real:
    return b.main.gate(output, b.supply, output if b.own_bulk else mpf(0))


def middle(low: Real, high: Real) -> Real:
    if low > high:
        raise UndefinedError(f"the range is empty: {mp.nstr(low, 6)} to {mp.nstr(high, 6)} V")
    return (low + high) / 2


def held_levels(b: Bench) -> dict[str, Real]:
    """What the nominal condition fixes, from ground. A level that is not in the answer follows."""
    given = {key: b.ground(mpf(b.assume[f"{key}_level"])) for key in ("input", "output") if f"{key}_level" in b.assume}
    if b.stage == "source-follower":
        if not given:
            given = {"input": follower_gate(b, middle(*output_range(b, mpf(0))))}
    elif b.stage == "common-gate":
        if "input" not in given:
            highest = given["output"] if "output" in given else b.supply - b.saturated(b.bias)
            given["input"] = middle(mpf(0), highest - b.saturated(b.main))
        if "output" not in given:
            given["output"] = middle(*output_range(b, given["input"]))
    elif "output" not in given:
        given["output"] = middle(*output_range(b, given.get("input", b.supply)))
    return {key: b.ground(value) for key, value in given.items()}


def levels(b: Bench, held: dict[str, Real]) -> Levels:
    """All node voltages at this condition, in the frame, with `held` from ground."""
    given = {key: b.ground(value) for key, value in held.items()}
    if b.stage == "source-follower":
        if "input" in given:
            gate = given["input"]
            return Levels(gate, b.main.source(gate, b.supply, bulk_on_source=b.own_bulk), gate)
        gate = follower_gate(b, given["output"])
        return Levels(gate, given["output"], gate)
    output = given["output"]
    if b.stage == "drain-follower":
        drain = given.get("input", b.supply)
        return Levels(drain, output, b.main.gate(output, drain, output if b.own_bulk else mpf(0)))
    if b.stage == "common-gate":
        source = given["input"]
        return Levels(source, output, b.main.gate(source, output, source if b.own_bulk else mpf(0)))
    if b.stage == "common-source":
        gate = b.main.gate(mpf(0), output, mpf(0))
        return Levels(gate, output, gate)
    inner = b.saturated(b.main)
    gate = b.main.gate(mpf(0), inner, mpf(0))
    return Levels(gate, output, gate, inner)


def points(b: Bench, at: Levels) -> dict[str, Point]:
    """Each transistor between its terminals: main and cascode in the frame, the bias device in its own frame."""
    zero = mpf(0)
    source, drain = {
        "source-follower": (at.output, b.supply),
        "drain-follower": (at.output, at.input),
        "common-source": (zero, at.output),
        "common-gate": (at.input, at.output),
        "cascode": (zero, at.middle),
    }[b.stage]
    bulk = source if b.own_bulk else zero
    result = {"main": Point(b.main, at.gate, source, drain, bulk, b.margin)}
    if b.cascode is not None:
        bulk = at.middle if b.own_bulk else zero
        gate = b.cascode.gate(at.middle, at.output, bulk)
        result["cascode"] = Point(b.cascode, gate, at.middle, at.output, bulk, b.margin)
    if b.bias is not None:
        drain = at.output if b.stage in SOURCE_OUTPUTS else b.supply - at.output
        result["bias"] = Point(b.bias, b.bias.gate(zero, drain, zero), zero, drain, zero, b.margin)
    return result


def from_ground(b: Bench, name: str, voltage: Real) -> Real:
    """A voltage of a device's own frame, from ground."""
    mirrored = name == "bias" and b.stage not in SOURCE_OUTPUTS
    return b.ground(b.supply - voltage if mirrored else voltage)


def output_after(b: Bench, at: Levels, step: Real, gain: Real) -> Real:
    """Where the output rests after a step at the input: by the charge law at a source, by the gain at a drain."""
    if b.stage == "source-follower":
        return b.main.source(at.gate + step, b.supply, bulk_on_source=b.own_bulk)
    if b.stage == "drain-follower":
        return b.main.source(at.gate, at.input + step, bulk_on_source=b.own_bulk)
    return at.output + gain * step


def validity(b: Bench, at: Levels, devices: dict[str, Point], gain: Real) -> list[dict[str, Any]]:
    """What keeps the condition from being valid, each with the most that is missing. [V]

    A gate is named by its device, a level by input or output. After an assumed step, rising and falling, the input, the
    output and the range that moves with the input are looked at again. `gain` has its sign.
    """
    found: dict[tuple[str, str], Real] = {}

    def note(device: str, what: str, short_by: Real) -> None:
        if short_by > SLACK:
            found[device, what] = max(short_by, found.get((device, what), short_by))

    for name, point in devices.items():
        note(name, "saturation", -point.headroom)
        note(name, "max_voltage", point.greatest_voltage - point.device.max_voltage)
        note(name, "range", outside(point.gate, mpf(0), b.supply))
    driven = "input" if b.stage in LEVEL_DRIVEN else "main"
    step = mpf(b.assume.get("step_size", 0.0))
    for move in (mpf(0), step, -step):
        level, output = at.input + move, output_after(b, at, move, gain) if move else at.output
        note(driven, "range", outside(level, mpf(0), b.supply))
        note("output", "range", outside(output, *output_range(b, level)))
        note("output", "range", outside(output, mpf(0), b.supply))
    return [{"device": device, "what": what, "short_by": short} for (device, what), short in found.items()]


def outside(value: Real, low: Real, high: Real) -> Real:
    return max(low - value, value - high)
