"""Any valid sheet is read as it was meant, and nothing that a file can hold makes a reader fall over."""

import tomllib
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.sheetfile.sheets import Drawn, sheets
from tests.sheetfile.texts import PROCESS, PROJECT, SHEET
from worksheet.sheetfile.locate import NestedTooDeeplyError, below, locate
from worksheet.sheetfile.read import parse_process, parse_project, parse_sheet

PIECES = [
    *("[", "]", "{", "}", '"', "'", '"""', "'''", "=", ",", ".", "#", "\n", "\r", "\r\n", "\\", "\0", "\x1b", " "),
    *("\u202e", "\ufeff", "é", "\U0001f600", "[[evidence]]", "[assume]", "[target.x]", "value = ", 'formula = "x"'),
    *("propose", "nan", "-inf", "1e999", "9" * 5000, "true", "2026-02-30", "07:00:00"),
    *("<<<<<<< a\n", "=======\n", ">>>>>>> b\n", "[" * 300, "a." * 300, "{x={" * 50),
]


@given(sheets())
def test_valid_sheets_are_read_without_a_problem(drawn: tuple[str, Drawn]) -> None:
    text, expected = drawn
    sheet, problems = parse_sheet(text.encode(), "drawn", "drawn.toml")
    assert problems == []
    assert sheet is not None
    assert (sheet.stage, sheet.title) == (expected["stage"], expected["title"])
    for part in ("assume", "choose"):
        read = getattr(sheet, part)
        wanted = {key: value for key, value in expected[part].items() if "number" in value}
        assert read.keys() == wanted.keys()
        for key, value in wanted.items():
            assert {name: getattr(read[key], name) for name in value} == value
            assert text.splitlines()[read[key].line - 1].removeprefix("\ufeff").lstrip().startswith(key)
    fingers = [value["count"] for value in expected["choose"].values() if "count" in value]
    assert sorted(sheet.fingers.values()) == sorted(fingers)
    assert {name: value.number for name, value in sheet.own.items()} == expected["own"]
    wanted = {name: (limits.get("min"), limits.get("max")) for name, limits in expected["target"].items()}
    assert {name: (one.minimum, one.maximum) for name, one in sheet.targets.items()} == wanted


def _paths(data: Any, where: str = "") -> list[tuple[str, str]]:
    """Every dotted key of plain data, and how its last part may look in the text."""
    found = []
    items = data.items() if isinstance(data, dict) else enumerate(data) if isinstance(data, list) else ()
    for key, value in items:
        inner = below(where, key)
        found += [(inner, str(key) if isinstance(data, dict) else ""), *_paths(value, inner)]
    return found


@given(sheets())
def test_every_key_has_the_line_it_stands_on(drawn: tuple[str, Drawn]) -> None:
    text = drawn[0].removeprefix("\ufeff")
    places = locate(text)
    lines = text.split("\n")
    assert places.stopped is None
    assert places.repeated == []
    for key, last in _paths(tomllib.loads(text)):
        assert last in lines[places.lines[key] - 1]


def _mutated(draw: st.DrawFn, text: str) -> str:
    for _ in range(draw(st.integers(1, 4))):
        start = draw(st.integers(0, len(text)))
        end = draw(st.integers(start, min(len(text), start + draw(st.sampled_from([0, 1, 5, 40])))))
        piece = draw(st.sampled_from(PIECES) | st.text(max_size=8) | st.sampled_from(text.split("\n")))
        text = text[:start] + piece + text[end:]
    return text


@st.composite
def mutations(draw: st.DrawFn, text: str) -> str:
    """A text with a few pieces taken out or put in."""
    return _mutated(draw, text)


@given(mutations(SHEET) | sheets().map(lambda drawn: drawn[0]).flatmap(mutations))
def test_no_text_makes_the_sheet_reader_fall_over(text: str) -> None:
    sheet, problems = parse_sheet(text, "fuzzed", "fuzzed.toml")
    assert (sheet is None) == bool(problems)
    for problem in problems:
        assert problem.message[-1] in ".?"
        assert problem.line is None or 1 <= problem.line <= text.count("\n") + 1


@given(mutations(PROCESS))
def test_no_text_makes_the_process_reader_fall_over(text: str) -> None:
    process, problems = parse_process(text, "fuzzed", "fuzzed.toml")
    assert (process is None) == bool(problems)


@given(mutations(PROJECT))
def test_no_text_makes_the_project_reader_fall_over(text: str) -> None:
    project, problems = parse_project(text, "fuzzed.toml")
    assert (project is None) == bool(problems)


@given(st.binary(max_size=200) | mutations(SHEET).map(lambda text: text.encode("utf-16")))
def test_no_bytes_make_the_reader_fall_over(content: bytes) -> None:
    sheet, problems = parse_sheet(content, "fuzzed", "fuzzed.toml")
    assert sheet is None
    assert problems


@given(mutations(SHEET))
def test_the_scan_follows_whatever_the_standard_reader_follows(text: str) -> None:
    try:
        data = tomllib.loads(text)
    except (ValueError, RecursionError):
        return
    try:
        places = locate(text)
    except NestedTooDeeplyError:
        return
    assert places.stopped is None
    assert [key for key, _ in _paths(data) if key not in places.lines] == []


@pytest.mark.parametrize(
    "text",
    [
        "a = 1\n" * 300_000,
        "[a]\n" * 400_000,
        "[[a]]\n" * 300_000,
        "a = [" + "1," * 900_000 + "]",
        "a = " + "[" * 1_900_000,
        "a" + ".b" * 900_000 + " = 1",
        "[a" + ".b" * 900_000 + "]",
        "a = {" + ", ".join(f"k{i}=1" for i in range(150_000)) + "}",
        "".join(f"k{i} = 1\n" for i in range(150_000)),
        'a = "' + "\\\\" * 900_000 + '"',
        'a = """' + '"' * 1_900_000,
        "<<<<<<< a\n" * 100_000 + ">>>>>>> b\n" * 80_000,
        "#" * 1_900_000,
        " " * 1_900_000,
    ],
    ids=lambda text: text[:12],
)
@pytest.mark.full
def test_large_hostile_texts_end_in_problems(text: str) -> None:
    sheet, problems = parse_sheet(text, "hostile", "hostile.toml")
    assert sheet is None
    assert 1 <= len(problems) <= 101
