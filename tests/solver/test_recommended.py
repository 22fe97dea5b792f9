"""The recommended point: the published relation of a self-loaded stage, random points, and review after taking."""

from __future__ import annotations

import json
import random
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from tests.precision.draw import draw
from tests.solver.drawn import KINDS, case_of, with_targets
from tests.support import run
from worksheet.device.constants import thermal_voltage
from worksheet.solver import needed, propose
from worksheet.solver.trials import holds

THERMAL = float(thermal_voltage(300.15))
FREQUENCY, LENGTH = 20e6, 0.5e-6


def common_source(folder: Path, load: str, lines: str = "") -> Path:
    """A new project whose sheet is a common source with an ideal current source and an open current and width."""
    assert run("start", str(folder), "--stage", "common-source").status == 0
    sheet = folder / "sheets/first_block.toml"
    sheet.write_text(
        "schema = 1\nstage = 'common-source'\ndevice = 'nfet'\n"
        f"[assume]\nload_capacitance = '{load}'\n[choose]\nlength = {LENGTH!r}\n[solve]\nover = 'nominal'\n"
        f"[target]\nunity_gain_frequency = {{ min = {FREQUENCY!r} }}\n{lines}",
        encoding="utf-8",
    )
    return sheet


def solved(sheet: Path) -> dict[str, Any]:
    document: dict[str, Any] = json.loads(run("solve", str(sheet), "--json").out)
    assert document["problems"] == []
    return document


def current_for(inversion: float, load: float) -> float:
    """I = 2 pi f C_L/(kappa G/U_T - 2 pi f c_w L/(I_sq IC)): Enz, Chicco and Pezzotta 2017, with the self-loading of a
    drain, c_w = C_ov + C_j; the numbers are those of `biasbook start`."""
    slope = 2.0 / (1.0 + np.sqrt(1.0 + 4.0 * inversion))
    omega = 2.0 * np.pi * FREQUENCY
    width_per_current = LENGTH / (0.6e-6 * inversion)
    bracket = 0.7 * slope / THERMAL - omega * (0.35e-9 + 0.8e-9) * width_per_current
    return omega * load / bracket if bracket > 0 else np.inf


def test_a_self_loaded_common_source_against_the_published_relation(tmp_path: Path) -> None:
    load = 0.2e-12
    best = minimize_scalar(
        lambda x: current_for(float(np.exp(x)), load), bounds=(np.log(0.01), np.log(100)), method="bounded"
    )
    point = solved(common_source(tmp_path / "book", "0.2 pF"))["recommended"]
    assert point["bias_current"] == pytest.approx(best.fun, rel=0.01)
    assert point["inversion_coefficient"] == pytest.approx(float(np.exp(best.x)), rel=0.1)


def test_least_current_of_a_gain_bandwidth_product(tmp_path: Path) -> None:
    """I = 2 pi f C n U_T in weak inversion: 198 nA for 1 MHz into 1 pF at n = 1.22 and 25.865 mV (Enz, "Cascode gain
    stage", 2025); the same relation here, at this sheet's numbers and the edge of the search, IC 0.01."""
    assert 2 * np.pi * 1e6 * 1e-12 * 1.22 * 25.865e-3 == pytest.approx(198e-9, rel=2e-3)
    point = solved(common_source(tmp_path / "book", "500 pF"))["recommended"]
    # 500 pF at 20 MHz ask for so wide a device that the process limit sets the inversion
    omega = 2 * np.pi * FREQUENCY
    slope = 2 / (1 + np.sqrt(1 + 4 * point["inversion_coefficient"]))
    assert point["bias_current"] == pytest.approx(omega * 500e-12 * THERMAL / (0.7 * slope), rel=0.05)


def test_no_current_is_recommended_where_nothing_asks_for_one(tmp_path: Path) -> None:
    sheet = common_source(tmp_path / "book", "1 pF")
    text = sheet.read_text(encoding="utf-8").replace("length =", "bias_current = '2 uA'\nwidth = '10 um'\nlength =")
    sheet.write_text(text[: text.index("[target]")] + "[target]\npower = { max = '20 uW' }\n", encoding="utf-8")
    document = solved(sheet)
    assert document["recommended"] is None
    assert document["feasible"]
    assert "no target bounds" in document["reason"]
    text = sheet.read_text(encoding="utf-8").replace("bias_current = '2 uA'\n", "")
    sheet.write_text(text, encoding="utf-8")
    done = run("solve", str(sheet), "--json")
    assert done.status == 2
    assert "no target bounds it" in json.loads(done.out)["problems"][0]["message"]


