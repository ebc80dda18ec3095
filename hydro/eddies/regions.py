"""Closed regions of a stream function: each extremum of psi with its dividing level and its nodes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .._kernels import regions as kernel
from ..streamfunction import StreamFunction
from ..streamfunction.solve import node_triangles

# psi counts as equal within this share of its range: far above the solver's round-off, far below any figure.
# Without it, round-off along the axis of a symmetric wake would decide what is joined to what.
_QUANTUM = 2.0**-33


@dataclass(frozen=True, eq=False)
class Region:
    """A maximal region round an extremum of psi that reaches no open boundary.

    Attributes
    ----------
    sign : +1 or -1
        +1 round a maximum (the water turns anticlockwise), -1 round a minimum.
    peak : int
        Node of the greatest extremum.
    level : float
        Dividing level of psi, m3/s.
    meets : int
        Node where that level was reached: a saddle, or a node of the wall that closes the region.
    nodes : (k,) int32
        Nodes beyond the level, nodes of walls inside it included.
    cores : (c,) int32
        Nodes of all its extrema, the greatest first.
    """

    sign: int
    peak: int
    level: float
    meets: int
    nodes: np.ndarray
    cores: np.ndarray


def closed_regions(sf: StreamFunction) -> list[Region]:
    """Every region of closed streamlines, however small, maxima first."""
    ends = sf.shape.open_node.copy()
    for wall in sf.walls:
        ends[wall.nodes] |= wall.reaches_open
    return [r for sign in (1, -1) for r in _grown(sf, sign, ends, past_ends=False)]


def open_regions(sf: StreamFunction) -> list[Region]:
    """Regions round extrema of psi on an open boundary: eddies that the model's edge cuts.

    The corner where two open boundaries meet is no such extremum: water may come in by one and
    leave by the other.
    """
    s, n = sf.shape, sf.frame.mesh.n_nodes
    low, high = np.full(n, len(sf.open_boundaries)), np.full(n, -1)
    both, kind = np.concatenate([s.a, s.b]), np.tile(s.opening, 2)
    np.minimum.at(low, both, kind)
    np.maximum.at(high, both, kind)
    within = low == high
    found = [r for sign in (1, -1) for r in _grown(sf, sign, s.open_node, past_ends=True)]
    return [r for r in found if within[r.peak]]


def _grown(sf: StreamFunction, sign: int, ends: np.ndarray, *, past_ends: bool) -> list[Region]:
    mesh = sf.frame.mesh
    psi = np.nan_to_num(sf.psi)
    quantum = float(np.ptp(psi)) * _QUANTUM
    values = sign * (np.round(psi / quantum) if quantum > 0 else psi)
    stands_for, first, nodes = _walls(sf)
    top = kernel.maxima(mesh.triangles, sf.domain, values, stands_for)
    if past_ends:
        seeds = np.flatnonzero(top & ends & (sf.shape.wall_of_node < 0))
    else:
        seeds = np.flatnonzero(top & ~ends)
    # The highest first, so that the peak of a region with several cores is its greatest.
    seeds = seeds[np.argsort(-sign * psi[seeds], kind="stable")].astype(np.int32)
    start, around = node_triangles(mesh)
    found, members, level, meets, peak = kernel.grow(
        mesh.triangles, sf.domain, start, around, values, stands_for, first, nodes, sf.shape.wall_of_node, ends, seeds,
        past_ends,
    )
    on_walls = {float(values[w.nodes[0]]): w.psi_m3_s for w in sf.walls}
    made = []
    for r in range(len(level)):
        own = members[found[r] : found[r + 1]]
        cores = own[top[own]]
        cores = cores[np.argsort(-sign * psi[cores], kind="stable")]
        edge = on_walls.get(float(level[r]), float(psi[meets[r]]))
        made.append(Region(sign, int(peak[r]), edge, int(meets[r]), _with_walls(sf, own), cores))
    return made


def _walls(sf: StreamFunction) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The node that stands for each node, and compressed lists of the nodes of walls."""
    stands_for = np.arange(sf.frame.mesh.n_nodes, dtype=np.int32)
    first = np.zeros(len(sf.walls) + 1, np.int64)
    for k, wall in enumerate(sf.walls):
        stands_for[wall.nodes] = wall.nodes[0]
        first[k + 1] = first[k] + len(wall.nodes)
    nodes = np.concatenate([w.nodes for w in sf.walls]) if sf.walls else np.zeros(0, np.int32)
    return stands_for, first, nodes


def _with_walls(sf: StreamFunction, standing: np.ndarray) -> np.ndarray:
    walls = np.unique(sf.shape.wall_of_node[standing])
    more = [sf.walls[w].nodes for w in walls if w >= 0]
    return np.unique(np.concatenate([standing, *more])).astype(np.int32)
