"""The algebra beside bounds: exact where it says so, in the trade's form, with what it neglects and by how much."""

from __future__ import annotations

import math
import random
from copy import deepcopy
from pathlib import Path

import pytest

from tests.documents import Document
from tests.precision.draw import draw
from tests.solver.drawn import KINDS, case_of, every_metric, with_targets
from worksheet.engine.symbolic.neglects import NEGLECTS
from worksheet.project.case import Case
from worksheet.solver import goals, needed
from worksheet.solver.hand import HandBound, hand_bound
from worksheet.solver.inversion import relevant
from worksheet.solver.present import Present
from worksheet.solver.results import Bound
from worksheet.solver.stated import at

EXACT = 1e-6


def limit_of(case: Case, bound: Bound) -> float:
    low, high = goals.limits(case.sheet.targets[bound.target])
    limit = low if bound.limit == "min" else high
    assert limit is not None
    return limit


def bounds_of(case: Case) -> list[tuple[str, Bound]]:
    found = needed.windows(needed.trials_of(case))
    return [(name, bound) for name, window in found.items() for bound in window.bounds]


def algebra_of(case: Case, name: str, bound: Bound) -> HandBound | None:
    return hand_bound(case, bound.target, bound.side, limit_of(case, bound), name, bound.point)


def check(kind: tuple[str, str, str], seed: object, folder: Path) -> tuple[int, int]:
    """How many bounds have a formula, and how many an exact one."""
    rng = random.Random(f"{kind}{seed}")
    documents = draw(rng, *kind, want_invalid=False)
    sheet = with_targets(rng, folder, documents)
    if sheet is None:
        return 0, 0
    sheet["solve"] = {"keep": rng.choice(["geometry", "inversion"])}
    case = case_of(folder, (documents[0], documents[1], sheet))
    assert case is not None
    formulas = exact = 0
    for name, bound in bounds_of(case):
        found = algebra_of(case, name, bound)
        if found is None:
            continue
        formulas += 1
        assert found.value > 0
        assert math.isfinite(found.value)
        assert found.exact == (not found.neglects), (name, bound, found)
        if found.exact:
            exact += 1
            assert found.value == pytest.approx(bound.value, rel=EXACT), (name, bound, found)
    return formulas, exact


@pytest.mark.parametrize("kind", KINDS[1::6], ids="-".join)
def test_a_closed_form_is_the_bound(kind: tuple[str, str, str], tmp_path: Path) -> None:
    assert any(check(kind, seed, tmp_path / seed)[0] for seed in "pqrst")


@pytest.mark.full
@pytest.mark.parametrize("seed", range(15))
@pytest.mark.parametrize("kind", KINDS, ids="-".join)
def test_a_closed_form_is_the_bound_at_length(kind: tuple[str, str, str], seed: int, tmp_path: Path) -> None:
    check(kind, seed, tmp_path)


def follower() -> tuple[Document, Document, Document]:
    """A source follower with an ideal source, all numbers its own."""
    device = {
        "polarity": "n", "own_well": True, "kappa": 0.7, "threshold": 0.45, "specific_current": 6e-7,
        "drain_coupling": 0.02, "drain_coupling_length": 1.8e-7, "drain_coupling_exponent": 1.0,
        "gate_capacitance": 8.5e-3, "overlap_capacitance": 3.5e-10, "junction_capacitance": 8e-10,
        "flicker": 3e-24, "flicker_exponent": 1.0, "matching_threshold": 4e-9, "matching_factor": 1e-8,
        "threshold_drift": 8e-4, "mobility_exponent": 1.5, "min_length": 1.8e-7, "max_length": 5e-5,
        "min_width": 2.2e-7, "max_width": 1e-2, "grid": 5e-9, "max_voltage": 1.98,
    }  # fmt: skip
    process = {"schema": 1, "title": "t", "reference_temperature": 300.15, "device": {"nfet": device}, "corner": {}}
    nominal = {"process": "typical", "temperature": 300.15, "supply": 1.8}
    conditions = {"process": ["typical"], "temperature": [233.15, 398.15], "supply": [1.62, 1.98], "nominal": nominal}
    project = {"schema": 1, "title": "t", "process": "drawn", "conditions": conditions}
    sheet = {
        "schema": 1, "title": "t", "stage": "source-follower", "device": "nfet",
        "bias": {"device": "ideal"},
        "assume": {"load_capacitance": 1.2e-12},
        "choose": {"bias_current": 4e-6, "width": 2e-5, "length": 5e-7},
        "target": {"bandwidth": {"min": 5e6}, "power": {"max": 2e-5}},
    }  # fmt: skip
    return project, process, sheet


def only(case: Case, name: str, target: str) -> HandBound:
    (bound,) = [b for n, b in bounds_of(case) if n == name and b.target == target]
    found = algebra_of(case, name, bound)
    assert found is not None
    return found


