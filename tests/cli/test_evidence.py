"""Evidence on the command line: one by one and from a table, all or nothing, and held against the calculation."""

from __future__ import annotations

import csv
import datetime
import io
import json
import tomllib
from pathlib import Path
from typing import Any

import pytest

from tests.cli import books
from tests.support import run
from worksheet.session.workbook import Workbook

AT_NOMINAL = 'nominal = { process = "typical", temperature = "27 °C", supply = "1.8 V" }'
AT_EVIDENCE = 'nominal = { process = "slow", temperature = "0 °C", supply = "1.7 V" }'
HEADER = "sheet,metric,value,found_by,at_process,at_temperature,at_supply,samples,dated,by\n"


@pytest.fixture
def book(tmp_path: Path) -> Path:
    return books.write(tmp_path / "book")


def stated(book: Path, sheet: str = books.BUFFER) -> list[dict[str, Any]]:
    return list(tomllib.loads((book / "sheets" / f"{sheet}.toml").read_text("utf-8")).get("evidence", []))


def contents(book: Path) -> dict[Path, bytes]:
    return {path: path.read_bytes() for path in (book / "sheets").iterdir()}


def test_one_piece_is_tied_to_the_inputs_it_was_found_for(book: Path) -> None:
    done = run("evidence", str(book), "--add", books.BUFFER, "bandwidth", "6 MHz", "--by", "M. Roe", "--samples", "12")
    assert done.status == 0, done.err
    (entry,) = stated(book)
    review = Workbook.read(book).review(books.TODAY)
    basis = next(one.basis for one in review.sheets if one.sheet.name == books.BUFFER)
    assert entry["basis"] == basis
    assert (entry["value"], entry["samples"], entry["by"], entry["found_by"]) == ("6 MHz", 12, "M. Roe", "simulation")


def test_values_of_the_operating_point_are_evidence_too(book: Path) -> None:
    done = run("evidence", str(book), "--add", books.BUFFER, "main.transconductance", "60 uS", "--json")
    assert done.status == 0, done.err
    (row,) = json.loads(done.out)["evidence"]
    result = next(s for s in Workbook.read(book).review(books.TODAY).sheets if s.sheet.name == books.BUFFER)
    calculated = result.operating_point["main"]["transconductance"]
    assert row["calculated"] == pytest.approx(calculated, rel=1e-9)
    assert row["unit"] == "S"
    assert row["off"] == pytest.approx((60e-6 - calculated) / calculated, rel=1e-9)  # type: ignore[operator]


def test_the_calculation_is_taken_at_the_condition_of_the_evidence(book: Path) -> None:
    at = "slow, 0 °C, 1.7 V"
    done = run("evidence", str(book), "--add", books.BUFFER, "bandwidth", "6 MHz", "--at", at, "--json")
    assert done.status == 0, done.err
    (row,) = json.loads(done.out)["evidence"]
    document = json.loads(run("review", str(book), "--json").out)
    target = next(s for s in document["sheets"] if s["sheet"] == books.BUFFER)["targets"][0]
    nominal = target["nominal"]
    assert row["at"] == {"process": "slow", "temperature": 273.15, "supply": 1.7}
    assert row["calculated"] != pytest.approx(nominal, rel=1e-3)
    alone = books.write(book.parent / "alone", project=books.PROJECT.replace(AT_NOMINAL, AT_EVIDENCE))
    review = Workbook.read(alone).review(books.TODAY)
    result = next(one for one in review.sheets if one.sheet.name == books.BUFFER)
    assert row["calculated"] == pytest.approx(result.metrics["bandwidth"].value, rel=1e-9)


def test_a_table_of_many_goes_into_several_sheets(book: Path) -> None:
    table = book / "bench.csv"
    table.write_text(
        HEADER
        + f"{books.BUFFER},bandwidth,5.9 MHz,measurement,slow,0 °C,1.7 V,8,2026-11-30,A. Bench\n"
        + f"{books.BUFFER},output_noise,6.1e-05,simulation,,,,,,\n\n"
        + f"{books.OTHER},dc_gain,30 dB,extraction,,,,,,\n",
        "utf-8",
    )
    done = run("evidence", str(book), "--from", str(table), "--csv")
    assert done.status == 0, done.err
    first, second = stated(book)
    assert first["at"] == {"process": "slow", "temperature": "0 °C", "supply": "1.7 V"}
    assert first["dated"] == datetime.date(2026, 11, 30)
    assert second["metric"] == "output_noise"
    rows = list(csv.DictReader(io.StringIO(done.out)))
    assert [row["metric"] for row in rows] == ["dc_gain", "bandwidth", "output_noise"]
    assert float(rows[0]["found"]) == pytest.approx(10**1.5)
    assert rows[1]["stale"] == "False"


@pytest.mark.parametrize(
    ("row", "said"),
    [
        ("buffer,bandwidht,5 MHz,measurement,,,,,,", "did you mean bandwidth"),
        ("buffer,bandwidth,5 kg,measurement,,,,,,", "5 kg"),
        ("buffer,bandwidth,,measurement,,,,,,", "value"),
        ("bufer,bandwidth,5 MHz,measurement,,,,,,", "did you mean buffer"),
        ("buffer,bandwidth,5 MHz,dream,,,,,,", "dream"),
        ("buffer,bandwidth,5 MHz,measurement,slow,,,,,", "at"),
        ("buffer,bandwidth,5 MHz", "columns"),
        ("buffer,bandwidth,5 MHz,measurement,,,,0,,", "samples"),
        ("buffer,bandwidth,5 MHz,measurement,,,,,yesterday,", "yesterday"),
    ],
)
def test_one_bad_row_keeps_all_of_the_table_out(book: Path, row: str, said: str) -> None:
    before = contents(book)
    table = book / "bench.csv"
    table.write_text(HEADER + f"{books.BUFFER},bandwidth,5.9 MHz,measurement,,,,,,\n{row}\n", "utf-8")
    done = run("evidence", str(book), "--from", str(table))
    assert done.status == 2
    assert said in done.err
    assert "bench.csv:3" in done.err
    assert contents(book) == before


@pytest.mark.parametrize(
    "content", [b"", b"\xff\xfe\x00", b"sheet,metric\n", b"sheet;metric;value;found_by\n", b'"a\n']
)
def test_what_is_no_table_of_evidence_is_refused(book: Path, content: bytes) -> None:
    before = contents(book)
    table = book / "bench.csv"
    table.write_bytes(content)
    done = run("evidence", str(book), "--from", str(table))
    assert done.status == 2
    assert "Traceback" not in done.err
    assert contents(book) == before


def test_over_the_project_each_metric_has_its_mean_and_rms(book: Path) -> None:
    for value in ("5 MHz", "7 MHz"):
        assert run("evidence", str(book), "--add", books.BUFFER, "bandwidth", value).status == 0
    document = json.loads(run("evidence", str(book), "--json").out)
    off = [row["off"] for row in document["evidence"]]
    (summary,) = document["metrics"]
    assert summary["count"] == 2
    assert summary["mean"] == pytest.approx(sum(off) / 2)
    assert summary["rms"] == pytest.approx((sum(x * x for x in off) / 2) ** 0.5)
