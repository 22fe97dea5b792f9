"""Tables as people have them: contract columns without a question, other headers, units and delimiters guessed."""

import hashlib
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.extract.independent import Device, Points, grid, noisy, write
from tests.extract.tables import of_file, problems_of, value
from worksheet.extract.data import Rows
from worksheet.extract.extraction import Request, read_rows
from worksheet.extract.header import Stated, parse_stated

DEVICE = Device()
POINTS = noisy(DEVICE, grid(np.arange(0.0, 1.21, 0.05), vs=(0.0, 0.4)), 1)


def _table(path: Path, header: str, sign: str, *columns: np.ndarray) -> Path:
    lines = [header, *(sign.join(f"{cell:.12g}" for cell in row) for row in zip(*columns, strict=True))]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def _read(path: Path, **asked: object) -> Rows:
    rows, readings, problems = read_rows([path], [path.name], Request(**asked))  # type: ignore[arg-type]
    assert rows is not None, problems
    assert len(readings) == 1
    return rows


def _same(rows: Rows, at: Points) -> None:
    for found, wanted in ((rows.gate, at.vg), (rows.source, at.vs), (rows.drain, at.vd)):
        np.testing.assert_allclose(found, wanted, atol=1e-12)
    np.testing.assert_allclose(rows.current, at.id, rtol=1e-9)


def test_contract_columns_are_read_without_a_question(tmp_path: Path) -> None:
    path = write(tmp_path / "idvg.csv", POINTS)
    result = of_file(path)
    (reading,) = result.readings
    assert not reading.guessed
    assert reading.rows == reading.kept == len(POINTS.vg)
    assert reading.digest == hashlib.sha256(path.read_bytes()).hexdigest()
    assert not any("guessed" in one for one in result.warnings)
    assert value(result, "kappa") == pytest.approx(DEVICE.kappa, rel=0.01)


def test_order_of_columns_and_others_beside_them_do_not_matter(tmp_path: Path) -> None:
    path = _table(tmp_path / "t.csv", "id,vd,gm,vs,vg", ",", POINTS.id, POINTS.vd, POINTS.id, POINTS.vs, POINTS.vg)
    rows, (reading,), _ = read_rows([path], ["t.csv"], Request())
    assert rows is not None
    _same(rows, POINTS)
    assert reading.ignored == ("gm",)
    assert not reading.guessed


@pytest.mark.parametrize(
    ("header", "sign"),
    [
        ("Vg;Vs;Vd;Id", ";"),
        ("V_G\tV_S\tV_D\tI_D", "\t"),
        ("vg  vs  vd  id", "  "),
        ("# vg vs vd id", " "),
        ("gate voltage | source voltage | drain voltage | drain current", " | "),
        ('"V(G)","V(S)","V(D)","I(D)"', ","),
        ("Vg [V],Vs [V],Vd [V],Id [A]", ","),
        ("Vg/V;Vs/V;Vd/V;Id/A", ";"),
    ],
)
def test_headers_and_delimiters_are_guessed(tmp_path: Path, header: str, sign: str) -> None:
    path = _table(tmp_path / "t.txt", header, sign, POINTS.vg, POINTS.vs, POINTS.vd, POINTS.id)
    rows, (reading,), _ = read_rows([path], ["t.txt"], Request())
    assert rows is not None
    _same(rows, POINTS)
    assert reading.guessed


@pytest.mark.parametrize(
    ("header", "scale"),
    [("vg (mV),vs (mV),vd (mV),id (uA)", (1e3, 1e6)), ("vg_mV,vs_mV,vd_mV,id_nA", (1e3, 1e9))],
)
def test_units_of_headers_are_scaled(tmp_path: Path, header: str, scale: tuple[float, float]) -> None:
    volts, amperes = scale
    columns = (POINTS.vg * volts, POINTS.vs * volts, POINTS.vd * volts, POINTS.id * amperes)
    _same(_read(_table(tmp_path / "t.csv", header, ",", *columns)), POINTS)


