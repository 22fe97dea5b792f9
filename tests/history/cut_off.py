"""A record that kills itself at a given step: python cut_off.py PROJECT STEP NOTE.

A step is the moment before or after anything that can leave a trace: a call of git, or a change of the file system.
Exit status 0 where the record ended before that step. It prints a line when the record begins, for whoever kills it
from outside.
"""

import os
import shutil
import signal
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

from worksheet.history import lock, program, record, repository
from worksheet.history.own import own_files

steps = 0


def main() -> None:
    """Record, with every such call counted."""
    project, last, note = Path(sys.argv[1]), int(sys.argv[2]), sys.argv[3]

    def count() -> None:
        global steps  # noqa: PLW0603 - one counter for the one thing this program does
        steps += 1
        if steps == last:
            os.kill(os.getpid(), signal.SIGKILL)

    def counted(original: Callable[..., Any]) -> Callable[..., Any]:
        def call(*arguments: Any, **others: Any) -> Any:
            count()
            try:
                return original(*arguments, **others)
            finally:
                count()

        return call

    place = repository.find(project)
    assert isinstance(place, repository.Repository)
    files = own_files(project)
    program.run = counted(program.run)
    os.link = counted(os.link)
    shutil.rmtree = counted(shutil.rmtree)  # type: ignore[assignment]
    for name in ("replace", "unlink", "write_text", "write_bytes"):
        setattr(Path, name, counted(getattr(Path, name)))
    lock._claim = counted(lock._claim)
    print("begins", flush=True)
    made = record.record(place, files, note=note)
    assert isinstance(made, record.Recorded), made


if __name__ == "__main__":
    main()
