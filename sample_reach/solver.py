"""A small two-dimensional shallow-water model on triangles: the friendly side of the compiled loops."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from scipy.spatial import cKDTree

from . import march
from .flow import INTERIOR, WALL


@dataclass(frozen=True, eq=False)
class Topology:
    """Cells, directed edges and geometry of a triangle mesh, local m.

    ``edges`` (e, 2) nodes, the left cell on the left of node 0 to node 1; ``right`` -1 at the boundary.
    """

    xy: np.ndarray
    cells: np.ndarray
    edges: np.ndarray
    left: np.ndarray
    right: np.ndarray
    cell_edge: np.ndarray
    cell_side: np.ndarray
    area: np.ndarray
    centre: np.ndarray
    length: np.ndarray
    normal: np.ndarray  # from left to right
    middle: np.ndarray


def topology(xy: np.ndarray, cells: np.ndarray) -> Topology:
    """Edges and geometry of anticlockwise triangles; edges are sorted by their left cell."""
    m = len(cells)
    sides = cells[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2)
    key = np.sort(sides, axis=1)
    _, first, edge = np.unique(key, axis=0, return_index=True, return_inverse=True)
    rank = np.argsort(np.argsort(first))  # number edges by their first, left, cell
    edge = rank[edge.ravel()]
    first = np.sort(first)
    owner = np.repeat(np.arange(m), 3)
    left = owner[first].astype(np.int32)
    right = np.full(len(first), -1, np.int32)
    second = np.ones(3 * m, bool)
    second[first] = False
    right[edge[second]] = owner[second]
    a, b, c = (xy[cells[:, k]] for k in range(3))
    area = ((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]) / 2
    if area.min() <= 0:
        raise ValueError(f"triangle {int(area.argmin())} has area {area.min():.3g} m2; list its nodes anticlockwise.")
    along = xy[sides[first, 1]] - xy[sides[first, 0]]
    length = np.hypot(along[:, 0], along[:, 1])
    return Topology(
        xy, cells, sides[first].astype(np.int32), left, right, edge.reshape(-1, 3).astype(np.int32),
        second.reshape(-1, 3).astype(np.int32), area, (a + b + c) / 3, length,
        np.column_stack([along[:, 1], -along[:, 0]]) / length[:, None], xy[sides[first]].mean(axis=1),
    )


def _stencil(t: Topology) -> tuple[np.ndarray, ...]:
    """Cells that share a node with each cell, and least-squares weights (1/d^2) of their differences."""
    order = np.argsort(t.cells.ravel(), kind="stable")
    node_start = np.searchsorted(t.cells.ravel()[order], np.arange(len(t.xy) + 1))
    node_cells = order // 3
    lists = []
    for i, nodes in enumerate(t.cells):
        around = np.unique(np.concatenate([node_cells[node_start[n] : node_start[n + 1]] for n in nodes]))
        lists.append(around[around != i])
    start, near = np.concatenate([[0], np.cumsum([len(a) for a in lists])]), np.concatenate(lists)
    d = t.centre[near] - np.repeat(t.centre, np.diff(start), axis=0)
    w = 1 / np.sum(d * d, axis=1)
    xx, xy, yy = (np.add.reduceat(w * p, start[:-1]) for p in (d[:, 0] ** 2, d[:, 0] * d[:, 1], d[:, 1] ** 2))
    det = np.repeat(xx * yy - xy * xy, np.diff(start))
    xx, xy, yy = (np.repeat(v, np.diff(start)) for v in (xx, xy, yy))
    flat = det < 1e-9 * xx * yy  # neighbours in one line: no gradient
    det = np.where(flat, np.inf, det)
    return start, near.astype(np.int32), w * (yy * d[:, 0] - xy * d[:, 1]) / det, w * (xx * d[:, 1] - xy * d[:, 0]) / det


@dataclass(frozen=True)
class Drive:
    """What enters and leaves: times (s) with river and tributary inflow (m3/s), and the outlet's rating."""

    times: np.ndarray
    river: np.ndarray
    tributary: np.ndarray
    rating_discharge: np.ndarray
    rating_level: np.ndarray


