"""How long it takes to read a project's sheets, beside the standard TOML reader alone, and to edit one value.

python -m tests.bench.read_sheets [SHEETS]
"""

import sys
import time
import tomllib
from collections.abc import Callable

from tests.sheetfile.texts import SHEET
from worksheet.sheetfile.edit import SetValue, apply
from worksheet.sheetfile.locate import locate
from worksheet.sheetfile.read import parse_sheet

SHORT = """\
schema = 1
title = "Output stage"
stage = "common-source"
device = "nfet"

[assume]
load_capacitance = { value = "1.2 pF", source = "floor plan", trust = "estimate" }
output_level = "0.9 V"

[choose]
bias_current = "4 uA"
width = "20 um"
length = "0.5 um"

[target]
bandwidth = { min = "5 MHz", source = "system spec" }
dc_gain = { min = 20 }
power = { max = "20 uW" }
"""


def per_sheet(work: Callable[[], object], sheets: int) -> float:
    """Least processor time of one call. [ms]"""
    times = []
    for _ in range(5):
        start = time.process_time()
        for _ in range(sheets):
            work()
        times.append(time.process_time() - start)
    return min(times) / sheets * 1e3


def measure(name: str, text: str, sheets: int) -> None:
    """Print milliseconds of processor time for one sheet."""
    content = text.encode()
    edit = SetValue(("choose", "width"), "21 um")
    print(f"{name} sheet, {text.count(chr(10))} lines, ms for one of {sheets}:")
    print(f"  standard reader alone  {per_sheet(lambda: tomllib.loads(text), sheets):.3f}")
    print(f"  lines of all keys      {per_sheet(lambda: locate(text), sheets):.3f}")
    print(f"  read and checked       {per_sheet(lambda: parse_sheet(content, 'a', 'a.toml'), sheets):.3f}")
    print(f"  one value edited       {per_sheet(lambda: apply(text, [edit]), 50):.3f}")


def main() -> None:
    """Measure a sheet as most are, and one that uses everything."""
    sheets = int(sys.argv[1]) if len(sys.argv) > 1 else 300
    measure("short", SHORT, sheets)
    measure("full", SHEET, sheets)


if __name__ == "__main__":
    main()
