"""Order of points along a Hilbert curve, so that neighbours in space are neighbours in memory."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def hilbert_keys(ix, iy, bits):
    """Keys (n,) int64 of integer cells ix, iy (n,) in a grid of 2**bits a side."""
    n = ix.size
    keys = np.empty(n, np.int64)
    for i in range(n):
        x = ix[i]
        y = iy[i]
        key = 0
        s = 1 << (bits - 1)
        while s > 0:
            rx = 1 if (x & s) > 0 else 0
            ry = 1 if (y & s) > 0 else 0
            key += s * s * ((3 * rx) ^ ry)
            if ry == 0:
                if rx == 1:
                    x = (1 << bits) - 1 - x
                    y = (1 << bits) - 1 - y
                x, y = y, x
            s >>= 1
        keys[i] = key
    return keys


def hilbert_order(xy: np.ndarray, bits: int = 16) -> np.ndarray:
    """Indices (n,) that sort points (n, 2) along the curve; ties keep their order."""
    low = xy.min(axis=0)
    span = max(float((xy.max(axis=0) - low).max()), 1e-300)
    cell = np.minimum(((xy - low) / span * (1 << bits)).astype(np.int64), (1 << bits) - 1)
    return np.argsort(hilbert_keys(cell[:, 0], cell[:, 1], bits), kind="stable")
