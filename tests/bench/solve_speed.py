"""How long the solver takes over 27 conditions: all bounds of a sheet, its points, a conflict, the first formula.

python -m tests.bench.solve_speed
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

from tests.documents import to_toml
from tests.paths import TOP
from tests.support import write_project
from worksheet.project.case import Case
from worksheet.session.workbook import Workbook
from worksheet.solver import conflict, needed, propose

CONDITIONS = {
    "process": ["typical", "slow", "fast"],
    "temperature": ["-40 °C", "27 °C", "125 °C"],
    "supply": ["1.62 V", "1.8 V", "1.98 V"],
    "nominal": {"process": "typical", "temperature": "27 °C", "supply": "1.8 V"},
}
DEVICE = {
    "own_well": True, "kappa": 0.7, "threshold": 0.45, "specific_current": 6e-7, "drain_coupling": 0.02,
    "drain_coupling_length": 1.8e-7, "drain_coupling_exponent": 1.0, "gate_capacitance": 8.5e-3,
    "overlap_capacitance": 3.5e-10, "junction_capacitance": 8e-10, "flicker": 3e-24, "flicker_exponent": 1.0,
    "matching_threshold": 4e-9, "matching_factor": 1e-8, "threshold_drift": 8e-4, "mobility_exponent": 1.5,
    "min_length": 1.8e-7, "max_length": 5e-5, "min_width": 2.2e-7, "max_width": 1e-2, "grid": 5e-9, "max_voltage": 1.98,
}  # fmt: skip
CORNERS = {
    "slow": {"threshold_shift": 0.04, "specific_current_factor": 0.85, "capacitance_factor": 1.05},
    "fast": {"threshold_shift": -0.04, "specific_current_factor": 1.15, "drain_coupling_factor": 1.1},
}
CHOSEN = {"bias_current": 4e-6, "width": 2e-5, "length": 5e-7}
TARGETS = {
    "source-follower": {"bandwidth": {"min": 2e6}, "dc_gain": {"min": 0.65}, "output_noise": {"max": 2e-4},
                        "offset_limit": {"max": 2e-2}, "power": {"max": 4e-5}},
    "common-source": {"unity_gain_frequency": {"min": 2e6}, "dc_gain": {"min": 30.0}, "input_noise": {"max": 2e-4},
                      "output_swing": {"min": 0.8}, "power": {"max": 4e-5}},
    "common-gate": {"unity_gain_frequency": {"min": 2e6}, "noise_density": {"max": 5e-8}, "power": {"max": 4e-5}},
    "drain-follower": {"bandwidth": {"min": 2e6}, "settling_time": {"max": 3e-6}, "power": {"max": 4e-5}},
    "cascode": {"unity_gain_frequency": {"min": 2e6}, "settling_time": {"max": 3e-3}, "power": {"max": 4e-5}},
}  # fmt: skip


def case_of(folder: Path, stage: str, **changes: object) -> Case:
    """A sheet over the 27 conditions."""
    project = {"schema": 1, "title": "speed", "owner": "", "process": "plain", "conditions": CONDITIONS}
    devices = {"nfet": {"polarity": "n", **DEVICE}, "pfet": {"polarity": "p", **DEVICE}}
    corners = {name: {"nfet": change, "pfet": change} for name, change in CORNERS.items()}
    process = {"schema": 1, "title": "plain", "reference_temperature": "27 °C", "device": devices, "corner": corners}
    chosen = dict(CHOSEN)
    if stage == "cascode":
        chosen |= {"cascode_width": 2e-5, "cascode_length": 5e-7}
    sheet = {
        "schema": 1, "title": stage, "stage": stage, "device": "nfet", "bulk": "rail", "bias": {"device": "ideal"},
        "assume": {"load_capacitance": 1e-12}, "choose": chosen, "target": TARGETS[stage], **changes,
    }  # fmt: skip
    write_project(folder, to_toml(project), to_toml(process), {"drawn": to_toml(sheet)})
    evaluator = Workbook.read(folder).evaluator
    assert evaluator is not None
    return evaluator.case("drawn")


def milliseconds(work: Callable[[], object], times: int = 9) -> float:
    """Median time of some work. [ms]"""
    taken = []
    for _ in range(times):
        start = time.perf_counter()
        work()
        taken.append(time.perf_counter() - start)
    return 1e3 * statistics.median(taken)


def first_formula() -> float:
    """From the start of the interpreter to a stage's first formula on a pipe. [ms]"""
    start = time.perf_counter()
    code = "import sys; from worksheet.cli.main import main; main(['stages', 'common-source'])"
    with subprocess.Popen([sys.executable, "-u", "-c", code], cwd=TOP, stdout=subprocess.PIPE, text=True) as child:
        assert child.stdout is not None
        for line in child.stdout:
            if line.strip() == "bandwidth":  # the gain's formula stands before it
                taken = time.perf_counter() - start
                child.kill()
                return 1e3 * taken
    raise AssertionError("no formula was printed")


def main() -> None:
    """Print milliseconds."""
    print(f"{'':28} solve once  all bounds  points  [ms]")
    with tempfile.TemporaryDirectory() as folder:
        for stage in TARGETS:
            sheets = {"": {}, ", drive resistance": {"assume": {"load_capacitance": 1e-12, "drive_resistance": 2e4}}}
            for name, changes in sheets.items():
                case = case_of(Path(folder) / f"{stage}{name}", stage, **changes)
                once = milliseconds(lambda c=case: needed.trials_of(c).clear({"bias_current": c.inputs.current}))  # type: ignore[misc]
                bounds = milliseconds(lambda c=case: needed.windows(needed.trials_of(c)))  # type: ignore[misc]
                points = milliseconds(lambda c=case: propose.optimum(c, needed.trials_of(c)), 3)  # type: ignore[misc]
                print(f"{stage + name:34} {once:6.1f} {bounds:10.1f} {points:8.0f}")
        tight = {**TARGETS["common-source"], "power": {"max": 1e-7}}
        case = case_of(Path(folder) / "tight", "common-source", target=tight)
        trials = needed.trials_of(case)
        free = propose.optimum(case, trials).free
        spent = milliseconds(lambda: conflict.conflict(needed.trials_of(case), free), 3)
        print(f"conflict of a common source {spent:8.0f} ms")
    print(f"first formula, from the start {first_formula():6.0f} ms")


if __name__ == "__main__":
    main()
