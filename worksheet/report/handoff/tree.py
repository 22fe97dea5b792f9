"""What a page consists of, whatever it is written as: headings, paragraphs, tables, formulas, pictures, lines of text.

A number carries its value beside what is shown of it, and where it stands in the JSON documents, so that a page can be
read back and held against them. All text is foreign text: the writers make it harmless.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from worksheet.model.dimension import Dimension
from worksheet.model.quantity import format_quantity
from worksheet.report import wording

DIGITS = 4


@dataclass(frozen=True, slots=True)
class Number:
    """A number as it is shown.

    Attributes:
        shown: With its unit, "5.9 MHz".
        value: In SI base units. [unit]
        unit: SI unit; "" for none.
        of: Where it stands in the JSON documents, as a path with slashes.
        name: What it is within its cell, "min"; "" where the column says it.
    """

    shown: str
    value: float
    unit: str
    of: str = ""
    name: str = ""


Part = str | Number


@dataclass(frozen=True, slots=True)
class Cell:
    """Text with numbers in it. `tone` is a verdict, which its words say too."""

    parts: tuple[Part, ...] = ()
    tone: str = ""

    @property
    def text(self) -> str:
        """Everything as text."""
        return "".join(part if isinstance(part, str) else part.shown for part in self.parts)

    @property
    def numbers(self) -> tuple[Number, ...]:
        """The numbers alone."""
        return tuple(part for part in self.parts if isinstance(part, Number))


@dataclass(frozen=True, slots=True)
class Heading:
    """A heading of a level from 1, with a name that links can lead to; `block` names the block that begins with it."""

    text: str
    level: int
    name: str
    block: str = ""


@dataclass(frozen=True, slots=True)
class Paragraph:
    """A paragraph. `strong` sets it off."""

    cell: Cell
    strong: bool = False


@dataclass(frozen=True, slots=True)
class Points:
    """Short statements, one below the other."""

    items: tuple[Cell, ...]


@dataclass(frozen=True, slots=True)
class Links:
    """A table of contents: text, name of a heading, and how it stands."""

    title: str
    items: tuple[tuple[str, str, Cell], ...]


@dataclass(frozen=True, slots=True)
class Table:
    """A table with a caption; the first cell of a row names the row, `right` tells which columns hold numbers."""

    caption: str
    columns: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]
    right: frozenset[int] = frozenset()


@dataclass(frozen=True, slots=True)
class Lines:
    """Lines kept as they are, under a caption."""

    caption: str
    lines: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Formula:
    """An equation.

    Attributes:
        title: What it gives.
        mathml: Presentation MathML elements.
        put_in: The same with numbers in the place of letters.
        lines: As lines of characters.
        value: What it comes to.
        source: The published relation behind it.
    """

    title: str
    mathml: tuple[str, ...]
    put_in: tuple[str, ...]
    lines: tuple[str, ...]
    value: Cell
    source: str = ""


@dataclass(frozen=True, slots=True)
class Picture:
    """A picture as SVG, what it shows in words, and its caption. `lines` draws the same in characters, if it can be."""

    svg: str
    alt: str
    caption: str
    lines: tuple[str, ...] = ()


Node = Heading | Paragraph | Points | Links | Table | Lines | Formula | Picture


@dataclass(frozen=True, slots=True)
class Page:
    """A page: its title and language, what the footer repeats, and its nodes, the first a heading of level 1."""

    title: str
    foot: str
    nodes: tuple[Node, ...]
    language: str = "en"


@dataclass
class Builder:
    """Puts nodes one below the other, headings with names of their own."""

    level: int = 1
    prefix: str = ""
    nodes: list[Node] = field(default_factory=list)

    def head(self, text: str, name: str, deeper: int = 0, *, block: str = "") -> None:
        """A heading, `deeper` levels below the builder's own."""
        self.nodes.append(Heading(text, self.level + deeper, f"{self.prefix}{name}", block))

    def say(self, *parts: Part, strong: bool = False) -> None:
        """A paragraph."""
        self.nodes.append(Paragraph(Cell(parts), strong))

    def table(
        self, caption: str, columns: Sequence[str], rows: Sequence[tuple[Cell, ...]], right: Sequence[int] = ()
    ) -> None:
        """A table, or nothing where there are no rows."""
        if rows:
            self.nodes.append(Table(caption, tuple(columns), tuple(rows), frozenset(right)))

    def add(self, *nodes: Node) -> None:
        """Any nodes."""
        self.nodes.extend(nodes)


def text(said: object, tone: str = "") -> Cell:
    """A cell of text."""
    return Cell((str(said),) if str(said) else (), tone)


def number(value: float | None, unit: str, of: str = "", reason: str | None = None, digits: int = DIGITS) -> Cell:
    """A cell of one number, or why there is none."""
    if value is None:
        return text(reason or "-")
    return Cell((Number(wording.number(_seen(value, unit), unit, digits=digits), value, unit, of),))


def _seen(value: float, unit: str) -> float:
    """A voltage that rounding alone keeps from 0, as 0."""
    return 0.0 if unit == "V" and abs(value) < wording.NO_VOLTAGE else value


def end(value: float | None, unit: str, of: str, side: str) -> Cell:
    """As number, of an end of what is needed: shown on the side that meets."""
    if value is None:
        return text("-")
    return Cell((Number(wording.number(wording.safe(value, side, DIGITS), unit, digits=DIGITS), value, unit, of),))


def metric(
    key: str, value: float | None, unit: str, of: str = "", reason: str | None = None, digits: int = DIGITS
) -> Cell:
    """As number, in the dimension that the metric is described with."""
    if value is None:
        return text(reason or "-")
    return Cell((Number(wording.metric_number(key, _seen(value, unit), unit, digits=digits), value, unit, of),))


def quantity(value: float | None, dimension: Dimension, of: str = "", digits: int = DIGITS) -> Cell:
    """As number, of a dimension."""
    if value is None:
        return text("-")
    return Cell((Number(format_quantity(value, dimension, digits), value, dimension.unit, of),))


def share(value: float | None, of: str = "", *, sign: bool = False) -> Cell:
    """A cell of a fraction in per cent."""
    if value is None:
        return text("-")
    shown = wording.margin(value) if sign else f"{value:.1%}"
    return Cell((Number(shown, value, "", of),))


def joined(*cells: Cell, between: str = "") -> Cell:
    """Cells as one."""
    parts: list[Part] = []
    for cell in cells:
        if parts and cell.parts and between:
            parts.append(between)
        parts += cell.parts
    return Cell(tuple(parts))


def headings(page: Page) -> Iterator[Heading]:
    """The headings of a page."""
    return (node for node in page.nodes if isinstance(node, Heading))
