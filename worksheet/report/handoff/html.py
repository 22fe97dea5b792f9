"""A page as one HTML file that needs nothing else: no script, no font, no request.

Everything foreign goes through `escaped`; MathML is read and written anew from a list of known elements; pictures are
data within `img`, where nothing of them can act. The policy in the head forbids whatever is not one of these.
"""

from __future__ import annotations

import base64
import re
from collections.abc import Iterator, Sequence
from xml.etree import ElementTree

from worksheet.model.text import clean
from worksheet.report.handoff import math_width, style
from worksheet.report.handoff.tree import (
    Cell,
    Formula,
    Heading,
    Lines,
    Links,
    Node,
    Number,
    Page,
    Paragraph,
    Picture,
    Points,
    Table,
)

_SHORT = 36
"""Lines of a table that is not parted by a page break; a page holds some 48."""

_ACROSS = 110
"""Characters that a page holds across in a table."""

_ON_ONE_LINE = 14
"""Characters of a cell that is not broken."""

_PIECES = re.compile(r"\S{1,28}|\s+")
"""Words, long ones in pieces, and what is between them."""

_BREAKS = re.compile(r"(?<=[A-Za-z])([_./])(?=[A-Za-z])")

POLICY = "default-src 'none'; img-src data:; style-src 'unsafe-inline'; base-uri 'none'; form-action 'none'"
"""What a browser may do with the page: show its own style and pictures that are in it."""

_SPECIAL = str.maketrans({"&": "&amp;", "<": "&lt;", ">": "&gt;", '"': "&quot;", "'": "&#39;"})
_MATH = frozenset(
    (
        *("math", "mrow", "mi", "mn", "mo", "mtext", "mspace", "msub", "msup", "msubsup", "mfrac", "msqrt", "mroot"),
        *("mfenced", "mover", "munder", "munderover", "mtable", "mtr", "mtd", "mstyle", "mpadded", "menclose"),
    )
)
_MATH_ATTRIBUTES = frozenset({"display", "mathvariant", "open", "close", "separators", "linethickness", "stretchy"})


def escaped(text: str) -> str:
    """Foreign text that shows itself and does nothing else, inside elements and inside quoted attributes."""
    return clean(text, lines=True).translate(_SPECIAL)


def write(page: Page) -> str:
    """A page as an HTML document."""
    return "\n".join(_document(page)) + "\n"


def _document(page: Page) -> Iterator[str]:
    yield "<!DOCTYPE html>"
    yield f'<html lang="{escaped(page.language)}">'
    yield "<head>"
    yield '<meta charset="utf-8">'
    yield f'<meta http-equiv="Content-Security-Policy" content="{POLICY}">'
    yield '<meta name="viewport" content="width=device-width, initial-scale=1">'
    yield '<meta name="referrer" content="no-referrer">'
    yield f"<title>{escaped(page.title)}</title>"
    yield f"<style>{style.SHEET}</style>"
    yield "</head>"
    yield "<body>"
    yield '<a class="skip" href="#main">Skip to the content</a>'
    yield '<main id="main">'
    yield from _kept_together(page.nodes)
    yield "</main>"
    yield f"<footer><p>{escaped(page.foot)}</p></footer>"
    yield "</body>"
    yield "</html>"


def _kept_together(nodes: Sequence[Node]) -> Iterator[str]:
    """The nodes; headings and what follows them in one piece that no page break parts, unless it is a long table."""
    place = 0
    while place < len(nodes):
        end = place
        while end < len(nodes) and isinstance(nodes[end], Heading):
            end += 1
        while end > place and end < len(nodes) and isinstance(nodes[end], Paragraph):
            end += 1
        follows = nodes[end] if end > place and end < len(nodes) else None
        if follows is not None and not isinstance(follows, Heading) and not _long(follows):
            end += 1
        group = nodes[place : max(end, place + 1)]
        kept = len(group) > 1
        if kept:
            fresh = " page" if isinstance(group[0], Heading) and group[0].block else ""
            yield f'<div class="keep{fresh}">'
        for node in group:
            yield from _node(node)
        if kept:
            yield "</div>"
        place += len(group)


def _long(node: Node) -> bool:
    if isinstance(node, Lines):
        return len(node.lines) > _SHORT
    return isinstance(node, Table) and sum(map(_high, node.rows)) > _SHORT


