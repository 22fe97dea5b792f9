"""The two engines against each other: every stage, metric and operating-point value at random points, n and p.

They share the network's terms and the metrics' rules, and no code that solves anything: the numeric one expands
minors over arrays, the symbolic one asks sympy.
"""

from __future__ import annotations

import ast
import random
import subprocess
import sys
from pathlib import Path

import pytest

from tests.engine.symbols import differences, drawn, missing
from tests.paths import TOP
from tests.precision.draw import draw
from tests.solver.drawn import KINDS, case_of
from worksheet.engine.symbolic.algebra import Setting, of
from worksheet.model import dimension as dim
from worksheet.model import metrics
from worksheet.model.metrics import Metric, Reason
from worksheet.solver.present import Present
from worksheet.solver.stage_algebra import plain_setting
from worksheet.stages import catalogue
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import GROUND, IN, LINE, OUT, Stage, Transistor


def compare(kind: tuple[str, str, str], seed: object, folder: Path) -> int:
    case = drawn(kind, seed, folder)
    if case is None:
        return 0
    compared = 0
    for index in (0, 1):
        count, wrong = differences(case, index)
        assert not wrong, f"{kind} {seed} condition {index}:\n" + "\n".join(wrong)
        compared += count
    return compared


@pytest.mark.parametrize(
    "kind", [pytest.param(k, marks=pytest.mark.full if i % 2 else ()) for i, k in enumerate(KINDS)], ids="-".join
)
def test_engines_agree(kind: tuple[str, str, str], tmp_path: Path) -> None:
    """Bulk, bias source, velocity saturation, levels, steps and drive resistance are drawn with the rest."""
    compared = 0
    for seed in "abcdef":
        compared += compare(kind, seed, tmp_path / seed)
        if compared >= 120:
            break
    assert compared >= 120


@pytest.mark.full
@pytest.mark.parametrize("seed", range(40))
@pytest.mark.parametrize("kind", KINDS, ids="-".join)
def test_engines_agree_at_length(kind: tuple[str, str, str], seed: int, tmp_path: Path) -> None:
    compare(kind, seed, tmp_path)


TRIPLE = Stage(
    key="triple-cascode",
    title="Triple cascode",
    purpose="Three transistors in one stack, for this test.",
    transistors=(
        Transistor("main", gate=IN, drain="first", source=GROUND),
        Transistor("cascode", gate=LINE, drain="second", source="first"),
        Transistor("upper", gate=LINE, drain=OUT, source="second"),
    ),
    levels=("output_level",),
)


@pytest.mark.parametrize("source", ["ideal", "transistor"])
@pytest.mark.parametrize("polarity", ["n", "p"])
def test_a_stage_that_is_entered_has_its_algebra(polarity: str, source: str, tmp_path: Path) -> None:
    """Three nodes, and four with a drive resistance, over which the numeric integral of noise keeps eight digits."""
    catalogue.register(TRIPLE)
    try:
        compared = 0
        for seed in range(6):
            project, process, sheet = draw(random.Random(seed), "cascode", polarity, source, want_invalid=False)
            sheet["stage"] = TRIPLE.key
            sheet["choose"].update(upper_width=2e-5, upper_length=7e-7)
            if seed == 0:
                sheet["assume"]["drive_resistance"] = 2e4
            case = case_of(tmp_path / str(seed), (project, process, sheet))
            if case is not None and compared == 0:
                compared, wrong = differences(case, 1, relative=1e-7)
                assert not wrong, "\n".join(wrong)
        assert compared >= 60
    finally:
        catalogue.withdraw(TRIPLE.key)


def test_a_metric_that_is_entered_has_its_algebra(tmp_path: Path) -> None:
    """A rule is arithmetic over what a solution offers, whichever engine solved it."""
    name = "current_for_gain"
    rule = Metric(
        name, "Current for the gain", "I_A", dim.CURRENT, "For this test.", lambda s: s.current * s["dc_gain"]
    )
    metrics.register(rule)
    try:
        case = drawn(KINDS[0], "a", tmp_path)
        assert case is not None
        assert differences(case, 0)[1] == []
        algebra = of(plain_setting(case.circuit))
        found = algebra.definition(name)
        assert found is not None
        assert found.expression == algebra.symbol("current") * algebra.symbol("dc_gain")
    finally:
        metrics.withdraw(name)


def every_circuit() -> list[Circuit]:
    return [
        Circuit(stage, polarity, bulk, ideal, driven)
        for stage in catalogue.stages()
        for polarity in "np"
        for bulk in ("rail", "source")
        for ideal in (True, False)
        for driven in (True, False)
    ]


@pytest.mark.parametrize("stage", catalogue.keys())
def test_every_metric_of_every_circuit_is_defined(stage: str) -> None:
    for circuit in every_circuit():
        if circuit.stage.key != stage:
            continue
        algebra = of(Setting(circuit, frozenset({"input_level", "output_level"})))
        for metric in metrics.all_metrics():
            if circuit.stage.absent_metric(metric.key) is None:
                found = algebra.definition(metric.key)
                assert found is not None, metric.key
                assert (found.expression is None) == (found.missing is not Reason.NONE), metric.key
                assert found.source, metric.key


@pytest.mark.parametrize(
    "kind", [("drain-follower", "n", "ideal"), ("source-follower", "p", "transistor")], ids="-".join
)
def test_a_gain_below_one_has_no_unity_gain_frequency(kind: tuple[str, str, str], tmp_path: Path) -> None:
    """What the numeric engine calls missing for this reason has no value in the algebra either."""
    seen = 0
    for seed in range(12):
        case = drawn(kind, seed, tmp_path / str(seed))
        if case is not None and missing(case, "unity_gain_frequency", 0) is Reason.GAIN_BELOW_1:
            seen += 1
            assert Present(case, 0).point.number("unity_gain_frequency") is None
    assert seen


SHARED = {"worksheet.engine.inputs"}
"""What both engines may read: the inputs are what the program has of numbers, and solve nothing."""


def test_the_symbolic_engine_uses_nothing_of_the_numeric_one() -> None:
    numeric = {f"worksheet.engine.{path.stem}" for path in (TOP / "worksheet" / "engine").glob("[!_]*.py")} - SHARED
    found = set()
    for path in (TOP / "worksheet" / "engine" / "symbolic").glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if isinstance(node, ast.ImportFrom):
                found |= {node.module or ""} | {f"{node.module}.{alias.name}" for alias in node.names}
    assert found & (numeric | {"numpy", "worksheet.device"}) == set()
    assert not any(name.startswith("worksheet.device") for name in found)


def test_no_module_loads_sympy_before_it_is_asked_for_algebra() -> None:
    names = [f"worksheet.engine.symbolic.{p.stem}" for p in (TOP / "worksheet/engine/symbolic").glob("[!_]*.py")]
    names += [f"worksheet.solver.{p.stem}" for p in (TOP / "worksheet/solver").glob("[!_]*.py")]
    code = f"import sys, {', '.join(names)}; print('sympy' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], cwd=TOP, capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
