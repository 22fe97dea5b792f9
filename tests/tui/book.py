"""The project that the tests of the app open: eight invented blocks over all five stages, with every verdict."""

from __future__ import annotations

from pathlib import Path

from tests.support import write_project
from worksheet.session.starter import process_text

PROJECT = """schema = 1
title = "Rain gauge front end"
owner = "M. Okafor"
process = "my_process"

[conditions]
process = ["typical", "slow", "fast"]
temperature = ["-40 °C", "27 °C", "85 °C"]
supply = ["1.71 V", "1.8 V", "1.89 V"]
nominal = { process = "typical", temperature = "27 °C", supply = "1.8 V" }

[budget]
supply_current = { max = "420 uA" }
gate_area = { max = "0.01 mm^2" }
"""

SHEETS = {
    "bucket_buffer": """schema = 1
title = "Bucket sensor buffer"
stage = "source-follower"
device = "nfet"
count = 16
owner = "M. Okafor"
notes = "Drives the row wires of the bucket array."

[assume]
load_capacitance = { value = "1.2 pF", low = "0.9 pF", high = "1.6 pF", source = "floor plan, rev 3", trust = "estimate" }
input_level = { value = "1.2 V", source = "sensor datasheet", trust = "agreed" }

[choose]
bias_current = "4 uA"    # to be revisited after the layout
width = "20 um"
length = "0.5 um"
fingers = 4

[target]
bandwidth = { min = "2 MHz", id = "RG-12", source = "system spec rev C", guard = 0.1 }
dc_gain = { min = 0.65, max = 1.0 }
power = { max = "8 uW", why = "sixteen of them run all night" }
output_noise = { max = "200 uV", at = "nominal" }

[[evidence]]
metric = "bandwidth"
value = "5.1 MHz"
found_by = "simulation"
basis = "000000000000"
by = "M. Okafor"
reference = "run 118"
""",
    "drip_amplifier": """schema = 1
title = "Drip amplifier"
stage = "common-source"
device = "nfet"
state = "for-review"

[bias]
device = "pfet"

[assume]
load_capacitance = { value = "0.5 pF", source = "bucket row wire", trust = "guess" }
output_level = { value = "0.9 V", source = "next block", trust = "agreed" }

[choose]
bias_current = "10 uA"
width = "30 um"
length = "1 um"
bias_width = "40 um"
bias_length = "1 um"

[target]
dc_gain = { min = "30 dB" }
unity_gain_frequency = { min = "20 MHz" }
""",
    "wind_cascode": """schema = 1
title = "Wind channel cascode"
stage = "cascode"
device = "nfet"
state = "accepted"

[bias]
device = "pfet"

[assume]
load_capacitance = { value = "1 pF", source = "layout of May", trust = "simulated" }
output_level = { value = "0.9 V", source = "next block", trust = "agreed" }

[own]
sample_rate = { value = "40 kHz", source = "system spec rev C", trust = "agreed" }

[choose]
bias_current = "5 uA"
width = "20 um"
length = "0.5 um"
cascode_width = "20 um"
cascode_length = "0.3 um"
bias_width = "20 um"
bias_length = "1 um"

[target]
dc_gain = { min = "46 dB" }
unity_gain_frequency = { min = "5 MHz" }
rate_margin = { formula = "unity_gain_frequency/sample_rate", min = 40 }
""",
    "sun_gate": """schema = 1
title = "Sun cell current input"
stage = "common-gate"
device = "nfet"

[assume]
load_capacitance = { value = "0.3 pF", source = "estimate of wires", trust = "estimate" }
input_level = { value = "0.2 V", source = "cell", trust = "measured" }
output_level = { value = "0.9 V", source = "next block", trust = "agreed" }

[choose]
bias_current = "2 uA"
width = "10 um"
length = "0.5 um"

[target]
bandwidth = { min = "500 kHz" }
dc_gain = { min = 20 }
""",
    "level_divider": """schema = 1
title = "Level divider"
stage = "drain-follower"
device = "nfet"

[assume]
load_capacitance = { value = "0.2 pF", source = "estimate of wires", trust = "estimate" }

[choose]
bias_current = "1 uA"
width = "5 um"
length = "0.5 um"

[target]
dc_gain = { max = 0.05 }
""",
    "supply_sense": """schema = 1
title = "Supply sense, rejection not met"
stage = "source-follower"
device = "nfet"

[assume]
load_capacitance = { formula = "2*drip_amplifier.input_capacitance + 200e-15", source = "two of them", trust = "estimate" }

[choose]
bias_current = "1 uA"
width = "5 um"
length = "0.3 um"

[target]
supply_rejection = { min = "60 dB" }
bandwidth = { min = "500 kHz" }

[[waiver]]
target = "supply_rejection"
by = "A. Lindqvist"
reason = "the regulator before it makes up for it"
value = "20 dB"
dated = 2026-11-03
""",
    "clock_driver": """schema = 1
title = "Clock line driver, left to the solver"
stage = "source-follower"
device = "nfet"

[assume]
load_capacitance = { value = "3 pF", source = "clock tree", trust = "estimate" }

[choose]
length = "0.25 um"

[target]
bandwidth = { min = "10 MHz" }
power = { max = "400 uW" }
""",
    "reset_follower": """schema = 1
title = "Reset follower, p-channel"
stage = "source-follower"
device = "pfet"
bulk = "source"

[bias]
device = "pfet"

[assume]
load_capacitance = { value = "0.8 pF", source = "floor plan, rev 3", trust = "estimate" }

[choose]
bias_current = "3 uA"
width = "40 um"
length = "0.4 um"
bias_width = "20 um"
bias_length = "1 um"

[target]
dc_gain = { min = 0.9 }
bandwidth = { min = "1 MHz" }
""",
}
"""Text of each sheet by its name."""


def write_book(folder: Path) -> Path:
    """The project, written into a folder."""
    return write_project(folder, PROJECT, process_text(), SHEETS)
