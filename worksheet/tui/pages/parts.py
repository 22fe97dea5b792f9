"""Parts of a sheet's page that stand in its file: targets, choices, assumptions, names, evidence, waivers, the block.

Each part gives rows whose fields are the values as typed.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from worksheet.model.dimension import Dimension
from worksheet.model.keys import ANNOTATIONS, Key
from worksheet.model.quantity import format_quantity
from worksheet.model.sheet_keys import (
    ACCEPTANCE,
    BIAS_KEYS,
    EVIDENCE,
    OWN,
    REMARK,
    SHEET,
    SOLVE_KEYS,
    TARGET_KEYS,
    WAIVER,
)
from worksheet.report import wording
from worksheet.report.table import wrapped
from worksheet.review.results import SheetReview, TargetReview
from worksheet.session.fields import stage_keys
from worksheet.session.snapshot import Snapshot
from worksheet.solver.results import Region, Solved
from worksheet.stages import catalogue
from worksheet.tui import rows
from worksheet.tui.pages import words
from worksheet.tui.rows import LABEL, PLAIN, QUIET, VALUE, Field, KeyPath, Line, Row, Span, line
from worksheet.tui.signs import Signs

_NAME = 20
_INDENT = Span("  ")
_EMPTY = "-"


@dataclass(frozen=True)
class Facts:
    """Everything that a sheet's page is made of.

    Attributes:
        snapshot: The book.
        name: The sheet.
        result: Its results, None while there are none or where it cannot be solved.
        solved: What it needs, None while that is not known.
        columns: Room for a line.
        signs: Of the terminal.
        proposal: What taking the proposal over would write, by key. [SI]
        hands: Hand formulas by (variable, target, side), where they are known.
    """

    snapshot: Snapshot
    name: str
    result: SheetReview | None
    solved: Solved | None
    columns: int
    signs: Signs
    proposal: Mapping[str, float]
    hands: Mapping[tuple[str, str, str], str]

    @property
    def data(self) -> Mapping[str, Any]:
        """What the file states, as typed."""
        return self.snapshot.data(self.name)

    def field(self, path: KeyPath, key: Key, value: Any, title: str = "") -> Field:
        """A field with what stands there."""
        return Field(path, words.typed(value), key, title or key.title)

    def text(self, text: str, role: str = PLAIN, width: int = 0) -> Span:
        """Text as the terminal can show it."""
        return Span(self.signs.text(text), role, width)


def value_span(facts: Facts, field: Field, width: int = 0, empty: str = _EMPTY) -> Span:
    """A field on the page; what is not stated is shown as a dash, or as what holds instead."""
    role = VALUE if field.text else QUIET
    shown = " ".join(field.text.split()) or empty
    return Span(facts.signs.text(shown), role, width, field=field)


def targets(facts: Facts) -> Iterator[Row]:
    """What is wanted, with what is achieved."""
    found = {} if facts.result is None else {one.target.name: one for one in facts.result.targets}
    stated = facts.data.get("target")
    for name, wanted in (stated if isinstance(stated, Mapping) else {}).items():
        yield _target(facts, name, wanted if isinstance(wanted, Mapping) else {}, found.get(name))


def _target(facts: Facts, name: str, wanted: Mapping[str, Any], result: TargetReview | None) -> Row:
    fields = {key.name: facts.field(("target", name, key.name), key, wanted.get(key.name), f"{name}: {key.title}")
              for key in TARGET_KEYS}  # fmt: skip
    first = [facts.text(name, LABEL, _NAME)]
    for key, sign in (("min", "≥"), ("max", "≤")):
        if key in wanted or (key == "min" and "max" not in wanted):
            first += [facts.text(sign, QUIET), value_span(facts, fields[key])]
    for key, sign in (("guard", "guard"), ("yield", "yield"), ("formula", "of")):
        if key in wanted:
            first += [facts.text(sign, QUIET), value_span(facts, fields[key])]
    if "at" in wanted:
        first += [facts.text("at", QUIET), value_span(facts, fields["at"])]
    lines: list[Line] = [line(*first)]
    if result is not None:
        tail = line(words.verdict_span(result.verdict, 7), Span(wording.margin(result.margin), PLAIN, 8, right=True))
        lines = [*_with_tail(lines[0], tail, facts.columns), *_achieved(facts, result)]
    subject = ("metric", name)
    copied = (name, *(_copied(result) if result is not None else ()))
    below = [value_span(facts, fields[key]) for key in ("id", "source", "why") if key in wanted]
    if below:
        lines.append((_INDENT, *line(*below, gap=2)))
    return Row(f"target.{name}", tuple(lines), subject=subject, copied=copied)


def _with_tail(first: Line, tail: Line, columns: int) -> list[Line]:
    """A line with something at its right end, on a line of its own where there is no room."""
    room = columns - rows.width(first) - rows.width(tail)
    if room < 1:
        return [first, (Span(" " * max(columns - rows.width(tail), 0)), *tail)]
    return [(*first, Span(" " * room), *tail)]


def _achieved(facts: Facts, result: TargetReview) -> Iterator[Line]:
    stale = sum(one.stale for one in result.evidence)
    parts = [f"now {words.metric(result, result.nominal)}", f"worst {words.metric(result, result.worst)}"]
    where = words.worst_place(result.worst_at, result.worst_with)
    text = f"{', '.join(parts)} {where}".rstrip()
    if result.reason:
        text += f"; {result.reason}"
    if result.evidence:
        text += f"; evidence: {len(result.evidence)}" + (f", {stale} stale" if stale else "")
    for part in wrapped(text, max(facts.columns - 2, 20)):
        yield line(_INDENT, facts.text(part, PLAIN), gap=0)


def _copied(result: TargetReview) -> tuple[str, ...]:
    return (
        wording.limits(result.target, result.unit),
        words.metric(result, result.nominal),
        words.metric(result, result.worst),
        wording.condition(result.worst_at),
        wording.margin(result.margin),
        result.verdict,
    )


def choices(facts: Facts) -> Iterator[Row]:
    """The designer's decisions, each with the window that the targets leave it."""
    stated = facts.data.get("choose")
    chosen = stated if isinstance(stated, Mapping) else {}
    assumed = facts.data.get("assume")
    for key in design(facts):
        if isinstance(assumed, Mapping) and key.name in assumed:
            continue
        yield _choice(facts, key, chosen.get(key.name))


