"""What was decided between two states of a project: accepted, sent back, waived, remarked, settled, checked.

Read off the sheets themselves, so that whatever was decided stands there however the meeting ended.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from worksheet.model.sheet import Remark, Sheet, Value
from worksheet.project.links import values_of


@dataclass(frozen=True, slots=True)
class Decision:
    """One decision.

    Attributes:
        sheet: The block.
        about: A target or a dotted key; "" for the block as a whole.
        what: "accepted", "waived", "sent back", ...; or "state" with what it is now.
        by: Who decided; "" where the sheet does not say.
        said: The reason, the remark or the answer.
    """

    sheet: str
    about: str
    what: str
    by: str
    said: str


def decisions(old: Mapping[str, Sheet], new: Mapping[str, Sheet]) -> tuple[Decision, ...]:
    """What was decided between two states, in the order of the sheets.

    Args:
        old, new: Sheets by name, as their files state them; a sheet that one state lacks has no decisions.
    """
    return tuple(one for name, sheet in new.items() if name in old for one in _of(old[name], sheet))


def _of(old: Sheet, new: Sheet) -> Iterator[Decision]:
    accepted = [one for one in new.acceptances if one not in old.acceptances]
    for acceptance in accepted:
        yield Decision(new.name, "", "accepted", acceptance.by, acceptance.note)
    for waiver in new.waivers:
        if waiver not in old.waivers:
            until = f" until {waiver.until.isoformat()}" if waiver.until is not None else ""
            yield Decision(new.name, waiver.target, f"waived{until}", waiver.by, waiver.reason)
    for waiver in old.waivers:
        if not any(waiver.target == other.target for other in new.waivers):
            yield Decision(new.name, waiver.target, "waiver taken back", "", "")
    if new.state != old.state and not accepted:
        yield Decision(new.name, "", f"state: {old.state} -> {new.state}", "", "")
    yield from _remarks(old, new)
    yield from _checks(old, new)


def _remarks(old: Sheet, new: Sheet) -> Iterator[Decision]:
    before = {_known(remark): remark for remark in old.remarks}
    for remark in new.remarks:
        was = before.get(_known(remark))
        if was is None:
            yield Decision(new.name, remark.about, "remark" + (f" to {remark.to}" if remark.to else ""), remark.by,
                           remark.text)  # fmt: skip
        if not remark.open and (was is None or was.open):
            yield Decision(new.name, remark.about, "remark settled", remark.settled_by, remark.answer or remark.text)


def _known(remark: Remark) -> tuple[str, str, str]:
    return remark.by, remark.about, remark.text


def _checks(old: Sheet, new: Sheet) -> Iterator[Decision]:
    before = values_of(old)
    for key, value in values_of(new).items():
        was = before.get(key, Value())
        if (value.checked, value.checked_by) != (was.checked, was.checked_by) and value.checked is not None:
            trust = f", trust {was.trust or 'none'} -> {value.trust}" if value.trust != was.trust else ""
            yield Decision(new.name, key, f"checked{trust}", value.checked_by, value.source)
