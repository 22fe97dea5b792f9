"""What reading single files cannot show of a chain: whether its sheets exist, and often enough."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Iterator, Mapping

from worksheet.model.problem import Problem
from worksheet.model.sheet import ProjectFile, Sheet
from worksheet.model.text import clean, nearest


def chain_problems(file: ProjectFile, sheets: Mapping[str, Sheet], bad: Collection[str]) -> Iterator[Problem]:
    """Sheets of chains that are not there, and sheets that a path uses more often than the chip has them.

    Args:
        file: The project file.
        sheets: Sheets that could be read.
        bad: Names of sheets with problems of their own; they are there.
    """
    for chain in file.chains.values():
        where = f"chain.{chain.name}.sheets"
        for place, name in enumerate(chain.sheets):
            if name not in sheets and name not in bad:
                near = nearest(name, [*sheets, *bad])
                hint = f'; did you mean "{near}"?' if near else "."
                key = f"{where}.{place}"
                message = f'Found "{clean(name)}", expected a sheet of this project{hint}'
                yield Problem(file.file, file.lines.get(key, file.lines.get(where)), key, message)
        for name, times in Counter(chain.sheets).items():
            if name in sheets and times > sheets[name].count:
                has = sheets[name].count
                message = (
                    f'Found "{name}" {times} times in one path, expected at most {has}: its count says that the chip '
                    f"has {has} of it, and a path that came back to one block would be a loop."
                )
                yield Problem(file.file, file.lines.get(where), where, message)
