"""A page as Markdown: tables, lines of algebra, pictures in words; foreign text shows itself and does nothing else."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model.text import clean
from worksheet.report.handoff.tree import (
    Formula,
    Heading,
    Lines,
    Links,
    Node,
    Page,
    Paragraph,
    Picture,
    Points,
    Table,
)
from worksheet.report.minutes import escaped


def write(page: Page) -> str:
    """A page as Markdown."""
    lines: list[str] = []
    for node in page.nodes:
        written = list(_node(node))
        if written:
            lines += [*written, ""]
    return "\n".join([*lines, "---", "", escaped(page.foot)]) + "\n"


def _node(node: Node) -> Iterator[str]:
    match node:
        case Heading():
            yield f"{'#' * node.level} {escaped(node.text)}"
        case Paragraph():
            said = escaped(node.cell.text)
            yield f"**{said}**" if node.strong and said else said
        case Points():
            yield from (f"- {escaped(item.text)}" for item in node.items)
        case Links():
            yield from (f"- {escaped(f'{said} {cell.text}'.strip())}" for said, _, cell in node.items)
        case Table():
            yield f"*{escaped(node.caption)}*"
            yield ""
            yield f"| {' | '.join(map(escaped, node.columns))} |"
            yield "|" + "|".join(" ---: " if k in node.right else " --- " for k in range(len(node.columns))) + "|"
            yield from (f"| {' | '.join(escaped(cell.text) for cell in row)} |" for row in node.rows)
        case Lines():
            yield f"*{escaped(node.caption)}*"
            yield ""
            yield from _kept(node.lines)
        case Formula():
            yield f"*{escaped(node.title)}*"
            yield ""
            yield from _kept(node.lines)
            yield ""
            yield escaped(f"{node.value.text}{'; behind it: ' + node.source if node.source else ''}")
        case Picture():
            yield f"*{escaped(node.caption)}*: {escaped(node.alt)}"
            if node.lines:
                yield ""
                yield from _kept(node.lines)


def _kept(lines: tuple[str, ...]) -> Iterator[str]:
    """Lines of characters as they are: indented code, out of which nothing can break."""
    yield from (f"    {clean(line)}".rstrip() for line in lines)
