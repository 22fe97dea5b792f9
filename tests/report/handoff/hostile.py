"""A project whose every text is an attempt: markup, scripts, formulas of spreadsheets, escape sequences."""

from __future__ import annotations

from pathlib import Path

from tests.cli.books import PROCESS
from tests.support import write_project

MARKUP = (
    "<script>document.title='taken'</script><img src=x onerror=alert(1)><svg onload=alert(2)>"
    "</style></title></textarea>--><iframe src=//example.org></iframe><a href='javascript:alert(3)'>x</a>"
    '<style>*{display:none}</style><meta http-equiv=refresh content=0><base href=//example.org>\\" onfocus=alert(4) '
    'autofocus x=\\"&lt;b&gt; ]]> <![CDATA[ </svg></math><math><mtext><script>alert(5)</script> $(id) `id` | * _ # ['
    "click](javascript:alert(6)) ![](//example.org/x.png)"
)
"""As it stands inside a TOML string in double quotes."""

HIDDEN = "\\u001b]0;taken\\u0007\\u001b[2J\\u202e\\u200b"
FORMULA = '=HYPERLINK(\\"//example.org\\",\\"x\\")'

PROJECT = f"""\
schema = 1
title = "{MARKUP}{HIDDEN}"
owner = "{MARKUP}"
process = "plain_180"

[conditions]
process = ["typical", "slow"]
temperature = ["27 °C"]
supply = ["1.8 V"]
nominal = {{ process = "typical", temperature = "27 °C", supply = "1.8 V" }}

[budget]
supply_current = {{ max = "1 uA" }}

[requirement]
"AB-1" = "{MARKUP}"
"""

SHEET = f"""\
schema = 1
title = "{MARKUP}{HIDDEN}"
stage = "source-follower"
device = "nfet"
owner = "{MARKUP}"
notes = "{MARKUP}. {FORMULA}"

[bias]
device = "nfet"

[assume]
input_level = {{ value = "1.2 V", source = "{MARKUP}", note = "{FORMULA}", trust = "guess" }}
load_capacitance = {{ value = "1 pF", source = "{FORMULA}", note = "{HIDDEN}", trust = "estimate" }}

[choose]
bias_current = "3 uA"
width = "10 um"
length = "0.5 um"
bias_width = "4 um"
bias_length = "1 um"

[target]
bandwidth = {{ min = "900 MHz", id = "{MARKUP}", source = "{MARKUP}", why = "{MARKUP}" }}
dc_gain = {{ min = 0.5, id = "{FORMULA}", source = "{FORMULA}" }}

[[waiver]]
target = "bandwidth"
by = "{MARKUP}"
reason = "{MARKUP}{HIDDEN}"
dated = 2026-01-05

[[evidence]]
metric = "dc_gain"
value = 0.7
found_by = "simulation"
by = "{MARKUP}"
reference = "{MARKUP}"
note = "{FORMULA}"
dated = 2026-01-05

[[remark]]
by = "{MARKUP}"
to = "{MARKUP}"
text = "{MARKUP}{HIDDEN}"
dated = 2026-01-05
"""


def write_hostile(folder: Path) -> Path:
    """The project in a folder."""
    process = PROCESS.replace('title = "Plain process"', f'title = "{MARKUP}"')
    return write_project(folder, PROJECT, process, {"lamp": SHEET})
