"""What is decided about a block, as requests: accept, send back, waive a miss, remark and settle, check a value.

Each is an ordinary change of a sheet, so it can be taken back like any other.
"""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from typing import Any

from worksheet.model.keys import TRUST
from worksheet.model.sheet_keys import ACCEPTANCE, REMARK, WAIVER
from worksheet.review.state import ACCEPTED, DRAFT
from worksheet.session.edits import AddEntry, ChangeSheet, KeyPath, Piece, Put


def accept(sheet: str, basis: str, by: str, today: datetime.date, note: str = "") -> ChangeSheet:
    """Accept a block for the inputs it has now.

    Args:
        sheet: Its name.
        basis: Its digest, as reviewed.
        by: Who accepts it.
        today: The day.
        note: On what grounds.
    """
    entry = _entry(by=by, basis=basis, dated=today, note=note)
    return ChangeSheet(sheet, (Put(("state",), ACCEPTED), AddEntry(ACCEPTANCE.name, entry)), f"accepted by {by}")


def waive(
    sheet: str,
    target: str,
    by: str,
    reason: str,
    today: datetime.date,
    value: str | float | None = None,
    until: datetime.date | None = None,
) -> ChangeSheet:
    """Accept a miss: for nothing worse than `value` (as typed, or in SI units of the metric) and until a day."""
    entry = _entry(target=target, by=by, reason=reason, value=value, dated=today, until=until)
    return ChangeSheet(sheet, (AddEntry(WAIVER.name, entry),), f"waived {target}")


def remark(sheet: str, by: str, text: str, today: datetime.date, to: str = "", about: str = "") -> ChangeSheet:
    """Say or ask something about a sheet or one of its keys."""
    entry = _entry(by=by, to=to, about=about, text=text, dated=today)
    return ChangeSheet(sheet, (AddEntry(REMARK.name, entry),), "remark" + (f" to {to}" if to else ""))


def send_back(sheet: str, by: str, text: str, today: datetime.date, to: str = "", about: str = "") -> ChangeSheet:
    """Make a draft of a block again, with a remark that says what is wanted and of whom."""
    made = remark(sheet, by, text, today, to, about)
    said = "sent back" + (f" to {to}" if to else "")
    return ChangeSheet(sheet, (Put(("state",), DRAFT), *made.pieces), said)


def settle(sheet: str, number: int, by: str, answer: str, today: datetime.date) -> ChangeSheet:
    """Settle a remark, counted from 0 in its sheet."""
    stated = _entry(answer=answer, settled=today, settled_by=by)
    pieces = tuple(Put((REMARK.name, number, key), value) for key, value in stated.items())
    return ChangeSheet(sheet, pieces, "settled a remark")


def check(sheet: str, path: KeyPath, by: str, today: datetime.date, trust: str = "") -> ChangeSheet:
    """Stand by a value that was looked up again, with the trust it now deserves; "" leaves that as it is.

    Raises: ValueError, for a trust that there is none of.
    """
    if trust and trust not in TRUST:
        raise ValueError(f"Found the trust {trust}, expected one of {', '.join(TRUST)}.")
    stated: list[Piece] = [Put((*path, "checked_by"), by), Put((*path, "checked"), today)]
    if trust:
        stated.insert(0, Put((*path, "trust"), trust))
    return ChangeSheet(sheet, tuple(stated), f"checked {path[-1]}")


def _entry(**values: Any) -> Mapping[str, Any]:
    """What is stated, without what is left out."""
    return {key: value for key, value in values.items() if value not in (None, "")}
