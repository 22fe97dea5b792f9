"""A bound put back into the sheet makes its target just met in the worst condition, for every stage and unknown."""

from __future__ import annotations

import random
from copy import deepcopy
from pathlib import Path

import numpy as np
import pytest

from tests.bench.solve_speed import case_of as speed_case
from tests.documents import Document
from tests.precision.draw import draw
from tests.solver.drawn import KINDS, case_of, with_targets
from worksheet.solver import needed
from worksheet.solver.results import Bound

JUST_MET = 1e-6


def put_back(sheet: Document, name: str, bound: Bound) -> Document:
    """The sheet as a user would edit it: the variable at its bound, and what moves with it."""
    moved = deepcopy(sheet)
    for key, value in {name: bound.value, **bound.moves_with}.items():
        table = "assume" if key in moved["assume"] else "choose"
        moved[table][key] = value
    return moved


def check(seed: int, kind: tuple[str, str, str], folder: Path, keep: str) -> int:
    rng = random.Random(seed)
    documents = draw(rng, *kind, want_invalid=False)
    sheet = with_targets(rng, folder, documents)
    if sheet is None:
        return 0
    sheet["solve"] = {"keep": keep}
    case = case_of(folder, (documents[0], documents[1], sheet))
    assert case is not None
    checked = 0
    for name, window in needed.windows(needed.trials_of(case)).items():
        for bound in window.bounds:
            again = case_of(folder, (documents[0], documents[1], put_back(sheet, name, bound)))
            if again is None:  # the bound's end lies a rounding beyond a process limit
                continue
            trials = needed.trials_of(again)
            index = next(
                k
                for k, c in enumerate(trials.constraints)
                if c.name == bound.target and c.side == ("low" if bound.limit == "min" else "high")
            )
            slack = trials.clear(
                {"load_capacitance": np.array([float(np.ravel(again.value("load_capacitance"))[0])])}
            ).slack
            if bound.edge:
                assert slack[index, 0] >= -JUST_MET, (name, bound)
            else:
                assert abs(slack[index, 0]) <= JUST_MET, (name, bound, slack[index, 0])
            room = float(slack[trials.target_count :, 0].min())
            if abs(room) > JUST_MET:
                assert bound.valid is (room > 0), (name, bound, room)
            checked += 1
    return checked


@pytest.mark.parametrize("kind", KINDS, ids="-".join)
def test_bounds_put_back(kind: tuple[str, str, str], tmp_path: Path) -> None:
    checked = sum(check(seed, kind, tmp_path / str(seed), "geometry") for seed in range(2))
    assert checked >= 2


@pytest.mark.parametrize("kind", KINDS[::4], ids="-".join)
def test_bounds_put_back_with_the_inversion_kept(kind: tuple[str, str, str], tmp_path: Path) -> None:
    assert sum(check(seed, kind, tmp_path / str(seed), "inversion") for seed in (11, 12)) >= 2


@pytest.mark.full
@pytest.mark.parametrize("seed", range(100, 112))
@pytest.mark.parametrize("kind", KINDS, ids="-".join)
def test_bounds_put_back_at_length(kind: tuple[str, str, str], seed: int, tmp_path: Path) -> None:
    check(seed, kind, tmp_path, random.Random(seed).choice(("geometry", "inversion")))


def test_a_range_counts_while_other_variables_move(tmp_path: Path) -> None:
    """The worst end of the load's range sets the bound of the current; put back, it is just met there."""
    load = {"value": 1e-12, "low": 0.7e-12, "high": 1.5e-12}
    case = speed_case(tmp_path, "source-follower", assume={"load_capacitance": load})
    (bound,) = [b for b in needed.windows(needed.trials_of(case))["bias_current"].bounds if b.target == "bandwidth"]
    worst = [
        float(np.min(case.moved({"bias_current": bound.value, "load_capacitance": farads}).solution["bandwidth"]))
        for farads in load.values()
    ]
    assert min(worst) == worst[2] == pytest.approx(2e6, rel=JUST_MET)


def test_a_region_between_two_samples_is_found(tmp_path: Path) -> None:
    """A minimum and a maximum that leave less than a step of the scan between them, and one that a turn leaves out."""
    case = speed_case(tmp_path, "common-source", target={"slew_rate": {"min": 4e6, "max": 4.0004e6}})
    window = needed.windows(needed.trials_of(case, "nominal"))["bias_current"]
    assert window.region is not None
    assert window.region.low is not None
    assert window.region.high is not None
    assert window.region.high / window.region.low == pytest.approx(1.0001, rel=1e-6)
