"""Broken, empty, huge, binary and mis-signed tables: a clear message with file and line, never a traceback."""

import json
import os
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.extract.independent import Device, grid, noisy, write
from tests.extract.tables import problems_of
from worksheet.extract.data import Rows
from worksheet.extract.document import document
from worksheet.extract.extraction import Request, extract_from_rows, extract_parameters

GOOD = noisy(Device(), grid(np.arange(0.0, 1.21, 0.05), vs=(0.0, 0.4)), 1)
HEADER = "vg,vs,vd,id\n"

CASES: dict[str, tuple[bytes, int | None, tuple[str, ...]]] = {
    "empty": (b"", None, ("empty file",)),
    "blank": (b"\n \n\n", None, ("blank lines",)),
    "header alone": (HEADER.encode(), None, ("header and no rows",)),
    "no header": (b"0.1,0,1,1e-6\n0.2,0,1,2e-6\n", 1, ("numbers and no header", "vg, vs, vd and id")),
    "other header": (b"a,b,c\n1,2,3\n", 1, ('"a,b,c"', "NAME=HEADER")),
    "binary": (b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR", 1, ("not text",)),
    "zero bytes": (b"vg,vs,vd,id\n0,0\x00,1,1e-6\n", 2, ("binary data",)),
    "utf-16": ("vg,vs,vd,id\n0,0,1,1e-6\n".encode("utf-16"), 1, ("UTF-16", "UTF-8")),
    "control characters": (b"vg,vs,vd,id\n0,0,1,\x81\x07\n", 2, ("not text",)),
    "a line without end": (b"vg,vs,vd,id" + b"," * 100_000, 1, ("line of more than",)),
    "word": (HEADER.encode() + b"0.1,0,1,1e-6\n0.2,0,x,2e-6\n", 3, ('"x"', "a voltage")),
    "empty cell": (HEADER.encode() + b"0.1,0,,1e-6\n", 2, ("an empty cell",)),
    "short line": (HEADER.encode() + b"0.1,0,1,1e-6\n0.2,0\n", 3, ("Found 2 cells, expected 4",)),
    "nan": (HEADER.encode() + b"0.1,0,1,nan\n", 2, ('"nan"', "finite")),
    "infinite": (HEADER.encode() + b"0.1,0,1,1e999\n", 2, ('"1e999"', "finite")),
    "prefix in a cell": (HEADER.encode() + b"0.1,0,1,1.2u\n", 2, ('"1.2u"', "without prefix", "id=HEADER:UNIT")),
    "decimal comma": (b"vg;vs;vd;id\n0,1;0;1;1e-6\n", 2, ('"0,1"', "decimal commas are not read")),
    "decimal comma in a comma table": (HEADER.encode() + b"0,1,0,1,1e-6\n", 2, ("5 cells", "decimal commas")),
    "no current column": (b"vg,vs,vd\n0,0,1\n", None, ("no drain current",)),
    "no drain column": (b"vg,vs,id,w\n0,0,1e-6,1e-6\n", None, ("Found no vd",)),
    "a quote never closed": (HEADER.encode() + b'0.1,0,1,"1e-6\n0.2,0,1,x\n', 3, ('"x"',)),
    "two columns for one": (b"vg,vs,vd,id,Ids\n0,0,1,1e-6,1e-6\n", 1, ("two columns", '"id"', '"Ids"')),
    "nothing flows": (HEADER.encode() + b"0,0,1,0\n0.1,0,1,0\n", None, ("no current other than 0",)),
    "micrometres": (b"vg,vs,vd,id,w,l\n0,0,1,1e-6,10,1\n", None, ("l=HEADER:UNIT",)),
    "celsius": (b"vg,vs,vd,id,temperature\n0,0,1,1e-6,27\n", None, ("Celsius", "temperature=HEADER")),
    "size below 0": (b"vg,vs,vd,id,w,l\n0,0,1,1e-6,-1e-6,1e-6\n", None, ("above 0",)),
    "too few rows": (HEADER.encode() + b"0.1,0,1,1e-9\n0.3,0,1,1e-6\n", None, ("Found 2 rows of 2",)),
}


@pytest.mark.parametrize("name", CASES)
def test_each_way_of_being_wrong_is_said(tmp_path: Path, name: str) -> None:
    content, line, words = CASES[name]
    path = tmp_path / "table.csv"
    path.write_bytes(content)
    problems = problems_of(path)
    said = "\n".join(map(str, problems))
    for word in words:
        assert word in said
    assert all(one.file == "table.csv" for one in problems)
    if line is not None:
        assert problems[0].line == line


def test_missing_folder_and_device(tmp_path: Path) -> None:
    assert "does not exist" in problems_of(tmp_path / "none.csv")[0].message
    assert "folder" in problems_of(tmp_path)[0].message
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    assert "pipe or a device" in problems_of(pipe)[0].message


def test_many_broken_lines_are_told_up_to_a_number(tmp_path: Path) -> None:
    path = tmp_path / "t.csv"
    path.write_text(HEADER + "x,0,1,1e-6\n" * 500)
    problems = problems_of(path)
    assert len(problems) == 21
    assert "not looked at" in problems[-1].message


@pytest.mark.parametrize(
    ("polarity", "signs", "word"),
    [
        ("n", (1, 1, 1, -1), "id=-HEADER"),
        ("n", (-1, -1, -1, -1), "--polarity p"),
        ("n", (-1, 1, 1, 1), "vg=-HEADER"),
        ("p", (-1, -1, -1, 1), "all magnitudes or all signs"),
        ("p", (1, -1, -1, -1), "vg=-HEADER"),
    ],
)
def test_wrong_signs(tmp_path: Path, polarity: str, signs: tuple[int, ...], word: str) -> None:
    at = noisy(Device(), grid(np.arange(0.0, 1.21, 0.05)), 1)
    path = tmp_path / "t.csv"
    columns = np.column_stack([sign * one for sign, one in zip(signs, (at.vg, at.vs, at.vd, at.id), strict=True)])
    np.savetxt(path, columns, delimiter=",", header="vg,vs,vd,id", comments="")
    (problem,) = problems_of(path, polarity=polarity)
    assert word in problem.message


def test_noise_alone_is_no_device(tmp_path: Path) -> None:
    draw = np.random.default_rng(0)
    gate = np.tile(np.arange(0.0, 1.2, 0.05), 3)
    table = np.column_stack([gate, 0 * gate, 0 * gate + 1.0, 1e-12 * draw.standard_normal(len(gate))])
    path = tmp_path / "t.csv"
    np.savetxt(path, table, delimiter=",", header="vg,vs,vd,id", comments="")
    result, problems = extract_parameters([path], Request())
    assert problems or (result is not None and result.poor)


def test_one_bad_file_does_not_hide_another(tmp_path: Path) -> None:
    for name in ("a.csv", "b.csv"):
        (tmp_path / name).write_text(HEADER + "0.1,0,1,x\n")
    good = write(tmp_path / "c.csv", GOOD)
    result, problems = extract_parameters([tmp_path / "a.csv", good, tmp_path / "b.csv"], Request())
    assert result is None
    assert [Path(one.file).name for one in problems] == ["a.csv", "b.csv"]


def test_numbers_of_sizes_must_fit_the_files(tmp_path: Path) -> None:
    good = write(tmp_path / "c.csv", GOOD)
    result, (problem,) = extract_parameters([good], Request(length=[1e-6, 2e-6]))
    assert result is None
    assert "Found 2 values" in problem.message


@given(st.binary(max_size=400))
def test_any_bytes_give_problems_or_a_result(tmp_path_factory: pytest.TempPathFactory, content: bytes) -> None:
    path = tmp_path_factory.mktemp("t") / "t.csv"
    path.write_bytes(content)
    result, problems = extract_parameters([path], Request())
    assert result is not None or problems


KINDS = ("flat", "wild", "steps", "grid")


def _any_currents(seed: int, count: int, kind: str) -> None:
    draw = np.random.default_rng(seed)
    gate, source = draw.uniform(-1, 2, count), draw.choice([0.0, 0.5], count)
    across = draw.choice([0.05, 1.0], count) if kind == "grid" else draw.uniform(0, 2, count)
    current = {
        "flat": np.full(count, 1e-6),
        "wild": 10.0 ** draw.uniform(-15, -2, count),
        "steps": np.where(gate > 0.5, 1e-5, 1e-9),
        "grid": 1e-7 * np.exp(gate * draw.uniform(0, 40)),
    }[kind] * draw.choice([1.0, 1.0, 1.0, -1.0], count)
    size = np.full(count, draw.choice([1e-6, np.nan]))
    rows = Rows(gate, source, source + across, current, size, size, np.full(count, 300.0))
    result, problems = extract_from_rows(rows, Request())
    assert result is not None or problems
    if result is not None:
        json.dumps(document(result), allow_nan=False)
        assert result.points + sum(one.count for one in result.left_out) == count


@pytest.mark.full
@pytest.mark.parametrize("kind", KINDS)
def test_currents_of_no_transistor_give_a_whole_document_or_problems(kind: str) -> None:
    _any_currents(1, 25, kind)


@pytest.mark.full
@settings(max_examples=40)
@given(st.integers(0, 10_000), st.sampled_from([12, 25, 60]), st.sampled_from(KINDS))
def test_any_currents_give_a_whole_document_or_problems(seed: int, count: int, kind: str) -> None:
    _any_currents(seed, count, kind)


TOKENS = [
    "vg",
    "vs",
    "vd",
    "id",
    "w",
    "l",
    ",",
    ";",
    "\t",
    "\n",
    "0",
    "1",
    "-1e-6",
    "0,5",
    "nan",
    '"',
    "#",
    "µ",
    " ",
    "1e-6",
]


@given(st.lists(st.sampled_from(TOKENS), max_size=80))
def test_any_arrangement_of_likely_text_gives_problems_or_a_result(
    tmp_path_factory: pytest.TempPathFactory, parts: list[str]
) -> None:
    path = tmp_path_factory.mktemp("t") / "t.csv"
    path.write_text("vg,vs,vd,id\n" + "".join(parts), encoding="utf-8")
    result, problems = extract_parameters([path], Request())
    assert result is not None or problems
