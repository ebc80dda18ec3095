"""Meshes from places that come without one: lattices of cells or points, scattered points, loose polygons."""

from __future__ import annotations

import numpy as np
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components
from scipy.spatial import Delaunay, QhullError, cKDTree

LONGEST_SIDE = 3.0  # times the local spacing; longer triangle sides span a gap between points. Leewater's own.


def quads(rows: int, columns: int) -> np.ndarray:
    """Faces (rows * columns, 4) of a lattice with (rows + 1) * (columns + 1) nodes, both numbered row by row."""
    j, i = np.mgrid[0:rows, 0:columns]
    a = (j * (columns + 1) + i).ravel()
    return np.column_stack([a, a + 1, a + columns + 2, a + columns + 1])


def corners_from_centres(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Corners (rows + 1, columns + 1, 2) midway between cell centres x, y (rows, columns), which go on as they end."""
    out = []
    for values in (x, y):
        wide = np.pad(values, 1)
        wide[0], wide[-1] = 2 * wide[1] - wide[2], 2 * wide[-2] - wide[-3]
        wide[:, 0], wide[:, -1] = 2 * wide[:, 1] - wide[:, 2], 2 * wide[:, -2] - wide[:, -3]
        out.append((wide[:-1, :-1] + wide[1:, :-1] + wide[:-1, 1:] + wide[1:, 1:]) / 4)
    return np.stack(out, axis=-1)


def weld(xy: np.ndarray, within: float) -> tuple[np.ndarray, np.ndarray]:
    """Join points (n, 2) that lie within a distance of one another: (k, 2) points and the new number (n,) of each."""
    points, number = np.unique(xy, axis=0, return_inverse=True)
    number = number.ravel()
    pairs = cKDTree(points).query_pairs(within, output_type="ndarray")
    if not len(pairs):
        return points, number
    graph = coo_matrix((np.ones(len(pairs)), pairs.T), shape=(len(points),) * 2)
    count, group = connected_components(graph, directed=False)
    joined = np.empty((count, 2))
    joined[group[::-1]] = points[::-1]  # the first point of a group stands for it
    return joined, group[number]


def lattice_of(xy: np.ndarray) -> np.ndarray | None:
    """Quads (q, 4) between points (n, 2) that stand on a rectangular lattice, whole cells only; None if they do not."""
    x, y = (np.unique(np.round(xy[:, k], 6)) for k in (0, 1))
    if len(x) < 2 or len(y) < 2 or len(x) * len(y) > 20 * len(xy):
        return None
    # Points of a lattice that is not full have steps that are multiples of the least.
    steps = [np.diff(v) / np.diff(v).min() for v in (x, y)]
    if any(np.abs(s - np.round(s)).max() > 1e-3 for s in steps) or len(x) * len(y) < len(xy):
        return None
    if any(np.round(s).max() > 1 for s in steps) or len(xy) < 4:
        return None
    number = np.full((len(y), len(x)), -1)
    number[np.searchsorted(y, np.round(xy[:, 1], 6)), np.searchsorted(x, np.round(xy[:, 0], 6))] = np.arange(len(xy))
    cells = number.ravel()[quads(len(y) - 1, len(x) - 1)]
    cells = cells[(cells >= 0).all(axis=1)]
    return cells if len(cells) else None


def triangles_of(xy: np.ndarray) -> tuple[np.ndarray, int]:
    """Delaunay triangles (t, 3) of scattered points without those that span a gap, and how many were left out.

    A triangle spans a gap when a side is longer than :data:`LONGEST_SIDE` times the local spacing: the
    median, over a point's neighbours and itself, of the distance to the nearest point.
    """
    if len(xy) < 3:
        raise ValueError("fewer than three points make no mesh")
    centred = xy - xy.mean(axis=0)
    try:
        found = Delaunay(centred).simplices
    except QhullError:
        raise ValueError("its points stand in a line") from None
    distance, near = cKDTree(centred).query(centred, k=min(7, len(xy)))
    spacing = np.median(distance[near, 1], axis=1)
    sides = np.linalg.norm(centred[found] - centred[np.roll(found, -1, axis=1)], axis=2)
    spans = sides.max(axis=1) > LONGEST_SIDE * spacing[found].max(axis=1)
    a, b, c = (centred[found[:, k]] for k in range(3))
    area = np.abs((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]) / 2
    flat = area < 1e-6 * sides.max(axis=1) ** 2
    kept = found[~spans & ~flat]
    if not len(kept):
        raise ValueError("its points stand too far apart to be joined")
    return kept, int(np.count_nonzero(spans))
