"""Docstrings of what computes: every quantity with its unit, every relation of a device with its source.

A missing unit is the commonest complaint about scientific code, and cannot be seen from a signature of floats.
"""

import ast
import re
from collections.abc import Iterator

UNIT = re.compile(r"\[[^\]\n]+\]")
NUMBERS = {"Number", "Array", "float", "np.ndarray"}
LAYERS = ("device", "engine")


def _numbers(node: ast.FunctionDef) -> set[str]:
    """The arguments that are annotated as numbers."""
    arguments = [*node.args.posonlyargs, *node.args.args, *node.args.kwonlyargs]
    return {
        one.arg
        for one in arguments
        if one.annotation and NUMBERS & {part.strip() for part in ast.unparse(one.annotation).split("|")}
    }


def _computing(modules: dict[str, ast.Module], layers: tuple[str, ...]) -> Iterator[tuple[str, set[str], str]]:
    """Name, arguments that are numbers, and docstring of every public function of the layers that has any."""
    for path, tree in modules.items():
        if path.split("/")[1] in layers:
            for node in tree.body:
                if isinstance(node, ast.FunctionDef) and not node.name.startswith("_") and _numbers(node):
                    yield f"{path}: {node.name}", _numbers(node), ast.get_docstring(node) or ""


def _bare_arguments(numbers: set[str], text: str) -> list[str]:
    """The numbers among the described arguments whose description holds no unit."""
    section = re.search(r"^Args:\n(.*?)(?=^\S|\Z)", text, re.MULTILINE | re.DOTALL)
    entries = re.split(r"^    (?=\w)", section[1], flags=re.MULTILINE)[1:] if section else []
    described = [(set(re.findall(r"\w+", entry.partition(":")[0])), entry) for entry in entries]
    return [entry.partition(":")[0] for names, entry in described if names & numbers and not UNIT.search(entry)]


def test_computing_functions_name_their_units(modules: dict[str, ast.Module]) -> None:
    """In the engine there is also arithmetic of bare numbers (polynomials, say), which has none."""
    assert [name for name, _, text in _computing(modules, ("device",)) if not UNIT.search(text)] == []


def test_every_argument_that_is_described_has_its_unit(modules: dict[str, ast.Module]) -> None:
    found = {name: _bare_arguments(numbers, text) for name, numbers, text in _computing(modules, LAYERS)}
    assert {name: bare for name, bare in found.items() if bare} == {}


def test_relations_of_a_device_name_their_source(modules: dict[str, ast.Module]) -> None:
    """A published source, or the function of the same module whose source it shares ("see NAME")."""
    assert [
        name for name, _, text in _computing(modules, ("device",)) if not re.search(r"Source:|\bsee \w", text)
    ] == []


def test_a_missing_unit_is_seen() -> None:
    tree = ast.parse(
        'def f(x: float, y: Array) -> float:\n    """F.\n\n    Args:\n        x: Bare.\n        y: Full. [V]\n    """\n'
    )
    ((_, numbers, text),) = _computing({"worksheet/device/f.py": tree}, LAYERS)
    assert _bare_arguments(numbers, text) == ["x"]
