"""Every check of a change behind one command: lint, format, types, imports, tests.

    python tests/check.py              the fast suite, what every change must pass
    python tests/check.py --full       with real terminals, browsers, kills and long fuzzing
    python tests/check.py --no-tests   all but the tests

Every check runs, also after one that failed, so that one run shows all there is to mend. Exit status 0 when
all passed, 1 otherwise.
"""

import argparse
import subprocess
import sys
import time
from pathlib import Path

TOP = Path(__file__).resolve().parent.parent
LINT_IMPORTS = "import sys; from importlinter.cli import lint_imports_command; sys.exit(lint_imports_command())"


def checks(*, tests: bool, full: bool) -> dict[str, list[str]]:
    """Arguments to the interpreter for each check, by the name under which it is reported."""
    found = {
        "lint": ["-m", "ruff", "check", "."],
        "format": ["-m", "ruff", "format", "--check", "."],
        "types": ["-m", "mypy"],
        "imports": ["-c", LINT_IMPORTS],
    }
    if tests:
        found["tests"] = ["-m", "pytest", "-q", "-n", "2", *(["-m", ""] if full else [])]
    return found


def main() -> int:
    """Run the checks that were asked for and print one closing line for each."""
    parser = argparse.ArgumentParser(description="lint, format, types, imports, tests")
    parser.add_argument("--full", action="store_true", help="the full suite of tests")
    parser.add_argument("--no-tests", action="store_true", help="all but the tests")
    wanted = parser.parse_args()
    outcome = []
    for name, arguments in checks(tests=not wanted.no_tests, full=wanted.full).items():
        print(f"== {name}", flush=True)
        start = time.monotonic()
        status = subprocess.run([sys.executable, *arguments], cwd=TOP, check=False).returncode
        outcome.append((name, status, time.monotonic() - start))
    for name, status, seconds in outcome:
        print(f"{name:<8} {'passed' if status == 0 else f'failed (exit {status})'} in {seconds:.1f} s")
    return int(any(status != 0 for _, status, _ in outcome))


if __name__ == "__main__":
    sys.exit(main())