def test_what_a_designer_reads(tmp_path: Path) -> None:
    case = case_of(tmp_path, follower())
    assert case is not None
    bandwidth, power = only(case, "bias_current", "bandwidth"), only(case, "bias_current", "power")
    assert bandwidth.formula == "I_spec*(y + y**2)"
    assert bandwidth.where == ("y = 2*pi*C_o*U_T*bandwidth/I_spec",)
    assert bandwidth.neglects == ("feed-through", "parasitics that move with current")
    assert not bandwidth.exact
    assert power.formula == "power/supply"
    assert power.exact
    assert power.neglects == ()
    assert power.value == pytest.approx(2e-5 / 1.98)


def test_the_hand_value_by_hand(tmp_path: Path) -> None:
    """The follower's formula with numbers taken straight from the sheet; C_o held at the present point, 398.15 K."""
    case = case_of(tmp_path, follower())
    assert case is not None
    (bound,) = [b for n, b in bounds_of(case) if n == "bias_current" and b.target == "bandwidth"]
    found = only(case, "bias_current", "bandwidth")
    temperature = bound.at.temperature
    thermal = 1.380649e-23 * temperature / 1.602176634e-19
    specific = 6e-7 * 20 / 0.5 * (temperature / 300.15) ** 0.5
    q = (math.sqrt(1 + 4 * 4e-6 / specific) - 1) / 2
    channel = 8.5e-3 * 20e-6 * 0.5e-6
    share = channel * q * (2 * q + 3) / (3 * (q + 1) ** 2)
    node = 1.2e-12 + share + 3.5e-10 * 20e-6 + 8e-10 * 20e-6 + (1 / 0.7 - 1) * share
    y = 2 * math.pi * 5e6 * node * thermal / specific
    assert found.value == pytest.approx(specific * (y + y * y), rel=1e-9)
    assert found.value == pytest.approx(bound.value, rel=0.1)


def test_the_inversion_kept(tmp_path: Path) -> None:
    """With the width going with the current the parasitics are not held but go with it."""
    project, process, sheet = follower()
    sheet["solve"] = {"keep": "inversion"}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    (bound,) = [b for n, b in bounds_of(case) if n == "bias_current" and b.target == "bandwidth"]
    found = only(case, "bias_current", "bandwidth")
    assert found.neglects == ("feed-through",)
    assert found.value == pytest.approx(bound.value, rel=0.02)


def test_a_stated_inversion_is_the_one_kept(tmp_path: Path) -> None:
    project, process, sheet = follower()
    sheet["solve"] = {"keep": "inversion", "inversion_coefficient": 2.0}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    (bound,) = [b for n, b in bounds_of(case) if n == "bias_current" and b.target == "bandwidth" and b.side == "low"]
    found = algebra_of(case, "bias_current", bound)
    assert found is not None
    assert found.value == pytest.approx(bound.value, rel=0.02)


def test_the_yield_of_the_target_counts(tmp_path: Path) -> None:
    project, process, sheet = follower()
    sheet["target"] = {"offset_limit": {"max": 6e-3, "yield": 0.95}}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    found = only(case, "width", "offset_limit")
    (bound,) = [b for n, b in bounds_of(case) if n == "width"]
    assert found.value == pytest.approx(bound.value, rel=0.1)
    assert "current-factor mismatch" in found.neglects


def test_a_formula_that_something_else_follows_is_not_called_exact(tmp_path: Path) -> None:
    """The overhead is a formula over the current here: P/V_DD is no longer the whole story."""
    project, process, sheet = follower()
    sheet["assume"]["bias_overhead"] = {"formula": "bias_current/1e-4"}
    sheet["target"] = {"power": {"max": 2e-5}}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    found = only(case, "bias_current", "power")
    assert not found.exact
    assert found.neglects == ("what follows the unknown through formulas and held levels",)


def test_a_bound_of_the_other_side_gets_no_formula_that_runs_the_wrong_way(tmp_path: Path) -> None:
    """A wide device loads itself: the upper bound of the width is no matter of I = I_spec (y + y^2)."""
    project, process, sheet = follower()
    sheet["target"] = {"bandwidth": {"min": 8e6}}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    sides = {bound.side: algebra_of(case, name, bound) for name, bound in bounds_of(case) if name == "width"}
    assert set(sides) == {"low", "high"}
    assert sides["low"] is not None
    assert "I_sq" in sides["low"].formula
    assert sides["high"] is not None
    assert "c_W" in sides["high"].formula


def test_no_formula_for_a_figure(tmp_path: Path) -> None:
    project, process, sheet = follower()
    sheet["target"] = {"figure": {"formula": "bandwidth/power", "min": 3e11, "unit": "Hz/W"}}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    assert hand_bound(case, "figure", "low", 3e11, "bias_current", 0) is None


