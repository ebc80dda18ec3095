"""What psi does not explain of the flow: storage and sources, flow through walls, and the rest."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..frame import Frame
from ..mesh import Mesh
from .solve import System
from .walls import Topology


@dataclass(frozen=True, slots=True)
class Misfit:
    """Ratios of norms: the root of the area integral of the square, over that of the unit discharge.

    ``storage`` is None ("not available") where the rate of depth is not known; it is then part of
    ``unexplained``. Where no split was asked for, all is unexplained.
    """

    total: float
    storage: float | None
    walls: float
    unexplained: float


def potential_system(mesh: Mesh, shape: Topology) -> System:
    """The system of phi: free on walls, zero on open boundaries (one node where a part has none)."""
    held = shape.open_node.copy()
    nodes = np.flatnonzero(shape.part >= 0)
    parts, first = np.unique(shape.part[nodes], return_index=True)
    has = np.zeros(len(parts), bool)
    has[np.unique(shape.part[shape.open_node & (shape.part >= 0)])] = True
    held[nodes[first[~has]]] = True
    free = (shape.part >= 0) & ~held
    unknown = np.full(mesh.n_nodes, -1, np.int32)
    count = int(np.count_nonzero(free))
    unknown[free] = np.arange(count, dtype=np.int32)
    # Its norms are printed to two or three digits.
    return System(mesh, shape.triangles, unknown, count, count, tolerance=1e-5)


def wall_outflow(frame: Frame, shape: Topology) -> np.ndarray:
    """Discharge (w,) out through each wall side, m3/s: of its edge where stored, else of the field at its nodes.

    The faces' own values would not do: beside a curved wall they cross its sides at an angle that
    has nothing to do with leaking.
    """
    mesh, shut = frame.mesh, shape.opening < 0
    a, b = shape.a[shut], shape.b[shut]
    if frame.edge_discharge is not None:
        edge = mesh.triangle_edges[shape.tri[shut], shape.side[shut]]
        return np.where(mesh.edge_nodes[edge, 0] == a, 1.0, -1.0) * frame.edge_discharge[edge]
    along = mesh.node_xy[b] - mesh.node_xy[a]
    q = (frame.unit_discharge[a] + frame.unit_discharge[b]) / 2
    return q[:, 0] * along[:, 1] - q[:, 1] * along[:, 0]


def wall_load(frame: Frame, shape: Topology, system: System) -> np.ndarray:
    """Right-hand side of the flow that leaves through walls."""
    shut = shape.opening < 0
    a, b = shape.a[shut], shape.b[shut]
    out = wall_outflow(frame, shape)
    return _to_unknowns(system, np.concatenate([a, b]), np.tile(out / 2, 2))


def storage_load(mesh: Mesh, shape: Topology, rate: np.ndarray, system: System) -> np.ndarray:
    """Right-hand side of lap(phi) = -rate; rate (m,) is the rise of depth in each triangle, m/s."""
    inside = np.flatnonzero(shape.triangles)
    part = rate[inside] * mesh.triangle_area[inside] / 3
    return _to_unknowns(system, mesh.triangles[inside].T.ravel(), np.tile(part, 3))


def norm(mesh: Mesh, inside: np.ndarray, field: np.ndarray) -> float:
    """Root of the integral of the square of a field (m, 2) over the domain."""
    return float(np.sqrt(np.sum(mesh.triangle_area[inside] * np.sum(field[inside] ** 2, axis=1))))


def _to_unknowns(system: System, nodes: np.ndarray, values: np.ndarray) -> np.ndarray:
    unknown = system.unknown[nodes]
    used = unknown >= 0
    return np.bincount(unknown[used], values[used], minlength=system.size)
