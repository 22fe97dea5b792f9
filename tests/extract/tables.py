"""Tables for the tests of extraction: synthetic ones in memory and files, measured ones beside the checkout."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.extract.independent import Device, Points, noisy
from tests.paths import TOP
from worksheet.extract.data import Extraction, Rows
from worksheet.extract.extraction import Request, extract_from_rows, extract_parameters
from worksheet.model.problem import Problem

MEASURED = TOP.parent / "shared" / "data" / "measured"
LONG, SHORT = MEASURED / "nfet_w10_l10_300k.csv", MEASURED / "nfet_w10_l0p13_300k.csv"

needs_measured = pytest.mark.skipif(
    not (LONG.is_file() and SHORT.is_file()),
    reason="the measured tables do not lie beside this checkout (../shared/data/measured)",
)


def rows_of(at: Points) -> Rows:
    """Points as the package's rows."""
    return Rows(at.vg, at.vs, at.vd, at.id, at.w, at.l, at.temperature)


def fitted(device: Device, at: Points, seed: int = 0, noise: float = 0.01, **asked: object) -> Extraction:
    """The extraction from a device's currents with noise."""
    result, problems = extract_from_rows(rows_of(noisy(device, at, seed, noise)), Request(**asked))  # type: ignore[arg-type]
    assert result is not None, problems
    return result


def of_file(*paths: Path, **asked: object) -> Extraction:
    """The extraction from files that are good."""
    result, problems = extract_parameters(list(paths), Request(**asked))  # type: ignore[arg-type]
    assert result is not None, problems
    return result


def problems_of(path: Path, **asked: object) -> list[Problem]:
    """What is said of a file that is not."""
    result, problems = extract_parameters([path], Request(**asked), shown=[path.name])  # type: ignore[arg-type]
    assert result is None
    assert problems
    return problems


def value(result: Extraction, name: str) -> float:
    """A parameter that must have come from the data."""
    estimate = result.estimates[name]
    assert estimate.value is not None, estimate.reason
    return estimate.value


def error(result: Extraction, name: str) -> float:
    """Its standard error."""
    found = result.estimates[name].standard_error
    assert found is not None, result.estimates[name]
    return found