@pytest.mark.parametrize("kind", KINDS[::8], ids="-".join)
def test_taking_all_neglects_back_gives_the_exact_value(kind: tuple[str, str, str], tmp_path: Path) -> None:
    """In any order and for every metric; and each effect is the change that the neglect alone makes."""
    case = next(
        c
        for seed in range(20)
        if (c := case_of(tmp_path / str(seed), draw(random.Random(f"{kind}{seed}"), *kind, want_invalid=False)))
    )
    present, checked = Present(case, 0), 0
    for key in every_metric(case):
        exact = at(case.solution.measure(key).values, 0)
        names = relevant(present.setting, key, frozenset(n.name for n in NEGLECTS))
        if not math.isfinite(exact) or not names:
            continue
        shuffled = random.Random(key).sample(names, len(names))
        steps = present.restored(key, tuple(shuffled))
        assert [name for name, _ in steps] == ["", *shuffled]
        last = steps[-1][1]
        assert last is not None
        assert last == pytest.approx(exact, rel=1e-9, abs=1e-9 if present.point.algebra.word(key).unit == "V" else 0)
        for effect in present.effects(key):
            alone = present.neglecting(key, frozenset({effect.name}))
            if effect.share is not None and alone is not None and exact:
                assert alone == pytest.approx(exact + effect.share * abs(exact), rel=1e-6)
        checked += 1
    assert checked >= 1


def test_what_holding_leaves_out_is_the_slope_that_is_missing(tmp_path: Path) -> None:
    """Bandwidth against current, with the parasitics held and without: the difference is what the effect says."""
    case = case_of(tmp_path, follower())
    assert case is not None
    found = only(case, "bias_current", "bandwidth")
    (effect,) = [e for e in found.effects if e.moving]
    (bound,) = [b for n, b in bounds_of(case) if n == "bias_current" and b.target == "bandwidth"]
    index, h = bound.point, 1e-4

    def bandwidth(factor: float) -> float:
        moved = case.moved({"bias_current": 4e-6 * factor})
        return at(moved.solution["bandwidth"], index)

    def node(factor: float) -> float:
        return at(case.moved({"bias_current": 4e-6 * factor}).solution.output_capacitance, index)

    whole = (bandwidth(1 + h) - bandwidth(1 - h)) / (2 * h) / bandwidth(1)
    load = at(case.value("load_capacitance"), index)
    shift = (node(1 + h) - node(1 - h)) / 2  # add to the load what the parasitics gained, so that C_o stands still

    def held(factor: float, less: float) -> float:
        moved = case.moved({"bias_current": 4e-6 * factor, "load_capacitance": load - less})
        return at(moved.solution["bandwidth"], index)

    still = (held(1 + h, shift) - held(1 - h, -shift)) / (2 * h) / bandwidth(1)
    assert effect.share == pytest.approx(still - whole, rel=0.05)  # feed-through moves too, a little


def test_the_sheet_is_left_alone(tmp_path: Path) -> None:
    project, process, sheet = follower()
    before = deepcopy(sheet)
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    only(case, "bias_current", "bandwidth")
    assert sheet == before
    assert case.moves == {}


@pytest.mark.parametrize("drive", [0.0, 2e4])
def test_the_neglects_that_are_named_are_all_that_stand_between_formula_and_metric(
    drive: float, tmp_path: Path
) -> None:
    """A cascode, with three nodes where it is driven through a resistance: poles beyond the first are named too."""
    project, process, sheet = cascode()
    sheet["assume"]["drive_resistance"] = drive
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    found = only(case, "load_capacitance", "unity_gain_frequency")
    assert "poles beyond the first" in found.neglects
    assert ("drive resistance" in found.neglects) is (drive > 0)
    (bound,) = [b for name, b in bounds_of(case) if name == "load_capacitance" and b.target == "unity_gain_frequency"]
    at_bound = case.moved({"load_capacitance": found.value})
    simplified = Present(at_bound, bound.point).neglecting("unity_gain_frequency", frozenset(found.neglects))
    assert simplified == pytest.approx(limit_of(case, bound), rel=1e-6), "with these left out the formula is exact"
    steps = Present(case, bound.point).restored("unity_gain_frequency", found.neglects)
    exact = at(case.solution.measure("unity_gain_frequency").values, bound.point)
    assert steps[-1][1] == pytest.approx(exact, rel=1e-9)


def cascode() -> tuple[Document, Document, Document]:
    """A cascode on an ideal source, with a load that is sought."""
    project, process, sheet = follower()
    sheet |= {"stage": "cascode", "target": {"unity_gain_frequency": {"min": 2e6}}}
    sheet["choose"] |= {"cascode_width": 2e-5, "cascode_length": 5e-7}
    return project, process, sheet
