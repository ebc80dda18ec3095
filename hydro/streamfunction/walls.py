"""Walls: the stretches of the domain's edge that water does not cross, each with one value of psi."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely

from .._kernels import labels, p1
from ..mesh import Mesh
from ..reach import CentreLine, Structure
from .boundaries import OpenBoundary
from .domain import Domain


@dataclass(frozen=True, eq=False)
class Wall:
    """A connected stretch of boundary that water does not cross.

    Attributes
    ----------
    id, name : str
        "right bank", "Pier 1", "island 2" ... (a label that is lasting only for structures).
    psi_m3_s : float
    nodes : (k,) int32
    structure_id : str or None
        The structure of the review that it is the outline of.
    reaches_open : bool
        It ends on an open boundary, as banks do; in a closed basin, it is the outermost wall.
    waterline : bool
        Some of it is a shore inside the mesh, not the mesh's own edge.
    """

    id: str
    name: str
    psi_m3_s: float
    nodes: np.ndarray
    structure_id: str | None
    reaches_open: bool
    waterline: bool


@dataclass(frozen=True, eq=False)
class Topology:
    """The domain's edge sorted into walls and open boundaries; it stays while the domain stays.

    Attributes
    ----------
    triangles : (m,) bool
    tri, side : (s,) int32
        Triangle and side number of each boundary side; the domain lies left of it.
    a, b : (s,) int32
        Its nodes.
    opening : (s,) int
        The open boundary that it belongs to; -1 for walls.
    wall_of_node : (n,) int32
        -1 where a node is on no wall.
    walls : tuple of Wall
        Without values (psi NaN).
    open_node : (n,) bool
        Nodes of open sides.
    part : (n,) int32
        Connected part of the domain; -1 outside.
    fixed_walls, fixed_nodes : arrays of int
        What is held at psi = 0: one wall or node of each part.
    """

    triangles: np.ndarray
    tri: np.ndarray
    side: np.ndarray
    a: np.ndarray
    b: np.ndarray
    opening: np.ndarray
    wall_of_node: np.ndarray
    walls: tuple[Wall, ...]
    open_node: np.ndarray
    part: np.ndarray
    fixed_walls: np.ndarray
    fixed_nodes: np.ndarray


def topology_of(
    mesh: Mesh, domain: Domain, boundaries: Sequence[OpenBoundary], structures: Sequence[Structure] = (),
    centre_line: CentreLine | None = None,
) -> Topology:
    """Walls and open sides of a domain.

    The right bank of each part is found from its greatest open boundary: with the water on the left
    hand, the wall that follows an inflow is the right bank. With a centre line the offset decides.
    """
    tri, side = p1.boundary_sides(mesh.triangles, mesh.neighbours, domain.triangles)
    a, b = mesh.triangles[tri, side], mesh.triangles[tri, (side + 1) % 3]
    edge = mesh.triangle_edges[tri, side]
    opening = np.full(mesh.n_edges, -1, np.int32)
    for i, boundary in enumerate(boundaries):
        opening[boundary.edges] = i
    opening = np.where((edge >= 0) & (mesh.neighbours[tri, side] < 0), opening[edge], -1)

    shut = opening < 0
    on_wall = np.zeros(mesh.n_nodes, bool)
    on_wall[a[shut]] = on_wall[b[shut]] = True
    wall_of_node, count = labels.of_pairs(a[shut], b[shut], on_wall)
    open_node = np.zeros(mesh.n_nodes, bool)
    open_node[a[~shut]] = open_node[b[~shut]] = True
    part, n_parts = labels.of_corners(mesh.triangles, domain.triangles, mesh.n_nodes)

    reaches = np.zeros(count, bool)
    reaches[wall_of_node[on_wall & open_node]] = True
    fixed_walls, fixed_nodes = [], []
    wall_part = np.zeros(count, np.int32)
    wall_part[wall_of_node[on_wall]] = part[on_wall]
    groups = _grouped_nodes(wall_of_node, count)
    for p in range(n_parts):
        own_open = (~shut) & (part[a] == p)
        if own_open.any():
            node = _right_end(mesh, a[own_open], b[own_open], opening[own_open], boundaries, centre_line)
            if wall_of_node[node] >= 0:
                fixed_walls.append(wall_of_node[node])
            else:
                fixed_nodes.append(node)
        else:
            outer = _outermost(mesh, np.flatnonzero(wall_part == p), groups)
            reaches[outer] = True
            fixed_walls.append(outer)
    shore = np.zeros(count, bool)
    shore[wall_of_node[a[shut & (mesh.neighbours[tri, side] >= 0)]]] = True
    walls = _named(mesh, groups, reaches, shore, fixed_walls, structures, centre_line)
    return Topology(
        domain.triangles, tri, side, a, b, opening, wall_of_node, walls, open_node, part,
        np.array(fixed_walls, int), np.array(fixed_nodes, int),
    )


def _grouped_nodes(wall_of_node: np.ndarray, count: int) -> list[np.ndarray]:
    nodes = np.flatnonzero(wall_of_node >= 0).astype(np.int32)
    order = np.argsort(wall_of_node[nodes], kind="stable")
    cuts = np.cumsum(np.bincount(wall_of_node[nodes], minlength=count))[:-1]
    return np.split(nodes[order], cuts) if count else []


def _right_end(mesh, a, b, opening, boundaries, centre_line) -> int:
    """The node where the greatest open boundary of a part meets the right bank."""
    present = np.zeros(mesh.n_nodes, bool)
    present[a] = present[b] = True
    chain, count = labels.of_pairs(a, b, present)
    size = np.bincount(opening, minlength=len(boundaries))
    share = np.array([boundaries[i].discharge_m3_s / size[i] for i in opening])
    total = np.bincount(chain[a], share, minlength=count)
    great = np.flatnonzero(np.abs(total) >= 0.5 * np.abs(total).max())
    if centre_line is not None:
        chainage, offset = centre_line.locate(mesh.node_xy[a])
        best = min(great, key=lambda c: chainage[chain[a] == c].mean())
    else:
        best = max(great, key=lambda c: (total[c] > 0, abs(total[c]), -c))
    mine = chain[a] == best
    first, last = np.setdiff1d(a[mine], b[mine]), np.setdiff1d(b[mine], a[mine])
    if not first.size:  # a ring with no end: the part has no bank
        return int(a[mine][0])
    ends = int(last[0]), int(first[0])
    if centre_line is not None:
        return min(ends, key=lambda n: float(centre_line.locate(mesh.node_xy[[n]])[1][0]))
    return ends[0] if total[best] >= 0 else ends[1]


def _outermost(mesh: Mesh, walls: np.ndarray, groups: list[np.ndarray]) -> int:
    return int(max(walls, key=lambda w: float(np.prod(np.ptp(mesh.node_xy[groups[w]], axis=0)))))


def _named(mesh, groups, reaches, shore, fixed, structures, centre_line) -> tuple[Wall, ...]:
    names: list[tuple[str, str | None]] = []
    middles = np.array([mesh.node_xy[g].mean(axis=0) for g in groups]).reshape(-1, 2)
    counts = {"bank": 0, "island": 0, "shore": 0}
    main = fixed[0] if fixed else -1
    if centre_line is not None:
        along, offset = centre_line.locate(middles) if len(middles) else (np.zeros(0), np.zeros(0))
    else:
        along, offset = middles[:, 0], np.zeros(len(groups))
    names = [("", None)] * len(groups)
    for w in np.lexsort((middles[:, 1], along)) if len(groups) else ():
        structure = None if reaches[w] else _structure_of(mesh, groups[w], structures)
        if structure is not None:
            names[w] = structure.name, structure.id
        elif reaches[w]:
            names[w] = _bank_name(w, main, offset[w] if centre_line is not None else None, counts), None
        else:
            counts["island"] += 1
            names[w] = f"island {counts['island']}", None
    used: dict[str, int] = {}
    walls = []
    for w, nodes in enumerate(groups):
        name, structure_id = names[w]
        used[name] = used.get(name, 0) + 1
        unique = name if used[name] == 1 else f"{name} ({used[name]})"
        walls.append(Wall(unique, name, float("nan"), nodes, structure_id, bool(reaches[w]), bool(shore[w])))
    return tuple(walls)


def _bank_name(w: int, main: int, offset: float | None, counts: dict[str, int]) -> str:
    if w == main:
        return "right bank"
    counts["bank"] += 1
    if offset is not None:
        return "left bank" if offset > 0 else "right bank"
    return "left bank" if counts["bank"] == 1 else f"bank {counts['bank']}"


def _structure_of(mesh: Mesh, nodes: np.ndarray, structures: Sequence[Structure]) -> Structure | None:
    """The structure whose outline a wall follows: most of its nodes lie within a tenth of its size of it."""
    points = shapely.points(mesh.node_xy[nodes])
    size = float(np.ptp(mesh.node_xy[nodes], axis=0).max())
    best, most = None, 0.5
    for s in structures:
        if s.geometry.geom_type not in ("Polygon", "MultiPolygon"):
            continue
        share = float(np.mean(shapely.distance(s.geometry, points) <= 0.1 * size))
        if share > most:
            best, most = s, share
    return best
