"""Random valid sheets, drawn from the key descriptions and written in as many ways as TOML allows."""

from typing import Any

from hypothesis import strategies as st

from worksheet.model import metrics
from worksheet.model.dimension import NUMBER, Dimension
from worksheet.model.keys import TRUST, Key, Kind
from worksheet.model.quantity import format_input
from worksheet.stages import catalogue
from worksheet.stages.stage import Stage

NAMES = st.from_regex(r"\A[a-z][a-z0-9_]{0,11}\Z").map(lambda name: f"x_{name}")
WORDS = st.text(st.characters(codec="utf-8", exclude_characters="\r"), max_size=20)

Drawn = dict[str, Any]


def quoted(text: str) -> str:
    """A basic string."""
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c if c.isprintable() else f"\\U{ord(c):08x}" for c in escaped) + '"'


@st.composite
def numbers(draw: st.DrawFn, key: Key, dimension: Dimension | None = None) -> tuple[str, float]:
    """A quantity within the key's range as written, and its SI value."""
    kind = dimension or key.dimension or NUMBER
    low = -1e9 if key.low is None else key.low
    high = 1e9 if key.high is None else key.high
    value = draw(
        st.floats(low, high, exclude_min=key.low_open, exclude_max=key.high_open, allow_subnormal=False).filter(
            lambda number: not number or 1e-28 < abs(number) < 1e28
        )
    )
    value += 0.0  # no negative zero
    if kind.unit and draw(st.booleans()):
        return quoted(format_input(value, kind)), value
    return repr(value), value


@st.composite
def values(draw: st.DrawFn, key: Key) -> tuple[str, Drawn]:
    """A value of a key as written, bare or in a table, and what must be read."""
    text, number = draw(numbers(key))
    if draw(st.booleans()):
        return text, {"number": number}
    note = draw(WORDS)
    trust = draw(st.sampled_from(TRUST))
    entries = [("value", text), ("note", quoted(note)), ("trust", quoted(trust))]
    drawn: Drawn = {"number": number, "note": note, "trust": trust}
    if draw(st.booleans()):
        entries.append(("low", repr(number)))
        drawn["low"] = number
    order = draw(st.permutations(entries))
    space = draw(st.sampled_from(["", " ", "  "]))
    return "{" + space + ", ".join(f"{name}{space}={space}{value}" for name, value in order) + space + "}", drawn


@st.composite
def tables(draw: st.DrawFn, keys: list[Key], least: tuple[str, ...] = ()) -> tuple[list[str], dict[str, Drawn]]:
    """Some of the keys of a table as lines, and what must be read."""
    chosen = draw(st.lists(st.sampled_from(keys), unique_by=lambda key: key.name)) if keys else []
    chosen += [key for key in keys if key.name in least and key not in chosen]
    lines, drawn = [], {}
    for key in chosen:
        if key.kind is Kind.WHOLE:
            count = draw(st.integers(1, 1000))
            text, drawn[key.name] = str(count), {"count": count}
        else:
            text, drawn[key.name] = draw(values(key))
        comment = draw(st.sampled_from(["", "  # [not] = a table", " #"]))
        lines.append(f"{draw(st.sampled_from(['', '  ']))}{key.name} = {text}{comment}")
        if draw(st.booleans()):
            lines.append(draw(st.sampled_from(["", "# a remark", "   "])))
    return lines, drawn


@st.composite
def targets(draw: st.DrawFn, stage: Stage) -> tuple[list[str], dict[str, Drawn]]:
    """Some targets as lines, and their limits."""
    defined = [one for one in metrics.all_metrics() if stage.absent_metric(one.key) is None]
    lines, drawn = [], {}
    limit = Key("min", "At least", "", low=None)
    for metric in draw(st.lists(st.sampled_from(defined), unique_by=lambda one: one.key, max_size=6)):
        low = draw(numbers(limit, metric.dimension))
        high = draw(numbers(limit, metric.dimension))
        low, high = sorted((low, high), key=lambda one: one[1])
        both = draw(st.sampled_from([("min",), ("max",), ("min", "max")]))
        text = ", ".join(f"{name} = {one[0]}" for name, one in (("min", low), ("max", high)) if name in both)
        drawn[metric.key] = {name: one[1] for name, one in (("min", low), ("max", high)) if name in both}
        lines.append(f"{metric.key} = {{ {text} }}")
    return lines, drawn


@st.composite
def sheets(draw: st.DrawFn) -> tuple[str, Drawn]:
    """A valid sheet, and what must be read from it."""
    stage = draw(st.sampled_from(catalogue.stages()))
    bulk = draw(st.sampled_from(["rail", "source"]))
    ideal = draw(st.booleans())
    title = draw(WORDS)
    head = ["schema = 1", f"stage = {quoted(stage.key)}", "device = 'nfet'", f"bulk = '{bulk}'"]
    head += [f"title = {quoted(title)}"]
    assumptions = [key for key in stage.assumption_keys(bulk) if not key.listed]
    if stage.one_level:
        assumptions = [key for key in assumptions if key.name != stage.levels[0]]
    assume_lines, assume = draw(tables(assumptions))
    design = list(stage.design_keys(ideal))
    choose_lines, choose = draw(tables(design, ("load_capacitance",)))
    own = draw(st.dictionaries(NAMES, st.floats(-1e9, 1e9), max_size=4))
    target_lines, wanted = draw(targets(stage))
    parts = [
        ["[bias]", 'device = "ideal"' if ideal else 'device = "nbias"'],
        ["[assume] # imposed", *assume_lines],
        ["[own]", *(f"{name} = {number!r}" for name, number in own.items())],
        ["[choose]", *choose_lines],
        ["[solve]", "keep = 'inversion'", "inversion_coefficient = 2.5"],
        ["[target]", *target_lines],
    ]
    lines = head + [line for part in draw(st.permutations(parts)) for line in ("", *part)]
    end = draw(st.sampled_from(["\n", "\r\n"]))
    mark = draw(st.sampled_from(["", "\ufeff"]))
    expected = {"title": title, "assume": assume, "choose": choose, "own": own, "target": wanted, "stage": stage.key}
    return mark + end.join(lines) + draw(st.sampled_from(["", end])), expected
