"""The algebra of any number: the expression with the numbers put in gives the value, down to what is stated."""

from __future__ import annotations

from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest

from tests.documents import Document, to_toml
from tests.engine.symbols import NOISES, drawn
from tests.solver.drawn import KINDS, case_of
from tests.solver.test_hand import follower
from tests.support import write_project
from worksheet.project.case import Case
from worksheet.session.workbook import Workbook
from worksheet.solver.algebra import explain, explainable
from worksheet.solver.explanation import Explanation

RELATIVE, VOLT = 1e-9, 1e-9


def evaluates(found: Explanation) -> bool:
    """Whether the expression with the numbers put in gives the value that the rest of the program shows."""
    if found.value is None:
        return bool(found.reason)
    voltage = found.unit == "V" and found.key not in NOISES
    allowed = RELATIVE * abs(found.value) + (VOLT if voltage else 0.0)
    return found.evaluated is not None and abs(found.evaluated - found.value) <= allowed


def check(kind: tuple[str, str, str], seed: object, folder: Path) -> int:
    case = drawn(kind, seed, folder)
    if case is None:
        return 0
    keys = explainable(case)
    for index in (0, 1):
        wrong = [f"{key}@{index}" for key in keys if not evaluates(explain(case, key, index))]
        assert not wrong, f"{kind} {seed}: {wrong}"
    return 2 * len(keys)


@pytest.mark.parametrize(
    "kind", [pytest.param(k, marks=pytest.mark.full if i % 2 else ()) for i, k in enumerate(KINDS)], ids="-".join
)
def test_every_expression_gives_its_value(kind: tuple[str, str, str], tmp_path: Path) -> None:
    """All metrics and operating-point values of every stage, n and p; the value is the numeric engine's."""
    assert next(count for seed in "stuvw" if (count := check(kind, seed, tmp_path / seed))) >= 80


@pytest.mark.full
@pytest.mark.parametrize("seed", range(25))
@pytest.mark.parametrize("kind", KINDS, ids="-".join)
def test_every_expression_gives_its_value_at_length(kind: tuple[str, str, str], seed: int, tmp_path: Path) -> None:
    check(kind, seed, tmp_path)


def first(kind: tuple[str, str, str], folder: Path) -> Case:
    for seed in range(20):
        case = drawn(kind, seed, folder / str(seed))
        if case is not None:
            return case
    raise AssertionError(kind)


@pytest.mark.parametrize("kind", KINDS[::10], ids="-".join)
def test_every_level_is_followed_to_what_is_stated(kind: tuple[str, str, str], tmp_path: Path) -> None:
    """Each number put in has an explanation with the same number, and the way down ends at stated ones."""
    case, seen = first(kind, tmp_path), {}
    waiting = [(key, index) for key in explainable(case) for index in (0, 1)]
    while waiting:
        key, index = waiting.pop()
        if (key, index) in seen:
            continue
        found = seen[key, index] = explain(case, key, index)
        assert evaluates(found), (key, index)
        assert found.title
        assert found.given or found.origin is not None or not found.text(80) or " = " in found.text(80)[0], key
        for given in found.given:
            waiting.append((given.key, given.condition_index))
            inner = explain(case, given.key, given.condition_index)
            assert (inner.value is None) == (given.value is None), (key, given)
            if given.value is not None:
                assert inner.value == pytest.approx(given.value, rel=1e-9, abs=1e-15), (key, given)
                assert inner.unit == given.unit
    origins = {key: found.origin for (key, _), found in seen.items() if found.origin is not None}
    assert {o.kind for o in origins.values()} >= {"sheet", "process", "conditions", "constant"}


