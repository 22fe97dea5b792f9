"""What holds for every test: a fixed surrounding, and how long hypothesis may search.

The fast suite is derandomised, so that a change passes or fails for what it holds and not for the day's
examples; the full suite searches anew and longer each time.
"""

import os
import time

import pytest
from hypothesis import HealthCheck, settings

# Before anything reads them: textual takes its switches when it is first imported.
os.environ.update(TZ="UTC", LANG="C.UTF-8", LC_ALL="C.UTF-8", TEXTUAL_ANIMATIONS="none", PYTHONHASHSEED="0")
for name in ("COLUMNS", "LINES", "NO_COLOR", "FORCE_COLOR", "CLICOLOR_FORCE", "PYTHONWARNINGS"):
    os.environ.pop(name, None)
# A test that starts git works on its own repository, also where the suite itself runs under a git hook.
for name in ("GIT_DIR", "GIT_WORK_TREE", "GIT_INDEX_FILE", "GIT_PREFIX"):
    os.environ.pop(name, None)
time.tzset()

settings.register_profile(
    "fast",
    derandomize=True,
    max_examples=60,
    deadline=None,
    database=None,
    suppress_health_check=[HealthCheck.too_slow],
)
settings.register_profile(
    "full", max_examples=1000, deadline=None, print_blob=True, suppress_health_check=[HealthCheck.too_slow]
)


def pytest_configure(config: pytest.Config) -> None:
    """The full suite is the one that was not narrowed to the fast tests."""
    if config.getoption("--hypothesis-profile", default=None) is None:
        settings.load_profile("fast" if config.getoption("markexpr") == "not full" else "full")
