"""Pages in a real browser: nothing is asked of the network, nothing acts, no rule of accessibility is broken.

axe-core (Deque, from the npm registry) holds the page against WCAG 2.2; what it cannot tell of contrast is worked out
from the style itself.
"""

from __future__ import annotations

import itertools
import json
import re
import shutil
import subprocess
from pathlib import Path
from typing import Any

import pytest

from tests.report.handoff.conftest import handed
from tests.report.handoff.hostile import write_hostile
from worksheet.report.handoff import style

DRIVER = Path(__file__).parent / "browser"
BROWSER = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")


@pytest.fixture(scope="module")
def driver(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the driver and what it needs; the tests are skipped, saying why, where that cannot be had."""
    if BROWSER is None:
        pytest.skip("there is no Chromium here")
    if not (shutil.which("node") and shutil.which("npm")):
        pytest.skip("there is no node with npm here")
    place = tmp_path_factory.mktemp("browser")
    for file in DRIVER.iterdir():
        shutil.copy(file, place)
    command = ["npm", "install", "--no-audit", "--no-fund", "--ignore-scripts"]
    made = subprocess.run(command, cwd=place, capture_output=True, text=True, timeout=300, check=False)
    if made.returncode:
        pytest.skip(f"npm could not install the browser's driver: {made.stderr.strip()[:200]}")
    return place


def _seen(driver: Path, page: Path, *pdf: Path) -> dict[str, Any]:
    assert BROWSER is not None
    command = ["node", "look.mjs", BROWSER, str(page), *map(str, pdf)]
    done = subprocess.run(command, cwd=driver, capture_output=True, text=True, timeout=180, check=False)
    assert done.returncode == 0, done.stderr
    found: dict[str, Any] = json.loads(done.stdout)
    return found


def _quiet(found: dict[str, Any], page: Path) -> None:
    assert found["console"] == []
    assert found["dialogs"] == []
    own = {page.as_uri()[:40], *(r for r in found["requests"] if r.startswith("data:image/svg+xml;base64,"))}
    assert set(found["requests"]) == own
    assert found["scripts"] == 0
    assert found["broken"] == []
    assert found["violations"] == {"wide": [], "narrow": []}
    unsure = {rule["rule"] for rules in found["incomplete"].values() for rule in rules}
    assert unsure <= {"color-contrast"}  # of text that is scrolled out of sight; see the test of the style
    assert found["wide_overflow"] == 0


@pytest.mark.full
def test_the_project_asks_nothing_breaks_no_rule_and_prints(driver: Path, folder: Path, tmp_path: Path) -> None:
    page, printed = folder / "handoff.html", tmp_path / "handoff.pdf"
    found = _seen(driver, page, printed)
    _quiet(found, page)
    assert found["title"] == "Tide gauge readout: hand-off"
    assert found["narrow_overflow"] == 0
    assert found["maths"] == 0  # no equation that is drawn as nothing
    content = printed.read_bytes()
    assert content.startswith(b"%PDF-")
    assert len(re.findall(rb"/Type\s*/Page\b", content)) > 10


@pytest.mark.full
def test_a_project_full_of_markup_does_nothing(driver: Path, tmp_path: Path) -> None:
    root, into = write_hostile(tmp_path / "project"), tmp_path / "out"
    handed(root, into)
    handed(root, into, "lamp")
    for name in ("handoff", "handoff-lamp"):
        page = into / f"{name}.html"
        found = _seen(driver, page)
        _quiet(found, page)
        assert found["title"].startswith("<script>document.title='taken'</script>")


def _luminance(colour: str) -> float:
    """Relative luminance (WCAG 2.2, definition of relative luminance)."""
    full = colour if len(colour) == 6 else "".join(c * 2 for c in colour)
    parts = [int(full[k : k + 2], 16) / 255 for k in (0, 2, 4)]
    red, green, blue = (p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def _contrast(one: str, other: str) -> float:
    """Contrast ratio (WCAG 2.2, definition of contrast ratio)."""
    low, high = sorted((_luminance(one), _luminance(other)))
    return (high + 0.05) / (low + 0.05)


def test_every_colour_of_text_stands_out_from_every_ground() -> None:
    assert _contrast("000000", "ffffff") == pytest.approx(21.0)
    assert _contrast("777777", "ffffff") == pytest.approx(4.48, abs=0.01)  # the well-known grey that just fails
    texts = set(re.findall(r"(?<![-\w])color:#([0-9a-f]{3,6})", style.SHEET))
    grounds = set(re.findall(r"background(?:-color)?:#([0-9a-f]{3,6})", style.SHEET))
    assert len(texts) > 5
    assert len(grounds) > 1
    for text, ground in itertools.product(texts, grounds):
        assert _contrast(text, ground) >= 4.5, (text, ground)