def _high(row: Sequence[Cell]) -> int:
    """Lines that a row of a table takes at most, were every column as wide as the others."""
    across = _ACROSS // len(row)
    return max(-(-len(cell.text) // across) for cell in row) or 1


def _node(node: Node) -> Iterator[str]:
    match node:
        case Heading():
            yield f'<h{node.level} id="{escaped(node.name)}">{escaped(node.text)}</h{node.level}>'
        case Paragraph():
            yield f"<p{_class('strong' if node.strong else '')}>{_cell(node.cell)}</p>"
        case Points():
            yield f"<ul>{''.join(f'<li>{_cell(item)}</li>' for item in node.items)}</ul>"
        case Links():
            items = "".join(
                f'<li><a href="#{escaped(name)}">{escaped(said)}</a>{_beside(cell)}</li>'
                for said, name, cell in node.items
            )
            yield f'<nav aria-label="{escaped(node.title)}"><ul>{items}</ul></nav>'
        case Table():
            yield from _table(node)
        case Lines():
            lines = "\n".join(map(escaped, node.lines))
            label = escaped(node.caption)
            yield f'<figure class="lines"><figcaption>{label}</figcaption>'
            yield f'<pre tabindex="0" role="group" aria-label="{label}">{lines}</pre></figure>'
        case Formula():
            yield from _formula(node)
        case Picture():
            data = base64.b64encode(node.svg.encode()).decode("ascii")
            yield f'<figure><img alt="{escaped(node.alt)}" src="data:image/svg+xml;base64,{data}">'
            yield f"<figcaption>{escaped(node.caption)}</figcaption></figure>"


def _manner(node: Table, column: int, cell: Cell) -> str:
    """How a cell is set: numbers to the right, short ones on one line."""
    return "right" if column in node.right else "one" if len(cell.text) <= _ON_ONE_LINE else ""


def _side(node: Table, column: int) -> str:
    return _class("right" if column in node.right else "")


def _class(name: str) -> str:
    return f' class="{name}"' if name else ""


def _beside(cell: Cell) -> str:
    return f" {_cell(cell)}" if cell.parts else ""


def _cell(cell: Cell) -> str:
    shown = "".join(_number(part) if isinstance(part, Number) else _words(part) for part in cell.parts)
    return f'<span class="{escaped(cell.tone)}">{shown}</span>' if cell.tone else shown


def _words(said: str) -> str:
    """Text in which a long name or word may go on in the next line."""
    shown, joins = [], False
    for piece in _PIECES.findall(said):
        shown.append(f"{'<wbr>' if joins and not piece.isspace() else ''}{escaped(piece)}")
        joins = not piece.isspace()
    return _BREAKS.sub(r"\1<wbr>", "".join(shown))


def _number(part: Number) -> str:
    of = f' data-of="{escaped(part.of)}"' if part.of else ""
    return f'<data value="{part.value!r}"{of}>{escaped(part.shown)}</data>'


def _table(node: Table) -> Iterator[str]:
    caption = escaped(node.caption)
    short = "" if _long(node) else " short"
    yield f'<div class="wide{short}" tabindex="0" role="group" aria-label="{caption}">'
    yield f"<table><caption>{caption}</caption>"
    heads = (f'<th scope="col"{_side(node, k)}>{escaped(title)}</th>' for k, title in enumerate(node.columns))
    yield f"<thead><tr>{''.join(heads)}</tr></thead><tbody>"
    for row in node.rows:
        first = f'<th scope="row">{_cell(row[0])}</th>'
        rest = (f"<td{_class(_manner(node, k, cell))}>{_cell(cell)}</td>" for k, cell in enumerate(row[1:], start=1))
        yield f"<tr>{first}{''.join(rest)}</tr>"
    yield "</tbody></table></div>"


def _formula(node: Formula) -> Iterator[str]:
    label = escaped(node.title)
    yield f'<figure class="formula"><figcaption>{label}</figcaption>'
    yield f'<div class="wide" tabindex="0" role="group" aria-label="{label}">'
    plain = [ElementTree.fromstring(element) for element in node.mathml]  # noqa: S314  see math
    put_in = [ElementTree.fromstring(element) for element in node.put_in]  # noqa: S314  see math
    fitting = [element for element in put_in if math_width.size_of(element) is not None]
    for k, element in enumerate((*plain, *fitting)):
        yield _math(element, _class(math_width.size_of(element) or "screen"), " ".join(node.lines) if k == 0 else "")
    yield "</div>"
    if any(math_width.size_of(element) is None for element in plain):
        yield f'<pre class="paper" aria-hidden="true">{escaped(chr(10).join(node.lines))}</pre>'
    source = f'<p class="quiet">Behind it: {escaped(node.source)}</p>' if node.source else ""
    yield f"<p>{_cell(node.value)}</p>{source}</figure>"


def math(element: str) -> str:
    """A MathML element of known parts and nothing else. ValueError for anything unknown in it."""
    return _math(ElementTree.fromstring(element))  # noqa: S314  printed by our own printer, which declares no entity


def _math(element: ElementTree.Element, more: str = "", alternative: str = "") -> str:
    name = element.tag.rpartition("}")[2]
    if name not in _MATH:
        raise ValueError(f"no element of mathematics: {name}")
    if name == "mfenced":
        return _fenced(element)
    attributes = "".join(
        f' {key}="{escaped(value)}"' for key, value in element.attrib.items() if key in _MATH_ATTRIBUTES
    )
    said = f' alttext="{escaped(alternative)}"' if alternative else ""
    inner = escaped(element.text or "") if len(element) == 0 else "".join(map(_math, element))
    return f"<{name}{attributes}{more}{said}>{inner}</{name}>"


def _fenced(element: ElementTree.Element) -> str:
    """An element that MathML Core has given up, as the row that it stood for."""
    before, after = element.get("open", "("), element.get("close", ")")
    inner = "<mo>,</mo>".join(map(_math, element))
    return f"<mrow><mo>{escaped(before)}</mo>{inner}<mo>{escaped(after)}</mo></mrow>"
