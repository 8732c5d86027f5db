"""Array types shared by the physics."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Real = float | Array
"""A number, or an array that broadcasts with the other arguments."""