@pytest.mark.parametrize("kind", KINDS[::5], ids="-".join)
def test_an_origin_is_the_line_that_says_it(kind: tuple[str, str, str], tmp_path: Path) -> None:
    case = first(kind, tmp_path)
    folder = next(path for path in sorted(tmp_path.iterdir()) if drawn(kind, int(path.name), path) is not None)
    placed = 0
    for key in explainable(case):
        for given in explain(case, key, 1).given:
            origin = given.origin
            if origin is not None and origin.line is not None:
                line = (folder / origin.file).read_text("utf-8").splitlines()[origin.line - 1]
                name = origin.key.rpartition(".")[2]
                assert line.startswith(name) or line == f"[{origin.key}]", (origin, line)
                placed += 1
    assert placed >= 20


@pytest.mark.parametrize("kind", KINDS[::4], ids="-".join)
def test_printed_for_a_terminal_and_for_pages(kind: tuple[str, str, str], tmp_path: Path) -> None:
    case = first(kind, tmp_path)
    for key in explainable(case):
        found = explain(case, key)
        for width in (100, 80, 40):
            for use_unicode in (True, False):
                lines = found.text(width, use_unicode)
                assert all(len(line) <= width for line in lines), (key, width, lines)
                assert use_unicode or all(line.isascii() for line in lines), (key, lines)
        shown, latex, mathml = found.text(80), found.latex(), found.mathml()
        assert bool(shown) == bool(latex) == bool(mathml)
        for element in mathml:
            root = ElementTree.fromstring(element)
            assert root.tag == "{http://www.w3.org/1998/Math/MathML}math"
            assert "".join(root.itertext()).strip()
        for line in latex:
            assert line.count("{") == line.count("}")


def test_what_a_designer_reads(tmp_path: Path) -> None:
    case = case_of(tmp_path, follower())
    assert case is not None
    slope = explain(case, "main.source_conductance", 1)
    assert slope.text(80, use_unicode=False) == ["      G*I", "g_s = ---", "      U_T"]
    assert slope.latex() == (r"g_{s} = \frac{G I}{U_{T}}",)
    assert slope.at.temperature == 233.15
    by_symbol = {given.symbol: given for given in slope.given}
    assert by_symbol["I"].origin is not None
    assert (by_symbol["I"].origin.kind, by_symbol["I"].origin.key) == ("sheet", "choose.bias_current")
    assert by_symbol["G"].origin is None
    assert "Enz" in slope.relation
    assert slope.in_range


def test_a_level_that_is_held_is_followed_to_the_nominal_condition(tmp_path: Path) -> None:
    case = case_of(tmp_path, follower())
    assert case is not None
    (given,) = [g for g in explain(case, "output_level", 2).given if g.key == "input_level"]
    held = explain(case, "input_level", 2)
    (nominal,) = held.given
    assert (nominal.key, nominal.condition_index) == ("input_level", 0)
    assert nominal.value == pytest.approx(given.value)
    assert explain(case, "input_level", 0).value == pytest.approx(given.value)


def with_process(document: Document, **changes: Any) -> Document:
    document["device"]["nfet"].update(changes)
    return document


def test_source_and_trust_come_along(tmp_path: Path) -> None:
    project, process, sheet = follower()
    with_process(process, kappa={"value": 0.7, "source": "fit of 12 May", "trust": "measured"})
    sheet["assume"]["load_capacitance"] = {"value": 1.2e-12, "source": "floor plan, rev 3", "trust": "estimate"}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    (load,) = [g for g in explain(case, "output_capacitance").given if g.symbol == "C_L"]
    assert load.origin is not None
    assert (load.origin.source, load.origin.trust) == ("floor plan, rev 3", "estimate")
    (kappa,) = [g for g in explain(case, "main.transconductance").given if g.symbol == "kappa"]
    assert kappa.origin is not None
    assert (kappa.origin.source, kappa.origin.trust, kappa.origin.kind) == ("fit of 12 May", "measured", "process")


