"""The algebra of all numbers: each stage, n and p, either bulk, either current source, with and without a step."""

from __future__ import annotations

import random
import re
from pathlib import Path

import numpy as np
import pytest

from tests.engine.symbols import NOISES, differences
from tests.precision.draw import STAGES, draw
from tests.solver.drawn import KINDS, case_of, every_metric
from tests.solver.test_explain import evaluates
from worksheet.project.case import Case
from worksheet.solver.algebra import explain, explainable
from worksheet.stages import catalogue

BULKS, STEPS = ("rail", "source"), (None, 0.05)


def of(kind: tuple[str, str, str], bulk: str, step: float | None, folder: Path, seeds: range = range(20)) -> Case:
    """A drawn sheet with the bulk and the step that are asked for."""
    for seed in seeds:
        documents = draw(random.Random(f"{kind}{seed}x"), *kind, want_invalid=False)
        sheet = documents[2]
        sheet["bulk"] = bulk
        if bulk == "rail":
            sheet["assume"].pop("well_capacitance", None)
        sheet["assume"].pop("step_size", None)
        if step is not None:
            sheet["assume"]["step_size"] = step
        case = case_of(folder / str(seed), documents)
        if case is not None:
            return case
    raise AssertionError((kind, bulk, step))


def check(case: Case, index: int) -> None:
    """Every number at a condition: expression, numbers, places, relation, neglects, and what is printed."""
    for key in explainable(case):
        found = explain(case, key, index)
        assert evaluates(found), (key, found.value, found.evaluated)
        assert found.title, key
        assert found.relation or found.origin is not None, key
        assert found.remarks or found.origin is not None, key
        for given in found.given:
            assert given.title, (key, given)
            assert given.origin is not None or given.key, (key, given)
            if given.origin is not None and given.origin.kind in ("sheet", "process", "conditions"):
                assert given.origin.file, (key, given)
                assert given.origin.line, (key, given)
        simple = found.simplified
        if simple is not None and found.value is not None:
            exact = simple.restored[-1][1]
            slack = 1e-9 if found.unit == "V" and key not in NOISES else 0.0
            assert exact == pytest.approx(found.value, rel=1e-9, abs=slack), key
            assert [name for name, _ in simple.restored[1:]] == [effect.name for effect in simple.neglects]
            assert all(np.isfinite(effect.share or 0.0) for effect in simple.neglects), key
        for line in found.latex():
            assert balanced(line), (key, line)


def balanced(latex: str) -> bool:
    """Whether braces close in order and every left delimiter has its right one."""
    depth = 0
    for sign in re.sub(r"\\[{}]", "", latex):
        depth += {"{": 1, "}": -1}.get(sign, 0)
        if depth < 0:
            return False
    begins = re.findall(r"\\begin{(\w+)}", latex)
    ends = re.findall(r"\\end{(\w+)}", latex)
    return depth == 0 and latex.count(r"\left") == latex.count(r"\right") and sorted(begins) == sorted(ends)


@pytest.mark.parametrize("step", [STEPS[0], *(pytest.param(one, marks=pytest.mark.full) for one in STEPS[1:])])
@pytest.mark.parametrize("bulk", BULKS)
@pytest.mark.parametrize(
    "kind", [pytest.param(k, marks=() if i == 0 else pytest.mark.full) for i, k in enumerate(KINDS)], ids="-".join
)
def test_every_number_of_every_stage(kind: tuple[str, str, str], bulk: str, step: float | None, tmp_path: Path) -> None:
    case = of(kind, bulk, step, tmp_path)
    check(case, 0)
    if len(case.conditions.conditions) > 1:
        check(case, 1)


@pytest.mark.parametrize("polarity", ["n", pytest.param("p", marks=pytest.mark.full)])
@pytest.mark.parametrize(
    "stage", [pytest.param(one, marks=pytest.mark.full) if one == "cascode" else one for one in STAGES]
)
def test_no_metric_is_left_out_where_the_engines_are_compared(stage: str, polarity: str, tmp_path: Path) -> None:
    """What test_symbolic compares covers every metric of the stage; a follower's gain never reaches one."""
    found = catalogue.find(stage)
    assert found is not None
    never = {"unity_gain_frequency"} if found.source_output else set()
    compared: set[str] = set()
    for count, (source, bulk, step) in enumerate(
        (s, b, t) for s in ("ideal", "transistor") for b in BULKS for t in STEPS
    ):
        case = of((stage, polarity, source), bulk, step, tmp_path / str(count))
        number, wrong = differences(case, 0)
        assert number
        assert not wrong, wrong
        compared |= {key for key in every_metric(case) if case.solution.measure(key).complete}
    assert set(every_metric(case)) - compared <= never
