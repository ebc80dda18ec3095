"""Which triangle covers each pixel, and values of nodes carried to pixels."""

from __future__ import annotations

import math

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def bounds_of(x, y, triangles):
    """(m, 4) west, south, east, north of each triangle."""
    out = np.empty((len(triangles), 4))
    for t in range(len(triangles)):
        a, b, c = triangles[t, 0], triangles[t, 1], triangles[t, 2]
        out[t, 0] = min(x[a], x[b], x[c])
        out[t, 1] = min(y[a], y[b], y[c])
        out[t, 2] = max(x[a], x[b], x[c])
        out[t, 3] = max(y[a], y[b], y[c])
    return out


@njit(cache=True, nogil=True)
def fill_index(x, y, triangles, bounds, west, south, step, out):
    """Write into out (rows, columns) int32 the triangle over each pixel's centre, rows from the south.

    Rows and spans are half open, and a side is cut from its lower end in every triangle that has it:
    no pixel is claimed twice or missed between neighbours.
    """
    rows, columns = out.shape
    east, north = west + columns * step, south + rows * step
    out[:] = -1
    for t in range(len(triangles)):
        if bounds[t, 2] < west or bounds[t, 0] > east or bounds[t, 3] < south or bounds[t, 1] > north:
            continue
        first = max(0, math.ceil((bounds[t, 1] - south) / step - 0.5))
        last = min(rows, math.ceil((bounds[t, 3] - south) / step - 0.5))
        for r in range(first, last):
            level = south + (r + 0.5) * step
            low, high = np.inf, -np.inf
            for k in range(3):
                i, j = triangles[t, k], triangles[t, (k + 1) % 3]
                if y[i] > y[j] or (y[i] == y[j] and i > j):
                    i, j = j, i
                if y[i] <= level and level < y[j]:
                    cut = x[i] + (level - y[i]) * (x[j] - x[i]) / (y[j] - y[i])
                    low, high = min(low, cut), max(high, cut)
            if low < high:
                begin = max(0, math.ceil((low - west) / step - 0.5))
                end = min(columns, math.ceil((high - west) / step - 0.5))
                for c in range(begin, end):
                    out[r, c] = t


@njit(cache=True, nogil=True)
def paint(index, x, y, triangles, west, south, step, value, top, depth, wet, psi, tube, carries, out):
    """Write the map's bytes: 0 no water, 1-127 the value in an even tube, 128-254 in an odd tube.

    ``value`` from 0 to ``top`` and ``depth`` are linear in each triangle. Where ``psi`` (n,) is not a
    number or ``tube`` is 0 all counts as even. ``carries`` (m,) triangles are water however shallow.
    """
    rows, columns = index.shape
    scale = 126.999 / top
    for r in range(rows):
        py = south + (r + 0.5) * step
        for c in range(columns):
            out[r, c] = 0
            t = index[r, c]
            if t < 0:
                continue
            i, j, k = triangles[t, 0], triangles[t, 1], triangles[t, 2]
            px = west + (c + 0.5) * step
            area = (x[j] - x[i]) * (y[k] - y[i]) - (x[k] - x[i]) * (y[j] - y[i])
            a = ((x[j] - px) * (y[k] - py) - (x[k] - px) * (y[j] - py)) / area
            b = ((x[k] - px) * (y[i] - py) - (x[i] - px) * (y[k] - py)) / area
            g = 1.0 - a - b
            d = a * depth[i] + b * depth[j] + g * depth[k]
            if d <= wet and not (carries[t] and d > 0.0):
                continue
            v = a * value[i] + b * value[j] + g * value[k]
            shade = 1 + int(min(max(v * scale, 0.0), 126.0))
            if tube > 0.0:
                p = a * psi[i] + b * psi[j] + g * psi[k]
                if p == p and math.floor(p / tube) % 2 != 0:
                    shade += 127
            out[r, c] = shade


@njit(cache=True, nogil=True)
def at_pixels(index, x, y, triangles, west, south, step, value, out):
    """Write into out (rows, columns) values (n,) linear in each triangle; NaN off the mesh."""
    rows, columns = index.shape
    for r in range(rows):
        py = south + (r + 0.5) * step
        for c in range(columns):
            t = index[r, c]
            if t < 0:
                out[r, c] = np.nan
                continue
            i, j, k = triangles[t, 0], triangles[t, 1], triangles[t, 2]
            px = west + (c + 0.5) * step
            area = (x[j] - x[i]) * (y[k] - y[i]) - (x[k] - x[i]) * (y[j] - y[i])
            a = ((x[j] - px) * (y[k] - py) - (x[k] - px) * (y[j] - py)) / area
            b = ((x[k] - px) * (y[i] - py) - (x[i] - px) * (y[k] - py)) / area
            out[r, c] = a * value[i] + b * value[j] + (1.0 - a - b) * value[k]
