"""Reading a page back with the standard library: its numbers, headings, tables, pictures, and what could act."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from html.parser import HTMLParser

VOID = frozenset({"meta", "img", "br", "hr", "link", "input", "col", "area", "base", "embed", "source", "track", "wbr"})

PREFIXES = {"a": -18, "f": -15, "p": -12, "n": -9, "µ": -6, "m": -3, "": 0, "k": 3, "M": 6, "G": 9, "T": 12}
"""SI prefixes (BIPM, The International System of Units, 9th edition, table 7) as powers of ten."""

_FACTOR = re.compile(r"([afpnµmkMGT]?)(√Hz|Hz|V|A|s|m|K|F|S|Ω|W|C|J)(\^2|²)?")
_NUMBER = re.compile(r"([+\u2212-]?\d+(?:\.\d+)?(?:e[+-]?\d+)?)\s*(.*)")


@dataclass
class Shown:
    """A number of a page: the value behind it, where it says it stands in the documents, and what is shown."""

    value: float
    of: str
    text: str = ""


@dataclass
class Table:
    """A table: its caption, the scopes of its headers, and its rows as text."""

    caption: str = ""
    scopes: list[str] = field(default_factory=list)
    rows: list[list[str]] = field(default_factory=list)


class Page(HTMLParser):
    """Everything of a page that a test asks for; what is not nested rightly is an error.

    Attributes:
        elements: Names of the elements, as often as they occur, with their attributes.
        headings: Level, id and text.
        text: All text that is shown.
    """

    def __init__(self, html: str) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.headings: list[tuple[int, str, str]] = []
        self.numbers: list[Shown] = []
        self.tables: list[Table] = []
        self.title = ""
        self.text = ""
        self._open: list[str] = []
        self._catch: list[str] | None = None
        self.feed(html)
        self.close()
        assert self._open == []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        known = dict(attrs)
        assert len(known) == len(attrs), f"an attribute twice: {tag} {attrs}"
        self.elements.append((tag, known))
        if tag not in VOID:
            self._open.append(tag)
        if tag == "data":
            self.numbers.append(Shown(float(known["value"] or ""), known.get("data-of") or ""))
        elif re.fullmatch("h[1-6]", tag):
            self.headings.append((int(tag[1]), known.get("id") or "", ""))
        elif tag == "table":
            self.tables.append(Table())
        elif tag == "tr":
            self.tables[-1].rows.append([])
        elif tag in ("td", "th"):
            self.tables[-1].rows[-1].append("")
            if tag == "th":
                self.tables[-1].scopes.append(known.get("scope") or "")

    def handle_endtag(self, tag: str) -> None:
        assert tag in VOID or self._open.pop() == tag

    def handle_data(self, data: str) -> None:
        inside = self._open
        if "style" in inside:
            return
        if inside and inside[-1] == "title":
            self.title += data
        if "body" in inside:
            self.text += data
        if "data" in inside:
            self.numbers[-1].text += data
        if inside and re.fullmatch("h[1-6]", inside[-1]):
            level, name, before = self.headings[-1]
            self.headings[-1] = (level, name, before + data)
        if "caption" in inside:
            self.tables[-1].caption += data
        if {"td", "th"} & set(inside):
            self.tables[-1].rows[-1][-1] += data

    def named(self, *tags: str) -> list[dict[str, str | None]]:
        """The attributes of every element of these names."""
        return [attributes for tag, attributes in self.elements if tag in tags]


def read_shown(text: str) -> tuple[float, float]:
    """A shown number in SI, and half a step of its last digit.

    Args:
        text: "5.9 MHz", "40 µm²", "+21.2%", "-10 °C".
    """
    found = _NUMBER.fullmatch(text.strip())
    assert found, f"no number is shown: {text!r}"
    mantissa, said = found[1].replace("\u2212", "-"), found[2]
    places = len(re.sub(r"e.*", "", mantissa).partition(".")[2])
    exponent = int((re.findall(r"e(.*)", mantissa) or ["0"])[0])
    value, step = float(mantissa), 10.0 ** (exponent - places) / 2
    if said == "°C":
        return value + 273.15, step
    if said == "%":
        return value / 100, step / 100
    scale = 1.0 if said == "x" else 10.0 ** _decades(said)
    return value * scale, step * scale


def _decades(said: str) -> int:
    """The power of ten that the prefixes of a unit come to: "fF/µm²" to -3."""
    total = 0
    for place, side in enumerate(said.split("/")):
        for factor in side.split():
            found = _FACTOR.fullmatch(factor)
            assert found, f"no unit is known as {factor!r} in {said!r}"
            total += (1 if place == 0 else -1) * (2 if found[3] else 1) * PREFIXES[found[1]]
    return total
