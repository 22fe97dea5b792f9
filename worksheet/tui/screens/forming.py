"""Requests that come from forms: handed to the session, and what it says brought back as one sentence."""

from __future__ import annotations

from typing import TYPE_CHECKING

from worksheet.session.edits import Request

if TYPE_CHECKING:
    from worksheet.tui.app import BookApp


def submit(book: BookApp, request: Request) -> str:
    """Have something changed. Says what is wrong, "" where it was accepted."""
    outcome = book.change(request)
    if outcome.accepted:
        return ""
    if outcome.problems:
        problem = outcome.problems[0]
        return f"{problem.key}: {problem.message}" if problem.key else problem.message
    return "Somebody else changed this at the same time; look at it again."
