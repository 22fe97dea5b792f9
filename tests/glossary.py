"""The glossary of DEVELOPERS.md, made from the descriptions that the program itself runs on.

    python -m tests.glossary           says whether the document agrees with the descriptions
    python -m tests.glossary --write   puts the tables into the document

tests/architecture/test_glossary.py holds the document to what this makes.
"""

import argparse
import sys
from collections.abc import Iterable, Iterator
from pathlib import Path

from worksheet.model.dimension import DIMENSIONS
from worksheet.model.keys import ANNOTATIONS, Key, Table
from worksheet.model.metrics import METRICS
from worksheet.model.operating import OPERATING_POINT
from worksheet.model.process_keys import PROCESS
from worksheet.model.project_keys import PROJECT
from worksheet.model.sheet_keys import SHEET

TOP = Path(__file__).resolve().parent.parent
DOCUMENT = TOP / "DEVELOPERS.md"
MARK = "<!-- made by tests/glossary.py -->"

Row = tuple[str, ...]


def _keys(table: Table, path: str = "") -> Iterator[Row]:
    """One row a key, tables after the keys they stand beside, named as in TOML."""
    for key in table.keys:
        yield _row(key, path)
    for inner in table.tables:
        yield from _keys(inner, f"[[{inner.name}]]" if inner.repeated else _below(path, inner.name))
    if isinstance(table.entry, Table):
        yield from _keys(table.entry, _below(path, "NAME"))
    elif table.entry is not None:
        yield _row(table.entry, path, "NAME")


def _below(path: str, name: str) -> str:
    return f"{path[:-1]}.{name}]" if path else f"[{name}]"


def _row(key: Key, path: str, name: str = "") -> Row:
    unit = key.dimension.unit or "-" if key.dimension is not None else ""
    return f"`{path} {name or key.name}`".replace("` ", "`"), key.symbol, unit, key.help


def _table(title: str, heads: Row, rows: Iterable[Row]) -> str:
    lines = [heads, ("---",) * len(heads), *rows]
    body = "\n".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |" for line in lines)
    return f"#### {title}\n\n{body}\n"


def tables() -> str:
    """The tables of the glossary, as Markdown."""
    heads = ("name", "symbol", "unit", "meaning")
    parts = [
        _table("Metrics", heads, ((f"`{m.key}`", m.symbol, m.dimension.unit or "-", m.help) for m in METRICS)),
        _table(
            "Operating point of a device",
            heads,
            ((f"`{v.key}`", v.symbol, v.dimension.unit or "-", v.help) for v in OPERATING_POINT),
        ),
        _table("Keys of biasbook.toml", heads, _keys(PROJECT)),
        _table("Keys of process/NAME.toml", heads, _keys(PROCESS)),
        _table("Keys of sheets/NAME.toml", heads, _keys(SHEET)),
        _table("What may stand beside a value", heads, _keys(ANNOTATIONS)),
        _table(
            "Dimensions",
            ("dimension", "SI unit", "as typed"),
            ((d.name, d.unit or "-", f"`{d.example}`" if d.example else "") for d in DIMENSIONS),
        ),
    ]
    return "\n".join(parts)


def updated(document: str) -> str:
    """The document with the tables as they should be.

    Raises:
        ValueError: The document does not hold the two marks between which the tables stand.
    """
    before, _, after = document.split(MARK)
    return f"{before}{MARK}\n{tables()}{MARK}{after}"


def main() -> int:
    """Check or write the document; exit status 1 where a check finds it outdated."""
    parser = argparse.ArgumentParser(description="the glossary of DEVELOPERS.md")
    parser.add_argument("--write", action="store_true", help="put the tables into the document")
    write = parser.parse_args().write
    found = DOCUMENT.read_text("utf-8")
    wanted = updated(found)
    if write:
        DOCUMENT.write_text(wanted, "utf-8")
        return 0
    print("agrees" if found == wanted else "outdated: run python -m tests.glossary --write")
    return int(found != wanted)


if __name__ == "__main__":
    sys.exit(main())
