"""How long `review --json` of many sheets takes from a cold start, beside two yardsticks measured in the same run.

python -m tests.bench.review_speed [ROUNDS]

The yardsticks: the script that a designer would write (designer_script.py), and starting Python with numpy and reading
the same files with tomllib. Rounds alternate between all of them, and the least time of each counts. What is aimed at:
no slower than the script at 27 conditions and 2.5 times as fast at 125, with --fragile no slower than it at 125; at 27
conditions at most 4 times the reading; 1,000 sheets at most 3.6 times 300; less than 500 MB. And 100,000 samples of one
sheet within 5 times what numpy takes for one pass over as many, written for one circuit alone.
"""

from __future__ import annotations

import os
import resource
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from tests.bench.many_sheets import write
from worksheet.project.batch import MOST_POINTS
from worksheet.review.yields import yields
from worksheet.session.workbook import Workbook

ROOT = Path(__file__).parents[2]
READ = """
import sys, tomllib, numpy
from pathlib import Path
for path in sorted(Path(sys.argv[1]).rglob("*.toml")):
    tomllib.loads(path.read_text("utf-8"))
"""
REVIEW = "import sys; from worksheet.cli.main import entry; sys.exit(entry())"
SAMPLES = 100_000


@dataclass
class Command:
    """A command, its least time so far [s] and the most memory of it [MB]."""

    arguments: list[str]
    seconds: float = float("inf")
    megabytes: float = 0.0

    def run(self) -> None:
        """Run it once, in a process that nothing else has warmed."""
        environment = {**os.environ, "PYTHONPATH": str(ROOT)}
        environment.pop("PYTHONDONTWRITEBYTECODE", None)
        start = time.perf_counter()
        process = subprocess.Popen(
            [sys.executable, *self.arguments], env=environment, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
        )
        _, _, usage = os.wait4(process.pid, 0)
        process.returncode = 0
        self.seconds = min(self.seconds, time.perf_counter() - start)
        self.megabytes = max(self.megabytes, usage.ru_maxrss / 1024)


def commands(folder: Path) -> dict[str, Command]:
    """Everything that is timed, by name."""
    few, many, lots = write(folder / "27", 300, 27), write(folder / "125", 300, 125), write(folder / "1000", 1000, 27)
    script = str(ROOT / "tests/bench/designer_script.py")
    return {
        "read 27": Command(["-c", READ, str(few)]),
        "script 27": Command([script, str(few)]),
        "script 125": Command([script, str(many)]),
        "review 27": Command(["-c", REVIEW, "review", "--json", str(few)]),
        "review 125": Command(["-c", REVIEW, "review", "--json", str(many)]),
        "fragile 27": Command(["-c", REVIEW, "review", "--json", "--fragile", str(few)]),
        "fragile 125": Command(["-c", REVIEW, "review", "--json", "--fragile", str(many)]),
        "review 1000 sheets": Command(["-c", REVIEW, "review", "--json", str(lots)]),
    }


def ratios(timed: dict[str, Command]) -> None:
    """Print the ratios that are aimed at."""

    def over(name: str, other: str) -> float:
        return timed[name].seconds / timed[other].seconds

    for text, found, aim in (
        ("review / script, 27 conditions", over("review 27", "script 27"), "1"),
        ("review / script, 125 conditions", over("review 125", "script 125"), "0.4"),
        ("review / numpy and tomllib, 27 conditions", over("review 27", "read 27"), "4"),
        ("review --fragile / script, 125 conditions", over("fragile 125", "script 125"), "1"),
        ("1,000 sheets / 300 sheets", over("review 1000 sheets", "review 27"), "3.6"),
    ):
        print(f"{text:44} {found:5.2f}   aim: at most {aim}")


