"""What a hand calculation leaves out, by name. Each is a change of the algebra, so that its effect can be computed."""

from __future__ import annotations

from dataclasses import dataclass

FEED_THROUGH = "feed-through"
BIAS_CONDUCTANCE = "bias-source conductance"
DRAIN_CONDUCTANCE = "drain conductance against source conductance"
INNER_CAPACITANCE = "capacitance of inner nodes"
FASTER_POLES = "poles beyond the first"
DRIVE = "drive resistance"
OTHER_NOISE = "noise of other devices"
FLICKER = "flicker noise"
OTHER_MISMATCH = "mismatch of other devices"
FACTOR_MISMATCH = "current-factor mismatch"
SLEWING = "slewing"
LINEAR = "linear settling after slewing"
LENGTH_MODULATION = "length modulation"
VELOCITY = "velocity saturation"


@dataclass(frozen=True, slots=True)
class Neglect:
    """One neglect.

    Attributes:
        name: What it is called.
        of: Ends of the keys of which a metric must be made of one for the neglect to change it; () for any metric.
        parameter: The process parameter that it switches off; "" where it changes the network.
        nodes: Least number of unknown nodes for which it says anything.
    """

    name: str
    of: tuple[str, ...] = ()
    parameter: str = ""
    nodes: int = 1


NEGLECTS = (
    Neglect(BIAS_CONDUCTANCE, ("bias.output_conductance", "bias.drain_conductance")),
    Neglect(DRAIN_CONDUCTANCE, (".drain_conductance",)),
    Neglect(INNER_CAPACITANCE, ("load_capacitance",), nodes=2),
    Neglect(FASTER_POLES, ("load_capacitance",), nodes=2),
    Neglect(DRIVE, ("drive_resistance",), nodes=2),
    Neglect(FEED_THROUGH, ("load_capacitance",)),
    Neglect(OTHER_NOISE, (".white_density",)),
    Neglect(FLICKER, (".flicker_density",)),
    Neglect(OTHER_MISMATCH, (".process.matching_threshold",)),
    Neglect(FACTOR_MISMATCH, (".process.matching_factor",)),
    Neglect(SLEWING, ("step_size",)),
    Neglect(LINEAR, ("step_size",)),
    Neglect(LENGTH_MODULATION, (".process.length_modulation",), "length_modulation"),
    Neglect(VELOCITY, (".process.velocity_length",), "velocity_length"),
)
"""All of them, in the order in which they are taken back where a formula would otherwise not depend on its unknown."""

SWITCHES = {n.parameter: n.name for n in NEGLECTS if n.parameter}
"""Process parameters that a neglect switches off."""
