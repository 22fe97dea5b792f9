"""A device from curves in the app: read, fitted, looked at in every view, written into the process file and undone."""

from __future__ import annotations

import tomllib
from pathlib import Path

import numpy as np
import pytest

from tests.support import run
from tests.tui.driving import Drive, drive
from worksheet.extract.data import Extraction
from worksheet.extract.views import FITTED, MEASURED, VIEWS, families
from worksheet.tui.screens.curves import CurvesScreen


@pytest.fixture
def table(root: Path) -> Path:
    """Curves that the book's own device implies, with 1 % noise, among its evidence."""
    process = next((root / "process").iterdir())
    arguments = ["--curves", str(process), "--device", "nfet", "--width", "10 um", "--length", "1 um"]
    done = run("extract", *arguments, "--vg", "0:1.5:0.03", "--vs", "0,0.2", "--vds", "0.05,0.4,1.2")
    assert done.status == 0, done.err
    header, *lines = done.out.splitlines()
    names = header.split(",")
    noise = np.random.default_rng(0)
    wanted = ("vg", "vs", "vd", "id", "w", "l", "temperature")
    out = [",".join(wanted)]
    for line in lines:
        row = dict(zip(names, map(float, line.split(",")), strict=True))
        row["id"] *= 1.0 + 0.01 * noise.standard_normal()
        out.append(",".join(repr(row[name]) for name in wanted))
    path = root / "evidence" / "nfet.csv"
    path.parent.mkdir(exist_ok=True)
    path.write_text("\n".join(out) + "\n", "utf-8")
    return path


async def fitted(d: Drive, tables: str) -> CurvesScreen:
    await d.settled()
    await d.press("j", "enter")
    await d.type(tables)
    await d.press(*["enter"] * 5)
    screen = d.app.screen
    assert isinstance(screen, CurvesScreen)
    await d.until(lambda: screen.result is not None)
    return screen


@pytest.mark.full
def test_a_device_is_fitted_looked_at_written_and_undone(root: Path, table: Path) -> None:
    process = next((root / "process").iterdir())
    before = process.read_bytes()
    kept: list[Extraction] = []

    async def steps(d: Drive) -> None:
        screen = await fitted(d, str(table.relative_to(root)))
        assert screen.result is not None
        kept.append(screen.result)
        assert any("kappa" in row for row in d.rows())
        for view in VIEWS:
            await d.press("tab")
            assert view.title in d.text("#title")
            assert "o" in d.text("#plot")
        await d.press("n")
        assert "2 of 2" in d.text("#families")
        await d.press("w", "y")
        await d.settled()
        assert screen.snapshot.undo == "nfet from its curves"

    drive(root, steps)
    device = tomllib.loads(process.read_text("utf-8"))["device"]["nfet"]
    assert device["kappa"]["value"] == pytest.approx(kept[0].estimates["kappa"].value, rel=1e-5)
    assert device["kappa"]["standard_error"] > 0

    async def back(d: Drive) -> None:
        screen = await fitted(d, "")  # the tables it was fitted to are found among the evidence, by their digest
        assert screen.asked.paths == (table,)
        await d.press("w", "y")
        await d.settled()

    drive(root, back)
    assert process.read_bytes() != before


@pytest.mark.full
def test_what_was_written_can_be_taken_back(root: Path, table: Path) -> None:
    process = next((root / "process").iterdir())
    before = process.read_bytes()

    async def steps(d: Drive) -> None:
        await fitted(d, str(table))
        await d.press("w", "y")
        await d.settled()
        await d.press("z")
        await d.settled()

    drive(root, steps)
    assert process.read_bytes() == before


@pytest.mark.full
def test_columns_are_stated_where_they_are_not_told_by_their_names(root: Path, table: Path) -> None:
    text = table.read_text("utf-8").replace("vg,vs,vd,id,w,l", "front,vs,vd,loss,w,l", 1)
    table.write_text(text, "utf-8")

    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("j", "enter")
        await d.type("evidence/nfet.csv")
        await d.press(*["enter"] * 5)
        screen = d.app.screen
        assert isinstance(screen, CurvesScreen)
        await d.until(lambda: any("front" in row or "column" in row for row in d.rows()))
        await d.press("k", *["enter"] * 5)
        await d.type("vg=front, id=loss")
        await d.press("enter")
        await d.until(lambda: screen.result is not None)

    drive(root, steps)


@pytest.mark.full
def test_the_views_show_the_numbers_of_the_fit(root: Path, table: Path) -> None:
    kept: list[Extraction] = []

    async def steps(d: Drive) -> None:
        screen = await fitted(d, str(table))
        assert screen.result is not None
        kept.append(screen.result)

    drive(root, steps)
    result = kept[0]
    first = families(result)[0]
    views = {view.key: {one.kind: one for one in view.points(result, first)} for view in VIEWS}
    measured = views["transfer"][MEASURED]
    for x, y in zip(measured.x, measured.y, strict=True):
        assert ((result.rows.gate == x) & (result.rows.current == y)).any()
    residuals = views["residuals"][MEASURED]
    assert np.sqrt(np.mean(residuals.y**2)) == pytest.approx(1.0, rel=0.3)  # the noise that was put in, in per cent
    efficiency = views["efficiency"][FITTED]
    weak = efficiency.y[efficiency.x < 0.05]
    kappa = result.estimates["kappa"].value
    assert kappa is not None
    assert weak.max() == pytest.approx(kappa / 0.02586, rel=0.05)  # kappa/U_T in weak inversion, Enz and Vittoz 2006
