"""Where the tests find the project."""

from pathlib import Path

import pytest

TOP = Path(__file__).resolve().parents[1]

needs_command_line = pytest.mark.skipif(
    not (TOP / "worksheet" / "cli" / "main.py").is_file(), reason="this tree has no command line"
)
