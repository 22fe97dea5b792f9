"""Documents of a project written from plain dicts, for tests; nothing of the program is used."""

from __future__ import annotations

import json
from typing import Any

Document = dict[str, Any]


def to_toml(document: Document) -> str:
    """Nested dicts as TOML with tables; numbers as their shortest reprs."""
    lines: list[str] = []

    def section(title: str, table: Document) -> None:
        scalars = {key: value for key, value in table.items() if not isinstance(value, dict)}
        if title and (scalars or not table):
            lines.append(f"\n[{title}]")
        lines.extend(f"{key} = {json.dumps(value, ensure_ascii=False)}" for key, value in scalars.items())
        for key, value in table.items():
            if isinstance(value, dict):
                section(f"{title}.{key}" if title else key, value)

    section("", document)
    return "\n".join(lines) + "\n"
