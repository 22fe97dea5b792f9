"""One step of a value up or down: a point of the grid, a finger, or a share of what stands there.

Steps give round numbers and meet them again on the way back.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from worksheet.model.keys import Key, Kind
from worksheet.model.quantity import QuantityError, format_input, parse
from worksheet.model.sheet_keys import FINGERS, GEOMETRY
from worksheet.session.edits import Piece, Put, value_at
from worksheet.session.fields import Place
from worksheet.session.snapshot import Snapshot

GRID, FINGER = "grid", "finger"
SHARES = {"1 %": 0.01, "5 %": 0.05, "20 %": 0.2, "double": 1.0}
KINDS = (GRID, FINGER, *SHARES)
"""Kinds of step, as they are called."""

_DIGITS = 4


@dataclass(frozen=True, slots=True)
class Stepped:
    """Where a step leads: the pieces of the request, and what it comes to in words."""

    pieces: tuple[Piece, ...]
    text: str


def step(snapshot: Snapshot, place: Place, kind: str, *, up: bool, present: float | None = None) -> Stepped | str:
    """One step of the value at a place, or a sentence that says why there is none.

    Args:
        snapshot: The book.
        place: The value.
        kind: One of KINDS.
        up: Whether more is wanted.
        present: The value where the sheet does not state it itself (a proposal). [SI]
    """
    data = snapshot.data(place.sheet)
    if place.key.kind is Kind.WHOLE:
        whole = value_at(data, place.path)
        now = whole if isinstance(whole, int) else int(place.key.default or 1)
        return _checked(place, now + (1 if up else -1))
    if place.key.kind is not Kind.QUANTITY or place.key.dimension is None:
        return f"{place.key.title} has no steps."
    value = _number(data, place) if present is None else present
    if value is None:
        return f"{place.key.title} is no number that can be stepped."
    base = str(place.path[-1]).rpartition("_")[2]
    if kind == GRID and base in GEOMETRY:
        return _sized(place, _on_grid(value, _grid(snapshot, data, str(place.path[-1])), up=up))
    if kind == FINGER and base == GEOMETRY[0]:
        return _finger(data, place, value, up=up)
    return _sized(place, _share(value, SHARES.get(kind, 0.05), up=up))


def _number(data: Mapping[str, Any], place: Place) -> float | None:
    stated = value_at(data, place.path)
    if isinstance(stated, Mapping):
        stated = stated.get("value")
    try:
        return None if stated is None or place.key.dimension is None else parse(stated, place.key.dimension)
    except QuantityError:
        return None


def _grid(snapshot: Snapshot, data: Mapping[str, Any], name: str) -> float:
    """The grid of the device that a size belongs to. [m]"""
    process = snapshot.project.process
    owner = "bias" if name.startswith("bias_") else "device"
    device = value_at(data, ("bias", "device")) if owner == "bias" else data.get("device")
    model = process.devices.get(str(device)) if process is not None else None
    return model.number("grid") if model is not None else 5e-9


def _on_grid(value: float, grid: float, *, up: bool) -> float:
    """The next point of the grid; from between two points, the nearer end. [m]"""
    points = value / grid
    on = math.isclose(points, round(points), rel_tol=1e-9)
    count = round(points) + (1 if up else -1) if on else math.ceil(points) if up else math.floor(points)
    return float(f"{count * grid:.12g}")


def _share(value: float, share: float, *, up: bool) -> float:
    """A share more, or as much less as leads back, to few digits."""
    moved = value * (1 + share) if up else value / (1 + share)
    return float(f"{moved:.{_DIGITS}g}")


def _finger(data: Mapping[str, Any], place: Place, value: float, *, up: bool) -> Stepped | str:
    """One finger more or less, each as wide as before."""
    name = str(place.path[-1])
    key = name.replace(GEOMETRY[0], FINGERS.name)
    stated = value_at(data, ("choose", key))
    fingers = stated if isinstance(stated, int) else 1
    count = fingers + (1 if up else -1)
    if count < 1:
        return "There is one finger only."
    sized = _sized(place, float(f"{value / fingers * count:.12g}"))
    if isinstance(sized, str):
        return sized
    return Stepped((*sized.pieces, Put(("choose", key), count)), f"{sized.text}, {count} fingers")


def _sized(place: Place, value: float) -> Stepped | str:
    assert place.key.dimension is not None  # asked for quantities with a unit only
    wanted = place.key.outside(value)
    text = format_input(value, place.key.dimension)
    if wanted is not None or value <= 0:
        return f"{place.key.title} cannot go there: expected {wanted or 'more than nothing'}."
    stated: Any = float(text) if place.key.dimension.plain else text
    return Stepped((Put(place.path, stated),), text)


def _checked(place: Place, value: int) -> Stepped | str:
    key: Key = place.key
    wanted = key.outside(float(value))
    if wanted is not None:
        return f"{key.title}: expected {wanted}."
    return Stepped((Put(place.path, value),), str(value))
