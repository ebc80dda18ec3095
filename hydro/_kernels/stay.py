"""Parcels that follow psi exactly, triangle by triangle, and walk at random between, until they leave a zone."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from .move import _weights, walk_to
from .wood import uniform


@njit(cache=True, nogil=True)
def _slopes(xy, tri, t, fa, fb, fc):
    """Gradient in triangle t of a field given at its corners."""
    a, b, c = tri[t, 0], tri[t, 1], tri[t, 2]
    bx, by, cx, cy = xy[b, 0] - xy[a, 0], xy[b, 1] - xy[a, 1], xy[c, 0] - xy[a, 0], xy[c, 1] - xy[a, 1]
    area2 = bx * cy - by * cx
    return ((fb - fa) * cy - (fc - fa) * by) / area2, ((fc - fa) * bx - (fb - fa) * cx) / area2


@njit(cache=True, nogil=True)
def carried(xy, tri, nb, psi, depth, least, t, x, y, dt):
    """Follow psi for dt s: q = (dpsi/dy, -dpsi/dx) is constant in a triangle and tangent to psi.

    Returns (x, y, triangle). A parcel stays where a wall, which psi follows, ends its triangle.
    """
    rest = dt
    came = -1
    for _ in range(10000):
        a, b, c = tri[t, 0], tri[t, 1], tri[t, 2]
        gx, gy = _slopes(xy, tri, t, psi[t, 0], psi[t, 1], psi[t, 2])
        h = max((depth[a] + depth[b] + depth[c]) / 3.0, least)
        u, v = gy / h, -gx / h
        wa, wb, wc = _weights(xy, tri, t, x, y)
        pa, pb, pc = _weights(xy, tri, t, x + u, y + v)
        first = rest
        side = -1
        # Corner a lies across side 1, b across side 2, c across side 0.
        for w, rate, s in ((wa, pa - wa, 1), (wb, pb - wb, 2), (wc, pc - wc, 0)):
            if rate < 0.0 and nb[t, s] != came:
                time = max(w, 0.0) / -rate
                if time < first:
                    first = time
                    side = s
        x += u * first
        y += v * first
        rest -= first
        if side < 0 or rest <= 0.0 or nb[t, side] < 0:
            return x, y, t
        came = t
        t = nb[t, side]
    return x, y, t


@njit(cache=True, nogil=True, parallel=True)
def stay(xy, tri, nb, psi, depth, least, inside, edge, sign, mixing, dt, steps, seed, x, y, triangle, seconds, left):
    """Move every parcel until psi is not beyond ``edge`` or its triangle is not ``inside`` (m,) bool.

    ``psi`` (m, 3) at the corners of triangles. The walk of depth-mixed parcels drifts by (K/h) grad h (from
    d(hC)/dt = div(h K grad C)); a walk that would cross a wall or dry ground is not made.
    """
    spread = np.sqrt(6.0 * mixing * dt)
    for k in prange(x.shape[0]):
        px, py, t = x[k], y[k], triangle[k]
        for n in range(steps):
            px, py, t = carried(xy, tri, nb, psi, depth, least, t, px, py, dt)
            a, b, c = tri[t, 0], tri[t, 1], tri[t, 2]
            hx, hy = _slopes(xy, tri, t, depth[a], depth[b], depth[c])
            h = max((depth[a] + depth[b] + depth[c]) / 3.0, least)
            wx = px + mixing * dt * hx / h + spread * (2.0 * uniform(seed, k, n, 0) - 1.0)
            wy = py + mixing * dt * hy / h + spread * (2.0 * uniform(seed, k, n, 1) - 1.0)
            to, _, _ = walk_to(xy, tri, nb, t, wx, wy)
            if to >= 0 and np.isfinite(psi[to, 0] + psi[to, 1] + psi[to, 2]):
                px, py, t = wx, wy, to
            wa, wb, wc = _weights(xy, tri, t, px, py)
            level = wa * psi[t, 0] + wb * psi[t, 1] + wc * psi[t, 2]
            if not inside[t] or sign * (level - edge) <= 0.0:
                seconds[k] = (n + 1) * dt
                left[k] = True
                break
