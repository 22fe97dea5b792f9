"""Formulas with their numbers put in: read back from the MathML and reckoned, they give the number."""

from __future__ import annotations

import math
import re
from xml.etree import ElementTree

import pytest

from tests.paths import TOP
from worksheet.report import wording
from worksheet.session.workbook import Workbook
from worksheet.solver.algebra import explain
from worksheet.solver.explanation import Explanation

PREFIX = {"a": 1e-18, "f": 1e-15, "p": 1e-12, "n": 1e-9, "µ": 1e-6, "m": 1e-3, "k": 1e3, "M": 1e6, "G": 1e9}
"""SI prefixes (BIPM, The International System of Units, 9th edition, table 7)."""


def explained(sheet: str, key: str) -> Explanation:
    evaluator = Workbook.read(TOP / "sample_projects" / "tide_gauge").evaluator
    assert evaluator is not None
    return explain(evaluator.case(sheet), key)


def put_in(found: Explanation, digits: int = 4) -> tuple[str, ...]:
    return found.mathml_put_in(
        {g.symbol: wording.number(g.value, g.unit, digits=digits) for g in found.given if g.value is not None}
    )


@pytest.mark.parametrize(
    ("sheet", "key"),
    [
        ("electrode_buffer", "dc_gain"),
        ("electrode_buffer", "bandwidth"),
        ("electrode_buffer", "supply_current"),
        ("electrode_buffer", "output_noise"),
        ("electrode_buffer", "figure"),
        ("level_amplifier", "noise_density"),
        ("level_amplifier", "output_swing"),
        ("mux_driver", "input_capacitance"),
        ("wake_comparator", "supply_rejection"),
    ],
)
def test_the_numbers_in_a_formula_come_to_its_value(sheet: str, key: str) -> None:
    found = explained(sheet, key)
    element = ElementTree.fromstring(put_in(found, digits=12)[0])
    assert found.value is not None
    assert reckoned(element) == pytest.approx(found.value, rel=1e-6)


def test_letters_stay_in_the_equation_of_a_root_and_its_numbers_are_in_it() -> None:
    found = explained("pressure_input", "bandwidth")
    text = " ".join("".join(ElementTree.fromstring(one).itertext()) for one in put_in(found))
    assert "x" in text
    assert "10" in text
    assert len(put_in(found)) < len(found.mathml())


def reckoned(element: ElementTree.Element) -> float:
    """The value of presentation MathML that holds numbers with units, reckoned by the rules of arithmetic."""
    (row,) = element
    equals, *parts = row
    assert equals.text == "="
    whole = "".join(map(_terms, parts))
    return float(eval(whole, {"__builtins__": {}, "sqrt": math.sqrt, "pi": math.pi, "abs": abs}))


def _terms(element: ElementTree.Element) -> str:
    """Python for an element; the test's own text, from the program's own printer."""
    name = element.tag.rpartition("}")[2]
    inner = [_terms(part) for part in element]
    if name == "mn":
        return element.text or ""
    if name == "mtext":
        unit = (element.text or "").strip()
        return f"*{PREFIX.get(unit[0], 1.0) if re.match('[afpnµmkMG][A-ZΩ]', unit) else 1.0}"
    if name == "mi":
        return {"π": "pi"}[element.text or ""]
    if name == "mo":
        return {"×": "*", "-": "-", "−": "-", "+": "+", "(": "(", ")": ")", "|": "|"}[element.text or ""]
    if name == "mfrac":
        return f"(({inner[0]})/({inner[1]}))"
    if name == "msqrt":
        return f"sqrt({''.join(inner)})"
    if name == "msup":
        return f"(({inner[0]})**({inner[1].replace('−', '-')}))"
    if name == "mfenced":
        return f"({''.join(inner)})"
    return f"({''.join(inner)})"
