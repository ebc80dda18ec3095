"""Connected parts by union-find: of pairs of things, and of the corners of triangles."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def _root(parent, i):
    while parent[i] != i:
        parent[i] = parent[parent[i]]
        i = parent[i]
    return i


@njit(cache=True, nogil=True)
def _join(parent, i, j):
    i = _root(parent, i)
    j = _root(parent, j)
    # The lower number becomes the root, so labels do not depend on the order of joining.
    if i < j:
        parent[j] = i
    elif j < i:
        parent[i] = j


@njit(cache=True, nogil=True)
def _numbered(parent, present):
    label = np.full(parent.size, -1, np.int32)
    count = 0
    for i in range(parent.size):
        if present[i]:
            r = _root(parent, i)
            if label[r] < 0:
                label[r] = count
                count += 1
            label[i] = label[r]
    return label, count


@njit(cache=True, nogil=True)
def of_pairs(a, b, present):
    """Label (n,) of each present thing (-1 for the rest) and the number of parts, given pairs that are joined."""
    parent = np.arange(present.size).astype(np.int32)
    for k in range(a.size):
        _join(parent, a[k], b[k])
    return _numbered(parent, present)


@njit(cache=True, nogil=True)
def of_corners(triangles, inside, n):
    """Label (n,) of each node of the domain's triangles (-1 for the rest) and the number of parts."""
    parent = np.arange(n).astype(np.int32)
    present = np.zeros(n, np.bool_)
    for t in range(triangles.shape[0]):
        if inside[t]:
            a = triangles[t, 0]
            present[a] = True
            present[triangles[t, 1]] = True
            present[triangles[t, 2]] = True
            _join(parent, a, triangles[t, 1])
            _join(parent, a, triangles[t, 2])
    return _numbered(parent, present)
