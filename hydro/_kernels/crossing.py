"""Where straight lines cross triangles: the pieces of each segment inside each triangle."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def pieces(xy, triangles, grid, start, items, ax, ay, bx, by):
    """Pieces of the segment a to b inside triangles: (triangle, from, to), shares of its length, in order.

    A piece along a side shared by two triangles is given to one of them. ``grid, start, items`` list
    the triangles by cell, as made by :func:`locate.seed_grid`.
    """
    nx = int(grid[3])
    ny = int(grid[4])
    dx = bx - ax
    dy = by - ay
    length = np.hypot(dx, dy)
    room = 64
    of = np.empty(room, np.int32)
    lo = np.empty(room)
    hi = np.empty(room)
    n = 0
    r0 = max(int(np.floor((min(ay, by) - grid[1]) / grid[2])), 0)
    r1 = min(int(np.floor((max(ay, by) - grid[1]) / grid[2])), ny - 1)
    for r in range(r0, r1 + 1):
        # The part of the segment within this row of cells bounds the columns that it can meet.
        f0, f1 = 0.0, 1.0
        if dy != 0.0:
            g0 = (grid[1] + r * grid[2] - ay) / dy
            g1 = (grid[1] + (r + 1) * grid[2] - ay) / dy
            f0 = max(0.0, min(g0, g1))
            f1 = min(1.0, max(g0, g1))
        x0 = ax + f0 * dx
        x1 = ax + f1 * dx
        c0 = max(int(np.floor((min(x0, x1) - grid[0]) / grid[2] - 1e-9)), 0)
        c1 = min(int(np.floor((max(x0, x1) - grid[0]) / grid[2] + 1e-9)), nx - 1)
        for c in range(c0, c1 + 1):
            for p in range(start[r * nx + c], start[r * nx + c + 1]):
                t = items[p]
                t0, t1 = 0.0, 1.0
                for k in range(3):
                    i = triangles[t, k]
                    j = triangles[t, (k + 1) % 3]
                    ex = xy[j, 0] - xy[i, 0]
                    ey = xy[j, 1] - xy[i, 1]
                    at_a = ex * (ay - xy[i, 1]) - ey * (ax - xy[i, 0])
                    slope = ex * dy - ey * dx
                    if abs(slope) <= 1e-14 * length * (abs(ex) + abs(ey)):
                        if at_a < 0.0:
                            t1 = -1.0
                            break
                    elif slope > 0.0:
                        t0 = max(t0, -at_a / slope)
                    else:
                        t1 = min(t1, -at_a / slope)
                if t1 - t0 > 1e-12:
                    if n == room:
                        room *= 2
                        of = np.concatenate((of, np.empty(n, np.int32)))
                        lo = np.concatenate((lo, np.empty(n)))
                        hi = np.concatenate((hi, np.empty(n)))
                    of[n] = t
                    lo[n] = t0
                    hi[n] = t1
                    n += 1
    order = np.argsort(lo[:n] + 1e-9 * hi[:n], kind="mergesort")
    keep = np.zeros(n, np.bool_)
    reached = -1.0
    for k in range(n):
        i = order[k]
        # The same triangle is met from several cells, and a shared side from both of its triangles.
        if hi[i] > reached + 1e-12:
            lo[i] = max(lo[i], reached)
            keep[k] = True
            reached = hi[i]
    chosen = order[keep]
    return of[chosen], lo[chosen], hi[chosen]
