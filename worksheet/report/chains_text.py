"""A chain as a designer reads it: what the path achieves, and what each of its sheets takes."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model.text import clean
from worksheet.report import wording
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.report.targets_text import targets_table
from worksheet.review.chained import ChainNumber, ChainReview, StageShare
from worksheet.review.results import MET

_DIGITS = 3
_SHARES = (
    Column("sheet", flexible=True),
    Column("gain", right=True),
    Column("input noise", right=True),
    Column("part", right=True),
    Column("bandwidth", right=True),
    Column("settling", right=True),
    Column("current", right=True),
    Column("part", right=True),
)
"""Parts of the noise's square and of the current; of bandwidth and settling, what an infinitely fast one would save."""


def chain(result: ChainReview, width: int) -> Iterator[str]:
    """Lines of one chain, no wider than `width` columns where words allow it."""
    stated = result.chain
    title = f": {clean(stated.title)}" if stated.title else ""
    yield from wrapped(f"Chain {stated.name}{title} ({' > '.join(stated.sheets)})", width)
    if result.reason is not None:
        yield from wrapped(f"not reckoned: {clean(result.reason)}", width, "  ")
    if result.targets:
        yield from lines(targets_table(result.targets, width), width, "  ")
        for target in result.targets:
            if target.verdict != MET and target.worst_at is not None:
                yield from wrapped(f"{target.target.name}: worst at {wording.condition(target.worst_at)}", width, "  ")
    if result.metrics:
        yield from lines(_numbers(result), width, "  ")
    if result.stages:
        yield "  What each takes, nominal; of bandwidth and settling, what is lost to it"
        yield from lines(shares_table(result), width, "  ")
    if result.invalid:
        word = "condition" if result.invalid == 1 else "conditions"
        yield from wrapped(
            f"not valid: some sheet of the path in {result.invalid} {word}; its own part says why", width, "  "
        )
    for note in result.notes:
        yield from wrapped(f"{note.about}: {note.text}", width, "  ")


def shares_table(result: ChainReview) -> Table:
    """What each sheet takes, a row each in the order of the signal."""
    return Table(_SHARES, tuple(_share(share) for share in result.stages))


def _numbers(result: ChainReview) -> Table:
    """Every quantity that no limit shows already."""
    shown = {target.target.name for target in result.targets}
    columns = (
        Column("of the path"),
        Column("nominal", right=True),
        Column("least", right=True),
        Column("greatest", right=True),
    )
    rows = tuple(_number(key, found) for key, found in result.metrics.items() if key not in shown)
    return Table(columns, rows)


def _number(key: str, found: ChainNumber) -> tuple[str, ...]:
    unit, reason = found.nominal.unit, found.nominal.reason
    return (
        key,
        wording.metric_number(key, found.nominal.value, unit, reason, digits=_DIGITS),
        wording.metric_number(key, found.low, unit, digits=_DIGITS),
        wording.metric_number(key, found.high, unit, digits=_DIGITS),
    )


def _share(share: StageShare) -> tuple[str, ...]:
    return (
        share.sheet,
        "-" if share.gain is None else f"{share.gain:.{_DIGITS}g}",
        wording.metric_number("input_noise", share.input_noise, "V", digits=_DIGITS),
        part(share.noise_share),
        part(share.bandwidth_lost),
        part(share.settling_lost),
        wording.metric_number("supply_current", share.supply_current, "A", digits=_DIGITS),
        part(share.current_share),
    )


def part(value: float | None) -> str:
    """A share of a whole, in percent."""
    if value is None:
        return "-"
    percent = 100.0 * value
    return f"{0.0 if abs(percent) < 0.05 else percent:.1f} %"