def test_targets_that_exclude_each_other_are_named(tmp_path: Path) -> None:
    sheet = common_source(tmp_path / "book", "1 pF", "power = { max = '3 uW' }\n")
    text = sheet.read_text(encoding="utf-8").replace("length =", "bias_current = '2 uA'\nwidth = '10 um'\nlength =")
    sheet.write_text(text, encoding="utf-8")
    done = run("solve", str(sheet), "--json")
    assert done.status == 1
    conflict = json.loads(done.out)["conflict"]
    assert set(conflict["targets"]) == {"unity_gain_frequency", "power"}
    # each alone with the other held: no more than 3 uW buys that much speed, that speed costs that much power
    assert conflict["gives_way"]["unity_gain_frequency"] < FREQUENCY
    assert conflict["gives_way"]["power"] > 3e-6
    wide = json.loads(run("solve", str(common_source(tmp_path / "wide", "1 pF")), "--json").out)
    assert conflict["gives_way"]["power"] == pytest.approx(1.8 * wide["recommended"]["bias_current"], rel=2e-3)


@pytest.mark.parametrize("kind", KINDS[::3], ids="-".join)
def test_no_random_feasible_point_beats_it(kind: tuple[str, str, str], tmp_path: Path) -> None:
    rng = random.Random(7)
    documents = draw(rng, *kind, want_invalid=False)
    sheet = with_targets(rng, tmp_path, documents)
    if sheet is None:
        pytest.skip("this draw cannot be evaluated")
    case = case_of(tmp_path, (documents[0], documents[1], sheet))
    assert case is not None
    trials = needed.trials_of(case)
    found = propose.optimum(case, trials)
    free = found.free
    generator = np.random.default_rng(3)
    space = free.space()
    first = generator.uniform(*space.first, 4000)
    rest = (
        np.column_stack([generator.uniform(*span, 4000) for span in space.rest]) if space.rest else np.zeros((4000, 0))
    )
    slack = trials.clear(free.moves(first, rest)).slack
    good = holds(trials.constraints, slack).all(axis=0) & (free.room(first, rest) >= 0)
    if found.recommended is None:
        assert not good.any() or found.reason == propose.NO_BOUND
        return
    best = found.recommended
    held = trials.clear({name: np.array([best.values[name]]) for name in free.names}).slack
    assert holds(trials.constraints, held).all()
    if not free.by_inversion or len(space.rest) != 1:
        return
    here = np.log([best.values["bias_current"], best.inversion_coefficient])
    for scale in (10.0, 0.1, 1e-2, 1e-3, 1e-4):
        near = np.clip(here + scale * generator.normal(size=(2000, 2)), *np.array([space.first, *space.rest]).T)
        first, rest = np.append(first, near[:, 0]), np.concatenate([rest, near[:, 1:]])
    slack = trials.clear(free.moves(first, rest)).slack
    good = holds(trials.constraints, slack).all(axis=0) & (free.room(first, rest) >= 0)
    assert good.any()
    values = free.moves(first[good], rest[good])
    assert best.values["bias_current"] <= values["bias_current"].min() * (1 + 2e-6)
    assert found.compact is not None
    allowed = values["bias_current"] <= best.values["bias_current"] * (1 + case.sheet.solve.current_allowance)
    area = propose.gate_area(case, values)[allowed]
    assert not len(area) or found.compact.gate_area <= area.min() * (1 + 3e-3)


def test_what_is_taken_over_passes_review(tmp_path: Path) -> None:
    sheet = common_source(tmp_path / "book", "0.2 pF", "dc_gain = { min = 30 }\n")
    assert run("solve", str(sheet), "--take").status == 0
    (reviewed,) = json.loads(run("review", str(tmp_path / "book"), "--json").out)["sheets"]
    nominal = {t["metric"]: t for t in reviewed["targets"]}
    assert nominal["unity_gain_frequency"]["nominal"] >= FREQUENCY * (1 - 1e-9)
    assert reviewed["choose"]["width"]["origin"] == "chosen"
    steps = reviewed["choose"]["width"]["value"] / 5e-9
    assert abs(steps - round(steps)) < 1e-6
    assert not [n for n in reviewed["notes"] if n["about"] == "width"]
