"""Results of one mesh laid on another: levels and velocities interpolated, volumes carried conservatively."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy import sparse

from ._kernels import locate, overlap
from .mesh import Mesh


@dataclass(frozen=True, eq=False)
class Transfer:
    """From ``source`` to ``target``, two meshes about one origin (the source is moved if need be)."""

    target: Mesh
    source: Mesh

    @cached_property
    def _source_xy(self) -> np.ndarray:
        shift = np.subtract(self.source.origin, self.target.origin)
        return np.ascontiguousarray(self.source.node_xy + shift)

    @cached_property
    def shared(self) -> sparse.csr_matrix:
        """(target faces, source faces) areas in common, m2."""
        a, b = self.target, self.source
        grid = locate.seed_grid(self._source_xy, b.triangles)
        of_a, of_b, area = overlap.overlaps(a.node_xy, a.triangles, self._source_xy, b.triangles, *grid)
        shape = (a.n_faces, b.n_faces)
        return sparse.coo_matrix((area, (a.triangle_face[of_a], b.triangle_face[of_b])), shape=shape).tocsr()

    @cached_property
    def coverage(self) -> np.ndarray:
        """(target faces,) share of each face that the source covers, 0 to 1."""
        return np.clip(np.asarray(self.shared.sum(axis=1)).ravel() / self.target.face_area, 0.0, 1.0)

    def conserve(self, face_values: np.ndarray) -> np.ndarray:
        """Depth or unit discharge (source faces, ...) as means over the target's faces.

        What lies on the shared ground keeps its volume to round-off; the part of a target face that the
        source does not cover counts as dry.
        """
        values = np.asarray(face_values, float)
        flat = values.reshape(len(values), -1)
        out = (self.shared @ flat) / self.target.face_area[:, None]
        return out.reshape(len(out), *values.shape[1:])

    @cached_property
    def _at(self) -> tuple[np.ndarray, np.ndarray]:
        """Source triangle of each target node (-1: none) and its corner weights."""
        xy, tri, b = self._source_xy, self.source.triangles, self.source
        grid, start, items = locate.seed_grid(xy, tri)
        t = locate.find_points(xy, tri, b.neighbours, grid, start, items, np.ascontiguousarray(self.target.node_xy))
        return t, barycentric(xy, tri[np.maximum(t, 0)], self.target.node_xy)

    def interpolate(self, node_values: np.ndarray) -> np.ndarray:
        """Level or velocity (source nodes, ...) at the target's nodes; NaN outside or beside a NaN."""
        t, w = self._at
        corners = np.asarray(node_values, float)[self.source.triangles[np.maximum(t, 0)]]
        out = np.einsum("tk,tk...->t...", w, corners)
        out[t < 0] = np.nan
        return out


def barycentric(xy: np.ndarray, corners: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Weights (k, 3) of the corners (k, 3 node numbers) at points (k, 2)."""
    a, b, c = (xy[corners[:, k]] for k in range(3))
    area = _twice_area(a, b, c)
    w = np.column_stack([_twice_area(points, b, c), _twice_area(a, points, c), _twice_area(a, b, points)])
    return w / area[:, None]


def _twice_area(a: np.ndarray, b: np.ndarray, c: np.ndarray) -> np.ndarray:
    return (b[:, 0] - a[:, 0]) * (c[:, 1] - a[:, 1]) - (b[:, 1] - a[:, 1]) * (c[:, 0] - a[:, 0])