def one_pass(samples: int) -> None:
    """A common source under a transistor, mismatch drawn, all targets of such a sheet: plain numpy over whole arrays.

    Written as one would for this one circuit: no search, no checks of validity but the saturation of both devices.
    """
    rng = np.random.default_rng(0)
    thermal, temperature, boltzmann = 0.025865, 300.15, 1.380649e-23
    width, length, bias_width, bias_length, load = 2e-5, 5e-7, 1e-5, 1e-6, 1e-12
    threshold, factor, bias_threshold, bias_factor, spread = rng.standard_normal((5, samples))
    kappa = 0.7 + 0.004 * spread
    u = 2.0 + np.log(1.0) - 0.76 / thermal * 1e-3 * bias_threshold
    q = np.where(u > 1.0, u / 2.0, np.exp(np.minimum(u, 1.0)))
    for _ in range(4):
        q = q - (2.0 * q + np.log(q) - u) / (2.0 + 1.0 / q)
    current = 1.2e-7 * bias_width / bias_length * (1.0 + 3e-3 * bias_factor) * (q * q + q)
    devices = []
    for specific, w, el, k in (
        (6e-7 * (1.0 + 3e-3 * factor), width, length, kappa),
        (1.2e-7 * (1.0 + 3e-3 * bias_factor), bias_width, bias_length, 0.76),
    ):
        inversion = current / (specific * w / el)
        charge = (np.sqrt(1.0 + 4.0 * inversion) - 1.0) / 2.0
        g_s = current * 2.0 / (1.0 + np.sqrt(1.0 + 4.0 * inversion)) / thermal
        g_m, g_d = k * g_s, 0.02 * g_s + 2e-8 * current / el
        channel = 8.5e-3 * w * el
        intrinsic = channel * charge / 3.0 * (2.0 * charge + 3.0) / (charge + 1.0) ** 2
        white = 4.0 * boltzmann * temperature * (4.0 * charge + 3.0) / (6.0 * (charge + 1.0)) * g_s
        saturation = thermal * (2.0 * np.sqrt(inversion + 0.25) + 3.0)
        flicker = g_m**2 * 3e-24 / channel
        devices.append((g_m, g_d, intrinsic, white, flicker, saturation, 3.5e-10 * w, 8e-10 * w))
    main, bias = devices
    g_o, c_o = main[1] + bias[1], load + main[6] + main[7] + bias[6] + bias[7]
    gain, pole = main[0] / g_o, g_o / (2.0 * np.pi * c_o)
    zero = main[6] / main[0]
    bandwidth = pole / np.sqrt(1.0 - 2.0 * (zero * g_o / c_o) ** 2)
    noise = (main[3] + bias[3]) / (4.0 * g_o * c_o) + (main[4] + bias[4]) / g_o**2 * np.log(pole)
    swing = 1.8 - main[5] - bias[5]
    gate = 0.45 + 1e-3 * threshold + thermal * (2.0 * main[2] / main[2] + np.log(main[0])) / kappa
    met = (gain > 10.0) & (bandwidth > 1e5) & (np.sqrt(noise) < 5e-4) & (current * 1.8 < 1e-5) & (swing > 0.6)
    met &= (swing > 0.0) & (gate < 1.8)
    float(met.mean())


def samples(folder: Path) -> None:
    """Print how long the samples of one sheet of each stage take, beside one pass of plain numpy over as many."""
    workbook = Workbook.read(folder / "27")
    evaluator = workbook.evaluator
    assert evaluator is not None
    for name in ("block_0000", "block_0001", "block_0002", "block_0003", "block_0004"):
        taken, passed = [], []
        for _ in range(5):
            start = time.perf_counter()
            yields(evaluator, name, SAMPLES, 0)
            middle = time.perf_counter()
            one_pass(SAMPLES)
            taken.append(middle - start)
            passed.append(time.perf_counter() - middle)
        sheet = workbook.project.sheets[name]
        print(
            f"{SAMPLES} samples, {sheet.stage:16} {1e3 * min(taken):5.0f} ms, {min(taken) / min(passed):4.1f} times "
            f"one pass of numpy ({1e3 * min(passed):.0f} ms)   aim: at most 5"
        )


def main() -> None:
    """Measure everything."""
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 5
    with tempfile.TemporaryDirectory() as folder:
        timed = commands(Path(folder))
        for command in timed.values():
            command.run()  # byte code is written and files are in the page cache
            command.seconds = float("inf")
        for _ in range(rounds):
            for command in timed.values():
                command.run()
        for name, command in timed.items():
            print(f"{name:20} {1e3 * command.seconds:7.0f} ms {command.megabytes:6.0f} MB")
        ratios(timed)
        samples(Path(folder))
    print(f"parts of {MOST_POINTS} points; children took {resource.getrusage(resource.RUSAGE_CHILDREN).ru_utime:.0f} s")


if __name__ == "__main__":
    main()
