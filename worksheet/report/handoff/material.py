"""What a hand-off is made of: results, gathered by the session, as frozen data."""

from __future__ import annotations

import datetime
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from worksheet.compare.compared import Comparison, SheetChange
from worksheet.device.arrays import Array
from worksheet.history.revisions import Revision
from worksheet.model.keys import Key
from worksheet.model.sheet import Condition
from worksheet.review.pictured import Margins, Response
from worksheet.review.results import Review, SheetReview
from worksheet.review.weakest import Weak
from worksheet.solver.explanation import Explanation
from worksheet.solver.relief import Relief
from worksheet.solver.results import Solved
from worksheet.stages.circuit import Circuit

Hand = Mapping[str, Any]
"""Method, formula and hand value of a bound, as in the solve document."""


@dataclass(frozen=True, eq=False)
class Block:
    """One block.

    Attributes:
        review: Its sheet and what was found.
        circuit: Its stage with the sheet's options.
        models: The process file's device behind each transistor, by the transistor's name.
        weak: What it rests on, weakest first.
        solved: What is needed, None where nothing could be found, with the reason.
        keys: Descriptions of the windows' variables.
        hand: Algebra of the bounds that set a window, by window and side.
        algebra: Of every target, at the nominal condition.
        margins, response, relief: What its pictures are drawn from; None where there is nothing to draw.
        nominal: Its nominal condition.
    """

    review: SheetReview
    circuit: Circuit
    models: Mapping[str, str]
    weak: tuple[Weak, ...]
    solved: Solved | None
    keys: Mapping[str, Key]
    hand: Mapping[tuple[str, str], Hand]
    algebra: tuple[Explanation, ...]
    margins: Margins
    response: Response | None
    relief: Relief | None
    nominal: Condition
    unsolved: str = ""

    @property
    def name(self) -> str:
        """The sheet's name."""
        return self.review.sheet.name


@dataclass(frozen=True, slots=True)
class Origin:
    """The revision that a hand-off was made from ("" for none), and whether the files held more than it."""

    revision: str = ""
    changed: bool = False


@dataclass(frozen=True, eq=False)
class Since:
    """What moved since another state.

    Attributes:
        origin: What the last hand-off was made from.
        dated: Its day; "" where it is not known.
        comparison: What differs; None where it cannot be told, for the reason `why_not`.
        revisions: What was recorded meanwhile, newest first: the notes say why.
    """

    origin: Origin
    dated: str = ""
    comparison: Comparison | None = None
    revisions: tuple[Revision, ...] = ()
    why_not: str = ""

    def change(self, name: str) -> SheetChange | None:
        """What differs of one sheet."""
        every = () if self.comparison is None else self.comparison.sheets
        return next((one for one in every if one.sheet == name), None)


@dataclass(frozen=True, eq=False)
class Fit:
    """A device that was fitted to curves.

    Attributes:
        device, polarity: The device of the process file.
        stated: What [fitted.NAME] says.
        gate: Gate voltage from the source. [V], shape (points,)
        currents: Current that the parameters imply, by drain-source voltage [V]. [A], shape (points,)
        measured: Rows of the tables it was fitted to, as (gate voltage [V], current [A]), by drain-source voltage [V].
        width, length: That the curves are drawn for. [m]
    """

    device: str
    polarity: str
    stated: Mapping[str, Any]
    gate: Array
    currents: Mapping[float, Array]
    measured: Mapping[float, Sequence[tuple[float, float]]]
    width: float
    length: float


@dataclass(frozen=True, eq=False)
class HandOff:
    """A hand-off of blocks or of a whole project.

    Attributes:
        review: The project.
        owner, process: Who answers for it; the title of its process file.
        dated: The day of the hand-off.
        origin: What it is made from.
        since: What moved since the last one; None where this is the first that is known.
        blocks: What is handed over, in the order of the project.
        fits: Devices with a fit behind them.
        conditions: How many there are, in words.
    """

    review: Review
    owner: str
    process: str
    dated: datetime.date
    origin: Origin
    since: Since | None
    blocks: tuple[Block, ...]
    fits: tuple[Fit, ...] = ()
    conditions: str = ""
    whole: bool = True
    notes: Mapping[str, str] = field(default_factory=dict)
