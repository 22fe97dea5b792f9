"""How far a block is: what its sheet states, unless the inputs moved that somebody accepted it for."""

from __future__ import annotations

from worksheet.model.sheet import Sheet

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
