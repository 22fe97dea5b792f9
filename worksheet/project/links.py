"""Links between sheets: which value needs which, and loops, named.

A node is a value of a sheet, or the sheet as a whole; a metric depends on all of its sheet, which is what makes a
loop.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence

from worksheet.model import metrics
from worksheet.model.formula import Formula
from worksheet.model.problem import Problem
from worksheet.model.sheet import Sheet, Value
from worksheet.model.sheet_keys import ASSUMPTIONS
from worksheet.model.text import nearest
from worksheet.stages import catalogue

Node = tuple[str, str]
"""(sheet, name); the name "*" is the sheet as a whole."""

WHOLE = "*"
_CONDITIONS = ("supply", "temperature")


def values_of(sheet: Sheet) -> dict[str, Value]:
    """All values that a sheet states, by dotted key."""
    return {f"{table}.{name}": value for table, values in _tables(sheet) for name, value in values.items()}


def _tables(sheet: Sheet) -> tuple[tuple[str, Mapping[str, Value]], ...]:
    return ("assume", sheet.assume), ("own", sheet.own), ("choose", sheet.choose), ("bias", sheet.bias.values)


def names(sheet: Sheet) -> tuple[str, ...]:
    """Names that a formula may use of a sheet, metrics aside."""
    stage = catalogue.find(sheet.stage)
    design = (
        [] if stage is None else [key.name for key in stage.design_keys(sheet.bias.ideal) if key.dimension is not None]
    )
    defaults = [key.name for key in ASSUMPTIONS if key.default is not None]
    return tuple(dict.fromkeys([*sheet.assume, *sheet.own, *sheet.choose, *design, *defaults, *_CONDITIONS]))


def formulas_of(sheet: Sheet) -> Iterator[tuple[str, Formula, bool]]:
    """Every formula of a sheet: dotted key, formula, whether it may use the sheet's own metrics (a target's)."""
    for table, values in _tables(sheet):
        for name, value in values.items():
            if value.formula is not None:
                yield f"{table}.{name}", value.formula, False
    for name, target in sheet.targets.items():
        if target.formula is not None:
            yield f"target.{name}", target.formula, True


def names_used(sheets: Mapping[str, Sheet]) -> frozenset[str]:
    """Every name that any formula of a project uses."""
    return frozenset(n for sheet in sheets.values() for _, formula, _ in formulas_of(sheet) for n in formula.names)


def name_problems(
    sheet: Sheet, sheets: Mapping[str, Sheet], bad: Collection[str], elsewhere: frozenset[str]
) -> list[Problem]:  # fmt: skip
    """Names in a sheet's formulas that do not exist, and own names that nothing uses.

    Args:
        sheet, sheets: The sheet, and all of its project that can be read.
        bad: Names of those that cannot.
        elsewhere: names_used of the project.
    """
    problems: list[Problem] = []
    used: set[str] = set()
    for key, formula, own_metrics in formulas_of(sheet):
        for name in formula.names:
            used.add(name)
            spoilt = name.partition(".")[0] if "." in name else ""
            message = (
                f"it takes {name!r} from a sheet that has problems of its own"
                if spoilt in bad
                else _unknown(sheet, sheets, name, own_metrics)
            )
            if message:
                problems.append(
                    Problem(sheet.file, sheet.lines.get(f"{key}.formula", sheet.lines.get(key)), key, message)
                )
    for name in sheet.own:
        if name not in used and f"{sheet.name}.{name}" not in elsewhere:
            message = f"the own name {name!r} is used by no formula; remove it, or correct the name that was meant"
            problems.append(Problem(sheet.file, sheet.lines.get(f"own.{name}"), f"own.{name}", message))
    return problems


def _unknown(sheet: Sheet, sheets: Mapping[str, Sheet], name: str, own_metrics: bool) -> str | None:
    if "." not in name:
        known = [*names(sheet), *(metrics.keys() if own_metrics else ())]
        if not own_metrics and metrics.find(name) is not None:
            return f"{name!r} is a metric of this sheet; only a target's formula may use it"
        return None if name in known else _suggest(f"{name!r} is no name of this sheet", name, known)
    other_name, part = name.split(".", 1)
    other = sheets.get(other_name)
    if other is None:
        return _suggest(f"there is no sheet {other_name!r}", other_name, list(sheets))
    if part in other.targets and other.targets[part].formula is not None:
        return f"{name!r} is a target with a formula, which another sheet cannot use"
    stage = catalogue.find(other.stage)
    if metrics.find(part) is not None:
        return stage.absent_metric(part) if stage is not None else None
    known = [*names(other), *metrics.keys()]
    return None if part in known else _suggest(f"{part!r} is no name of the sheet {other_name!r}", part, known)


def _suggest(message: str, name: str, known: list[str]) -> str:
    near = nearest(name, known)
    return f"{message}; did you mean {near!r}?" if near else message


def _needs(sheets: Mapping[str, Sheet], node: Node) -> list[Node]:
    sheet = sheets.get(node[0])
    if sheet is None:
        return []
    if node[1] == WHOLE:
        return [(sheet.name, key) for key in values_of(sheet)] + _needs_of_proposals(sheets, sheet)
    value = values_of(sheet).get(node[1])
    return (
        [] if value is None or value.formula is None else [_node(sheets, sheet, name) for name in value.formula.names]
    )


def _needs_of_proposals(sheets: Mapping[str, Sheet], sheet: Sheet) -> list[Node]:
    """What the targets of a sheet need of other sheets, where something is left open: its proposals depend on them."""
    if not has_open_choices(sheet):
        return []
    targets = [t.formula for t in sheet.targets.values() if t.formula is not None]
    return [_node(sheets, sheet, name) for formula in targets for name in formula.names if "." in name]


def has_open_choices(sheet: Sheet) -> bool:
    """Whether a sheet leaves a design variable to the solver."""
    stage = catalogue.find(sheet.stage)
    design = (
        [] if stage is None else [key.name for key in stage.design_keys(sheet.bias.ideal) if key.dimension is not None]
    )
    return any(n not in sheet.assume and (n not in sheet.choose or sheet.choose[n].propose) for n in design)


def _node(sheets: Mapping[str, Sheet], sheet: Sheet, name: str) -> Node:
    owner, part = name.split(".", 1) if "." in name else (sheet.name, name)
    if "." in name and metrics.find(part) is not None:
        return owner, WHOLE
    other = sheets.get(owner)
    if other is None:
        return owner, part
    for table, values in (("assume", other.assume), ("own", other.own), ("choose", other.choose)):
        if part in values and not values[part].propose:
            return owner, f"{table}.{part}"
    stage = catalogue.find(other.stage)
    design = {key.name for key in stage.design_keys(other.bias.ideal)} if stage is not None else set()
    return (owner, WHOLE) if part in design and (owner != sheet.name) else (owner, part)


def loops(sheets: Mapping[str, Sheet]) -> list[list[Node]]:
    """Every loop of values, each once, as the nodes along it with the first repeated at the end."""
    state: dict[Node, int] = {}
    found: list[list[Node]] = []
    for root in [
        (name, key) for name, sheet in sheets.items() for key, _, of_target in formulas_of(sheet) if not of_target
    ]:
        if state.get(root):
            continue
        path: list[Node] = []
        stack: list[tuple[Node, Iterator[Node]]] = [(root, iter(_needs(sheets, root)))]
        state[root] = 1
        path.append(root)
        while stack:
            node, rest = stack[-1]
            following = next(rest, None)
            if following is None:
                stack.pop()
                path.pop()
                state[node] = 2
            elif state.get(following) == 1:
                found.append([*path[path.index(following) :], following])
            elif not state.get(following):
                state[following] = 1
                path.append(following)
                stack.append((following, iter(_needs(sheets, following))))
    return found


def loop_problems(sheets: Mapping[str, Sheet], found: Sequence[list[Node]]) -> list[Problem]:
    """One problem a loop that was found, at the first value along it, with the whole loop printed."""
    problems = []
    for loop in found:
        start = next(node for node in loop if node[1] != WHOLE)
        sheet = sheets[start[0]]
        turned = [*loop[loop.index(start) : -1], *loop[: loop.index(start)], start]
        text = " -> ".join(
            f"{name}.{key.split('.', 1)[-1]}" if key != WHOLE else f"{name} (all of it)" for name, key in turned
        )
        problems.append(Problem(sheet.file, sheet.lines.get(start[1]), start[1], f"the values form a loop: {text}"))
    return problems


def sheets_needed(sheet: Sheet) -> tuple[str, ...]:
    """Other sheets that a sheet's formulas name, targets included."""
    found = [name.split(".", 1)[0] for _, formula, _ in formulas_of(sheet) for name in formula.names if "." in name]
    return tuple(dict.fromkeys(found))


