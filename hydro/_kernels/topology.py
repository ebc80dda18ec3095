"""Edges, neighbours and triangles of faces given as padded node lists."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def signed_areas(x, y, faces, count):
    """Signed area (f,) of polygons; faces (f, k) int32, count (f,) corners each."""
    out = np.empty(faces.shape[0])
    for f in range(faces.shape[0]):
        x0 = x[faces[f, 0]]
        y0 = y[faces[f, 0]]
        a = 0.0
        for k in range(1, count[f] - 1):
            i = faces[f, k]
            j = faces[f, k + 1]
            a += (x[i] - x0) * (y[j] - y0) - (x[j] - x0) * (y[i] - y0)
        out[f] = a / 2
    return out


@njit(cache=True, nogil=True)
def turn_clockwise(faces, count, areas):
    """Reverse, in place, the node lists of faces whose area is negative."""
    turned = 0
    for f in range(faces.shape[0]):
        if areas[f] < 0:
            turned += 1
            n = count[f]
            for k in range(1, (n - 1) // 2 + 1):
                faces[f, k], faces[f, n - k] = faces[f, n - k], faces[f, k]
    return turned


@njit(cache=True, nogil=True)
def _blocks(ax, ay, bx, by, cx, cy, px, py):
    """Whether p lies in the ear a, b, c or on its cut from c to a, where it would leave a face of no area."""
    d1 = (bx - ax) * (py - ay) - (by - ay) * (px - ax)
    d2 = (cx - bx) * (py - by) - (cy - by) * (px - bx)
    d3 = (ax - cx) * (py - cy) - (ay - cy) * (px - cx)
    return d1 > 0 and d2 > 0 and d3 > -1e-9 * ((ax - cx) ** 2 + (ay - cy) ** 2)


@njit(cache=True, nogil=True)
def triangulate(x, y, faces, count):
    """Triangles (m, 3) of anticlockwise faces, face by face, and the first of each face (f + 1,).

    Each cut takes the corner whose ear is the least stretched, so a quad is cut along its better
    diagonal and a dented face is never cut outside itself.
    """
    first = np.zeros(faces.shape[0] + 1, np.int32)
    for f in range(faces.shape[0]):
        first[f + 1] = first[f] + count[f] - 2
    triangles = np.empty((first[-1], 3), np.int32)
    ring = np.empty(faces.shape[1], np.int32)
    for f in range(faces.shape[0]):
        n = count[f]
        for k in range(n):
            ring[k] = faces[f, k]
        out = first[f]
        while n > 3:
            best = -1
            quality = -1e300
            for k in range(n):
                a = ring[(k - 1) % n]
                b = ring[k]
                c = ring[(k + 1) % n]
                area = (x[b] - x[a]) * (y[c] - y[a]) - (x[c] - x[a]) * (y[b] - y[a])
                size = (x[c] - x[a]) ** 2 + (y[c] - y[a]) ** 2
                size += (x[b] - x[a]) ** 2 + (y[b] - y[a]) ** 2 + (x[c] - x[b]) ** 2 + (y[c] - y[b]) ** 2
                q = area / size
                if q > 0:
                    for j in range(n):
                        p = ring[j]
                        if p != a and p != b and p != c:
                            if _blocks(x[a], y[a], x[b], y[b], x[c], y[c], x[p], y[p]):
                                q = -1.0
                    # What is left after the last cut must not fold over.
                    if n == 4 and q > 0:
                        d = ring[(k + 2) % 4]
                        rest = (x[c] - x[a]) * (y[d] - y[a]) - (x[d] - x[a]) * (y[c] - y[a])
                        rest_size = (x[c] - x[a]) ** 2 + (y[c] - y[a]) ** 2
                        rest_size += (x[d] - x[a]) ** 2 + (y[d] - y[a]) ** 2 + (x[d] - x[c]) ** 2 + (y[d] - y[c]) ** 2
                        q = min(q, rest / rest_size)
                if q > quality * (1 + 1e-12) + 1e-15:
                    quality = q
                    best = k
            triangles[out, 0] = ring[(best - 1) % n]
            triangles[out, 1] = ring[best]
            triangles[out, 2] = ring[(best + 1) % n]
            out += 1
            for k in range(best, n - 1):
                ring[k] = ring[k + 1]
            n -= 1
        triangles[out, 0] = ring[0]
        triangles[out, 1] = ring[1]
        triangles[out, 2] = ring[2]
    return triangles, first


@njit(cache=True, nogil=True)
def face_sides(faces, count):
    """Directed sides of all faces: from-node, to-node and face, each (sides,), in face order."""
    total = 0
    for f in range(count.size):
        total += count[f]
    a = np.empty(total, np.int32)
    b = np.empty(total, np.int32)
    of = np.empty(total, np.int32)
    s = 0
    for f in range(count.size):
        for k in range(count[f]):
            a[s] = faces[f, k]
            b[s] = faces[f, (k + 1) % count[f]]
            of[s] = f
            s += 1
    return a, b, of


@njit(cache=True, nogil=True)
def pair_sides(a, b, of, start, order):
    """Group directed sides into edges.

    ``order`` sorts the sides by their lower node and ``start`` (n + 1,) marks each lower node's run
    in it. Returns the edge of each side (sides,), edges (e, 2) directed as first met, edge faces
    (e, 2) left and right (-1 none), and the first side that makes an edge's third face or meets
    one of the same direction twice (-1 if none).
    """
    n = a.size
    edge_of = np.full(n, -1, np.int32)
    edges = np.empty((n, 2), np.int32)
    faces = np.full((n, 2), -1, np.int32)
    bad = -1
    e = 0
    for s in range(n):
        if edge_of[s] >= 0:
            continue
        lo = min(a[s], b[s])
        edges[e, 0] = a[s]
        edges[e, 1] = b[s]
        faces[e, 0] = of[s]
        edge_of[s] = e
        for k in range(start[lo], start[lo + 1]):
            t = order[k]
            if t > s and edge_of[t] < 0 and ((a[t] == a[s] and b[t] == b[s]) or (a[t] == b[s] and b[t] == a[s])):
                edge_of[t] = e
                if a[t] == a[s] or faces[e, 1] >= 0:
                    if bad < 0:
                        bad = t
                else:
                    faces[e, 1] = of[t]
        e += 1
    return edge_of, edges[:e].copy(), faces[:e].copy(), bad


@njit(cache=True, nogil=True)
def triangle_neighbours(triangles, start, order):
    """Neighbour (m, 3) across side k (vertex k to k + 1); -1 on the boundary.

    ``start``/``order`` list, for each node, the sides (3 * triangle + k) that leave it.
    """
    out = np.full(triangles.shape, -1, np.int32)
    for t in range(triangles.shape[0]):
        for k in range(3):
            i = triangles[t, k]
            j = triangles[t, (k + 1) % 3]
            for p in range(start[j], start[j + 1]):
                s = order[p]
                u = s // 3
                if triangles[u, (s % 3 + 1) % 3] == i:
                    out[t, k] = u
                    break
    return out


@njit(cache=True, nogil=True)
def _counted(keys, start, order):
    """Counting sort: fills start (size + 1,) and order (n,), which keeps the order within a key."""
    for k in keys:
        start[k + 1] += 1
    for i in range(start.size - 1):
        start[i + 1] += start[i]
    place = start[:-1].copy()
    for i in range(keys.size):
        order[place[keys[i]]] = i
        place[keys[i]] += 1


def grouped(keys: np.ndarray, size: int) -> tuple[np.ndarray, np.ndarray]:
    """Compressed lists: start (size + 1,) and order, so that order[start[i]:start[i+1]] have key i."""
    start, order = np.zeros(size + 1, np.int32), np.empty(len(keys), np.int32)
    _counted(np.ascontiguousarray(keys, np.int32), start, order)
    return start, order


@njit(cache=True, nogil=True)
def corner_means(xy, faces, count):
    """Mean (f, 2) of the corners of each face."""
    out = np.zeros((faces.shape[0], 2))
    for f in range(faces.shape[0]):
        for k in range(count[f]):
            out[f, 0] += xy[faces[f, k], 0]
            out[f, 1] += xy[faces[f, k], 1]
        out[f, 0] /= count[f]
        out[f, 1] /= count[f]
    return out


@njit(cache=True, nogil=True)
def number_by_use(faces, count, n_nodes):
    """Number nodes in order of first use, in place in ``faces``; the old number (k,) of each new one."""
    new = np.full(n_nodes, -1, np.int32)
    old = np.empty(n_nodes, np.int32)
    used = 0
    for f in range(faces.shape[0]):
        for k in range(count[f]):
            node = faces[f, k]
            if new[node] < 0:
                new[node] = used
                old[used] = node
                used += 1
            faces[f, k] = new[node]
    return old[:used].copy()
