"""Parcels moved through two frames by an adaptive embedded Runge-Kutta pair, triangle by triangle.

Bogacki and Shampine 1989 (Appl. Math. Lett. 2, 321-325): third order with a second-order error estimate.
Nodes hold [q_x, q_y, h] of both frames together, so that a velocity costs one row a node.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

AFLOAT, LEFT, GROUNDED, OUTSIDE = 0, 1, 2, 3


@njit(cache=True, nogil=True, inline="always")
def _weights(xy, tri, t, x, y):
    a, b, c = tri[t, 0], tri[t, 1], tri[t, 2]
    area2 = (xy[b, 0] - xy[a, 0]) * (xy[c, 1] - xy[a, 1]) - (xy[b, 1] - xy[a, 1]) * (xy[c, 0] - xy[a, 0])
    wa = ((xy[b, 0] - x) * (xy[c, 1] - y) - (xy[c, 0] - x) * (xy[b, 1] - y)) / area2
    wb = ((xy[c, 0] - x) * (xy[a, 1] - y) - (xy[a, 0] - x) * (xy[c, 1] - y)) / area2
    return wa, wb, 1.0 - wa - wb


@njit(cache=True, nogil=True)
def walk_to(xy, tri, nb, t, x, y):
    """Triangle that holds (x, y), walking from t: (triangle or -1, last triangle, side it would leave by)."""
    for _ in range(10000):
        wa, wb, wc = _weights(xy, tri, t, x, y)
        # Corner a lies across side 1 (b to c), b across side 2, c across side 0.
        low = wa
        side = 1
        if wb < low:
            low = wb
            side = 2
        if wc < low:
            low = wc
            side = 0
        if low >= -1e-12:
            return t, t, -1
        u = nb[t, side]
        if u < 0:
            return -1, t, side
        t = u
    return -1, t, -1


@njit(cache=True, nogil=True)
def velocity(xy, tri, f0, f1, share, t, x, y, wet, vx, vy):
    """Velocity at a point in triangle t, in the view that moves with (vx, vy): (u, v, depth)."""
    wa, wb, wc = _weights(xy, tri, t, x, y)
    a, b, c = tri[t, 0], tri[t, 1], tri[t, 2]
    s = 1.0 - share
    qx = s * (wa * f0[a, 0] + wb * f0[b, 0] + wc * f0[c, 0]) + share * (wa * f1[a, 0] + wb * f1[b, 0] + wc * f1[c, 0])
    qy = s * (wa * f0[a, 1] + wb * f0[b, 1] + wc * f0[c, 1]) + share * (wa * f1[a, 1] + wb * f1[b, 1] + wc * f1[c, 1])
    h = s * (wa * f0[a, 2] + wb * f0[b, 2] + wc * f0[c, 2]) + share * (wa * f1[a, 2] + wb * f1[b, 2] + wc * f1[c, 2])
    if h <= wet:
        return 0.0, 0.0, h
    return qx / h - vx, qy / h - vy, h


@njit(cache=True, nogil=True)
def _one(xy, tri, nb, open_side, f0, f1, ta, tb, wet, vx, vy, tolerance, sense, x, y, t, now, until, step):
    """Move one parcel from ``now`` to ``until``: (x, y, triangle, state, touches, step, length)."""
    touches = 0
    length = 0.0
    span = tb - ta
    while sense * (until - now) > 1e-12 * max(1.0, abs(until)):
        share = 0.0 if span == 0.0 else (now - ta) / span
        u1, v1, h = velocity(xy, tri, f0, f1, share, t, x, y, wet, vx, vy)
        if h <= wet:
            # Aground: wait a twentieth of the gap between frames and look again.
            wait = abs(until - now) if span == 0.0 else min(abs(until - now), abs(span) / 20)
            now += sense * wait
            if span == 0.0 or sense * (until - now) <= 1e-12 * max(1.0, abs(until)):
                return x, y, t, GROUNDED, touches, step, length
            continue
        a, b, c = tri[t, 0], tri[t, 1], tri[t, 2]
        area2 = (xy[b, 0] - xy[a, 0]) * (xy[c, 1] - xy[a, 1]) - (xy[b, 1] - xy[a, 1]) * (xy[c, 0] - xy[a, 0])
        size = np.sqrt(area2)
        speed = np.hypot(u1, v1)
        dt = min(step, abs(until - now))
        if speed * dt > 0.7 * size:
            dt = 0.7 * size / speed
        moved = False
        while not moved:
            d = sense * dt
            s2 = 0.0 if span == 0.0 else (now + 0.5 * d - ta) / span
            s3 = 0.0 if span == 0.0 else (now + 0.75 * d - ta) / span
            s4 = 0.0 if span == 0.0 else (now + d - ta) / span
            t2, l2, e2 = walk_to(xy, tri, nb, t, x + 0.5 * d * u1, y + 0.5 * d * v1)
            ok = t2 >= 0
            if ok:
                u2, v2, h2 = velocity(xy, tri, f0, f1, s2, t2, x + 0.5 * d * u1, y + 0.5 * d * v1, wet, vx, vy)
                t3, l3, e3 = walk_to(xy, tri, nb, t2, x + 0.75 * d * u2, y + 0.75 * d * v2)
                ok = t3 >= 0
            if ok:
                u3, v3, h3 = velocity(xy, tri, f0, f1, s3, t3, x + 0.75 * d * u2, y + 0.75 * d * v2, wet, vx, vy)
                nx = x + d * (2 * u1 + 3 * u2 + 4 * u3) / 9
                ny = y + d * (2 * v1 + 3 * v2 + 4 * v3) / 9
                t4, last, side = walk_to(xy, tri, nb, t3, nx, ny)
                ok = t4 >= 0
            if ok:
                u4, v4, h4 = velocity(xy, tri, f0, f1, s4, t4, nx, ny, wet, vx, vy)
                ex = dt * (-5 * u1 / 72 + u2 / 12 + u3 / 9 - u4 / 8)
                ey = dt * (-5 * v1 / 72 + v2 / 12 + v3 / 9 - v4 / 8)
                error = np.hypot(ex, ey)
                if error > tolerance and dt > 1e-6:
                    dt *= max(0.2, 0.9 * (tolerance / error) ** (1.0 / 3.0))
                    continue
                length += np.hypot(nx - x, ny - y)
                x, y, t = nx, ny, t4
                now += d
                grow = 5.0 if error == 0.0 else min(5.0, 0.9 * (tolerance / error) ** (1.0 / 3.0))
                step = max(dt * grow, 1e-6)
                moved = True
                continue
            if dt * speed > 0.02 * size and dt > 1e-6:
                dt *= 0.5
                continue
            # A short step still leaves: which side does it meet?
            te, le, se = walk_to(xy, tri, nb, t, x + d * u1, y + d * v1)
            if te >= 0:
                x, y, t = x + d * u1, y + d * v1, te
                now += d
                moved = True
                continue
            if se >= 0 and open_side[3 * le + se]:
                return x + d * u1, y + d * v1, t, LEFT, touches, step, length + dt * speed
            touches += 1
            # A wall: go on along it, a hair inside.
            i = tri[le, se]
            j = tri[le, (se + 1) % 3]
            ex = xy[j, 0] - xy[i, 0]
            ey = xy[j, 1] - xy[i, 1]
            side_length = np.hypot(ex, ey)
            along = (u1 * ex + v1 * ey) / side_length
            hair = 1e-6 * side_length
            sx = x + d * along * ex / side_length - hair * ey / side_length
            sy = y + d * along * ey / side_length + hair * ex / side_length
            ts, ls, ss = walk_to(xy, tri, nb, t, sx, sy)
            if ts >= 0:
                length += np.hypot(sx - x, sy - y)
                x, y, t = sx, sy, ts
            now += d
            moved = True
    return x, y, t, AFLOAT, touches, step, length


@njit(cache=True, nogil=True, parallel=True)
def move(xy, tri, nb, open_side, f0, f1, ta, tb, wet, vx, vy, tolerance, sense, begin, until, px, py, pt, state, touches, step, length):
    """Move all parcels that are afloat or aground to ``until``, in place; each begins at its own time.

    ``begin`` (k,): now, for each parcel; those beyond ``until`` stay where they are.
    """
    for k in prange(px.size):
        if state[k] == LEFT or state[k] == OUTSIDE or sense * (until - begin[k]) <= 0.0:
            continue
        x, y, t, s, n, d, way = _one(
            xy, tri, nb, open_side, f0, f1, ta, tb, wet, vx, vy, tolerance, sense, px[k], py[k], pt[k], begin[k], until, step[k]
        )
        px[k] = x
        py[k] = y
        pt[k] = t
        state[k] = s
        touches[k] += n
        step[k] = d
        length[k] += way
