"""Linear triangles: lists of triangles round nodes, stiffness rows, right-hand sides, gradients."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def node_triangles(triangles, n):
    """Compressed lists start (n + 1,), around: the triangles round each node, in order of their numbers."""
    start = np.zeros(n + 1, np.int32)
    for t in range(triangles.shape[0]):
        for k in range(3):
            start[triangles[t, k] + 1] += 1
    for i in range(n):
        start[i + 1] += start[i]
    place = start[:-1].copy()
    around = np.empty(start[n], np.int32)
    for t in range(triangles.shape[0]):
        for k in range(3):
            i = triangles[t, k]
            around[place[i]] = t
            place[i] += 1
    return start, around


@njit(cache=True, nogil=True)
def boundary_sides(triangles, neighbours, inside):
    """Triangle and side number of every side of the domain that has no domain triangle across."""
    count = 0
    for t in range(triangles.shape[0]):
        if inside[t]:
            for k in range(3):
                u = neighbours[t, k]
                if u < 0 or not inside[u]:
                    count += 1
    tri = np.empty(count, np.int32)
    side = np.empty(count, np.int32)
    count = 0
    for t in range(triangles.shape[0]):
        if inside[t]:
            for k in range(3):
                u = neighbours[t, k]
                if u < 0 or not inside[u]:
                    tri[count] = t
                    side[count] = k
                    count += 1
    return tri, side


@njit(cache=True, nogil=True)
def _shape(xy, a, b, c):
    """Gradients of the corner functions of a, b and c times twice the area, and twice the area."""
    ax = xy[b, 1] - xy[c, 1]
    ay = xy[c, 0] - xy[b, 0]
    bx = xy[c, 1] - xy[a, 1]
    by = xy[a, 0] - xy[c, 0]
    cx = xy[a, 1] - xy[b, 1]
    cy = xy[b, 0] - xy[a, 0]
    return ax, ay, bx, by, cx, cy, bx * cy - by * cx


@njit(cache=True, nogil=True)
def stiffness(xy, triangles, start, around, inside, unknown, nodes, n_unknowns):
    """Rows of the stiffness matrix: integral of grad N_i . grad N_j over the domain.

    ``unknown`` (n,) numbers the unknown that each node stands for (-1: fixed at zero or outside).
    ``nodes`` lists the node of each of the first ``len(nodes)`` unknowns; those that follow are walls,
    whose rows come from :func:`wall_terms`. Returns CSR start, columns (ascending), values.
    """
    n = nodes.size
    row_start = np.zeros(n_unknowns + 1, np.int64)
    room = 0
    for r in range(n):
        room += start[nodes[r] + 1] - start[nodes[r]] + 2
    cols = np.empty(room, np.int32)
    vals = np.empty(room)
    used = 0
    for r in range(n):
        i = nodes[r]
        first = used
        cols[used] = r
        vals[used] = 0.0
        used += 1
        for p in range(start[i], start[i + 1]):
            t = around[p]
            if not inside[t]:
                continue
            k = 0
            while triangles[t, k] != i:
                k += 1
            j = triangles[t, (k + 1) % 3]
            l = triangles[t, (k + 2) % 3]
            ix, iy, jx, jy, lx, ly, twice = _shape(xy, i, j, l)
            vals[first] += (ix * ix + iy * iy) / (2 * twice)
            for side in range(2):
                u = unknown[j] if side == 0 else unknown[l]
                if u < 0:
                    continue
                v = (ix * jx + iy * jy) if side == 0 else (ix * lx + iy * ly)
                q = first
                while q < used and cols[q] != u:
                    q += 1
                if q == used:
                    cols[used] = u
                    vals[used] = 0.0
                    used += 1
                vals[q] += v / (2 * twice)
        for q in range(first + 1, used):
            c = cols[q]
            v = vals[q]
            s = q
            while s > first and cols[s - 1] > c:
                cols[s] = cols[s - 1]
                vals[s] = vals[s - 1]
                s -= 1
            cols[s] = c
            vals[s] = v
        row_start[r + 1] = used
    for r in range(n, n_unknowns):
        row_start[r + 1] = used
    return row_start, cols[:used].copy(), vals[:used].copy()


@njit(cache=True, nogil=True)
def wall_terms(xy, triangles, inside, unknown, n_nodes):
    """Matrix entries (row, column, value) of wall unknowns, those numbered ``n_nodes`` and up."""
    count = 0
    for t in range(triangles.shape[0]):
        if inside[t]:
            for k in range(3):
                if unknown[triangles[t, k]] >= n_nodes:
                    count += 3
    rows = np.empty(count, np.int32)
    cols = np.empty(count, np.int32)
    vals = np.empty(count)
    g = np.empty((3, 2))
    count = 0
    for t in range(triangles.shape[0]):
        if not inside[t]:
            continue
        a = triangles[t, 0]
        b = triangles[t, 1]
        c = triangles[t, 2]
        if unknown[a] < n_nodes and unknown[b] < n_nodes and unknown[c] < n_nodes:
            continue
        g[0, 0], g[0, 1], g[1, 0], g[1, 1], g[2, 0], g[2, 1], twice = _shape(xy, a, b, c)
        for k in range(3):
            r = unknown[triangles[t, k]]
            if r < n_nodes:
                continue
            for l in range(3):
                u = unknown[triangles[t, l]]
                if u >= 0:
                    rows[count] = r
                    cols[count] = u
                    vals[count] = (g[k, 0] * g[l, 0] + g[k, 1] * g[l, 1]) / (2 * twice)
                    count += 1
    return rows[:count], cols[:count], vals[:count]


@njit(cache=True, nogil=True)
def load(xy, triangles, inside, unknown, field, n_unknowns):
    """Right-hand side (n_unknowns,): sum of area * grad N_i . field over the triangles; field (m, 2)."""
    out = np.zeros(n_unknowns)
    for t in range(triangles.shape[0]):
        if not inside[t]:
            continue
        a = triangles[t, 0]
        b = triangles[t, 1]
        c = triangles[t, 2]
        ax, ay, bx, by, cx, cy, twice = _shape(xy, a, b, c)
        fx = field[t, 0] / 2
        fy = field[t, 1] / 2
        if unknown[a] >= 0:
            out[unknown[a]] += ax * fx + ay * fy
        if unknown[b] >= 0:
            out[unknown[b]] += bx * fx + by * fy
        if unknown[c] >= 0:
            out[unknown[c]] += cx * fx + cy * fy
    return out


@njit(cache=True, nogil=True)
def gradients(xy, triangles, inside, values):
    """Gradient (m, 2) of node values in each triangle; zero outside the domain."""
    out = np.zeros((triangles.shape[0], 2))
    for t in range(triangles.shape[0]):
        if inside[t]:
            a = triangles[t, 0]
            b = triangles[t, 1]
            c = triangles[t, 2]
            ax, ay, bx, by, cx, cy, twice = _shape(xy, a, b, c)
            out[t, 0] = (values[a] * ax + values[b] * bx + values[c] * cx) / twice
            out[t, 1] = (values[a] * ay + values[b] * by + values[c] * cy) / twice
    return out


@njit(cache=True, nogil=True)
def triangle_flow_from_edges(xy, triangles, triangle_edges, triangle_face, first, edge_nodes, discharge):
    """Unit discharge (m, 2) of triangles from the discharge of the edges round their faces.

    The cuts inside a face get the discharge that closes each triangle in turn, so that what a face
    keeps is shared by its triangles in proportion to their area.
    """
    m = triangles.shape[0]
    out = np.zeros((m, 2))
    flux = np.zeros((m, 3))
    known = np.zeros((m, 3), np.bool_)
    area = np.empty(m)
    for t in range(m):
        area[t] = _shape(xy, triangles[t, 0], triangles[t, 1], triangles[t, 2])[6] / 2
        for k in range(3):
            e = triangle_edges[t, k]
            if e >= 0:
                # Positive from left to right of the directed edge: outward where the triangle is left.
                known[t, k] = True
                flux[t, k] = discharge[e] if edge_nodes[e, 0] == triangles[t, k] else -discharge[e]
    for f in range(first.size - 1):
        net = 0.0
        whole = 0.0
        for t in range(first[f], first[f + 1]):
            whole += area[t]
            for k in range(3):
                net += flux[t, k]
        for _ in range(first[f + 1] - first[f]):
            for t in range(first[f], first[f + 1]):
                missing = -1
                left = 0
                total = 0.0
                for k in range(3):
                    if known[t, k]:
                        total += flux[t, k]
                    else:
                        missing = k
                        left += 1
                if left != 1:
                    continue
                flux[t, missing] = net * area[t] / whole - total
                known[t, missing] = True
                a = triangles[t, missing]
                b = triangles[t, (missing + 1) % 3]
                for u in range(first[f], first[f + 1]):
                    for k in range(3):
                        if u != t and triangles[u, k] == b and triangles[u, (k + 1) % 3] == a:
                            flux[u, k] = -flux[t, missing]
                            known[u, k] = True
    for t in range(m):
        for k in range(3):
            # Divergence theorem: exact for a uniform field, and net outflow alone adds nothing.
            far = triangles[t, (k + 2) % 3]
            a = triangles[t, k]
            b = triangles[t, (k + 1) % 3]
            mx = (xy[a, 0] + xy[b, 0]) / 2 - (xy[a, 0] + xy[b, 0] + xy[far, 0]) / 3
            my = (xy[a, 1] + xy[b, 1]) / 2 - (xy[a, 1] + xy[b, 1] + xy[far, 1]) / 3
            out[t, 0] += flux[t, k] * mx / area[t]
            out[t, 1] += flux[t, k] * my / area[t]
    return out
