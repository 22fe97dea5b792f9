"""Chains: one sheet alone, two sheets against scipy, what each takes, loads, and chains that cannot be reckoned."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy import integrate, optimize, signal

from tests.cli.books import AMPLIFIER, FOLLOWER, PROCESS, PROJECT, TODAY
from tests.support import review, run, write_project
from worksheet.device.arrays import Number
from worksheet.model.project_keys import CHAIN_METRICS
from worksheet.model.sheet import Condition
from worksheet.session.workbook import Workbook

DRIVEN = FOLLOWER.replace("[own]", 'drive_resistance = "20 kohm"\n\n[own]')
REGULATED = FOLLOWER.replace("[own]", 'supply = ["1.6 V", "1.65 V"]\n\n[own]')
GATE = """\
schema = 1
stage = "common-gate"
device = "nfet"

[bias]
output_conductance = "10 nS"

[assume]
load_capacitance = "1 pF"
input_level = "0.1 V"
output_level = "1 V"

[choose]
bias_current = "2 uA"
width = "10 um"
length = "1 um"
"""


def _chain(*sheets: str, rest: str = "") -> str:
    return f"\n[chain.path]\nsheets = {list(sheets)}\n{rest}".replace("'", '"')


def _found(folder: Path, chain: str, sheets: dict[str, str]) -> dict[str, Any]:
    document = review(folder, PROJECT + chain, PROCESS, sheets)
    assert not document["problems"], document["problems"]
    found: dict[str, Any] = document["chains"][0]
    return found


@pytest.mark.parametrize("text", [FOLLOWER, AMPLIFIER, DRIVEN, GATE], ids=["follower", "amplifier", "driven", "gate"])
def test_a_chain_of_one_sheet_has_that_sheets_numbers(tmp_path: Path, text: str) -> None:
    book = Workbook.read(write_project(tmp_path, PROJECT + _chain("block"), PROCESS, {"block": text}))
    (chain,) = book.review(TODAY).chains
    assert book.evaluator is not None
    solution = book.evaluator.case("block").solution
    conditions = book.evaluator.conditions("block").conditions
    for key in CHAIN_METRICS:
        values = np.broadcast_to(solution[key], (len(conditions),))
        assert np.isfinite(values).all()
        found = chain.metrics[key]
        assert found.nominal.value == pytest.approx(float(values[0]), rel=1e-9), key
        assert (found.low, found.high) == pytest.approx((values.min(), values.max()), rel=1e-9), key
        assert found.low_at == conditions[int(values.argmin())]
    (share,) = chain.stages
    assert (share.noise_share, share.bandwidth_lost, share.settling_lost, share.current_share) == (1, 1, 1, 1)
    assert share.input_noise == pytest.approx(float(np.ravel(solution["input_noise"])[0]), rel=1e-9)


def _polynomial(coefficients: list[Number], place: int) -> np.ndarray:
    """Highest power first, at one condition."""
    numbers = [float(np.ravel(c)[place if np.size(c) > 1 else 0]) for c in coefficients]
    return np.trim_zeros(np.array(numbers[::-1]), "f")


def test_two_sheets_are_the_product_of_their_transfer_functions(tmp_path: Path) -> None:
    sheets = {"first": AMPLIFIER, "second": DRIVEN}
    book = Workbook.read(write_project(tmp_path, PROJECT + _chain("first", "second"), PROCESS, sheets))
    (chain,) = book.review(TODAY).chains
    assert book.evaluator is not None
    first, second = (book.evaluator.case(name).solution for name in sheets)
    place = 0
    (n1, d1), (n2, d2) = (
        (_polynomial(s.network.transfer, place), _polynomial(s.network.denominator, place)) for s in (first, second)
    )

    def magnitude(f: float, top: np.ndarray, bottom: np.ndarray) -> float:
        return float(abs(np.polyval(top, 2j * np.pi * f) / np.polyval(bottom, 2j * np.pi * f)))

    def whole(f: float) -> float:
        return magnitude(f, n1, d1) * magnitude(f, n2, d2)

    static = whole(0.0)
    fall = optimize.brentq(lambda x: whole(np.exp(x)) - static / np.sqrt(2), 0, 30, xtol=1e-14)
    assert chain.metrics["dc_gain"].nominal.value == pytest.approx(static, rel=1e-12)
    assert chain.metrics["bandwidth"].nominal.value == pytest.approx(float(np.exp(fall)), rel=1e-9)

    powers = []
    for solution, bottom, after in ((first, d1, (n2, d2)), (second, d2, (np.ones(1), np.ones(1)))):
        total = 0.0
        poles = [solution["pole_frequency"], *([second["pole_frequency"]] if solution is first else [])]
        stop = min(float(np.ravel(pole)[0]) for pole in poles)
        for source in solution.noise_sources:
            white, flicker = (float(np.ravel(part)[0]) for part in (source.white, source.flicker))
            numerator = _polynomial(list(source.numerator), place)

            def density(
                x: float, numerator: np.ndarray = numerator, bottom: np.ndarray = bottom, after: Any = after
            ) -> float:
                f = 1e5 * np.exp(x)
                return float((magnitude(f, numerator, bottom) * magnitude(f, *after)) ** 2 * f)

            total += white * integrate.quad(density, -30, 30, limit=500, epsabs=0, epsrel=1e-10)[0]
            at_dc = magnitude(0.0, numerator, bottom) * magnitude(0.0, *after)
            total += at_dc**2 * flicker * np.log(stop / 1.0)
        powers.append(total)
    assert chain.metrics["output_noise"].nominal.value == pytest.approx(float(np.sqrt(sum(powers))), rel=1e-7)
    assert chain.metrics["input_noise"].nominal.value == pytest.approx(float(np.sqrt(sum(powers)) / static), rel=1e-7)
    assert [s.noise_share for s in chain.stages] == pytest.approx([p / sum(powers) for p in powers], rel=1e-6)

    time = chain.metrics["settling_time"].nominal.value
    assert time is not None
    unit = time / 10
    scaled = [p / unit ** np.arange(len(p))[::-1] for p in (np.polymul(n1, n2), np.polymul(d1, d2))]
    system = signal.TransferFunction(scaled[0] / scaled[1][-1] / static, scaled[1] / scaled[1][-1])
    _, response = signal.step(system, T=np.linspace(0, 20, 4001))
    outside = abs(response / response[-1] - 1)
    assert outside[2000] == pytest.approx(1e-3, rel=1e-3)
    assert (outside[2001:] < 1e-3).all()


def test_what_each_takes_follows_from_the_path_without_it(tmp_path: Path) -> None:
    sheets = {"first": AMPLIFIER, "second": FOLLOWER}
    found = _found(tmp_path, _chain("first", "second"), sheets)
    alone = {s["sheet"]: s["metrics"] for s in review(tmp_path, PROJECT, PROCESS, sheets)["sheets"]}
    numbers = {key: value["value"] for key, value in found["metrics"].items()}
    takes = {share["sheet"]: share for share in found["takes"]}
    assert takes["first"]["bandwidth_lost"] == pytest.approx(
        1 - numbers["bandwidth"] / alone["second"]["bandwidth"]["value"], rel=1e-9
    )
    assert takes["second"]["settling_lost"] == pytest.approx(
        1 - alone["first"]["settling_time"]["value"] / numbers["settling_time"], rel=1e-6
    )
    assert sum(share["noise_share"] for share in found["takes"]) == pytest.approx(1, rel=1e-12)
    assert sum(share["current_share"] for share in found["takes"]) == pytest.approx(1, rel=1e-12)
    squares = sum(share["input_noise"] ** 2 for share in found["takes"])
    assert squares == pytest.approx(numbers["input_noise"] ** 2, rel=1e-12)
    assert takes["first"]["gain"] < 0 < takes["second"]["gain"]


def test_limits_are_judged_over_all_conditions(tmp_path: Path) -> None:
    free = _found(tmp_path, _chain("block"), {"block": FOLLOWER})["metrics"]["bandwidth"]
    between = 0.5 * (free["low"] + free["value"])
    for limit, at, verdict in (
        (free["low"] * 0.999, "all", "met"),
        (between, "all", "missed"),
        (between, "nominal", "met"),
    ):
        rest = f'bandwidth = {{ min = {limit!r}, at = "{at}", id = "S-1" }}\n[requirement]\nS-1 = "Speed"\n'
        document = review(tmp_path, PROJECT + _chain("block", rest=rest), PROCESS, {"block": FOLLOWER})
        (target,) = document["chains"][0]["targets"]
        assert target["verdict"] == verdict
        assert document["chains"][0]["met"] is (verdict == "met")
        assert not document["uncovered"]
        if verdict == "missed":
            assert not document["met"]
            assert target["worst"] == free["low"]
            assert target["worst_at"] == free["low_at"]
            assert run("review", str(tmp_path)).status == 1


def test_a_sheet_on_its_own_regulator_is_at_its_nominal_supply(tmp_path: Path) -> None:
    book = Workbook.read(write_project(tmp_path, PROJECT + _chain("block"), PROCESS, {"block": REGULATED}))
    (chain,) = book.review(TODAY).chains
    assert book.evaluator is not None
    own = book.evaluator.conditions("block")
    places = [k for k, c in enumerate(own.conditions) if c.supply == own.nominal.supply]
    values = np.broadcast_to(book.evaluator.case("block").solution["bandwidth"], (len(own),))[places]
    assert chain.metrics["bandwidth"].low == pytest.approx(float(values.min()), rel=1e-9)
    assert isinstance(chain.metrics["bandwidth"].low_at, Condition)
    assert chain.metrics["bandwidth"].low_at.supply in (1.7, 1.8)  # a condition of the project


def test_a_load_below_the_next_input_is_noted(tmp_path: Path) -> None:
    sheets = {"first": FOLLOWER, "second": AMPLIFIER}
    assert not _found(tmp_path, _chain("first", "second"), sheets)["notes"]
    tight = FOLLOWER.replace('"1.2 pF"', '"0.05 pF"').replace('line/load_capacitance", max = 0.5', 'line", max = 1')
    (note,) = _found(tmp_path, _chain("first", "second"), {**sheets, "first": tight})["notes"]
    assert note["about"] == "first"
    assert "50 fF" in note["text"]
    assert "the input of second alone" in note["text"]


def test_a_chain_over_a_bad_sheet_is_unknown(tmp_path: Path) -> None:
    rest = 'dc_gain = { min = "1 V/V" }\n'
    sheets = {"first": FOLLOWER, "second": AMPLIFIER.replace("dc_gain", "dc_gian")}
    document = review(tmp_path, PROJECT + _chain("first", "second", rest=rest), PROCESS, sheets)
    (chain,) = document["chains"]
    assert "second" in chain["reason"]
    assert chain["targets"][0]["verdict"] == "unknown"
    assert not chain["met"]
    assert len(document["problems"]) == 1


def test_the_text_shows_the_path(tmp_path: Path) -> None:
    write_project(
        tmp_path,
        PROJECT + _chain("first", "second", rest='title = "Lamp to eye"\nsettling_time = { max = "1 ns" }\n'),
        PROCESS,
        {"first": FOLLOWER, "second": AMPLIFIER},
    )
    out = run("review", str(tmp_path)).out
    assert "Chain path: Lamp to eye (first > second)" in out
    assert "MISSED" in out
    assert "what is lost to it" in out
    assert all(len(line) <= 80 for line in out.splitlines())
