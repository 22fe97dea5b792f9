"""README against the program: the commands it gives are the commands there are."""

import re
import subprocess
import sys

from tests.paths import TOP, needs_command_line


def _readme() -> str:
    return (TOP / "README.md").read_text("utf-8")


def _help() -> str:
    code = "import sys; sys.argv = ['biasbook', '--help']; from worksheet.cli.main import entry; sys.exit(entry())"
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=TOP, capture_output=True, text=True, check=True, stdin=subprocess.DEVNULL
    )
    return done.stdout


def test_opens_with_a_paragraph_and_two_commands() -> None:
    blocks = [block for block in _readme().split("\n\n") if block.strip()]
    commands = [block.strip() for block in blocks if block.startswith("    python3 ")]
    assert blocks[0].startswith("# ")
    assert not blocks[1].startswith(("#", "    ", "|", "-"))
    assert len(commands) == 2
    assert all(command.startswith("python3 -m venv .venv && .venv/bin/pip install -e ") for command in commands)
    demo, tests = commands
    assert demo.endswith("&& .venv/bin/biasbook demo")
    assert "&& .venv/bin/python -m pytest" in tests


@needs_command_line
def test_names_every_command_and_no_other() -> None:
    listed = set(re.findall(r"^\| `biasbook ([a-z]+)", _readme(), re.MULTILINE))
    offered = set(re.findall(r"^ {2,}([a-z]+)(?: {2,}|$)", _help(), re.MULTILINE))
    assert listed == offered
