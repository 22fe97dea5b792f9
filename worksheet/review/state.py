"""How far a block is: what its sheet states, unless the inputs moved that somebody accepted it for."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from worksheet.model.sheet import Sheet
from worksheet.review.evidence import is_stale

if TYPE_CHECKING:
    from worksheet.review.results import SheetReview

DRAFT, FOR_REVIEW, ACCEPTED = "draft", "for-review", "accepted"
"""States, in the order of a block's life."""


def state_of(sheet: Sheet, basis: str) -> tuple[str, str | None]:
    """The state that holds, and why it is not, or not surely, the one that is stated.

    An accepted sheet stays accepted while its digest is one that was accepted; else it falls back to for-review.

    Args:
        sheet: As its file states it.
        basis: Its present digest.
    Returns: (state, reason or None)
    """
    if sheet.state != ACCEPTED:
        return sheet.state, None
    if not sheet.acceptances:
        return ACCEPTED, "the sheet does not say by whom and for which inputs it was accepted"
    if any(one.basis == basis for one in sheet.acceptances):
        return ACCEPTED, None
    last = sheet.acceptances[-1]
    when = f" on {last.dated.isoformat()}" if last.dated is not None else ""
    return FOR_REVIEW, f"accepted by {last.by}{when} for inputs that have moved since"


@dataclass(frozen=True, slots=True)
class Past:
    """What was found or accepted for inputs that a sheet has left behind.

    Attributes:
        about: What it is, in words: an acceptance, or evidence on which metrics.
        basis: The digest of those inputs.
    """

    about: str
    basis: str


def left_behind(result: SheetReview) -> tuple[Past, ...]:
    """The acceptance and the evidence that a sheet's present inputs are no longer those of."""
    sheet, found = result.sheet, []
    if sheet.state == ACCEPTED and result.state != ACCEPTED and sheet.acceptances:
        last = sheet.acceptances[-1]
        found.append(Past(f"accepted by {last.by}", last.basis))
    stale: dict[str, list[str]] = {}
    for one in sheet.evidence:
        if one.basis and is_stale(one, result.basis):
            stale.setdefault(one.basis, []).append(one.metric)
    found += [Past(f"evidence on {', '.join(dict.fromkeys(names))}", basis) for basis, names in stale.items()]
    return tuple(found)
