"""Values at nodes from values on faces: exact for linear fields, wet faces only."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def face_gradients(centre, face_nodes, count, start, around, wet, values):
    """Least-squares gradient (f, v, 2) of values (f, v) over the wet faces that share a node.

    Weights are one over distance squared. Zero where the neighbours do not span the plane.
    """
    n, width = values.shape
    out = np.zeros((n, width, 2))
    rx = np.empty(width)
    ry = np.empty(width)
    for f in range(n):
        if not wet[f]:
            continue
        sxx = 0.0
        sxy = 0.0
        syy = 0.0
        rx[:] = 0.0
        ry[:] = 0.0
        for k in range(count[f]):
            node = face_nodes[f, k]
            for p in range(start[node], start[node + 1]):
                g = around[p]
                if g == f or not wet[g]:
                    continue
                dx = centre[g, 0] - centre[f, 0]
                dy = centre[g, 1] - centre[f, 1]
                w = 1.0 / (dx * dx + dy * dy)
                sxx += w * dx * dx
                sxy += w * dx * dy
                syy += w * dy * dy
                for v in range(width):
                    d = w * (values[g, v] - values[f, v])
                    rx[v] += dx * d
                    ry[v] += dy * d
        det = sxx * syy - sxy * sxy
        if det > 1e-6 * (sxx + syy) ** 2:
            for v in range(width):
                out[f, v, 0] = (syy * rx[v] - sxy * ry[v]) / det
                out[f, v, 1] = (sxx * ry[v] - sxy * rx[v]) / det
    return out


@njit(cache=True, nogil=True)
def node_means(xy, centre, start, around, wet, values, gradients):
    """Mean (n, v) at nodes of the wet faces' values carried along their gradients; NaN without wet face.

    Weights are one over distance.
    """
    n = xy.shape[0]
    width = values.shape[1]
    out = np.empty((n, width))
    for i in range(n):
        total = 0.0
        out[i, :] = 0.0
        for p in range(start[i], start[i + 1]):
            f = around[p]
            if not wet[f]:
                continue
            dx = xy[i, 0] - centre[f, 0]
            dy = xy[i, 1] - centre[f, 1]
            w = 1.0 / np.sqrt(dx * dx + dy * dy)
            total += w
            for v in range(width):
                out[i, v] += w * (values[f, v] + gradients[f, v, 0] * dx + gradients[f, v, 1] * dy)
        if total > 0:
            out[i, :] /= total
        else:
            out[i, :] = np.nan
    return out
