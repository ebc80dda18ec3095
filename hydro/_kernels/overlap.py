"""Areas that the triangles of two meshes share, by clipping one against the other."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def _clip_area(ax, ay, bx, by, px, py, qx, qy):
    """Area common to two anticlockwise triangles (Sutherland and Hodgman 1974); p, q are scratch."""
    n = 3
    for k in range(3):
        px[k] = ax[k]
        py[k] = ay[k]
    for k in range(3):
        x0 = bx[k]
        y0 = by[k]
        ex = bx[(k + 1) % 3] - x0
        ey = by[(k + 1) % 3] - y0
        m = 0
        for i in range(n):
            j = (i + 1) % n
            di = ex * (py[i] - y0) - ey * (px[i] - x0)
            dj = ex * (py[j] - y0) - ey * (px[j] - x0)
            if di >= 0:
                qx[m] = px[i]
                qy[m] = py[i]
                m += 1
            if (di > 0 and dj < 0) or (di < 0 and dj > 0):
                f = di / (di - dj)
                qx[m] = px[i] + f * (px[j] - px[i])
                qy[m] = py[i] + f * (py[j] - py[i])
                m += 1
        n = m
        if n < 3:
            return 0.0
        for i in range(n):
            px[i] = qx[i]
            py[i] = qy[i]
    area = 0.0
    for i in range(1, n - 1):
        area += (px[i] - px[0]) * (py[i + 1] - py[0]) - (px[i + 1] - px[0]) * (py[i] - py[0])
    return area / 2


@njit(cache=True, nogil=True)
def overlaps(xy_a, tri_a, xy_b, tri_b, grid, start, items):
    """Pairs of triangles of a and b that share area: (a, b, shared area), in order of a.

    ``grid, start, items`` list b's triangles by cell, as made by :func:`locate.seed_grid`.
    """
    room = max(16, 4 * tri_a.shape[0])
    of_a = np.empty(room, np.int32)
    of_b = np.empty(room, np.int32)
    shared = np.empty(room)
    seen = np.full(tri_b.shape[0], -1, np.int32)
    ax = np.empty(3)
    ay = np.empty(3)
    bx = np.empty(3)
    by = np.empty(3)
    px = np.empty(12)
    py = np.empty(12)
    qx = np.empty(12)
    qy = np.empty(12)
    nx = int(grid[3])
    ny = int(grid[4])
    n = 0
    for t in range(tri_a.shape[0]):
        for k in range(3):
            ax[k] = xy_a[tri_a[t, k], 0]
            ay[k] = xy_a[tri_a[t, k], 1]
        west, east, south, north = ax.min(), ax.max(), ay.min(), ay.max()
        c0 = max(int(np.floor((west - grid[0]) / grid[2])), 0)
        c1 = min(int(np.floor((east - grid[0]) / grid[2])), nx - 1)
        r0 = max(int(np.floor((south - grid[1]) / grid[2])), 0)
        r1 = min(int(np.floor((north - grid[1]) / grid[2])), ny - 1)
        for r in range(r0, r1 + 1):
            for c in range(c0, c1 + 1):
                for p in range(start[r * nx + c], start[r * nx + c + 1]):
                    u = items[p]
                    if seen[u] == t:
                        continue
                    seen[u] = t
                    for k in range(3):
                        bx[k] = xy_b[tri_b[u, k], 0]
                        by[k] = xy_b[tri_b[u, k], 1]
                    if bx.max() <= west or bx.min() >= east or by.max() <= south or by.min() >= north:
                        continue
                    area = _clip_area(ax, ay, bx, by, px, py, qx, qy)
                    if area <= 0.0:
                        continue
                    if n == room:
                        room *= 2
                        of_a = np.concatenate((of_a, np.empty(n, np.int32)))
                        of_b = np.concatenate((of_b, np.empty(n, np.int32)))
                        shared = np.concatenate((shared, np.empty(n)))
                    of_a[n] = t
                    of_b[n] = u
                    shared[n] = area
                    n += 1
    return of_a[:n], of_b[:n], shared[:n]
