"""The map of the window, decoded from what stands on the screen and held against solve's bounds."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from tests.tui.driving import Drive, drive
from worksheet.model.dimension import CAPACITANCE, CURRENT
from worksheet.model.quantity import parse
from worksheet.session.needs import Needs
from worksheet.solver.plane import Span
from worksheet.tui.pages import map_page
from worksheet.tui.screens.window_map import MapScreen


class Decoded:
    """A map read from the characters of the screen alone: its axes by their labels, its cells by their signs."""

    def __init__(self, text: str) -> None:
        lines = text.split("\n")
        corner = next(k for k, line in enumerate(lines) if line[map_page.LEFT - 1 : map_page.LEFT] in ("└", "+") and k)
        self.rows = [line[map_page.LEFT :] for line in lines[:corner]]
        self.x = self._axis(lines[corner][map_page.LEFT :], lines[corner + 1][map_page.LEFT :], CURRENT)
        labels = {k: line[: map_page.LEFT - 1].strip() for k, line in enumerate(lines[:corner])}
        self.y = {k: parse(label.replace("µ", "u"), CAPACITANCE) for k, label in labels.items() if label}
        self.legend = dict(re.findall(r"(\w) (\w+) [≥≤]", "\n".join(lines[corner + 2 :])))

    @staticmethod
    def _axis(ticks: str, labels: str, dimension: object) -> dict[int, float]:
        """Values by column: each label stands around its tick."""
        found = {}
        for label in re.finditer(r"\S+ \S+", labels):
            middle = (label.start() + label.end()) / 2
            tick = min((k for k, sign in enumerate(ticks) if sign in "┴+"), key=lambda k: abs(k - middle))
            assert dimension is CURRENT
            found[tick] = parse(label[0].replace("µ", "u"), CURRENT)
        return found

    def column(self, current: float) -> float:
        """The column of a current, from a straight line through the labelled ticks in the logarithm."""
        ticks = np.array(list(self.x)) + 0.5
        slope, start = np.polyfit(np.log10(list(self.x.values())), ticks, 1)
        return float(slope * np.log10(current) + start)

    def row(self, load: float) -> int:
        """The row of a load."""
        ticks = np.array(list(self.y)) + 0.5
        slope, start = np.polyfit(np.log10(list(self.y.values())), ticks, 1)
        return int(slope * np.log10(load) + start)


def map_text(root: Path, sheet: str, size: tuple[int, int], *keys: str) -> str:
    found: list[str] = []

    async def steps(d: Drive) -> None:
        await d.settled()
        d.app.push_screen(MapScreen(sheet))
        await d.pilot.pause()
        screen = d.app.screen
        assert isinstance(screen, MapScreen)
        await d.until(lambda: screen.found is not None)
        for key in keys:
            await d.press(key)
        found.append(d.text("#map"))

    drive(root, steps, size=size)
    return found[0]


@pytest.mark.parametrize("sheet", ["bucket_buffer", "drip_amplifier", "sun_gate", "wind_cascode", "reset_follower"])
@pytest.mark.parametrize("size", [(80, 24), pytest.param((120, 40), marks=pytest.mark.full)])
def test_a_boundary_lies_within_one_cell_of_solve(root: Path, sheet: str, size: tuple[int, int]) -> None:
    decoded = Decoded(map_text(root, sheet, size))
    needs = Needs.of(root / "sheets" / f"{sheet}.toml")
    assert isinstance(needs, Needs)
    load = needs.solved.needed["load_capacitance"].present if "load_capacitance" in needs.solved.needed else None
    window = needs.solved.needed["bias_current"]
    assert load is not None
    row = decoded.rows[decoded.row(load)]
    drawn = {
        name: [k for k, sign in enumerate(row) if sign.lower() == letter.lower()]
        for letter, name in decoded.legend.items()
    }
    looked_at = 0
    for bound in window.bounds:
        column = decoded.column(bound.value)
        if 1 <= column < len(row) - 1 and drawn.get(bound.target):
            looked_at += 1
            assert min(abs(k + 0.5 - column) for k in drawn[bound.target]) <= 1.5, (bound.target, column, row)
    assert looked_at


def test_the_present_point_stands_where_its_values_are(root: Path) -> None:
    decoded = Decoded(map_text(root, "bucket_buffer", (80, 24), "left", "left"))
    (row,) = [k for k, cells in enumerate(decoded.rows) if "◆" in cells]
    assert abs(decoded.rows[row].index("◆") + 0.5 - decoded.column(4e-6)) <= 1
    assert abs(row - decoded.row(1.2e-12)) <= 1


def test_every_boundary_is_named(root: Path) -> None:
    text = map_text(root, "wind_cascode", (80, 24))
    decoded = Decoded(text)
    letters = {sign.lower() for row in decoded.rows for sign in row if sign.isalpha()}
    named = set(re.findall(r"(?:^|  )(\w) ", "\n".join(text.split("\n")[len(decoded.rows) + 2 :]).lower()))
    assert letters
    assert letters <= named


def test_the_place_of_the_cross_is_taken_and_comes_back_with_undo(root: Path) -> None:
    before = (root / "sheets" / "wind_cascode.toml").read_bytes()

    async def steps(d: Drive) -> None:
        await d.settled()
        d.app.push_screen(MapScreen("wind_cascode"))
        await d.pilot.pause()
        screen = d.app.screen
        assert isinstance(screen, MapScreen)
        await d.until(lambda: screen.found is not None)
        await d.press("right", "right", "right", "enter")
        await d.settled()
        chosen = d.app.snapshot.data("wind_cascode")["choose"]["bias_current"]
        assert parse(chosen, CURRENT) > 5e-6
        assert d.app.snapshot.data("wind_cascode")["assume"]["load_capacitance"]["value"] == "1 pF"
        await d.press("z")
        await d.settled()

    drive(root, steps)
    assert (root / "sheets" / "wind_cascode.toml").read_bytes() == before


def test_closer_and_wider_keep_the_cross_and_whole_shows_all_again(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        d.app.push_screen(MapScreen("sun_gate"))
        await d.pilot.pause()
        screen = d.app.screen
        assert isinstance(screen, MapScreen)
        await d.until(lambda: screen.found is not None)
        assert screen.found is not None
        first = screen.found.plane
        await d.press("plus")
        await d.until(lambda: screen.found is not None and screen.found.plane is not first)
        closer = screen.found.plane
        assert closer.x_span.decades == pytest.approx(0.7 * first.x_span.decades)
        await d.press("w")
        await d.until(lambda: screen.found is not None and screen.found.plane is not closer)
        assert screen.found.plane.x_span == first.x_span

    drive(root, steps)


def test_a_span_is_cut_into_equal_steps_of_the_logarithm() -> None:
    span = Span(1e-6, 1e-3)
    assert span.decades == pytest.approx(3)
    assert [span.cell(value, 30) for value in (1e-6, 1.2e-6, 1e-5, 9.99e-4, 1e-3)] == [0, 0, 10, 29, 29]
    assert span.cell(9e-7, 30) is None
    assert span.closer(1e-4, 0.5).decades == pytest.approx(1.5)
