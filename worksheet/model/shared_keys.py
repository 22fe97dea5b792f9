"""Keys that sheets and the project file share: what a target may say, and the tolerance of settling."""

from __future__ import annotations

from worksheet.model import dimension as dim
from worksheet.model.keys import Key, Kind

SETTLING_TOLERANCE = Key(
    "settling_tolerance",
    "Settling tolerance",
    "Share of the final change within which the output counts as settled.",
    dimension=dim.NUMBER,
    symbol="eps",
    low_open=True,
    high=0.5,
    high_open=True,
    default=1e-3,
    annotated=True,
    formula=True,
    example="0.1 %",
)

AT = Key(
    "at",
    "At",
    '"nominal", or every condition where left out.',
    Kind.CHOICE,
    choices=("all", "nominal"),
    default="all",
    moves_results=False,
)

TARGET_KEYS = (
    Key("min", "At least", "The least value that is acceptable.", low=None, moves_results=False),
    Key("max", "At most", "The greatest value that is acceptable.", low=None, moves_results=False),
    AT,
    Key(
        "guard",
        "Guard",
        "Wanted beyond the limit, as a fraction of it.",
        dimension=dim.NUMBER,
        default=0.0,
        example="0.1",
        moves_results=False,
    ),
    Key(
        "yield",
        "Yield",
        "Share of parts within the limit; for offset_limit.",
        dimension=dim.NUMBER,
        low_open=True,
        high=1.0,
        high_open=True,
        default=0.9973,
        moves_results=False,
    ),
    Key(
        "formula",
        "Formula",
        "A figure of your own over this sheet's names and metrics.",
        Kind.FORMULA,
        moves_results=False,
    ),
    Key("unit", "Unit", "Unit of a figure of your own; text without a prefix.", Kind.TEXT, moves_results=False),
    Key("id", "Requirement", "Number of the requirement in the specification.", Kind.TEXT, moves_results=False),
    Key("source", "Source", "Where the target came from.", Kind.TEXT, moves_results=False),
    Key("why", "Why", "What the target is for.", Kind.TEXT, moves_results=False),
)
"""What a target may say. min and max take the dimension of the metric."""