@dataclass(eq=False)
class Model:
    """A mesh with its bed, roughness and boundary, and a state that :meth:`advance` moves in time.

    Attributes
    ----------
    topology : Topology
    bed, roughness : (m,) m and s/m^(1/3)
    kind : (e,) int32
        One of the codes of :mod:`sample_reach.flow` for each edge.
    alpha : float
        Eddy viscosity over depth times shear velocity.
    link : two cells
        Inlet and outlet of the culvert, -1 without.
    """

    topology: Topology
    bed: np.ndarray
    roughness: np.ndarray
    kind: np.ndarray | None = None
    alpha: float = 0.0
    courant: float = 0.9
    link: tuple[int, int] = (-1, -1)
    link_area: float = 0.0
    link_loss: float = 1.0
    h: np.ndarray = field(init=False)
    hu: np.ndarray = field(init=False)
    hv: np.ndarray = field(init=False)
    state: np.ndarray = field(init=False)

    def __post_init__(self) -> None:
        t = self.topology
        if self.kind is None:
            self.kind = np.where(t.right < 0, WALL, INTERIOR).astype(np.int32)
        n = len(t.cells)
        self.h, self.hu, self.hv = np.zeros(n), np.zeros(n), np.zeros(n)
        self.state = np.zeros(9)
        arm = t.middle[t.cell_edge] - t.centre[:, None, :]
        self._mesh = (
            *_stencil(t), arm, self.kind, t.left, t.right, t.normal, t.length, t.middle, t.centre, t.area, t.cell_edge,
            t.cell_side,
        )
        self._work = march.work_arrays(n, len(t.edges))
        self.sums = (np.zeros(n), np.zeros(len(t.edges)), np.zeros(len(t.edges)))

    @property
    def volume(self) -> float:
        """Water held, m3."""
        return float(np.sum(self.h * self.topology.area))

    @property
    def time(self) -> float:
        return float(self.state[0])

    def clear_sums(self) -> None:
        """Begin a new mean: forget what was summed of depth, edge discharge and culvert volume."""
        for a in self.sums:
            a[:] = 0
        self.state[8] = 0.0

    def advance(self, until: float, drive: Drive | None = None) -> None:
        """Move the state to the time ``until``, s.

        Raises ``FloatingPointError`` when the flow blows up.
        """
        if drive is None:
            none = np.zeros(1)
            drive = Drive(none, none, none, none, none)
        failed = march.march(
            self.h, self.hu, self.hv, self.bed, self.roughness, self.alpha, self.courant, self._mesh,
            np.array(self.link, np.int64), self.link_area, self.link_loss, (drive.times, drive.river, drive.tributary),
            (drive.rating_discharge, drive.rating_level), self.state, float(until), self._work, self.sums,
        )
        if failed or not np.all(np.isfinite(self.h)):
            raise FloatingPointError(f"the flow blew up at {self.time:.3f} s; take a smaller Courant number.")


def carry(source: Model, target: Model) -> None:
    """Start one model from another's level and velocity, whatever their meshes: mean of the three nearest wet cells."""
    wet = np.flatnonzero(source.h > 0.01)
    distance, near = cKDTree(source.topology.centre[wet]).query(target.topology.centre, k=3)
    weight = 1 / (distance + 0.01)
    weight /= weight.sum(axis=1, keepdims=True)
    near = wet[near]
    level = np.sum(weight * (source.bed + source.h)[near], axis=1)
    target.h[:] = np.where(distance[:, 0] < 4.0, np.maximum(level - target.bed, 0), 0)
    for name in ("hu", "hv"):
        speed = np.sum(weight * (getattr(source, name) / source.h.clip(1e-3))[near], axis=1)
        getattr(target, name)[:] = np.where(target.h > 0.01, speed * target.h, 0)
    target.state[:2] = source.state[:2]


def cell_flow(t: Topology, edge_discharge: np.ndarray) -> np.ndarray:
    """Unit discharge (m, 2) of each cell, m2/s, from the discharges of its edges.

    Sum of outward discharge times (edge midpoint - centroid) over area: exact for a field with no
    divergence that is linear.
    """
    out = np.where(t.cell_side == 0, 1.0, -1.0) * edge_discharge[t.cell_edge]
    arm = t.middle[t.cell_edge] - t.centre[:, None, :]
    return np.sum(out[:, :, None] * arm, axis=1) / t.area[:, None]
