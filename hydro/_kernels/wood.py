"""Floating logs moved by two frames: mean and first moment of the water's velocity along the axis, contact with outlines."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from .move import _weights, walk_to

AFLOAT, LEFT, AGROUND, LODGED, WAITING, OUTSIDE = 0, 1, 2, 3, 4, 5
_S = np.array([-0.4, -0.2, 0.0, 0.2, 0.4])  # middles of five equal pieces of the axis, in lengths


@njit(cache=True, nogil=True)
def uniform(seed, parcel, step, which):
    """A number in (0, 1) that depends on its key alone (splitmix64; Steele, Lea and Flood 2014)."""
    z = np.uint64(seed) * np.uint64(0x9E3779B97F4A7C15)
    z ^= np.uint64(parcel + 1) * np.uint64(0xBF58476D1CE4E5B9)
    z ^= np.uint64(step + 1) * np.uint64(0x94D049BB133111EB)
    z ^= np.uint64(which + 1) * np.uint64(0xD6E8FEB86659FD93)
    for _ in range(2):
        z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
        z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
        z = z ^ (z >> np.uint64(31))
    return (np.float64(z >> np.uint64(11)) + 0.5) / 9007199254740992.0


@njit(cache=True, nogil=True)
def over_draft(draft, depth, profile):
    """Mean velocity over the draft over the depth mean, for u ~ z^(1/profile); 1 where profile is 0."""
    if profile <= 0.0 or depth <= 0.0:
        return 1.0
    d = min(draft / depth, 1.0)
    if d <= 0.0:
        return (profile + 1.0) / profile
    return (1.0 - (1.0 - d) ** ((profile + 1.0) / profile)) / d


@njit(cache=True, nogil=True)
def segment_distance(ax, ay, bx, by, cx, cy, dx, dy):
    """Distance of segments ab and cd, with the share along ab and the nearest point of cd."""
    rx, ry, sx, sy = bx - ax, by - ay, dx - cx, dy - cy
    cross = rx * sy - ry * sx
    if cross != 0.0:
        p = ((cx - ax) * sy - (cy - ay) * sx) / cross
        q = ((cx - ax) * ry - (cy - ay) * rx) / cross
        if 0.0 <= p <= 1.0 and 0.0 <= q <= 1.0:
            return 0.0, p, ax + p * rx, ay + p * ry
    best = 1e300
    share = 0.0
    px = cx
    py = cy
    rr = max(rx * rx + ry * ry, 1e-300)
    ss = max(sx * sx + sy * sy, 1e-300)
    for k in range(4):
        if k < 2:
            qx, qy = (cx, cy) if k == 0 else (dx, dy)
            f = min(max(((qx - ax) * rx + (qy - ay) * ry) / rr, 0.0), 1.0)
            g = np.hypot(ax + f * rx - qx, ay + f * ry - qy)
        else:
            f = 0.0 if k == 2 else 1.0
            ex, ey = ax + f * rx, ay + f * ry
            h = min(max(((ex - cx) * sx + (ey - cy) * sy) / ss, 0.0), 1.0)
            qx, qy = cx + h * sx, cy + h * sy
            g = np.hypot(ex - qx, ey - qy)
        if g < best:
            best, share, px, py = g, f, qx, qy
    return best, share, px, py


@njit(cache=True, nogil=True)
def nearest_outline(rings, starts, boxes, ax, ay, bx, by, reach):
    """Outline nearer to the segment than ``reach``: (index or -1, distance, share along, contact point)."""
    which = -1
    best = reach
    share = 0.0
    px = 0.0
    py = 0.0
    for p in range(starts.size - 1):
        if min(ax, bx) > boxes[p, 2] + reach or max(ax, bx) < boxes[p, 0] - reach:
            continue
        if min(ay, by) > boxes[p, 3] + reach or max(ay, by) < boxes[p, 1] - reach:
            continue
        for i in range(starts[p], starts[p + 1] - 1):
            d, f, qx, qy = segment_distance(ax, ay, bx, by, rings[i, 0], rings[i, 1], rings[i + 1, 0], rings[i + 1, 1])
            if d < best:
                which, best, share, px, py = p, d, f, qx, qy
    return which, best, share, px, py


@njit(cache=True, nogil=True)
def crosses(ax, ay, bx, by, line):
    """Whether the step a to b crosses the line (x0, y0, x1, y1)."""
    d, _f, _x, _y = segment_distance(ax, ay, bx, by, line[0], line[1], line[2], line[3])
    return d == 0.0


@njit(cache=True, nogil=True)
def _log(xy, tri, nb, open_side, f0, f1, bed, mixing, ta, tb, draft, length, radius, profile, seed, k, number, dt, now, x, y, t, angle, rings, starts, boxes, lodge):
    """One step of a log: (x, y, t, angle, state, outline touched or -1, contact share, level)."""
    share = 0.0 if tb == ta else (now + 0.5 * dt - ta) / (tb - ta)
    cx, cy = np.cos(angle), np.sin(angle)
    su, sv, moment, square, n = 0.0, 0.0, 0.0, 0.0, 0
    shallow = 1e300
    level = 0.0
    for j in range(5):
        s = _S[j] * length
        tj, lj, ej = walk_to(xy, tri, nb, t, x + s * cx, y + s * cy)
        if tj < 0:
            continue
        wa, wb, wc = _weights(xy, tri, tj, x + s * cx, y + s * cy)
        a, b, c = tri[tj, 0], tri[tj, 1], tri[tj, 2]
        r = 1.0 - share
        qx = r * (wa * f0[a, 0] + wb * f0[b, 0] + wc * f0[c, 0]) + share * (wa * f1[a, 0] + wb * f1[b, 0] + wc * f1[c, 0])
        qy = r * (wa * f0[a, 1] + wb * f0[b, 1] + wc * f0[c, 1]) + share * (wa * f1[a, 1] + wb * f1[b, 1] + wc * f1[c, 1])
        h = r * (wa * f0[a, 2] + wb * f0[b, 2] + wc * f0[c, 2]) + share * (wa * f1[a, 2] + wb * f1[b, 2] + wc * f1[c, 2])
        shallow = min(shallow, h)
        if j == 2:
            level = h + wa * bed[a] + wb * bed[b] + wc * bed[c]
        u, v = 0.0, 0.0
        if h > 1e-3:
            factor = over_draft(draft, h, profile) / h
            u, v = qx * factor, qy * factor
        su += u
        sv += v
        moment += s * (-cy * u + cx * v)
        square += s * s
        n += 1
    if n == 0:
        return x, y, t, angle, OUTSIDE, -1, 0.0, level
    if shallow < draft:
        return x, y, t, angle, AGROUND, -1, 0.0, level
    u, v = su / n, sv / n
    turn = moment / square if square > 0.0 else 0.0
    if mixing > 0.0:
        # Uniform numbers on (-1, 1) have variance 1/3: sqrt(6 K dt) gives 2 K dt (Visser 1997); K is one value for the run.
        spread = np.sqrt(6.0 * mixing * dt)
        u += spread * (2.0 * uniform(seed, k, number, 0) - 1.0) / dt
        v += spread * (2.0 * uniform(seed, k, number, 1) - 1.0) / dt
    half = 0.5 * length
    which, near, along, px, py = nearest_outline(rings, starts, boxes, x - half * cx, y - half * cy, x + half * cx, y + half * cy, radius)
    if which >= 0:
        arm = (along - 0.5) * length
        if lodge > 0.0 and abs(arm) <= lodge * half:
            return x, y, t, angle, LODGED, which, along, level
        # The contact point holds its place across the outline: the log slides along it and turns about it.
        ox, oy = x + arm * cx - px, y + arm * cy - py
        size = np.hypot(ox, oy)
        if size < 1e-9:
            ox, oy = x - 0.5 * (boxes[which, 0] + boxes[which, 2]), y - 0.5 * (boxes[which, 1] + boxes[which, 3])
            size = max(np.hypot(ox, oy), 1e-9)
        ox, oy = ox / size, oy / size
        inward = u * ox + v * oy
        if inward < 0.0:
            u -= inward * ox
            v -= inward * oy
        u += ox * (radius - near) / dt * 0.5
        v += oy * (radius - near) / dt * 0.5
        across = -cy * (su / n) + cx * (sv / n)
        turn = (moment - arm * across * n) / (square + n * arm * arm)
    nx, ny = x + u * dt, y + v * dt
    tn, last, side = walk_to(xy, tri, nb, t, nx, ny)
    if tn < 0:
        if side >= 0 and open_side[3 * last + side]:
            return nx, ny, t, angle, LEFT, which, along, level
        return x, y, t, angle + turn * dt, AFLOAT, which, along, level
    return nx, ny, tn, angle + turn * dt, AFLOAT, which, along, level


@njit(cache=True, nogil=True, parallel=True)
def drift(xy, tri, nb, open_side, f0, f1, bed, mixing, ta, tb, begin, until, dt, profile, lodge, seed, draft, length, radius, x, y, t, angle, state, released, touched, first_touch, passed, pass_time, pass_level, lodged_at, step, rings, starts, boxes, openings):
    """Move all logs from ``begin`` to ``until`` in steps of ``dt``, in place.

    ``mixing`` m2/s. ``touched`` (k, piers) bool, ``first_touch`` (k, piers) s; ``passed`` (k,) the first
    opening crossed (-1), with its time and level; ``lodged_at`` (k,) the pier it lodges on (-1).
    """
    for k in prange(x.size):
        now = begin
        while now < until - 1e-9:
            d = min(dt, until - now)
            if state[k] == WAITING and released[k] <= now + 1e-9:
                state[k] = AFLOAT
            if state[k] == LEFT or state[k] == LODGED or state[k] == OUTSIDE:
                break
            if state[k] != WAITING:
                nx, ny, nt, na, ns, which, along, level = _log(
                    xy, tri, nb, open_side, f0, f1, bed, mixing, ta, tb, draft[k], length[k], radius[k], profile, seed, k, step[k],
                    d, now, x[k], y[k], t[k], angle[k], rings, starts, boxes, lodge,
                )
                if which >= 0 and not touched[k, which]:
                    touched[k, which] = True
                    first_touch[k, which] = now
                if ns == LODGED:
                    lodged_at[k] = which
                if passed[k] < 0:
                    for o in range(openings.shape[0]):
                        if crosses(x[k], y[k], nx, ny, openings[o]) and (nx != x[k] or ny != y[k]):
                            passed[k] = o
                            pass_time[k] = now + d
                            pass_level[k] = level
                            break
                x[k], y[k], t[k], angle[k], state[k] = nx, ny, nt, na, ns
                step[k] += 1
            now += d