def design(facts: Facts) -> list[Key]:
    """Design variables of the sheet's stage."""
    """The design variables of the sheet's stage, in the order of a form."""
    stage = catalogue.find(str(facts.data.get("stage")))
    bias = facts.data.get("bias")
    ideal = not isinstance(bias, Mapping) or str(bias.get("device", "ideal")) == "ideal"
    return [] if stage is None else list(stage.design_keys(ideal))


def _choice(facts: Facts, key: Key, stated: Any) -> Row:
    field = facts.field(("choose", key.name), key, stated)
    found = None if facts.result is None else facts.result.choices.get(key.name)
    spans = [facts.text(f"{key.title} {key.symbol}".rstrip(), LABEL, _NAME + 4), value_span(facts, field, 12, "open")]
    if found is not None and (found.origin != "chosen" or isinstance(stated, Mapping)):
        spans.append(facts.text(f"{found.origin}: {_number(found.value, key.dimension)}"))
    proposed = facts.proposal.get(key.name)
    if proposed is not None and key.dimension is not None:
        spans.append(facts.text(f"proposal {_number(proposed, key.dimension)}", QUIET))
    lines = [line(*spans)]
    window = None if facts.solved is None else facts.solved.needed.get(key.name)
    if window is not None:
        lines.append(line(_INDENT, facts.text(f"needed {region_text(window.region, key)}", QUIET), gap=0))
    copied = (key.name, field.text, "" if found is None else _number(found.value, key.dimension))
    return Row(f"choose.{key.name}", tuple(lines), subject=("variable", key.name), copied=copied)


def region_text(region: Region | None, key: Key) -> str:
    """A window in words, with what sets its ends."""
    if region is None:
        return "nothing: no value meets all that it can meet"
    low, high = (
        f"{sign} {_number(end if end is None else wording.safe(end, side, words.DIGITS), key.dimension)} ({by})"
        if by
        else ""
        for sign, end, side, by in (
            ("≥", region.low, "low", region.low_set_by),
            ("≤", region.high, "high", region.high_set_by),
        )
    )
    return ", ".join(part for part in (low, high) if part) or "any value"


def _number(value: float | None, dimension: Dimension | None) -> str:
    if value is None or dimension is None:
        return "-" if value is None else f"{value:g}"
    return format_quantity(value, dimension, words.DIGITS)


def assumptions(facts: Facts) -> Iterator[Row]:
    """What is imposed, with range, source and trust."""
    known = stage_keys(facts.data)
    stated = facts.data.get("assume")
    for name, value in (stated if isinstance(stated, Mapping) else {}).items():
        key = known.get(name)
        if key is not None:
            yield _annotated(facts, "assume", name, key, value)


def own_names(facts: Facts) -> Iterator[Row]:
    """Names of the user's own."""
    stated = facts.data.get("own")
    for name, value in (stated if isinstance(stated, Mapping) else {}).items():
        yield _annotated(facts, "own", name, OWN, value)


