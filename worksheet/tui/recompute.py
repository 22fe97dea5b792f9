"""Work off the event loop: one thread, newest wanted state first, results stamped with the revision they belong to.

A result that comes late (its revision is no longer the newest) is dropped where it arrives, never shown.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass
from typing import Generic, TypeVar

Result = TypeVar("Result")


@dataclass(frozen=True, eq=False, slots=True)
class Stamped(Generic[Result]):
    """A result, the revision of the book it was computed for, or why there is none."""

    revision: int
    value: Result | None
    error: str | None = None


class Recompute(Generic[Result]):
    """Runs the newest job only: one that has not begun when a newer one comes is never begun.

    Args:
        deliver: Called in the worker's thread with each stamped result; hands it to the event loop.
    """

    def __init__(self, deliver: Callable[[Stamped[Result]], None]) -> None:
        self._deliver = deliver
        self._wake = threading.Condition()
        self._wanted: tuple[int, Callable[[], Result]] | None = None
        self._stopped = False
        self._thread: threading.Thread | None = None

    def want(self, revision: int, job: Callable[[], Result]) -> None:
        """Ask for a result; replaces what was asked for before and has not begun."""
        with self._wake:
            self._wanted = (revision, job)
            if self._thread is None:
                self._thread = threading.Thread(target=self._run, name="recompute", daemon=True)
                self._thread.start()
            self._wake.notify()

    def stop(self) -> None:
        """Begin nothing more."""
        with self._wake:
            self._stopped = True
            self._wanted = None
            self._wake.notify()

    def _run(self) -> None:
        while True:
            with self._wake:
                while self._wanted is None and not self._stopped:
                    self._wake.wait()
                if self._stopped or self._wanted is None:
                    return
                revision, job = self._wanted
                self._wanted = None
            self._deliver(self._made(revision, job))

    @staticmethod
    def _made(revision: int, job: Callable[[], Result]) -> Stamped[Result]:
        try:
            return Stamped(revision, job())
        except Exception as error:  # noqa: BLE001 - a fault in a result must not end the thread; it is shown
            return Stamped(revision, None, f"{type(error).__name__}: {error}")
