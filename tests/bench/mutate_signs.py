"""Flip every sign of device/ and engine/, one at a time, and see whether a test fails.

Run by hand:  python -m tests.bench.mutate_signs [--only worksheet/device/charge.py] [--limit N]

Every + becomes -, every - becomes + (binary and unary, in assignments too), in a copy of the tree; the precision,
published, device and engine tests run on it and stop at the first failure. Prints the survivors and the score.
"""

from __future__ import annotations

import argparse
import ast
import shutil
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path

TOP = Path(__file__).resolve().parents[2]
TESTS = (
    "tests/precision/test_device.py",
    "tests/precision/test_engine.py",
    "tests/published",
    "tests/device",
    "tests/engine",
)
FOLDERS = ("worksheet/device", "worksheet/engine")


def places(source: str) -> Iterator[tuple[int, int, str]]:
    """Line, column and replacement of every sign that is computed with."""
    lines = source.splitlines()
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.BinOp | ast.AugAssign) and isinstance(node.op, ast.Add | ast.Sub):
            left = node.left if isinstance(node, ast.BinOp) else node.target
            right = node.right if isinstance(node, ast.BinOp) else node.value
            if _is_text(node):
                continue
            sign = "+" if isinstance(node.op, ast.Add) else "-"
            found = _find(lines, sign, left.end_lineno or 0, left.end_col_offset or 0, right.lineno)
            if found is not None:
                yield *found, "-" if sign == "+" else "+"
        elif isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub):
            yield node.lineno - 1, node.col_offset, "+"


def _is_text(node: ast.AST) -> bool:
    return any(isinstance(n, ast.Constant) and isinstance(n.value, str) for n in ast.walk(node))


def _find(lines: list[str], sign: str, line: int, column: int, last: int) -> tuple[int, int] | None:
    for number in range(line - 1, last):
        start = column if number == line - 1 else 0
        place = lines[number].find(sign, start)
        if place >= 0:
            return number, place
    return None


def survives(copy: Path) -> bool:
    """Whether all tests pass on a mutated copy."""
    command = [sys.executable, "-m", "pytest", "-q", "-x", "-p", "no:cacheprovider", "-p", "no:xdist", *TESTS]
    done = subprocess.run(command, cwd=copy, capture_output=True, timeout=600, check=False)
    return done.returncode == 0


def main() -> int:
    """Run all mutations and report."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--only", action="append")
    parser.add_argument("--limit", type=int, default=10**9)
    arguments = parser.parse_args()
    files = [p for folder in FOLDERS for p in sorted((TOP / folder).glob("*.py"))]
    if arguments.only:
        files = [TOP / name for name in arguments.only]
    started, killed, alive = time.monotonic(), 0, []
    with tempfile.TemporaryDirectory() as folder:
        copy = Path(folder) / "tree"
        shutil.copytree(TOP, copy, ignore=shutil.ignore_patterns(".git", ".venv", "*cache*", "dist"))
        if not survives(copy):
            print("the tests fail without any mutation")
            return 1
        for path in files:
            source = path.read_text(encoding="utf-8")
            target = copy / path.relative_to(TOP)
            for line, column, sign in list(places(source))[: arguments.limit]:
                lines = source.splitlines(keepends=True)
                lines[line] = lines[line][:column] + sign + lines[line][column + 1 :]
                target.write_text("".join(lines), encoding="utf-8")
                if survives(copy):
                    alive.append(f"{path.relative_to(TOP)}:{line + 1}:{column + 1}: {lines[line].strip()}")
                    print("survived", alive[-1], flush=True)
                else:
                    killed += 1
            target.write_text(source, encoding="utf-8")
    total = killed + len(alive)
    print(f"{killed} of {total} flipped signs made a test fail, in {time.monotonic() - started:.0f} s")
    return 0


if __name__ == "__main__":
    sys.exit(main())
