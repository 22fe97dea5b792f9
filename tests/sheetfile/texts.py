"""One full example of each file, from which the tests make variations. Invented data."""

from pathlib import Path

SHEET = """\
schema = 1
title = "Element buffer"
stage = "source-follower"
device = "nfet"
bulk = "rail"                            # or "source"
count = 64
owner = "R. Osei"
state = "draft"
notes = \"\"\"Drives the column line.
Second line.
\"\"\"

[bias]
device = "ideal"
output_conductance = "0 S"
capacitance = "0 F"

[assume]                                 # what is imposed
load_capacitance = { value = "1.2 pF", low = "0.9 pF", high = "1.6 pF", source = "floor plan", trust = "estimate" }
input_level = { value = "0.9 V", source = "sensor", trust = "agreed" }
step_size = { formula = "2*own_step", note = "both edges" }
supply = ["1.1 V", "1.2 V"]

[own]
sample_rate = { value = "40 kHz", trust = "agreed" }
own_step = 0.1

[choose]
bias_current = "4 uA"
width = "20 um"
length = "0.5 um"                        # above the shortest
fingers = 4

[solve]
keep = "geometry"
inversion_coefficient = 1.0
over = "all"
current_allowance = 0.05

[target]
bandwidth = { min = "5 MHz", id = "AFE-12", source = "system spec", guard = 0.1 }
dc_gain = { min = 0.65, max = 1.0, why = "headroom" }
output_noise = { max = "80 uV", at = "nominal" }
offset_limit = { max = "6 mV", yield = 0.997 }
figure = { formula = "bandwidth/power", min = 1e11, unit = "Hz/W" }

[[evidence]]
metric = "bandwidth"
value = "5.6 MHz"
found_by = "simulation"
dated = 2026-11-02
basis = "9f2c61d0a3be"
at = { process = "slow", temperature = "125 °C", supply = "1.62 V" }

[[evidence]]
metric = "figure"
value = 2e11
low = 1e11
high = 3e11
spread = 1e9
samples = 30
found_by = "measurement"

[[waiver]]
target = "bandwidth"
by = "L. Marsh"
reason = "second silicon"
value = "4 MHz"
dated = 2026-11-03
until = 2027-01-31
"""

PROCESS = """\
schema = 1
title = "Example process"
reference_temperature = "27 °C"

[device.nfet]
polarity = "n"
own_well = false
kappa = { value = 0.7, source = "fit", trust = "measured", standard_error = 0.002 }
threshold = "0.45 V"
specific_current = "0.6 uA"
drain_coupling = 0.02
drain_coupling_length = "0.18 um"
drain_coupling_exponent = 1.0
length_modulation = "0 um/V"
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

PROJECT = """\
schema = 1
title = "Tide gauge"
owner = "R. Osei"
process = "example_180"

[conditions]
process = ["typical", "slow"]
temperature = [
    "-40 °C",
    "27 °C",
]
supply = "1.8 V"
nominal = { process = "typical", temperature = "27 °C", supply = "1.8 V" }

[budget]
supply_current = { max = "250 uA" }
gate_area = { max = "0.02 mm^2" }
"""


def line_of(text: str, part: str) -> int:
    """Line of the first occurrence of a part of a text."""
    assert part in text, part
    return text.count("\n", 0, text.index(part)) + 1


def written(folder: Path, name: str, content: str | bytes) -> Path:
    """A file with this content."""
    path = folder / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path
