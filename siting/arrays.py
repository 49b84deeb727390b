"""Names of the array types used throughout, so that signatures say what an array holds."""

import numpy as np
from numpy.typing import NDArray

Flags = NDArray[np.bool_]
"""True or false, one per element."""

Floats = NDArray[np.float64]
"""Double-precision numbers; the unit is in the docstring of the field."""

Positions = NDArray[np.int32]
"""Positions in a tuple of names; never shown to a user."""
