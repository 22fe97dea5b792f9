"""The package's own source as these tests see it."""

import ast

import pytest

from tests.paths import TOP


@pytest.fixture(scope="session")
def modules() -> dict[str, ast.Module]:
    """Syntax tree of every module of the package, by its path from the top of the project."""
    paths = sorted((TOP / "worksheet").rglob("*.py"))
    return {path.relative_to(TOP).as_posix(): ast.parse(path.read_text("utf-8")) for path in paths}