def test_figures_own_names_and_formulas(tmp_path: Path) -> None:
    project, process, sheet = follower()
    sheet["own"] = {"channels": 4.0, "wiring": 2e-13}
    sheet["assume"]["load_capacitance"] = {"formula": "channels*2e-13 + wiring", "source": "block plan"}
    sheet["target"]["merit"] = {"formula": "bandwidth/power*channels", "min": 1e10, "unit": "Hz/W"}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    figure = explain(case, "merit", 1)
    assert figure.value == pytest.approx(float(case.figure(case.sheet.targets["merit"])[1]))
    assert figure.evaluated == pytest.approx(figure.value)
    assert [g.key for g in figure.given] == ["bandwidth", "power", "channels"]
    assert figure.unit == "Hz/W"
    load = explain(case, "load_capacitance")
    assert load.value == pytest.approx(1e-12)
    assert load.evaluated == pytest.approx(1e-12)
    assert [g.key for g in load.given] == ["channels", "wiring"]
    assert load.origin is not None
    assert load.origin.formula == "channels*2e-13 + wiring"
    assert explain(case, "channels").value == 4.0
    assert "merit" in explainable(case)


def test_a_name_written_with_a_prefix_is_shown_in_what_its_number_is_in(tmp_path: Path) -> None:
    project, process, sheet = follower()
    sheet["own"] = {"hold": "2 pF"}
    sheet["assume"]["load_capacitance"] = {"formula": "hold/2"}
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    (given,) = explain(case, "load_capacitance").given
    for found in (explain(case, "hold"), given):
        assert (found.value, found.unit) == (2e-12, "F")


def test_a_number_of_another_sheet(tmp_path: Path) -> None:
    project, process, sheet = follower()
    second = {**sheet, "assume": {"load_capacitance": {"formula": "2*first.input_capacitance"}}}
    texts = {"first": to_toml(sheet), "second": to_toml(second)}
    folder = write_project(tmp_path, to_toml(project), to_toml(process), texts)
    evaluator = Workbook.read(folder).evaluator
    assert evaluator is not None
    case = evaluator.case("second")
    load = explain(case, "load_capacitance", 1)
    (given,) = load.given
    assert given.key == "first.input_capacitance"
    assert given.origin is not None
    assert given.origin.kind == "linked"
    assert load.value == pytest.approx(2 * (given.value or 0.0))
    assert explain(case, given.key, 1).value == given.value


def test_it_says_where_the_calculation_does_not_hold(tmp_path: Path) -> None:
    project, process, sheet = follower()
    sheet["assume"]["output_level"] = 1.75
    case = case_of(tmp_path, (project, process, sheet))
    assert case is not None
    found = explain(case, "bandwidth")
    assert not found.in_range
    assert any("main is not saturated" in remark for remark in found.remarks)


def test_what_is_missing_has_its_reason(tmp_path: Path) -> None:
    case = case_of(tmp_path, follower())
    assert case is not None
    found = explain(case, "unity_gain_frequency")
    assert (found.value, found.evaluated, found.reason) == (None, None, "gain below 1")
    assert found.text(80)


@pytest.mark.parametrize("key", ["nothing", "main.nothing", "drain_follower", "network.denominator.7", "x.y.z"])
def test_an_unknown_number(key: str, tmp_path: Path) -> None:
    case = case_of(tmp_path, follower())
    assert case is not None
    with pytest.raises(KeyError):
        explain(case, key)


def test_a_metric_that_the_stage_has_not(tmp_path: Path) -> None:
    case = first(("drain-follower", "n", "ideal"), tmp_path)
    with pytest.raises(KeyError):
        explain(case, "supply_rejection")


def test_neglects_of_a_number_and_the_number_without_them(tmp_path: Path) -> None:
    case = case_of(tmp_path, follower())
    assert case is not None
    found = explain(case, "bandwidth")
    (effect,) = found.neglects
    assert effect.name == "feed-through"
    assert effect.share is not None
    assert -0.3 < effect.share < 0
    simple = found.simplified
    assert simple is not None
    assert simple.value == pytest.approx(explain(case, "pole_frequency").value)
    assert simple.share == pytest.approx(effect.share)
    assert simple.restored[-1][0] == "feed-through"
    assert simple.restored[-1][1] == pytest.approx(found.value)
    assert simple.lines == ("          g_s", "f_3dB = --------", "        2*pi*C_o")
