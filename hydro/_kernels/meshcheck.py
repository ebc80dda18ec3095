"""Faults of meshes that need a look at every face: faces that cross themselves, nodes inside other faces."""

from __future__ import annotations

from numba import njit


@njit(cache=True, nogil=True)
def _turn(ax, ay, bx, by, cx, cy):
    return (bx - ax) * (cy - ay) - (by - ay) * (cx - ax)


@njit(cache=True, nogil=True)
def self_crossing(xy, faces, count):
    """First face (f, k) int32 with ``count`` corners two of whose sides cross; -1 if none."""
    for f in range(faces.shape[0]):
        n = count[f]
        for i in range(n):
            a = faces[f, i]
            b = faces[f, (i + 1) % n]
            for j in range(i + 2, n):
                if i == 0 and j == n - 1:
                    continue
                c = faces[f, j]
                d = faces[f, (j + 1) % n]
                one = _turn(xy[a, 0], xy[a, 1], xy[b, 0], xy[b, 1], xy[c, 0], xy[c, 1])
                two = _turn(xy[a, 0], xy[a, 1], xy[b, 0], xy[b, 1], xy[d, 0], xy[d, 1])
                three = _turn(xy[c, 0], xy[c, 1], xy[d, 0], xy[d, 1], xy[a, 0], xy[a, 1])
                four = _turn(xy[c, 0], xy[c, 1], xy[d, 0], xy[d, 1], xy[b, 0], xy[b, 1])
                if one * two < 0 and three * four < 0:
                    return f
    return -1


@njit(cache=True, nogil=True)
def stray_nodes(xy, triangles, grid, start, items):
    """First node that lies in a triangle without being its corner.

    ``grid``, ``start``, ``items`` are the seed grid of the triangles. Returns what it is (0 none, 1 on
    a side, 2 inside), the node and the triangle. On a side means within 1e-9 of the side's length.
    """
    nx = int(grid[3])
    ny = int(grid[4])
    for i in range(xy.shape[0]):
        px = xy[i, 0]
        py = xy[i, 1]
        c = min(int((px - grid[0]) / grid[2]), nx - 1)
        r = min(int((py - grid[1]) / grid[2]), ny - 1)
        for p in range(start[r * nx + c], start[r * nx + c + 1]):
            t = items[p]
            lowest = 1e300
            apart = True
            for s in range(3):
                a = triangles[t, s]
                b = triangles[t, (s + 1) % 3]
                if a == i or (xy[a, 0] == px and xy[a, 1] == py):
                    apart = False
                    break
                dx = xy[b, 0] - xy[a, 0]
                dy = xy[b, 1] - xy[a, 1]
                away = (dx * (py - xy[a, 1]) - dy * (px - xy[a, 0])) / (dx * dx + dy * dy)
                lowest = min(lowest, away)
            if apart and lowest > -1e-9:
                return (1 if lowest < 1e-9 else 2), i, t
    return 0, -1, -1


@njit(cache=True, nogil=True)
def too_fast(flow, depth, wet, fastest):
    """First place and number of places whose unit discharge, by component, is beyond ``fastest`` times depth.

    In water no deeper than ``wet`` the bound is ``fastest`` itself; NaN is no flow. (-1, 0) where all is within.
    """
    first, count = -1, 0
    for i in range(depth.size):
        bound = fastest * (depth[i] if depth[i] > wet else 1.0)
        if abs(flow[i, 0]) > bound or abs(flow[i, 1]) > bound:
            if first < 0:
                first = i
            count += 1
    return first, count