def _annotated(facts: Facts, table: str, name: str, key: Key, stated: Any) -> Row:
    notes = stated if isinstance(stated, Mapping) else {}
    path: KeyPath = (table, name)
    title = name if table == "own" else f"{key.title} {key.symbol}".rstrip()
    field = Field(path, words.typed(stated), key, name if table == "own" else key.title)
    fields = {one.name: facts.field((*path, one.name), one, notes.get(one.name), f"{field.title}: {one.title}")
              for one in ANNOTATIONS.keys}  # fmt: skip
    trust = value_span(facts, fields["trust"], 9, "no trust")
    first = line(facts.text(title, LABEL, _NAME + 4), value_span(facts, field, 10), trust)
    second = [value_span(facts, fields["low"], 0, "low -"), Span("to", QUIET)]
    second += [value_span(facts, fields["high"], 0, "high -"), value_span(facts, fields["source"], 0, "source -")]
    lines: list[Line] = [first, (_INDENT, *line(*second))]
    if "note" in notes:
        lines.append((_INDENT, value_span(facts, fields["note"])))
    copied = (name, field.text, *(fields[k].text for k in ("low", "high", "source", "trust", "note")))
    subject = ("variable", name) if table == "assume" else ("own", name)
    return Row(f"{table}.{name}", tuple(lines), subject=subject, copied=copied)


def evidence(facts: Facts) -> Iterator[Row]:
    """What simulations and benches found, stale or not."""
    stated = facts.data.get("evidence")
    for k, entry in enumerate(stated if isinstance(stated, list) else []):
        if isinstance(entry, Mapping):
            yield _entry(facts, EVIDENCE.name, k, entry, EVIDENCE.keys, _standing(facts, entry))


def waivers(facts: Facts) -> Iterator[Row]:
    """Misses that were accepted."""
    stated = facts.data.get("waiver")
    for k, entry in enumerate(stated if isinstance(stated, list) else []):
        if isinstance(entry, Mapping):
            yield _entry(facts, WAIVER.name, k, entry, WAIVER.keys, None)


def remarks(facts: Facts) -> Iterator[Row]:
    """What somebody has to say or to ask."""
    stated = facts.data.get(REMARK.name)
    for k, entry in enumerate(stated if isinstance(stated, list) else []):
        if isinstance(entry, Mapping):
            tail = Span("settled", QUIET) if "settled" in entry else Span("open", rows.UNKNOWN)
            yield _entry(facts, REMARK.name, k, entry, REMARK.keys, tail)


def acceptances(facts: Facts) -> Iterator[Row]:
    """Who accepted the block, and whether for the inputs it has now."""
    stated = facts.data.get(ACCEPTANCE.name)
    for k, entry in enumerate(stated if isinstance(stated, list) else []):
        if isinstance(entry, Mapping):
            yield _entry(facts, ACCEPTANCE.name, k, entry, ACCEPTANCE.keys, _standing(facts, entry))


def _standing(facts: Facts, entry: Mapping[str, Any]) -> Span | None:
    if facts.result is None:
        return None
    if entry.get("basis") == facts.result.basis:
        return Span("of this basis", QUIET)
    return Span("STALE: the sheet has changed since", rows.UNKNOWN)


def _entry(facts: Facts, array: str, k: int, entry: Mapping[str, Any], keys: tuple[Key, ...], tail: Span | None) -> Row:
    fields = {
        key.name: facts.field((array, k, key.name), key, entry.get(key.name), f"{array} {k + 1}: {key.title}")
        for key in keys
    }
    lead, *rest = [key.name for key in keys if key.name in fields]
    first = [value_span(facts, fields[lead], _NAME)]
    if "value" in fields:
        first.append(value_span(facts, fields["value"], 10))
    if tail is not None:
        first.append(tail)
    second: list[Span] = []
    for name in rest:
        if name in entry and name != "value":
            second += [Span(fields[name].key.title.lower(), QUIET), value_span(facts, fields[name])]
    copied = tuple(field.text for field in fields.values())
    lines = (line(*first), (_INDENT, *line(*second))) if second else (line(*first),)
    return Row(f"{array}.{k}", lines, subject=(array, str(k)), copied=copied)


def block(facts: Facts) -> Iterator[Row]:
    """The block itself: title, stage, devices, state, notes, how it is solved."""
    for key in SHEET.keys:
        if key.name != "schema":
            yield _plain(facts, (key.name,), key, facts.data.get(key.name))
    for table, keys in (("bias", BIAS_KEYS), ("solve", SOLVE_KEYS)):
        stated = facts.data.get(table)
        for key in keys:
            if table == "bias" and key.name != "device" and not _ideal(stated):
                continue
            yield _plain(facts, (table, key.name), key, stated.get(key.name) if isinstance(stated, Mapping) else None)


def _ideal(bias: Any) -> bool:
    return not isinstance(bias, Mapping) or str(bias.get("device", "ideal")) == "ideal"


def _plain(facts: Facts, path: KeyPath, key: Key, stated: Any) -> Row:
    field = facts.field(path, key, stated)
    default = _EMPTY if key.default is None else f"{_default(key)}, unless stated"
    spans = line(facts.text(key.title, LABEL, _NAME + 4), value_span(facts, field, 0, default))
    return Row(".".join(map(str, path)), (spans,), subject=("key", key.name), copied=(key.name, field.text))


def _default(key: Key) -> str:
    if isinstance(key.default, float):
        return _number(key.default, key.dimension)
    return str(key.default)
