"""A small project whose process file extraction writes into."""

from pathlib import Path

from tests.support import write_project

PROJECT = """\
schema = 1
title = "Example"
owner = "A. Designer"
process = "example_180"

[conditions]
process = ["typical"]
temperature = ["27 °C"]
supply = ["1.8 V"]
nominal = { process = "typical", temperature = "27 °C", supply = "1.8 V" }
"""

PROCESS = """\
schema = 1
title = "Example 180 nm process"
reference_temperature = "27 °C"

# the one we use most
[device.nfet]
polarity = "n"
own_well = false
kappa = { value = 0.7, source = "manual", trust = "guess" }  # gate coupling
threshold = "0.45 V"
specific_current = "0.5 uA"
drain_coupling = 0.02
drain_coupling_length = "0.18 um"
drain_coupling_exponent = 1.0
length_modulation = { value = "0.1 um/V", standard_error = "0.02 um/V" }
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

[corner.slow.nfet]
threshold_shift = "40 mV"
specific_current_factor = 0.85
"""

SHEET = """\
schema = 1
title = "Buffer"
stage = "source-follower"
device = "nfet"

[bias]
device = "ideal"

[assume]
load_capacitance = "1 pF"

[choose]
bias_current = "100 uA"
width = "5 um"
length = "0.5 um"
"""


def project(folder: Path) -> Path:
    """The project, in a folder of its own."""
    return write_project(folder, PROJECT, PROCESS, {"buffer": SHEET})


def process_of(folder: Path) -> Path:
    """Its process file."""
    return folder / "process" / "example_180.toml"
