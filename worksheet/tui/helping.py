"""Help: what has the focus, from its own description; then the keys of the screen, from the table of commands."""

from __future__ import annotations

from worksheet.model import metrics, operating
from worksheet.model.keys import Key, Kind
from worksheet.model.sheet_keys import SHEET
from worksheet.tui import commands
from worksheet.tui.keymap import Keys
from worksheet.tui.rows import Field, Row

_FORMS = {
    Kind.QUANTITY: "a number with its unit",
    Kind.TEXT: "text",
    Kind.WHOLE: "a whole number",
    Kind.DATE: "a date such as 2026-11-03",
    Kind.FORMULA: "a formula",
    Kind.FLAG: "true or false",
}


def paragraphs(place: str, row: Row | None, field: Field | None, keys: Keys) -> list[str]:
    """Paragraphs of the help page.

    Args:
        place: The screen.
        row: The row under the cursor.
        field: The field under the cursor.
        keys: Keys of the commands.
    """
    found = [] if field is None else of_key(field.key, field.title)
    found += [] if row is None else of_subject(*row.subject)
    found.append(f"# Keys: {commands.PLACES[place].lower()}")
    for one in commands.of_place(place):
        pressed = ", ".join(commands.shown_key(key) for key in keys.of(one))
        found.append(f"{pressed:<12} {one.title}: {one.help}")
    found.append("arrows, page up, page down, home, end move the cursor; left and right go from field to field.")
    return found


def of_key(key: Key, title: str) -> list[str]:
    """What a key means and what may be typed there."""
    found = [f"# {title}", key.help]
    if key.choices:
        found.append(f"One of: {', '.join(key.choices)}.")
    elif key.kind in _FORMS:
        unit = key.dimension.unit if key.dimension is not None else ""
        also = ", or a formula over names and SHEET.metric" if key.formula else ""
        low = f"; {key.range_text()}" if key.kind in (Kind.QUANTITY, Kind.WHOLE) and _bounded(key) else ""
        found.append(f"Takes {_FORMS[key.kind]}{f' in {unit}' if unit else ''}{low}{also}.")
    if key.example:
        found.append(f"For example: {key.example}")
    return found


def _bounded(key: Key) -> bool:
    return key.low is not None or key.high is not None


def of_subject(kind: str, name: str) -> list[str]:
    """What a row is about, beyond its fields."""
    if kind == "metric":
        metric = metrics.find(name)
        if metric is None:
            return ["A figure of your own: its formula gives it from the sheet's metrics and names."]
        relation = [f"Relation: {metric.relation}"] if metric.relation else []
        return [f"# {metric.title} {metric.symbol}", metric.help, *relation]
    if kind == "operating":
        value = next((one for one in operating.OPERATING_POINT if one.key == name), None)
        return [] if value is None else [f"# {value.title} {value.symbol}", value.help]
    if kind in ("evidence", "waiver"):
        table = SHEET.table(kind)
        return [] if table is None else [table.help]
    if kind == "bound":
        return [
            "# A bound",
            "Where a target is just met as this variable moves with the others held, in the worst condition.",
            "The bounds that set the ends of the window bind.",
        ]
    return []
