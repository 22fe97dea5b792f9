"""Time and memory to read a long table of currents and to fit it: python -m tests.bench.extract_rows [ROWS].

Memory is bounded by the rows that are kept, whatever the table's length; printed, not asserted.
"""

import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from tests.extract.independent import Device, grid, noisy
from worksheet.extract.extraction import Request, extract_from_rows, read_rows


def table(path: Path, rows: int) -> None:
    """A table of about so many rows."""
    gates = max(rows // 800, 10)
    at = noisy(
        Device(),
        grid(np.linspace(-0.1, 1.2, gates), vs=tuple(np.linspace(0, 1, 20)), vds=tuple(np.linspace(0.02, 1.2, 40))),
        0,
    )
    columns = np.column_stack([at.vg, at.vs, at.vd, at.id, at.w, at.l, at.temperature])
    np.savetxt(path, columns, delimiter=",", header="vg,vs,vd,id,w,l,temperature", comments="", fmt="%.6g")


def main() -> None:
    """Write the table in a process of its own memory's sake first, then read and fit."""
    if len(sys.argv) > 2:
        table(Path(sys.argv[2]), int(sys.argv[1]))
        return
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "long.csv"
        subprocess.run([sys.executable, "-m", "tests.bench.extract_rows", str(rows), str(path)], check=True)
        start = time.perf_counter()
        found, (reading,), _ = read_rows([path], [path.name], Request())
        read = time.perf_counter() - start
        assert found is not None
        start = time.perf_counter()
        result, _ = extract_from_rows(found, Request(), (reading,))
        fitted = time.perf_counter() - start
    assert result is not None
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(f"{reading.rows} rows: read {read:.1f} s, {reading.kept} kept, fitted {fitted:.1f} s, peak {peak:.0f} MB")


if __name__ == "__main__":
    main()
