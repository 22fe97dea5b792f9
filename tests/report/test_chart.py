"""A chart in characters: points stand where the numbers at its edges say, limits and the present place cross it."""

from __future__ import annotations

import pytest

from worksheet.report.chart import HERE, LIMIT, Marks, chart, scale_of


def word(value: float) -> str:
    return f"{value:.3g}"


@pytest.mark.parametrize("size", [(40, 12), (78, 20), (118, 36)])
@pytest.mark.parametrize("logarithmic", [True, False])
def test_points_stand_where_the_edges_say(size: tuple[int, int], logarithmic: bool) -> None:
    xs, ys = [1.0, 10.0, 1000.0], [1e-9, 1e-7, 1e-3]
    x, y = scale_of(xs, logarithmic=logarithmic), scale_of(ys, logarithmic=logarithmic)
    rows = chart([Marks("o", "points", xs, ys)], x, y, (word, word), size)
    body = rows[:-2]
    left = rows[-2].index("+") + 1
    width, height = len(rows[-2]) - left, len(body)
    assert max(map(len, rows)) <= size[0]
    assert len(rows) == size[1]
    for value_x, value_y in zip(xs, ys, strict=True):
        share_x, share_y = x.share(value_x), y.share(value_y)
        assert share_x is not None
        assert share_y is not None
        row = body[height - 1 - min(int(share_y * height), height - 1)]
        assert row[left + min(int(share_x * width), width - 1)] == "o"
    assert sum(row.count("o") for row in body) <= len(xs)
    assert rows[-1].split() == [word(x.at(0.0)), word(x.at(1.0))]
    assert body[0].lstrip().startswith(word(y.at(1.0)))


def test_a_limit_is_a_level_line_and_the_present_place_an_upright_one() -> None:
    x, y = scale_of([0.0, 1.0], logarithmic=False), scale_of([0.0, 2.0], logarithmic=False)
    rows = chart([Marks("o", "points", [0.0], [0.0])], x, y, (word, word), (50, 14), lines=[1.0], here=0.5)
    left = rows[-2].index("+") + 1
    upright = {row[left:].index(HERE) for row in rows[:-2] if HERE in row[left:]}
    assert len(upright) == 1
    (level,) = (row[left:] for row in rows[:-2] if row[left:].count(LIMIT) > 20)
    assert level[upright.pop()] == "+"


def test_what_does_not_exist_is_not_drawn() -> None:
    x, y = scale_of([1.0, 10.0], logarithmic=True), scale_of([1.0, 10.0], logarithmic=True)
    rows = chart([Marks("o", "points", [1.0, -1.0, 5.0], [1.0, 2.0, float("nan")])], x, y, (word, word), (40, 10))
    assert sum(row.count("o") for row in rows) == 1
