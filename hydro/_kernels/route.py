"""Least-fatigue routes over points on the sides of triangles, and chains of them between resting areas.

A point is a node, or one of ``per_side`` points on a side of a triangle; straight links join the points
round each triangle. ``water`` (p, 5) holds x, y, depth and the two velocity components of every point.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit

from .queue import pop, push
from .swim import BODY, LEAST_DEPTH, POSITION, TIME_WEIGHT, TOP, WET_DEPTH, floor_metre, metre, needed

FREE = -1  # label of a point in no area
BARRED = 100.0  # legs a body length that barred water counts where it is let through
SECTORS = 16  # headings told apart by the mask of drops


class Net(NamedTuple):
    """Points and the triangles that link them; all int32.

    Points 0..n-1 are nodes, then ``per_side`` points a side, from the first node of ``side_nodes``.
    """

    triangles: np.ndarray  # (m, 3)
    triangle_sides: np.ndarray  # (m, 3), side k from corner k to k + 1
    side_nodes: np.ndarray  # (s, 2)
    side_triangles: np.ndarray  # (s, 2), -1 beyond the edge
    node_start: np.ndarray  # (n + 1,)
    node_triangles: np.ndarray
    per_side: int


class Chain(NamedTuple):
    """How each area was first reached: (areas,) arrays, and the points of every leg behind one another."""

    reached_from: np.ndarray  # the area the leg came from, -1: not reached
    fatigue: np.ndarray
    seconds: np.ndarray
    worst: np.ndarray  # worst leg of the chain up to this area
    path_start: np.ndarray
    path_end: np.ndarray
    paths: np.ndarray
    opened: int


@njit(cache=True, nogil=True)
def _round_triangle(t, skip_a, skip_b, net, n_nodes, to, within, count):
    """Add the points on the sides of triangle t other than two (side numbers in t)."""
    for k in range(3):
        if k != skip_a and k != skip_b:
            first = n_nodes + net.triangle_sides[t, k] * net.per_side
            for j in range(net.per_side):
                to[count] = first + j
                within[count] = t
                count += 1
    return count


@njit(cache=True, nogil=True)
def links_of(point, net, n_nodes, to, within):
    """Fill ``to`` and ``within`` with the points linked to this one and the triangles the links lie in."""
    m = net.per_side
    count = 0
    if point < n_nodes:
        for p in range(net.node_start[point], net.node_start[point + 1]):
            t = net.node_triangles[p]
            for k in range(3):
                if net.triangles[t, k] != point:
                    continue
                count = _round_triangle(t, k, (k + 2) % 3, net, n_nodes, to, within, count)
                for side in (net.triangle_sides[t, k], net.triangle_sides[t, (k + 2) % 3]):
                    if net.side_triangles[side, 0] == t:
                        a, b = net.side_nodes[side, 0], net.side_nodes[side, 1]
                        if m == 0:
                            to[count] = b if a == point else a
                        else:
                            to[count] = n_nodes + side * m + (0 if a == point else m - 1)
                        within[count] = t
                        count += 1
        return count
    side = (point - n_nodes) // m
    j = (point - n_nodes) % m
    for q in range(2):
        t = net.side_triangles[side, q]
        if t < 0:
            continue
        for k in range(3):
            if net.triangle_sides[t, k] == side:
                to[count] = net.triangles[t, (k + 2) % 3]
                within[count] = t
                count = _round_triangle(t, k, k, net, n_nodes, to, within, count + 1)
    to[count] = net.side_nodes[side, 0] if j == 0 else point - 1
    to[count + 1] = net.side_nodes[side, 1] if j == m - 1 else point + 1
    within[count] = within[count + 1] = net.side_triangles[side, 0]
    return count + 2


@njit(cache=True, nogil=True)
def barred_by(p, q, t, water, drops, swimmer, ex, ey):
    """How far a link is beyond the swimmer: (speed excess, depth deficit, drop), each 0 where it is not.

    Speed and deficit are relative to the limits. Along a straight link u moves on a straight line between its end
    values and depth is linear, so the ends decide exactly.
    """
    k = swimmer[POSITION]
    need = 0.0
    for end in (p, q):
        u, v = k * water[end, 3], k * water[end, 4]
        need = max(need, needed(u * ex + v * ey, u * ey - v * ex))
    speed = 0.0
    if need >= swimmer[TOP]:
        speed = max(need / swimmer[TOP] - 1.0, 1e-12)
    shallow = max(0.0, 1.0 - min(water[p, 2], water[q, 2]) / swimmer[LEAST_DEPTH])
    drop = 0.0
    if drops[t] != 0:
        sector = int(math.floor(math.atan2(ey, ex) / (2.0 * math.pi) * SECTORS + 0.5)) % SECTORS
        if (drops[t] >> sector) & 1:
            drop = 1.0
    return speed, shallow, drop


@njit(cache=True, nogil=True)
def link(p, q, t, water, drops, swimmer, relaxed, spare):
    """(fatigue, seconds) of the straight link p to q through triangle t; (inf, inf) if it is barred or cannot cost
    less than ``spare``.

    Two-point Gauss rule in depth-weighted place, so q/h is met exactly at its points. ``relaxed`` lets a barred link
    through at BARRED legs a body length and more with the excess: only where there is no other way.
    """
    dx, dy = water[q, 0] - water[p, 0], water[q, 1] - water[p, 1]
    length = math.sqrt(dx * dx + dy * dy)
    h0, h1 = water[p, 2], water[q, 2]
    if length == 0.0:
        return 0.0, 0.0
    if not relaxed and min(h0, h1) < swimmer[LEAST_DEPTH]:
        return math.inf, math.inf
    if min(h0, h1) < swimmer[WET_DEPTH]:
        return math.inf, math.inf
    ex, ey = dx / length, dy / length
    k = swimmer[POSITION]
    along = k * max(water[p, 3] * ex + water[p, 4] * ey, water[q, 3] * ex + water[q, 4] * ey)
    if not relaxed and length * floor_metre(along, swimmer) > spare:
        return math.inf, math.inf
    speed, shallow, drop = barred_by(p, q, t, water, drops, swimmer, ex, ey)
    if speed + shallow + drop > 0.0:
        if not relaxed:
            return math.inf, math.inf
        return BARRED * length / swimmer[BODY] * (1.0 + speed + shallow + drop), length / swimmer[TOP]
    fatigue = 0.0
    seconds = 0.0
    for s in (0.21132486540518713, 0.7886751345948129):
        w = h1 * s / (h0 * (1.0 - s) + h1 * s)
        u = k * (water[p, 3] + w * (water[q, 3] - water[p, 3]))
        v = k * (water[p, 4] + w * (water[q, 4] - water[p, 4]))
        f, r = metre(u * ex + v * ey, u * ey - v * ex, swimmer)
        fatigue += 0.5 * length * f
        seconds += 0.5 * length * r
    return fatigue, seconds


@njit(cache=True, nogil=True)
def _widest(net):
    """Most links that a point can have."""
    most = 0
    for i in range(net.node_start.shape[0] - 1):
        most = max(most, net.node_start[i + 1] - net.node_start[i])
    return max(most * (net.per_side + 2), 4 * net.per_side + 4)


@njit(cache=True, nogil=True)
def chain_of_legs(net, water, drops, swimmer, label, rim_start, rim_points, start, goal, bound, relaxed):
    """Chain of legs from area ``start`` to area ``goal`` whose worst leg is least.

    Areas open in the order of the worst leg that reaches them, as towns join a network by the cheapest road
    (Prim 1957): one field of fatigue serves all open areas, and an area that opens sets its points to zero and
    lets them improve what lies round it. A leg of more than ``bound`` is not followed. Stops at the goal.
    """
    n_nodes = net.node_start.shape[0] - 1
    n_points, n_areas = water.shape[0], rim_start.shape[0] - 1
    key = np.full(n_points + n_areas, math.inf)
    cost = np.full((n_points + n_areas, 2), math.inf)
    parent = np.full(n_points + n_areas, -1, np.int32)
    source = np.full(n_points + n_areas, -1, np.int32)
    heap = np.empty(n_points + n_areas, np.int32)
    place = np.full(n_points + n_areas, -1, np.int32)
    size = np.zeros(1, np.int64)
    most = _widest(net)
    to, within = np.empty(most, np.int32), np.empty(most, np.int32)
    reached_from = np.full(n_areas, -1, np.int32)
    entry = np.full(n_areas, -1, np.int32)
    worst = np.full(n_areas, math.inf)
    path_start, path_end = np.zeros(n_areas, np.int64), np.zeros(n_areas, np.int64)
    paths = np.empty(1024, np.int32)
    used, opened = 0, 0
    weight = swimmer[TIME_WEIGHT]
    cost[n_points + start] = 0.0
    push(n_points + start, 0.0, heap, place, key, size)
    while size[0] > 0:
        p = pop(heap, place, key, size)
        if p >= n_points:
            area = p - n_points
            opened += 1
            origin = source[p]
            reached_from[area] = area if origin < 0 else origin
            worst[area] = 0.0 if origin < 0 else max(worst[origin], cost[p, 0])
            key[p] = -1.0  # open: nothing reaches it again
            path_start[area] = used
            at = entry[area]
            while at >= 0:
                if used == paths.shape[0]:
                    longer = np.empty(2 * used, np.int32)
                    longer[:used] = paths
                    paths = longer
                paths[used] = at
                used += 1
                at = parent[p] if at == entry[area] else parent[at]
            path_end[area] = used
            if area == goal:
                break
            for r in range(rim_start[area], rim_start[area + 1]):
                w = rim_points[r]
                cost[w] = 0.0
                source[w] = area
                push(w, 0.0, heap, place, key, size)
            continue
        count = links_of(p, net, n_nodes, to, within)
        for c in range(count):
            w = to[c]
            area = label[w]
            item = w if area == FREE else n_points + area
            if key[item] <= key[p] or area == source[p]:
                continue
            spare = min(key[item] - key[p], bound - cost[p, 0])
            f, s = link(p, w, within[c], water, drops, swimmer, relaxed, spare)
            f += cost[p, 0]
            s += cost[p, 1]
            if f <= bound and f + weight * s < key[item]:
                cost[item, 0] = f
                cost[item, 1] = s
                source[item] = source[p]
                parent[item] = p
                if area != FREE:
                    entry[area] = w
                push(item, f + weight * s, heap, place, key, size)
    return Chain(reached_from, cost[n_points:, 0].copy(), cost[n_points:, 1].copy(), worst, path_start, path_end,
                 paths[:used].copy(), opened)


@njit(cache=True, nogil=True)
def legs_from(net, water, drops, swimmer, label, n_areas, sources, own, target, bound, relaxed):
    """Least-fatigue legs from points of area ``own`` to every other area, crossing ``own`` but no other area.

    Stops when the leg to ``target`` is known (-1: never). Returns (entry point of each area, -1: none; cost (p, 2) of
    fatigue and seconds; parent of each point).
    """
    n_nodes = net.node_start.shape[0] - 1
    n_points = water.shape[0]
    key = np.full(n_points, math.inf)
    cost = np.full((n_points, 2), math.inf)
    parent = np.full(n_points, -1, np.int32)
    heap = np.empty(n_points, np.int32)
    place = np.full(n_points, -1, np.int32)
    size = np.zeros(1, np.int64)
    most = _widest(net)
    to, within = np.empty(most, np.int32), np.empty(most, np.int32)
    entry = np.full(n_areas, -1, np.int32)
    weight = swimmer[TIME_WEIGHT]
    for w in sources:
        cost[w] = 0.0
        push(w, 0.0, heap, place, key, size)
    while size[0] > 0:
        p = pop(heap, place, key, size)
        area = label[p]
        if area != FREE and area != own:
            if entry[area] < 0:
                entry[area] = p
                if area == target:
                    break
            continue
        count = links_of(p, net, n_nodes, to, within)
        for c in range(count):
            w = to[c]
            if key[w] <= key[p]:
                continue
            resting = area == own and label[w] == own
            spare = math.inf if resting else key[w] - key[p]
            f, s = link(p, w, within[c], water, drops, swimmer, relaxed, spare)
            if resting:  # whatever the mean speed says
                f = 0.0
                if s == math.inf:
                    s = math.hypot(water[w, 0] - water[p, 0], water[w, 1] - water[p, 1]) / swimmer[TOP]
            f += cost[p, 0]
            s += cost[p, 1]
            if f <= bound and f + weight * s < key[w]:
                cost[w, 0] = f
                cost[w, 1] = s
                parent[w] = p
                push(w, f + weight * s, heap, place, key, size)
    return entry, cost, parent


@njit(cache=True, nogil=True)
def traced(parent, last):
    """Points from the source to ``last``."""
    count = 0
    at = last
    while at >= 0:
        count += 1
        at = parent[at]
    out = np.empty(count, np.int32)
    at = last
    for i in range(count - 1, -1, -1):
        out[i] = at
        at = parent[at]
    return out


@njit(cache=True, nogil=True)
def triangles_between(path, net):
    """The triangle (k - 1,) that each link of a path (k,) of points lies in, as the search took it."""
    n_nodes = net.node_start.shape[0] - 1
    most = _widest(net)
    to, within = np.empty(most, np.int32), np.empty(most, np.int32)
    out = np.full(path.shape[0] - 1, -1, np.int32)
    for i in range(path.shape[0] - 1):
        for c in range(links_of(path[i], net, n_nodes, to, within)):
            if to[c] == path[i + 1]:
                out[i] = within[c]
    return out


@njit(cache=True, nogil=True)
def walked(points, within, resting, drops, swimmer):
    """Every link of a route: (k - 1, 7) fatigue, seconds, speed through the water, ground speed at its middle, and what
    bars it (speed excess, depth deficit, drop).

    ``points`` (k, 5) as ``water``; ``within`` the triangle of each link, ``resting`` whether it lies in an area.
    """
    n = points.shape[0] - 1
    out = np.zeros((n, 7))
    for i in range(n):
        dx, dy = points[i + 1, 0] - points[i, 0], points[i + 1, 1] - points[i, 1]
        length = math.sqrt(dx * dx + dy * dy)
        if length == 0.0:
            continue
        ex, ey = dx / length, dy / length
        fatigue, seconds = link(i, i + 1, within[i], points, drops, swimmer, True, math.inf)
        k = swimmer[POSITION]
        u, v = 0.5 * k * (points[i, 3] + points[i + 1, 3]), 0.5 * k * (points[i, 4] + points[i + 1, 4])
        along, across = u * ex + v * ey, u * ey - v * ex
        _, pace = metre(along, across, swimmer)
        out[i, 0] = 0.0 if resting[i] else fatigue
        out[i, 1] = seconds
        if pace < math.inf:
            out[i, 3] = 1.0 / pace
            out[i, 2] = math.sqrt((out[i, 3] - along) ** 2 + across * across)
        else:
            out[i, 2] = needed(along, across)
        if not resting[i]:
            out[i, 4], out[i, 5], out[i, 6] = barred_by(i, i + 1, within[i], points, drops, swimmer, ex, ey)
    return out
