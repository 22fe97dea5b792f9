"""The project's own file changed through texts as typed: title, conditions, budgets; an edit like any other."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from worksheet.model import metrics
from worksheet.model.project_keys import CONDITION
from worksheet.project.discover import PROJECT_FILE
from worksheet.session.edits import KeyPath, Piece, Put, RefusedError, TakeBack, TakeOut, changed_content, value_at
from worksheet.session.reading import data_of
from worksheet.session.snapshot import Snapshot


@dataclass(frozen=True, slots=True)
class Entry:
    """One thing that may be typed.

    Attributes:
        key: Dotted, within biasbook.toml.
        title, help: For people.
        text: As it stands; lists with commas.
        listed: Whether several values may stand there, with commas.
    """

    key: str
    title: str
    help: str
    text: str
    listed: bool = False


def entries(snapshot: Snapshot) -> tuple[Entry, ...]:
    """Everything of the project's file that may be typed, as it stands."""
    data = _data(snapshot)
    found = [
        Entry("title", "Title", "What the project is, for people.", _text(data.get("title"))),
        Entry("owner", "Owner", "Who answers for the project.", _text(data.get("owner"))),
    ]
    for key in CONDITION.keys:
        stated = value_at(data, ("conditions", key.name))
        found.append(Entry(f"conditions.{key.name}", f"{key.title}s", f"{key.help} With commas.", _text(stated), True))
    for key in CONDITION.keys:
        stated = value_at(data, ("conditions", "nominal", key.name))
        help_text = f"{key.title} at which nominal values are stated."
        found.append(Entry(f"conditions.nominal.{key.name}", f"Nominal {key.title.lower()}", help_text, _text(stated)))
    for metric in metrics.all_metrics():
        if metric.additive:
            stated = value_at(data, ("budget", metric.key, "max"))
            help_text = f"The most that all blocks may take, each times its count. Such as {metric.dimension.example}."
            found.append(Entry(f"budget.{metric.key}", f"Budget {metric.key}", help_text, _text(stated)))
    return tuple(found)


def change(snapshot: Snapshot, texts: Mapping[str, str]) -> TakeBack | None:
    """The edit that makes the project's file state what was typed; None where nothing differs.

    Args:
        snapshot: The book.
        texts: By key of `entries`; an empty text takes the key out.
    Raises: RefusedError, WriteRefusedError (a ValueError), where the file cannot be changed in place.
    """
    content = snapshot.contents.get(PROJECT_FILE)
    if content is None:
        raise RefusedError("", f"There is no {PROJECT_FILE} that can be read.")
    data = _data(snapshot)
    pieces: list[Piece] = []
    for entry in entries(snapshot):
        text = texts.get(entry.key, entry.text).strip()
        if text != entry.text:
            pieces.append(_piece(data, entry, text))
    if not pieces:
        return None
    return TakeBack("", {PROJECT_FILE: changed_content(content, pieces)}, "project's conditions and budgets changed")


def _piece(data: Mapping[str, Any], entry: Entry, text: str) -> Piece:
    path: KeyPath = tuple(entry.key.split("."))
    if path[0] == "budget":
        if not text:
            return TakeOut(path)
        return Put((*path, "max"), text) if value_at(data, path) is not None else Put(path, {"max": text})
    if not text:
        return TakeOut(path)
    return Put(path, [one.strip() for one in text.split(",") if one.strip()] if entry.listed else text)


def _data(snapshot: Snapshot) -> Mapping[str, Any]:
    return data_of(snapshot.contents.get(PROJECT_FILE, b""), PROJECT_FILE)


def _text(stated: Any) -> str:
    if stated is None:
        return ""
    if isinstance(stated, list):
        return ", ".join(_text(one) for one in stated)
    return str(getattr(stated, "text", stated))
