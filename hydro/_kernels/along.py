"""Streamlines along psi: triangle by triangle, each crossing found from the side's own two nodes."""

from __future__ import annotations

import numpy as np
from numba import njit

LEFT, WALL, LIMIT, CLOSED, STILL = 0, 1, 2, 3, 4


@njit(cache=True, nogil=True)
def crossing(xy, psi, i, j, level):
    """Point where psi passes ``level`` on the side of nodes i, j; the same to the bit from both triangles."""
    if i > j:
        i, j = j, i
    f = (level - psi[i]) / (psi[j] - psi[i])
    return xy[i, 0] + f * (xy[j, 0] - xy[i, 0]), xy[i, 1] + f * (xy[j, 1] - xy[i, 1])


@njit(cache=True, nogil=True)
def _value(xy, triangles, psi, t, x, y):
    """psi at a point of triangle t."""
    a, b, c = triangles[t, 0], triangles[t, 1], triangles[t, 2]
    area2 = (xy[b, 0] - xy[a, 0]) * (xy[c, 1] - xy[a, 1]) - (xy[b, 1] - xy[a, 1]) * (xy[c, 0] - xy[a, 0])
    wa = ((xy[b, 0] - x) * (xy[c, 1] - y) - (xy[c, 0] - x) * (xy[b, 1] - y)) / area2
    wb = ((xy[c, 0] - x) * (xy[a, 1] - y) - (xy[a, 0] - x) * (xy[c, 1] - y)) / area2
    return wa * psi[a] + wb * psi[b] + (1.0 - wa - wb) * psi[c]


@njit(cache=True, nogil=True)
def follow(xy, triangles, neighbours, inside, psi, depth, open_side, beside, t, x, y, level, forward, out_xy, out_t, out_tri):
    """Follow psi = ``level`` from (x, y) in triangle t until it leaves, closes, or the arrays are full.

    Facing along the flow psi is higher on the left, so a line leaves an anticlockwise triangle where psi
    rises through the level along the side. Times come from depth over unit discharge, exact for linear
    depth. ``beside`` (m,) marks triangles at a link's path: psi jumps between them and their neighbours, so the level
    is read anew where the line enters. Returns (points written, why it ended).
    """
    room = out_xy.shape[0]
    out_xy[0, 0] = x
    out_xy[0, 1] = y
    out_t[0] = 0.0
    out_tri[0] = t
    first = -1
    n = 1
    while True:
        a, b, c = triangles[t, 0], triangles[t, 1], triangles[t, 2]
        area2 = (xy[b, 0] - xy[a, 0]) * (xy[c, 1] - xy[a, 1]) - (xy[b, 1] - xy[a, 1]) * (xy[c, 0] - xy[a, 0])
        px = (psi[a] * (xy[b, 1] - xy[c, 1]) + psi[b] * (xy[c, 1] - xy[a, 1]) + psi[c] * (xy[a, 1] - xy[b, 1])) / area2
        py = (psi[a] * (xy[c, 0] - xy[b, 0]) + psi[b] * (xy[a, 0] - xy[c, 0]) + psi[c] * (xy[b, 0] - xy[a, 0])) / area2
        flow = np.hypot(px, py)
        side = -1
        for k in range(3):
            low_i = psi[triangles[t, k]] < level
            low_j = psi[triangles[t, (k + 1) % 3]] < level
            if (forward and low_i and not low_j) or (not forward and not low_i and low_j):
                side = k
        if side < 0 or not flow > 0.0:
            return n, STILL
        nx, ny = crossing(xy, psi, triangles[t, side], triangles[t, (side + 1) % 3], level)
        # Depth is linear in the triangle: its mean over the piece is that of the piece's middle.
        x0 = out_xy[n - 1, 0]
        y0 = out_xy[n - 1, 1]
        mx = (x0 + nx) / 2
        my = (y0 + ny) / 2
        wa = ((xy[b, 0] - mx) * (xy[c, 1] - my) - (xy[c, 0] - mx) * (xy[b, 1] - my)) / area2
        wb = ((xy[c, 0] - mx) * (xy[a, 1] - my) - (xy[a, 0] - mx) * (xy[c, 1] - my)) / area2
        h = wa * depth[a] + wb * depth[b] + (1.0 - wa - wb) * depth[c]
        out_xy[n, 0] = nx
        out_xy[n, 1] = ny
        out_t[n] = out_t[n - 1] + np.hypot(nx - x0, ny - y0) * max(h, 0.0) / flow
        out_tri[n] = t
        n += 1
        here = 3 * t + side
        if first < 0:
            first = here
        elif here == first:
            return n, CLOSED
        u = neighbours[t, side]
        if u < 0 or not inside[u]:
            return n, LEFT if open_side[here] else WALL
        if n >= room:
            return n, LIMIT
        if beside[t] or beside[u]:
            level = _value(xy, triangles, psi, u, nx, ny)
        t = u
