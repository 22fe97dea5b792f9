"""A small book whose files tests spoil one at a time. Invented data."""

from __future__ import annotations

import datetime
from pathlib import Path

from tests.support import write_project

PROJECT = """\
schema = 1
title = "Harbour light"
owner = "T. Vik"
process = "plain_180"

[conditions]
process = ["typical", "slow"]
temperature = ["0 °C", "27 °C"]
supply = ["1.7 V", "1.8 V"]
nominal = { process = "typical", temperature = "27 °C", supply = "1.8 V" }

[budget]
supply_current = { max = "100 uA" }
"""

DEVICE = """\
kappa = 0.7
threshold = "0.45 V"
specific_current = "0.6 uA"
drain_coupling = 0.02
drain_coupling_length = "0.18 um"
drain_coupling_exponent = 1.0
gate_capacitance = "8.5 fF/um^2"
overlap_capacitance = "0.35 fF/um"
junction_capacitance = "0.8 fF/um"
flicker = "3e-24 V^2 F"
flicker_exponent = 1.0
matching_threshold = "4 mV um"
matching_factor = "1 % um"
threshold_drift = "0.8 mV/K"
mobility_exponent = 1.5
min_length = "0.18 um"
max_length = "50 um"
min_width = "0.22 um"
max_width = "10 mm"
grid = "0.005 um"
max_voltage = "1.98 V"
"""

PROCESS = f"""\
schema = 1
title = "Plain process"
reference_temperature = "27 °C"

[device.nfet]
polarity = "n"
own_well = false
{DEVICE}
[device.pfet]
polarity = "p"
own_well = true
{DEVICE}
[corner.slow.nfet]
threshold_shift = "40 mV"
specific_current_factor = 0.85

[corner.slow.pfet]
threshold_shift = "40 mV"
specific_current_factor = 0.85
"""

FOLLOWER = """\
schema = 1
title = "Lamp buffer"
stage = "source-follower"
device = "nfet"
owner = "T. Vik"
notes = "Drives the lamp's sense line."

[assume]
load_capacitance = { value = "1.2 pF", source = "floor plan", trust = "estimate", note = "" }
input_level = { value = "1.1 V", source = "sensor" }

[own]
line = { value = "0.4 pF", source = "floor plan" }

[choose]
bias_current = "4 uA"
width = "20 um"
length = "0.5 um"

[target]
bandwidth = { min = "5 MHz", id = "L-1", source = "plan", why = "speed" }
share = { formula = "line/load_capacitance", max = 0.5, unit = "F/F" }
"""

AMPLIFIER = """\
schema = 1
title = "Lamp amplifier"
stage = "common-source"
device = "nfet"

[bias]
device = "pfet"

[choose]
load_capacitance = "1 pF"
bias_current = "4 uA"
width = "20 um"
length = "0.5 um"
bias_width = "20 um"
bias_length = "1 um"

[target]
dc_gain = { min = "20 dB" }
"""

TODAY = datetime.date(2026, 12, 1)
"""A day on which reviews of these books are made."""

BUFFER, OTHER = "buffer", "amplifier"
"""Names of the sheet that tests spoil, and of the one that must be reviewed whatever becomes of the first."""


def write(folder: Path, follower: str = FOLLOWER, process: str = PROCESS, project: str = PROJECT) -> Path:
    """The book as a folder."""
    return write_project(folder, project, process, {BUFFER: follower, OTHER: AMPLIFIER})


def replaced(text: str, old: str, new: str) -> str:
    """A text with one part replaced, which must be there."""
    assert old in text, old
    return text.replace(old, new, 1)
