"""The array types that device and engine compute with: double precision, any shape that broadcasts."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
"""Double-precision array; the last axis runs over conditions where a layer above says so."""

Complex = NDArray[np.complex128]
"""Double-precision complex array, same conventions."""

Number = Array | float
"""What the functions of this layer take."""
