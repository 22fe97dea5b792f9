"""About how wide mathematics comes out, so that it can be set smaller before the edge of the paper cuts it off."""

from __future__ import annotations

from xml.etree import ElementTree

_SIZES = ((88.0, "full"), (118.0, "small"), (150.0, "smaller"))
"""Widths that fit on A4, and the size at which they do. [characters]"""

_SCRIPT = 0.75


def size_of(element: ElementTree.Element) -> str | None:
    """The size at which a MathML element fits on the paper: "full", "small", "smaller", None where at none."""
    wide = width(element)
    return next((name for most, name in _SIZES if wide <= most), None)


def width(element: ElementTree.Element) -> float:
    """About how wide a MathML element is. [characters]"""
    name = element.tag.rpartition("}")[2]
    inner = [width(part) for part in element]
    if not inner:
        return len(element.text or "") + (1.0 if name == "mo" else 0.0)
    if name == "mfrac":
        return max(inner) + 0.5
    if name in ("msub", "msup", "msubsup"):
        return inner[0] + _SCRIPT * max(inner[1:])
    return sum(inner) + (1.5 if name in ("msqrt", "mroot", "mfenced") else 0.0)
