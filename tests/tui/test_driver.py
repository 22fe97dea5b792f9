"""The driver that sends changed cells, held to a terminal emulator: fewer bytes, the same screen."""

import pyte
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from worksheet.tui.driver import Picture

ROWS, COLUMNS = 4, 12

texts = st.text(st.sampled_from("ab░─漢字 "), min_size=1, max_size=6)
styles = st.sampled_from(["0", "1", "31", "1;38;2;10;20;30", "7"])
pieces = st.tuples(st.integers(1, ROWS), st.integers(1, COLUMNS - 6), styles, texts)
frames = st.lists(st.lists(pieces, min_size=1, max_size=4), min_size=1, max_size=6)


def sent(frame: list[tuple[int, int, str, str]]) -> str:
    """A frame as the toolkit writes one: never beyond the right edge."""
    return "".join(
        f"\x1b[{row};{column}H\x1b[{style}m{fitting(text, column)}\x1b[0m" for row, column, style, text in frame
    )


def fitting(text: str, column: int) -> str:
    """As much of a text as has room from a column on."""
    while cell_len(text) > COLUMNS - column + 1:
        text = text[:-1]
    return text


def shown(writes: list[str]) -> list[list[pyte.screens.Char]]:
    screen = pyte.Screen(COLUMNS, ROWS)
    stream = pyte.Stream(screen)
    for one in writes:
        stream.feed(one)
    return [[screen.buffer[y][x] for x in range(COLUMNS)] for y in range(ROWS)]


@given(frames)
def test_the_screen_is_the_same(many: list[list[tuple[int, int, str, str]]]) -> None:
    picture = Picture()
    whole = [sent(frame) for frame in many]
    less = [picture.changes(one) for one in whole]
    assert all(one is not None for one in less)
    assert shown(whole) == shown([one or "" for one in less])


def test_what_stands_there_is_not_sent_again() -> None:
    picture = Picture()
    frame = sent([(1, 1, "1", "abab"), (2, 3, "0", "ba")])
    first, second = picture.changes(frame), picture.changes(frame)
    assert first is not None
    assert second is not None
    assert "a" in first
    assert "a" not in second


def test_one_cell_that_changes_costs_one_move_and_one_character() -> None:
    picture = Picture()
    picture.changes(sent([(1, 1, "0", "aaaa")]))
    assert picture.changes(sent([(1, 1, "0", "aaba")])) == "\x1b[1;3Hb\x1b[1;5H"


def test_what_is_not_understood_is_told() -> None:
    assert Picture().changes("\x1b[1;1Ha\x1b]8;;x\x1b\\b") is None
    assert Picture().changes("\x1b[1;1He\u0301") is None


def test_after_forgetting_all_is_sent() -> None:
    picture = Picture()
    frame = sent([(1, 1, "0", "abab")])
    picture.changes(frame)
    picture.forget()
    assert "abab" in (picture.changes(frame) or "")
