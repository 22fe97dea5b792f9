"""The glossary and the units of DEVELOPERS.md against the descriptions that the program runs on."""

from tests import glossary
from worksheet.model.metrics import METRICS


def test_document_holds_the_tables_as_described() -> None:
    found = glossary.DOCUMENT.read_text("utf-8")
    assert found == glossary.updated(found), "run: python -m tests.glossary --write"


def test_every_metric_has_a_row_of_its_own() -> None:
    rows = glossary.tables().splitlines()
    for metric in METRICS:
        assert len([row for row in rows if row.startswith(f"| `{metric.key}` |")]) >= 1


def test_no_two_names_share_a_meaning() -> None:
    meanings: dict[str, set[str]] = {}
    for row in glossary.tables().splitlines():
        if row.startswith("| `"):
            name, *_, meaning = (cell.strip() for cell in row.strip("|").split(" | "))
            meanings.setdefault(meaning, set()).add(name.strip("`").rpartition(" ")[2])
    assert {meaning: names for meaning, names in meanings.items() if len(names) > 1} == {}
