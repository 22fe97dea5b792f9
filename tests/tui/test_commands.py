"""The table of commands: every key once a screen, second ways that multiplexers leave alone, every method there."""

import itertools
from pathlib import Path

import pytest

from worksheet.tui import keymap
from worksheet.tui.commands import (
    ALGEBRA,
    BOOK,
    CHAIN,
    COMMANDS,
    COMPARE,
    CURVES,
    FAILING,
    FRONT,
    MAP,
    MEETING,
    PLACES,
    SHEET,
    SWEEP,
    TAKEOVER,
    VARIANTS,
    find,
    of_place,
    shown_key,
)
from worksheet.tui.screens.algebra import AlgebraScreen
from worksheet.tui.screens.book import BookScreen
from worksheet.tui.screens.chains import ChainScreen
from worksheet.tui.screens.compare import CompareScreen
from worksheet.tui.screens.curves import CurvesScreen
from worksheet.tui.screens.failing import FailingScreen
from worksheet.tui.screens.front import FrontScreen
from worksheet.tui.screens.meeting import MeetingScreen
from worksheet.tui.screens.sheet import SheetScreen
from worksheet.tui.screens.sweeping import SweepScreen
from worksheet.tui.screens.takeover import TakeoverScreen
from worksheet.tui.screens.variants import VariantsScreen
from worksheet.tui.screens.window_map import MapScreen

SCREENS = {
    BOOK: BookScreen,
    SHEET: SheetScreen,
    ALGEBRA: AlgebraScreen,
    MAP: MapScreen,
    MEETING: MeetingScreen,
    TAKEOVER: TakeoverScreen,
    COMPARE: CompareScreen,
    VARIANTS: VariantsScreen,
    SWEEP: SweepScreen,
    FRONT: FrontScreen,
    CHAIN: ChainScreen,
    FAILING: FailingScreen,
    CURVES: CurvesScreen,
}

TAKEN_BY_OTHERS = {
    "ctrl+a",  # usual prefix of one terminal multiplexer
    "ctrl+b",  # and of another
    "ctrl+s",  # stops a terminal with flow control (termios VSTOP)
    "ctrl+q",  # starts it again (VSTART)
    "ctrl+c",  # interrupts (VINTR)
    "ctrl+m",  # is enter
    "ctrl+i",  # is tab
    "ctrl+h",  # is backspace on many terminals
    "ctrl+j",  # is a line feed
}


@pytest.mark.parametrize("place", PLACES)
def test_a_key_means_one_thing_on_a_screen(place: str) -> None:
    keys = list(itertools.chain.from_iterable((one.key, one.second) for one in of_place(place)))
    assert sorted({key for key in keys if keys.count(key) > 1}) == []


def test_every_command_has_two_ways_in_that_no_terminal_keeps() -> None:
    for command in COMMANDS:
        assert command.key
        assert command.second
        assert command.key != command.second
        assert not {command.key, command.second} & TAKEN_BY_OTHERS


def test_one_way_in_of_each_needs_no_modifier() -> None:
    """Function keys and control keys are lost in some chain of terminals; a plain key never is."""
    for command in COMMANDS:
        plain = [key for key in (command.key, command.second) if "+" not in key]
        assert plain or command.name == "previous_section", command.name


@pytest.mark.parametrize("place", PLACES)
def test_every_command_has_its_method(place: str) -> None:
    missing = [one.name for one in of_place(place) if not hasattr(SCREENS[place], f"action_{one.name}")]
    assert missing == []


def test_help_differs_for_every_command() -> None:
    helps = [command.help for command in COMMANDS]
    assert len(set(helps)) == len(helps)
    assert all(text.endswith(".") for text in helps)


def test_keys_are_shown_as_people_write_them() -> None:
    assert [shown_key(key) for key in ("question_mark", "f1", "ctrl+f", "plus", "x")] == ["?", "F1", "ctrl+f", "+", "x"]


def user_keys(folder: Path, text: str) -> keymap.Keys:
    (folder / keymap.FILE).write_text(text, "utf-8")
    return keymap.read(folder)


def test_no_file_leaves_the_programs_own_keys(tmp_path: Path) -> None:
    found = keymap.read(tmp_path)
    assert found.problems == ()
    assert found.changed() == {}


def test_the_users_keys_take_their_place(tmp_path: Path) -> None:
    found = user_keys(tmp_path, 'find = ";"\nundo = ["u", "f3"]\n')
    assert found.problems == ()
    assert found.changed() == {"find": "semicolon", "undo": "u,f3"}


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ('fnd = "g"\n', "keys.toml:1: fnd: Found no command of this name; did you mean find?"),
        ("find = 3\n", "keys.toml:1: find: Found no key"),
        ("find = []\n", "keys.toml:1: find: Found no key"),
        ('find = "hyper+q+q"\n', "keys.toml:1: find: Found"),
        ('find = "d"\n', "find: d is the key of duplicate already; find keeps its own keys."),
        ("find = \n", "keys.toml:1"),
    ],
)
def test_what_cannot_be_used_is_told_and_changes_nothing(tmp_path: Path, text: str, said: str) -> None:
    found = user_keys(tmp_path, text)
    command = find("find")
    assert command is not None
    assert found.of(command) == (command.key, command.second)
    assert any(said in str(problem) for problem in found.problems), [str(p) for p in found.problems]


@pytest.mark.parametrize("place", [place for place in PLACES if place != BOOK])
def test_every_screen_but_the_first_has_a_way_back(place: str) -> None:
    assert "back" in {command.name for command in of_place(place)}
