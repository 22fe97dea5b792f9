"""CSV as scripts and spreadsheets read it: numbers to the last bit, nothing for what is absent, nothing that acts."""

from __future__ import annotations

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from worksheet.report.csv_rows import csv_lines


def read(*row: object) -> list[str]:
    (found,) = csv.reader(io.StringIO("\n".join(csv_lines([row]))))
    return found


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_a_number_comes_back_to_the_last_bit(value: float) -> None:
    assert float(read(value)[0]) == value


def test_what_does_not_exist_is_an_empty_cell() -> None:
    assert read("a", None, 3, True) == ["a", "", "3", "True"]


@pytest.mark.parametrize("text", ["=1+1", "+cmd", "-2+3", "@x", "\t=1"])
def test_no_text_begins_a_formula(text: str) -> None:
    assert not read(text)[0].startswith(("=", "+", "-", "@", "\t"))


@given(st.text())
def test_no_text_carries_an_escape_sequence_or_breaks_its_row(text: str) -> None:
    (found,) = read(text)
    assert "\x1b" not in found
    assert "\n" not in found


@pytest.mark.parametrize("text", ["+33.8%", "-40 °C", 'plain, "quoted"'])
def test_harmless_text_stays_as_it_is(text: str) -> None:
    assert read(text) == [text]