def test_micro_sign_of_an_older_encoding(tmp_path: Path) -> None:
    columns = (POINTS.vg, POINTS.vs, POINTS.vd, POINTS.id * 1e6)
    path = _table(tmp_path / "t.csv", "vg,vs,vd,id [uA]", ",", *columns)
    path.write_bytes(path.read_bytes().replace(b"uA", b"\xb5A"))
    _same(_read(path), POINTS)


def test_voltages_from_the_source_and_a_bulk_bias(tmp_path: Path) -> None:
    columns = (POINTS.vg - POINTS.vs, POINTS.vd - POINTS.vs, -POINTS.vs, POINTS.id)
    _same(_read(_table(tmp_path / "t.csv", "Vgs,Vds,Vbs,Ids", ",", *columns)), POINTS)


def test_voltages_from_ground_and_a_bulk_column(tmp_path: Path) -> None:
    bulk = np.full_like(POINTS.vg, -0.3)
    columns = (POINTS.vg - 0.3, POINTS.vs - 0.3, POINTS.vd - 0.3, bulk, POINTS.id)
    _same(_read(_table(tmp_path / "t.csv", "vg,vs,vd,vb,id", ",", *columns)), POINTS)


def test_columns_can_be_stated(tmp_path: Path) -> None:
    columns = (POINTS.vg, POINTS.vs, POINTS.vd, -POINTS.id * 1e6)
    path = _table(tmp_path / "t.csv", "x1,x2,x3,current of the drain supply", ",", *columns)
    stated = dict(
        one
        for text in ("vg=x1", "vs=#2", "vd=x3", "id=-current of the drain supply:uA")
        if not isinstance(one := parse_stated(text), str)
    )
    rows, (reading,), _ = read_rows([path], ["t.csv"], Request(columns=stated))
    assert rows is not None
    _same(rows, POINTS)
    assert not reading.guessed
    again = dict(one for text in reading.mapping if not isinstance(one := parse_stated(text), str))
    _same(_read(path, columns=again), POINTS)


def test_columns_by_number_where_there_is_no_header(tmp_path: Path) -> None:
    path = tmp_path / "t.dat"
    np.savetxt(path, np.column_stack([POINTS.vg, POINTS.vs, POINTS.vd, POINTS.id]), fmt="%.12g")
    stated = {name: Stated(f"#{place}") for place, name in enumerate(("vg", "vs", "vd", "id"), 1)}
    _same(_read(path, columns=stated), POINTS)


def test_a_voltage_without_a_column_can_be_stated(tmp_path: Path) -> None:
    at = noisy(DEVICE, grid(np.arange(0.0, 1.21, 0.05), vds=(0.6,)), 1)
    _same(
        _read(
            _table(tmp_path / "t.csv", "vg,id", ",", at.vg, at.id),
            fixed={"vd": 0.6, "vs": 0.0},
            columns={"vg": Stated("vg"), "id": Stated("id")},
        ),
        at,
    )


def test_a_missing_source_voltage_is_taken_on_the_bulk_and_said(tmp_path: Path) -> None:
    at = noisy(DEVICE, grid(np.arange(0.0, 1.21, 0.05)), 1)
    result = of_file(_table(tmp_path / "t.csv", "vg,vd,id", ",", at.vg, at.vd, at.id))
    assert any("source was taken on the bulk" in one for one in result.warnings)
    assert result.readings[0].guessed


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_p_tables_in_magnitudes_or_with_signs(tmp_path: Path, sign: float) -> None:
    columns = (sign * POINTS.vg, sign * POINTS.vs, sign * POINTS.vd, sign * POINTS.id)
    path = _table(tmp_path / "t.csv", "vg,vs,vd,id", ",", *columns)
    _same(_read(path, polarity="p"), POINTS)


def test_source_and_drain_may_be_exchanged(tmp_path: Path) -> None:
    path = _table(tmp_path / "t.csv", "vg,vs,vd,id", ",", POINTS.vg, POINTS.vd, POINTS.vs, -POINTS.id)
    _same(_read(path), POINTS)


