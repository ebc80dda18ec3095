"""The nearest place of a line for many points: chainage along it and signed offset."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def locate(xy, line, chainages, s, n):
    """Fill chainage s (k,) and offset n (k,), positive to the left, of points xy (k, 2).

    The first of equally near segments counts; beyond the line's ends its end segments go on.
    """
    last = line.shape[0] - 2
    for p in range(xy.shape[0]):
        best = np.inf
        for i in range(last + 1):
            dx, dy = line[i + 1, 0] - line[i, 0], line[i + 1, 1] - line[i, 1]
            length = np.hypot(dx, dy)
            rx, ry = xy[p, 0] - line[i, 0], xy[p, 1] - line[i, 1]
            along = (rx * dx + ry * dy) / length
            foot = along
            if i > 0 and foot < 0.0:
                foot = 0.0
            if i < last and foot > length:
                foot = length
            across = (dx * ry - dy * rx) / length
            distance = np.hypot(across, along - foot)
            if distance < best - 1e-12:
                best = distance
                s[p] = chainages[i] + foot
                n[p] = -distance if across < 0.0 else distance