def waves(sheets: Mapping[str, Sheet], wanted: Iterable[str]) -> Iterator[list[str]]:
    """Sheets in groups that can be solved one after the other, each after those that it takes values from.

    Args:
        sheets: All of the project.
        wanted: Names of those that are to be solved.
    """
    needs = {name: set(sheets_needed(sheets[name])) for name in wanted}
    while needs:
        ready = [name for name, needed in needs.items() if not any(n in needs for n in needed if n != name)]
        ready = ready or list(needs)  # values of two sheets may need each other without a loop
        yield ready
        for name in ready:
            del needs[name]


def metrics_taken(sheets: Mapping[str, Sheet], names: Iterable[str]) -> dict[str, tuple[str, ...]]:
    """Metrics that sheets take from others, nearer or further, by the name of the other.

    Args:
        sheets: All of the project.
        names: Of the sheets that take them.
    """
    found: dict[str, dict[str, None]] = {}
    asked, asking = set(), list(names)
    while asking:
        sheet = sheets.get(asking.pop())
        if sheet is None or sheet.name in asked:
            continue
        asked.add(sheet.name)
        for _, formula, _ in formulas_of(sheet):
            for owner, dot, part in (name.partition(".") for name in formula.names):
                if dot:
                    asking.append(owner)
                    if metrics.find(part) is not None and owner in sheets:
                        found.setdefault(owner, {})[part] = None
    return {name: tuple(keys) for name, keys in found.items()}