def test_several_files_with_a_size_each(tmp_path: Path) -> None:
    lengths = (0.5e-6, 2e-6)
    paths = []
    for length in lengths:
        at = noisy(DEVICE, grid(np.arange(-0.1, 1.21, 0.05), sizes=((5e-6, length),)), 1)
        paths.append(write(tmp_path / f"l{length}.csv", at, ("vg", "vs", "vd", "id")))
    result = of_file(*paths, width=[5e-6], length=list(lengths), reference_length=0.5e-6)
    assert value(result, "kappa") == pytest.approx(DEVICE.kappa, rel=0.01)
    assert value(result, "specific_current") == pytest.approx(DEVICE.specific_current, rel=0.05)
    assert value(result, "drain_coupling_exponent") == pytest.approx(1.0, abs=0.1)
    assert result.trust.length is not None
    assert (result.trust.length.low, result.trust.length.high) == lengths


def test_shuffled_rows_give_the_same_parameters(tmp_path: Path) -> None:
    order = np.random.default_rng(0).permutation(len(POINTS.vg))
    mixed = Points(*(getattr(POINTS, name)[order] for name in ("vg", "vs", "vd", "w", "l", "temperature", "id")))
    one, other = (of_file(write(tmp_path / name, at)) for name, at in (("a.csv", POINTS), ("b.csv", mixed)))
    for name in ("kappa", "threshold", "specific_current", "drain_coupling"):
        assert value(other, name) == pytest.approx(value(one, name), rel=1e-5)


def test_a_long_table_is_thinned_and_said(tmp_path: Path) -> None:
    at = noisy(DEVICE, grid(np.arange(0.0, 1.2, 0.002), vs=(0.0, 0.4)), 1)
    result = of_file(write(tmp_path / "t.csv", at), capacity=500)
    (reading,) = result.readings
    assert (reading.rows, reading.kept) == (len(at.vg), 500)
    assert any("drawn at random" in one for one in result.warnings)
    assert value(result, "kappa") == pytest.approx(DEVICE.kappa, rel=0.01)


def test_comments_and_blank_lines_between_rows(tmp_path: Path) -> None:
    path = write(tmp_path / "t.csv", POINTS)
    lines = path.read_text().splitlines()
    path.write_text("* run 12\n\n" + lines[0] + "\n# measured twice\n" + "\r\n".join(lines[1:]) + "\n\n")
    _same(_read(path), POINTS)


numbers = st.floats(-2.0, 2.0, allow_nan=False).map(lambda x: round(x, 6))


@given(st.lists(st.tuples(numbers, numbers, numbers), min_size=1, max_size=30), st.sampled_from([",", ";", "\t"]))
def test_any_numbers_survive_the_way_through_a_file(
    tmp_path_factory: pytest.TempPathFactory, points: list[tuple[float, float, float]], sign: str
) -> None:
    path = tmp_path_factory.mktemp("t") / "t.csv"
    lines = ["vg,vs,vd,id".replace(",", sign)]
    lines += [sign.join(map(repr, (g, s, d, 1e-6 if d >= s else -1e-6))) for g, s, d in points]
    path.write_text("\n".join(lines))
    rows, _, problems = read_rows([path], ["t.csv"], Request())
    if rows is None:
        assert any(
            "drain at the source" in str(one)
            or "are below 0" in str(one)
            or "falls as the gate" in str(one)
            or "currents and voltages below 0" in str(one)
            for one in problems
        )
        return
    np.testing.assert_allclose(rows.gate, [g for g, _, _ in points], atol=1e-12)
    np.testing.assert_allclose(rows.source, [min(s, d) for _, s, d in points], atol=1e-12)


def test_columns_that_are_both_stated_and_fixed_must_agree(tmp_path: Path) -> None:
    (problem,) = problems_of(write(tmp_path / "t.csv", POINTS), length=[1e-6])
    assert problem.key == "l"
    assert "only one of the two" in problem.message
