"""Which triangle holds a point: a seed from a coarse grid, then a walk through neighbours."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def _cells(xy, triangles, x0, y0, size, nx, ny, start, items, filling):
    """Count (first pass) or list (second pass) the triangles whose bounds touch each grid cell."""
    for t in range(triangles.shape[0]):
        i, j, k = triangles[t, 0], triangles[t, 1], triangles[t, 2]
        c0 = int((min(xy[i, 0], xy[j, 0], xy[k, 0]) - x0) / size)
        c1 = int((max(xy[i, 0], xy[j, 0], xy[k, 0]) - x0) / size)
        r0 = int((min(xy[i, 1], xy[j, 1], xy[k, 1]) - y0) / size)
        r1 = int((max(xy[i, 1], xy[j, 1], xy[k, 1]) - y0) / size)
        for r in range(max(r0, 0), min(r1, ny - 1) + 1):
            for c in range(max(c0, 0), min(c1, nx - 1) + 1):
                cell = r * nx + c
                if filling:
                    items[start[cell]] = t
                    start[cell] += 1
                else:
                    start[cell + 1] += 1


def seed_grid(xy, triangles):
    """Grid (geometry, cell starts, triangles in each cell), about two triangles to a cell that holds any.

    A river fills little of its bounding box: the cell follows the triangles' own area, as far as the grid
    keeps to twenty cells a triangle.
    """
    low, high = xy.min(axis=0), xy.max(axis=0)
    span = np.maximum(high - low, 1e-300)
    p = xy[triangles]
    one, two = p[:, 1] - p[:, 0], p[:, 2] - p[:, 0]
    area = float(np.abs(one[:, 0] * two[:, 1] - one[:, 1] * two[:, 0]).sum()) / 2
    size = float(np.sqrt(2 * area / max(len(triangles), 1)))
    size = max(size, float(np.sqrt(span[0] * span[1] / (20 * len(triangles) + 100))))
    nx, ny = int(span[0] / size) + 1, int(span[1] / size) + 1
    start = np.zeros(nx * ny + 1, np.int64)
    _cells(xy, triangles, low[0], low[1], size, nx, ny, start, np.empty(0, np.int32), False)
    np.cumsum(start, out=start)
    items = np.empty(start[-1], np.int32)
    _cells(xy, triangles, low[0], low[1], size, nx, ny, start.copy(), items, True)
    return np.array([low[0], low[1], size, nx, ny]), start, items


@njit(cache=True, nogil=True)
def _outside_by(xy, triangles, t, px, py):
    """Side with the most negative distance measure and that measure, relative to the area."""
    worst = 0.0
    side = -1
    i, j, k = triangles[t, 0], triangles[t, 1], triangles[t, 2]
    area = (xy[j, 0] - xy[i, 0]) * (xy[k, 1] - xy[i, 1]) - (xy[k, 0] - xy[i, 0]) * (xy[j, 1] - xy[i, 1])
    for s in range(3):
        a = triangles[t, s]
        b = triangles[t, (s + 1) % 3]
        d = (xy[b, 0] - xy[a, 0]) * (py - xy[a, 1]) - (xy[b, 1] - xy[a, 1]) * (px - xy[a, 0])
        d /= area
        if d < worst:
            worst = d
            side = s
    return side, worst


@njit(cache=True, nogil=True)
def search_cell(xy, triangles, grid, start, items, px, py):
    """Triangle of the point's grid cell that holds it, within round-off; -1 if none does."""
    nx = int(grid[3])
    ny = int(grid[4])
    c = int((px - grid[0]) / grid[2])
    r = int((py - grid[1]) / grid[2])
    if px < grid[0] or py < grid[1] or c >= nx or r >= ny:
        if px < grid[0] or py < grid[1] or c > nx or r > ny:
            return -1
        c = min(c, nx - 1)
        r = min(r, ny - 1)
    best = -1
    nearest = -1e-9
    for p in range(start[r * nx + c], start[r * nx + c + 1]):
        t = items[p]
        side, by = _outside_by(xy, triangles, t, px, py)
        if side < 0:
            return t
        if by > nearest:
            nearest = by
            best = t
    return best


@njit(cache=True, nogil=True)
def walk(xy, triangles, neighbours, t, px, py, limit):
    """Triangle reached from t by crossing the side most in the way; -1 at the mesh edge or the limit."""
    for _ in range(limit):
        side, _by = _outside_by(xy, triangles, t, px, py)
        if side < 0:
            return t
        t = neighbours[t, side]
        if t < 0:
            return -1
    return -1


@njit(cache=True, nogil=True)
def find_points(xy, triangles, neighbours, grid, start, items, points):
    """Triangle (k,) of each point (k, 2), -1 outside. Tries the last point's triangle first."""
    out = np.empty(points.shape[0], np.int32)
    last = -1
    for i in range(points.shape[0]):
        t = -1
        if last >= 0:
            t = walk(xy, triangles, neighbours, last, points[i, 0], points[i, 1], 4)
        if t < 0:
            t = search_cell(xy, triangles, grid, start, items, points[i, 0], points[i, 1])
        out[i] = t
        if t >= 0:
            last = t
    return out
