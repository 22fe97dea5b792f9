"""The tables of a page as CSV (RFC 4180), a number or text a row, in SI base units, for spreadsheets and scripts."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator

from worksheet.report.csv_rows import harmless
from worksheet.report.handoff.tree import Cell, Heading, Page, Table

COLUMNS = ("block", "section", "table", "row", "quantity", "value", "unit", "text")


def write(page: Page) -> str:
    """The tables of a page as CSV."""
    into = io.StringIO()
    writer = csv.writer(into, lineterminator="\r\n")
    writer.writerow(COLUMNS)
    block = section = ""
    top = 0
    for node in page.nodes:
        if isinstance(node, Heading):
            if node.block:
                block, section, top = node.block, "", node.level
            else:
                block = block if node.level > top else ""
                section = node.text
        elif isinstance(node, Table):
            for row in _rows(node):
                writer.writerow([harmless(block), harmless(section), harmless(node.caption), *row])
    return into.getvalue()


def _rows(node: Table) -> Iterator[tuple[str, ...]]:
    for row in node.rows:
        for title, cell in zip(node.columns[1:], row[1:], strict=True):
            for quantity, value, unit, said in _entries(title, cell):
                yield harmless(row[0].text), harmless(quantity), value, harmless(unit), harmless(said)


def _entries(title: str, cell: Cell) -> Iterator[tuple[str, str, str, str]]:
    for number in cell.numbers:
        yield f"{title} {number.name}".strip(), repr(number.value), number.unit, cell.text
    if not cell.numbers and cell.text not in ("", "-"):
        yield title, "", "", cell.text
