"""Foreign text made safe, names guessed and judged."""

import keyword
import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from worksheet.model.text import REPLACEMENT, clean, is_identifier, nearest

# Unicode bidirectional algorithm (UAX 9), table of explicit formatting characters and implicit marks.
BIDIRECTIONAL = "\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069\u200e\u200f\u061c"


@pytest.mark.parametrize("character", [chr(code) for code in range(0x110000) if
                                       unicodedata.category(chr(code)) in {"Cc", "Zl", "Zp"}])  # fmt: skip
def test_every_control_character_and_separator_is_replaced(character: str) -> None:
    assert clean(f"a{character}b") == ("a b" if character in "\t\n" else f"a{REPLACEMENT}b")


@pytest.mark.parametrize(
    "character", [*BIDIRECTIONAL, "\ufeff", "\u200b", "\ud800", chr(0xDFFF), "\ufffe", "\U000e0041"]
)
def test_direction_and_invisible_characters_are_replaced(character: str) -> None:
    assert clean(f"a{character}b") == f"a{REPLACEMENT}b"
    assert clean(f"a{character}b", lines=True) == f"a{REPLACEMENT}b"


@pytest.mark.parametrize(
    "text", ["", "plain", "[/x] [@click=app.quit]q[/]", "µA √Hz °C Ω", "日本語 é ç", "\u200d", "👩‍🔬"]
)
def test_ordinary_text_and_markup_are_left_alone(text: str) -> None:
    assert clean(text) == text


def test_lines_are_kept_where_they_are_wanted() -> None:
    assert clean("a\r\nb\n\tc\rd", lines=True) == f"a\nb\n\tc{REPLACEMENT}d"
    assert clean("a\r\nb\n\tc\rd") == f"a b  c{REPLACEMENT}d"


@given(text=st.text(st.characters()), lines=st.booleans())
def test_clean_text_can_be_shown_written_and_cleaned_again(text: str, lines: bool) -> None:
    safe = clean(text, lines=lines)
    assert clean(safe, lines=lines) == safe
    safe.encode()
    assert not [c for c in safe if unicodedata.category(c) in {"Cc", "Cs", "Zl", "Zp"} and not (lines and c in "\t\n")]


@pytest.mark.parametrize(("name", "expected"), [
    ("bandwith", "bandwidth"), ("Bandwidth", "bandwidth"), ("dc-gain", "dc_gain"), ("lenght", "length"),
    ("xyzzy", None), ("", None), ("b" * 1000, None),
])  # fmt: skip
def test_the_nearest_name_is_found(name: str, expected: str | None) -> None:
    assert nearest(name, iter(["dc_gain", "bandwidth", "length"])) == expected


@pytest.mark.parametrize("name", ["buffer", "pi", "min", "_x", "élément", "match"])
def test_names_of_sheets(name: str) -> None:
    assert is_identifier(name)


@pytest.mark.parametrize("name", ["", "1a", "a b", "a-b", "a.b", "../x", "a\n", *keyword.kwlist])
def test_what_cannot_name_a_sheet(name: str) -> None:
    assert not is_identifier(name)
