"""The linear system of psi: one unknown a node, one a wall; factored once for each domain."""

from __future__ import annotations

import warnings

import numpy as np
import scipy.sparse as sp
from scipy.sparse.linalg import splu

from .._kernels import p1
from ..mesh import Mesh

# Above this a direct factor needs more time and memory than multigrid.
_DIRECT_NODES = 200_000


class System:
    """Stiffness of linear triangles over a domain, with merged unknowns for walls.

    ``unknown`` (n,) int32 names the unknown of each node, -1 where it is fixed at zero or outside;
    the first ``n_nodes`` unknowns are single nodes, the rest walls. ``tolerance`` is the residual, as a
    share of the first, at which an iterative solver stops.
    """

    def __init__(
        self, mesh: Mesh, inside: np.ndarray, unknown: np.ndarray, n_nodes: int, n_unknowns: int,
        *, tolerance: float = 1e-10,
    ) -> None:
        self.mesh, self.inside, self.unknown, self.size = mesh, inside, unknown, n_unknowns
        self.tolerance = tolerance
        nodes = np.empty(n_nodes, np.int32)
        single = np.flatnonzero((unknown >= 0) & (unknown < n_nodes))
        nodes[unknown[single]] = single
        start, around = node_triangles(mesh)
        arrays = p1.stiffness(mesh.node_xy, mesh.triangles, start, around, inside, unknown, nodes, n_unknowns)
        matrix = sp.csr_array((arrays[2], arrays[1], arrays[0]), shape=(n_unknowns, n_unknowns))
        if n_unknowns > n_nodes:
            rows, cols, vals = p1.wall_terms(mesh.node_xy, mesh.triangles, inside, unknown, n_nodes)
            matrix = matrix + sp.coo_array((vals, (rows, cols)), shape=matrix.shape).tocsr()
        self.matrix = matrix
        self._factor = None

    def solve(self, right: np.ndarray) -> np.ndarray:
        """The unknowns (size,) for a right-hand side (size,)."""
        if not self.size:
            return np.zeros(0)
        factor = self._factor or _factor(self.matrix, self.tolerance)
        self._factor = factor
        return factor(right)

    def load(self, field: np.ndarray) -> np.ndarray:
        """Right-hand side of a field (m, 2): sum of area * grad N . field."""
        mesh = self.mesh
        return p1.load(mesh.node_xy, mesh.triangles, self.inside, self.unknown, field, self.size)

    def on_nodes(self, values: np.ndarray) -> np.ndarray:
        """Unknowns spread over the nodes (n,); 0 where fixed."""
        return np.where(self.unknown >= 0, np.append(values, 0.0)[self.unknown], 0.0)


def node_triangles(mesh: Mesh) -> tuple[np.ndarray, np.ndarray]:
    """Compressed lists of the triangles round each node, kept with the mesh."""
    kept = mesh.__dict__.get("_node_triangles")
    if kept is None:
        kept = p1.node_triangles(mesh.triangles, mesh.n_nodes)
        mesh.__dict__["_node_triangles"] = kept
    return kept


def _factor(matrix, tolerance: float):
    if matrix.shape[0] <= _DIRECT_NODES:
        # The matrix is symmetric, so its rows serve as columns.
        columns = sp.csc_array((matrix.data, matrix.indices, matrix.indptr), shape=matrix.shape)
        lu = splu(columns, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True})
        return lu.solve
    return _multigrid(matrix, tolerance)


def _multigrid(matrix, tolerance: float):
    """Ruge-Stuben multigrid with conjugate gradients; one sweep each way keeps it symmetric at half the usual cost."""
    import pyamg

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        levels = pyamg.ruge_stuben_solver(
            sp.csr_matrix(matrix), max_coarse=500,
            presmoother=("gauss_seidel", {"sweep": "forward"}), postsmoother=("gauss_seidel", {"sweep": "backward"}),
        )

    def solve(right: np.ndarray) -> np.ndarray:
        residuals: list[float] = []
        found = levels.solve(right, tol=tolerance, accel="cg", maxiter=100, residuals=residuals)
        if residuals and residuals[-1] > 10 * tolerance * max(residuals[0], 1e-300):
            raise ArithmeticError(f"the multigrid solver stopped at {residuals[-1] / residuals[0]:.1e} of its first residual")
        return found

    return solve
