"""Whether the user's locale asks for plain ASCII."""

from __future__ import annotations

from collections.abc import Mapping

_PLAIN = ("C", "POSIX")
_COERCED = ("C.UTF-8", "C.utf8", "UTF-8")
"""What Python puts into LC_CTYPE of its own where the locale is C (PEP 538): nobody asked for that."""


def asks_for_ascii(environment: Mapping[str, str]) -> bool:
    """Whether the locale that counts is stated, and is C or POSIX.

    Args:
        environment: Of the process; LC_ALL counts before LC_CTYPE before LANG (POSIX.1, section 8.2).
    """
    everything, characters, language = (environment.get(name, "") for name in ("LC_ALL", "LC_CTYPE", "LANG"))
    if characters in _COERCED and language in _PLAIN:
        characters = ""
    return (everything or characters or language) in _PLAIN
