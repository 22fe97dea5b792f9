"""The weakest assumptions of a block first: least trust, then least room before a target breaks.

What could double or vanish without breaking anything comes last, however little it is trusted: nothing rests on it.
"""

from __future__ import annotations

import datetime
from dataclasses import dataclass

from worksheet.model.keys import TRUST
from worksheet.model.sheet import Process, Sheet, Value
from worksheet.project.links import values_of
from worksheet.review.fragility import Fragile, Fragility

_CHOSEN = "choose."
_AMPLE = 1.0
"""Room from which on nothing rests on a value. [-]"""


@dataclass(frozen=True, slots=True)
class Weak:
    """One value that a block rests on.

    Attributes:
        key: Dotted, such as assume.load_capacitance or process.nfet.kappa.
        value: Its number, None where a formula gives it. [unit]
        unit: SI unit.
        trust, source, note: What is stated beside it; "" for nothing.
        checked_by, checked: Who looked it up again, and when.
        room: The least relative move that breaks a target, at the nominal or a worst condition; None for none. [-]
        target: The target that breaks; "" for none.
        break_value: At which it does. [unit]
        standard_error: Of the value. [unit]
    """

    key: str
    value: float | None
    unit: str
    trust: str
    source: str
    note: str
    checked_by: str
    checked: datetime.date | None
    room: float | None
    target: str
    break_value: float | None
    standard_error: float | None


def weakest(sheet: Sheet, process: Process | None, ranked: Fragility) -> tuple[Weak, ...]:
    """Values that a block takes from elsewhere: what it assumes, its own names, its bias, and its devices' parameters.

    Choices are the designer's own and are left out; parameters without a break value too.

    Args:
        sheet: As its file states it.
        process: Its process file, for what stands beside a device's parameters; None where it cannot be read.
        ranked: Its fragility.
    Returns: least trust first (nothing stated is least), least room first among equals; then, in the same order, what
        has more room than its own size
    """
    rows = (*ranked.nominal, *ranked.worst)
    least: dict[str, Fragile] = {}
    for row in rows:
        known = least.get(row.name)
        if known is None or (row.room is not None and (known.room is None or row.room < known.room)):
            least[row.name] = row
    stated = {key: value for key, value in values_of(sheet).items() if not key.startswith(_CHOSEN)}
    found = [_weak(key, value, least.get(key)) for key, value in stated.items()]
    found += [
        _weak(name, _parameter(process, name), row)
        for name, row in least.items()
        if name not in stated and name.startswith("process.") and row.room is not None
    ]
    return tuple(sorted(found, key=_order))


def _parameter(process: Process | None, name: str) -> Value | None:
    """What the process file states of process.DEVICE.PARAMETER."""
    device, parameter = name.split(".")[1:]
    model = None if process is None else process.devices.get(device)
    return None if model is None else model.values.get(parameter)


def _weak(key: str, value: Value | None, row: Fragile | None) -> Weak:
    stated = value or Value()
    return Weak(
        key,
        row.value if row is not None else stated.number,
        row.unit if row is not None else stated.unit,
        row.trust if row is not None and not stated.trust else stated.trust,
        stated.source,
        stated.note,
        stated.checked_by,
        stated.checked,
        None if row is None else row.room,
        "" if row is None or row.room is None else row.target,
        None if row is None else row.break_value,
        row.standard_error if row is not None else stated.standard_error,
    )


def _order(one: Weak) -> tuple[bool, int, bool, float, str]:
    trust = TRUST.index(one.trust) if one.trust in TRUST else -1
    return one.room is None or one.room > _AMPLE, trust, one.room is None, one.room or 0.0, one.key
