"""Compiled loops that are not hydraulics: thinning of seeds and order along a Hilbert curve."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True)
def thin_seeds(xy, radius, fixed):
    """Which points stay so that none lies nearer than its own radius to one before it; the first ``fixed`` all stay."""
    n = len(xy)
    cell = 0.0
    for i in range(n):
        cell = max(cell, radius[i])
    x0, y0 = xy[:, 0].min(), xy[:, 1].min()
    nx = int((xy[:, 0].max() - x0) / cell) + 1
    ny = int((xy[:, 1].max() - y0) / cell) + 1
    head = np.full(nx * ny, -1, np.int64)
    following = np.full(n, -1, np.int64)
    kept = np.zeros(n, np.bool_)
    for i in range(n):
        cx, cy = int((xy[i, 0] - x0) / cell), int((xy[i, 1] - y0) / cell)
        near = False
        if i >= fixed:
            for gx in range(max(cx - 1, 0), min(cx + 2, nx)):
                for gy in range(max(cy - 1, 0), min(cy + 2, ny)):
                    j = head[gx * ny + gy]
                    while j >= 0 and not near:
                        d2 = (xy[i, 0] - xy[j, 0]) ** 2 + (xy[i, 1] - xy[j, 1]) ** 2
                        near = d2 < radius[i] ** 2
                        j = following[j]
        if not near:
            kept[i] = True
            following[i] = head[cx * ny + cy]
            head[cx * ny + cy] = i
    return kept


@njit(cache=True)
def hilbert_key(xy):
    """Place of each point along a Hilbert curve of 2^16 by 2^16 squares."""
    side = 1 << 16
    x0, y0 = xy[:, 0].min(), xy[:, 1].min()
    scale = (side - 1) / max(xy[:, 0].max() - x0, xy[:, 1].max() - y0)
    key = np.zeros(len(xy), np.int64)
    for i in range(len(xy)):
        x, y = int((xy[i, 0] - x0) * scale), int((xy[i, 1] - y0) * scale)
        s = side >> 1
        while s > 0:
            rx, ry = int((x & s) > 0), int((y & s) > 0)
            key[i] += s * s * ((3 * rx) ^ ry)
            if ry == 0:
                if rx == 1:
                    x, y = side - 1 - x, side - 1 - y
                x, y = y, x
            s >>= 1
    return key
