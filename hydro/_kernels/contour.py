"""Contours of a field that is linear in each triangle: lines, and triangles cut at a level."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def _way_out(values, triangles, t, level):
    """Side by which the contour leaves triangle t with the higher values on its left; -1 if it does not enter it."""
    a = values[triangles[t, 0]] > level
    b = values[triangles[t, 1]] > level
    c = values[triangles[t, 2]] > level
    if b and not a:
        return 0
    if c and not b:
        return 1
    if a and not c:
        return 2
    return -1


@njit(cache=True, nogil=True)
def _way_in(values, triangles, t, level):
    a = values[triangles[t, 0]] > level
    b = values[triangles[t, 1]] > level
    c = values[triangles[t, 2]] > level
    if a and not b:
        return 0
    if b and not c:
        return 1
    return 2


@njit(cache=True, nogil=True)
def _crossing(xy, values, triangles, t, k, level):
    """Where the level lies on side k of triangle t; the same bits from either side."""
    i = triangles[t, k]
    j = triangles[t, (k + 1) % 3]
    if j < i:
        i, j = j, i
    f = (level - values[i]) / (values[j] - values[i])
    return xy[i, 0] + f * (xy[j, 0] - xy[i, 0]), xy[i, 1] + f * (xy[j, 1] - xy[i, 1])


@njit(cache=True, nogil=True)
def lines(xy, triangles, neighbours, inside, values, level):
    """Contour lines: points (p, 2) and the first point of each line (k + 1,).

    Higher values lie on the left of each line. Open lines start and end on the domain's edge; closed ones
    repeat their first point.
    """
    m = triangles.shape[0]
    done = np.zeros(m, np.bool_)
    count = 0
    for t in range(m):
        if inside[t]:
            done[t] = _way_out(values, triangles, t, level) < 0
            if not done[t]:
                count += 1
        else:
            done[t] = True
    points = np.empty((2 * count, 2))
    first = np.zeros(count + 1, np.int64)
    n_lines = 0
    n = 0
    for closed in range(2):
        for t0 in range(m):
            if done[t0]:
                continue
            k = _way_in(values, triangles, t0, level)
            if closed == 0:
                u = neighbours[t0, k]
                if u >= 0 and inside[u]:
                    continue
            t = t0
            points[n, 0], points[n, 1] = _crossing(xy, values, triangles, t, k, level)
            n += 1
            while t >= 0 and inside[t] and not done[t]:
                done[t] = True
                k = _way_out(values, triangles, t, level)
                points[n, 0], points[n, 1] = _crossing(xy, values, triangles, t, k, level)
                n += 1
                t = neighbours[t, k]
            n_lines += 1
            first[n_lines] = n
    return points[:n].copy(), first[: n_lines + 1].copy()


@njit(cache=True, nogil=True)
def cut(xy, triangles, chosen, values, level, depth):
    """The part above a level of each chosen triangle.

    Returns corners (c, 4, 2), their number (c,), areas (c,), volumes (c,) under ``depth`` (linear between
    nodes), and the greatest depth (c,).
    """
    n = chosen.size
    corners = np.zeros((n, 4, 2))
    number = np.zeros(n, np.int32)
    area = np.zeros(n)
    volume = np.zeros(n)
    deepest = np.zeros(n)
    d = np.empty(4)
    for s in range(n):
        t = chosen[s]
        c = 0
        for k in range(3):
            i = triangles[t, k]
            j = triangles[t, (k + 1) % 3]
            if values[i] >= level:
                corners[s, c] = xy[i]
                d[c] = depth[i]
                c += 1
            if (values[i] > level and values[j] < level) or (values[i] < level and values[j] > level):
                corners[s, c, 0], corners[s, c, 1] = _crossing(xy, values, triangles, t, k, level)
                f = (level - values[i]) / (values[j] - values[i])
                d[c] = depth[i] + f * (depth[j] - depth[i])
                c += 1
        number[s] = c
        for k in range(c):
            deepest[s] = max(deepest[s], d[k])
        for k in range(1, c - 1):
            ux = corners[s, k, 0] - corners[s, 0, 0]
            uy = corners[s, k, 1] - corners[s, 0, 1]
            vx = corners[s, k + 1, 0] - corners[s, 0, 0]
            vy = corners[s, k + 1, 1] - corners[s, 0, 1]
            piece = (ux * vy - uy * vx) / 2
            area[s] += piece
            volume[s] += piece * (d[0] + d[k] + d[k + 1]) / 3
    return corners, number, area, volume, deepest
