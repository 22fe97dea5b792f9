"""Adding to a sheet: what, which, and a form whose lines come from the descriptions of the keys."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from worksheet.model import metrics
from worksheet.model.keys import ANNOTATIONS, Key
from worksheet.model.sheet_keys import EVIDENCE, REMARK, TARGET_KEYS, WAIVER
from worksheet.model.text import is_identifier
from worksheet.session import fields, revisions
from worksheet.session.edits import AddEntry, ChangeSheet, KeyPath, Piece, Put
from worksheet.session.fields import Place as FieldPlace
from worksheet.tui.dialogs.form import FormDialog, FormLine
from worksheet.tui.dialogs.pick import Item, PickDialog
from worksheet.tui.recomputed import today
from worksheet.tui.screens.changing import path_of
from worksheet.tui.screens.forming import submit

if TYPE_CHECKING:
    from worksheet.tui.screens.sheet import SheetScreen

_FIGURE = "figure of your own"
_KINDS = (
    Item("target", "Target", "What a metric must reach, with its requirement and why."),
    Item("assume", "Assumption", "What is imposed on the block, with its range, source and trust."),
    Item("own", "Own name", "A number of your own and the formula that uses it."),
    Item("evidence", "Evidence", "What a simulation or a bench found."),
    Item("waiver", "Waiver", "A miss that is accepted, by whom and why."),
    Item("remark", "Remark", "What is to be said or asked about the sheet or one of its values."),
)
_NOTES = ("low", "high", "source", "trust", "note")


def ask(screen: SheetScreen) -> None:
    """Ask what is to be added."""
    row = screen.ledger.row
    present = row.key.partition(".")[0] if row is not None else ""

    def done(kind: str | None) -> None:
        if kind is not None:
            _KINDS_DONE[kind](screen)

    screen.app.push_screen(PickDialog("Add", _KINDS, screen.book.signs, present), done)


def _assume(screen: SheetScreen) -> None:
    data = screen.snapshot.data(screen.name_of_sheet)
    taken = {*_table(data, "assume"), *_table(data, "choose")}
    items = [
        Item(key.name, f"{key.title} {key.symbol}".rstrip(), key.help, key.symbol)
        for key in fields.stage_keys(data).values()
        if key.name not in taken
    ]

    def done(name: str | None) -> None:
        if name is not None:
            places = _noted(screen, ("assume", name))
            _form(screen, f"Assume {name}", places, lambda values: (Put(("assume", name), _stated(values)),))

    screen.app.push_screen(PickDialog("Assume", items, screen.book.signs), done)


def _target(screen: SheetScreen) -> None:
    data = screen.snapshot.data(screen.name_of_sheet)
    taken = _table(data, "target")
    result = None if screen.book.results is None else screen.book.results.sheet(screen.name_of_sheet)
    known = metrics.keys() if result is None else tuple(result.metrics)
    items = [Item(key, key, _help(key)) for key in known if key not in taken]
    items.append(Item(_FIGURE, _FIGURE, "A formula over this sheet's metrics and names."))

    def done(name: str | None) -> None:
        if name == _FIGURE:
            _figure(screen)
        elif name is not None:
            places = _target_places(screen, name)
            _form(screen, f"Target {name}", places, lambda values: (Put(("target", name), values),))

    screen.app.push_screen(PickDialog("Target", items, screen.book.signs), done)


def _help(name: str) -> str:
    metric = metrics.find(name)
    return "" if metric is None else f"{metric.title} {metric.symbol}: {metric.help}"


def _target_places(screen: SheetScreen, name: str, *, figure: bool = False) -> dict[str, FieldPlace]:
    metric = metrics.find(name)
    left_out = set() if figure else {"formula", "unit"}
    if metric is None or not metric.of_yield:
        left_out.add("yield")
    keys = [key.name for key in TARGET_KEYS if key.name not in left_out]
    order = ["formula", *keys] if figure else keys
    return _places(screen, {key: ("target", name, key) for key in dict.fromkeys(order)})


def _figure(screen: SheetScreen) -> None:
    def pieces(values: Mapping[str, Any]) -> tuple[Piece, ...]:
        rest = dict(values)
        return (Put(("target", str(rest.pop("name"))), rest),)

    places = _target_places(screen, "figure", figure=True)
    _form(screen, "A figure of your own", places, pieces, lead=(_name("Of the figure, as a formula would call it."),))


def _own(screen: SheetScreen) -> None:
    """A name and the formula that uses it, since a sheet has no unused names."""
    data = screen.snapshot.data(screen.name_of_sheet)
    stated = [f"{table}.{name}" for table in ("assume", "choose", "target") for name in _table(data, table)]
    used = FormLine(
        "used in",
        "Used in",
        "Where a formula uses the name: " + ", ".join(stated),
        stated[0] if stated else "",
        lambda text: "" if text in stated else f"Found {text}, expected one of {', '.join(stated)}.",
        lambda text: [one for one in stated if one.startswith(text) and one != text],
    )
    formula = FormLine("as", "By the formula", "The formula that then stands there, such as 2*my_name.")

    def pieces(values: Mapping[str, Any]) -> tuple[Piece, ...]:
        rest = dict(values)
        name, table, text = str(rest.pop("name")), str(rest.pop("used in", "")), str(rest.pop("as", ""))
        own = Put(("own", name), _stated(rest))
        return (own, Put((*table.split(".", 1), "formula"), text)) if table and text else (own,)

    lead = (_name("For formulas: letters, digits and _."),)
    _form(screen, "A name of your own", _noted(screen, ("own", "name")), pieces, lead=lead, tail=(used, formula))


def _evidence(screen: SheetScreen) -> None:
    result = None if screen.book.results is None else screen.book.results.sheet(screen.name_of_sheet)
    texts = {"metric": _subject(screen), "basis": "" if result is None else result.basis}
    _entry(screen, "evidence", EVIDENCE.keys, "metric", texts)


def _waiver(screen: SheetScreen) -> None:
    _entry(screen, "waiver", WAIVER.keys, "target", {"target": _subject(screen)})


def _remark(screen: SheetScreen) -> None:
    row = screen.ledger.row
    about = ".".join(map(str, found)) if row is not None and (found := path_of(row)) else ""
    person = revisions.identity(screen.snapshot.project.root)
    texts = {"by": person, "about": about, "dated": today().isoformat()}
    _entry(screen, "remark", REMARK.keys, "about", texts)


def _subject(screen: SheetScreen) -> str:
    row = screen.ledger.row
    return row.subject[1] if row is not None and row.key.startswith("target.") else ""


def _entry(screen: SheetScreen, array: str, keys: tuple[Key, ...], about: str, texts: Mapping[str, str]) -> None:
    places = {
        key.name: place
        for key in keys
        if (place := fields.coming(screen.snapshot, screen.name_of_sheet, (array, 0, key.name), texts[about]))
    }
    _form(screen, f"Add {array}", places, lambda values: (AddEntry(array, values),), texts=texts)


# Forms


def _noted(screen: SheetScreen, path: KeyPath) -> dict[str, FieldPlace]:
    return _places(screen, {"value": path, **{note: (*path, note) for note in _NOTES}})


def _places(screen: SheetScreen, paths: Mapping[str, KeyPath]) -> dict[str, FieldPlace]:
    found = {key: fields.place(screen.snapshot, screen.name_of_sheet, path) for key, path in paths.items()}
    return {key: place for key, place in found.items() if place is not None}


def _name(help: str) -> FormLine:  # noqa: A002
    def wrong(text: str) -> str:
        return "" if is_identifier(text) else "Letters, digits and _ only."

    return FormLine("name", "Name", help, check=wrong)


def _stated(values: Mapping[str, Any]) -> Any:
    """A value alone where nothing stands beside it, else a table."""
    return values["value"] if set(values) == {"value"} else dict(values)


def _form(
    screen: SheetScreen,
    title: str,
    places: Mapping[str, FieldPlace],
    pieces: Any,
    *,
    lead: tuple[FormLine, ...] = (),
    tail: tuple[FormLine, ...] = (),
    texts: Mapping[str, str] | None = None,
) -> None:
    """Show a form of places, and have made what its texts come to."""
    lines = [*lead, *(_line(key, place, (texts or {}).get(key, "")) for key, place in places.items()), *tail]

    def taken(typed: Mapping[str, str]) -> str:
        values: dict[str, Any] = {line.key: typed[line.key] for line in (*lead, *tail) if typed[line.key]}
        if any(not typed[line.key] for line in lead):
            return f"{lead[0].title} is needed."
        for key, place in places.items():
            text = typed[key]
            if not text and not place.required:
                continue
            found = fields.read(place, text)
            if isinstance(found, str):
                return found
            values |= _read(key, found)
        if not set(values) - {line.key for line in lead}:
            return "Nothing is stated yet."
        if places.keys() >= {"value", *_NOTES} and not {"value", "formula"} & set(values):
            return "A value is needed."
        return submit(screen.book, ChangeSheet(screen.name_of_sheet, pieces(values), title))

    def done(accepted: bool | None) -> None:
        if accepted:
            screen.say(screen.snapshot.undo)

    screen.app.push_screen(FormDialog(title, lines, taken, screen.book.signs), done)


def _read(key: str, found: tuple[Piece, ...]) -> dict[str, Any]:
    (piece,) = found
    if not isinstance(piece, Put):
        return {}
    return {"formula" if piece.path[-1] == "formula" else key: piece.value}


def _line(key: str, place: FieldPlace, text: str) -> FormLine:
    described = place.key
    needed = " (needed)" if place.required else ""
    example = f" Such as {described.example}." if described.example else ""
    title = ANNOTATIONS.keys[0].title if key == "value" else described.title

    def wrong(typed: str) -> str:
        found = fields.read(place, typed)
        return found if isinstance(found, str) else ""

    return FormLine(
        key, f"{title}{needed}", described.help + example, text, wrong, lambda typed: fields.complete(place, typed)
    )


def _table(data: Mapping[str, Any], name: str) -> list[str]:
    table = data.get(name)
    return list(table) if isinstance(table, Mapping) else []


_KINDS_DONE = {
    "target": _target,
    "assume": _assume,
    "own": _own,
    "evidence": _evidence,
    "waiver": _waiver,
    "remark": _remark,
}
