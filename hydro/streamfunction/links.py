"""Links (culverts, pipes, pumps) and single sources in psi: a jump along a path of mesh edges.

A link takes water out of the field at its first point and gives it back at its last. Going round either
end psi changes by its discharge, so psi cannot be of one value: it jumps by the discharge across a path between
the ends. Facing along the path, psi on the left is higher. An end that lies outside the mesh joins the link to
the nearest open boundary: that is how a single source or sink is drawn.

psi at the nodes holds the value on the right of the path. Triangles that touch the path from the left add their
share of the jump at those corners.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import dijkstra

from ..mesh import Mesh
from ..reach import Structure
from .solve import node_triangles
from .walls import Topology

_NEAR_EDGES = 3.0  # an end on dry ground is joined to water no further away than this many edges


@dataclass(frozen=True, eq=False)
class LinkPath:
    """The path of one link through a domain.

    Attributes
    ----------
    name, series : str
        The link, and the run's series that holds its discharge.
    nodes : (k,) int32
        From where water is taken to where it is given back.
    triangles : (t,) int32
        Those that have a share of the jump at a corner.
    share : (t, 3) float64
        0 to 1, of each corner.
    """

    name: str
    series: str
    nodes: np.ndarray
    triangles: np.ndarray
    share: np.ndarray


@dataclass(frozen=True, eq=False)
class Link:
    """A link of one frame: its path and what it carries, m3/s, from the first node of the path to the last."""

    path: LinkPath
    discharge_m3_s: float


def link_paths(mesh: Mesh, shape: Topology, structures: Sequence[Structure]) -> tuple[tuple[LinkPath, ...], tuple[str, ...]]:
    """Paths of the links among the structures, and the names of those that find no water at an end."""
    links = [s for s in structures if s.represented_as == "link" and s.discharge_variable]
    paths, lost = [], []
    for link in links:
        ends = np.asarray(link.geometry.coords)[[0, -1], :2]
        nodes = _path(mesh, shape, ends)
        if nodes is None:
            lost.append(link.name)
        else:
            paths.append(LinkPath(link.name, link.discharge_variable, nodes, *_shares(mesh, shape, nodes)))
    return tuple(paths), tuple(lost)


def corner_jumps(links: Sequence[Link]) -> tuple[np.ndarray, np.ndarray]:
    """Triangles (t,) and what psi has at their corners (t, 3) above the nodes' values, m3/s, of all links together."""
    if not links:
        return np.zeros(0, np.int32), np.zeros((0, 3))
    triangles, place = np.unique(np.concatenate([link.path.triangles for link in links]), return_inverse=True)
    jump = np.zeros((len(triangles), 3))
    np.add.at(jump, place, np.concatenate([link.discharge_m3_s * link.path.share for link in links]))
    return triangles.astype(np.int32), jump


def jump_gradient(mesh: Mesh, triangles: np.ndarray, jump: np.ndarray) -> np.ndarray:
    """Gradient (t, 2) of the corners' jumps in their triangles."""
    a, b, c = (mesh.node_xy[mesh.triangles[triangles, k]] for k in range(3))
    area2 = ((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0])[:, None]
    normals = (_turned(c - b), _turned(a - c), _turned(b - a))  # of the side that faces each corner, inwards
    return sum(jump[:, k : k + 1] * normals[k] for k in range(3)) / area2


def _turned(v: np.ndarray) -> np.ndarray:
    return np.column_stack([-v[:, 1], v[:, 0]])


def _path(mesh: Mesh, shape: Topology, ends: np.ndarray) -> np.ndarray | None:
    """Nodes of the shortest way along edges, off the walls; None where an end finds no water."""
    usable = (shape.part >= 0) & (shape.wall_of_node < 0)
    i, j = mesh.edge_nodes.T
    keep = usable[i] & usable[j] & ~(shape.open_node[i] & shape.open_node[j])
    i, j = i[keep], j[keep]
    length = np.hypot(*(mesh.node_xy[i] - mesh.node_xy[j]).T)
    if not length.size:
        return None
    found = [_end(mesh, shape, usable, at, float(np.median(length))) for at in ends]
    if found[0] is None or found[1] is None or found[0] == found[1]:
        return None
    graph = coo_array((length, (i, j)), shape=(mesh.n_nodes, mesh.n_nodes)).tocsr()
    reach, before = dijkstra(graph, directed=False, indices=found[0], return_predecessors=True)
    if not np.isfinite(reach[found[1]]):
        return None
    nodes = [found[1]]
    while nodes[-1] != found[0]:
        nodes.append(int(before[nodes[-1]]))
    return np.array(nodes[::-1], np.int32)


def _end(mesh: Mesh, shape: Topology, usable: np.ndarray, at: np.ndarray, edge: float) -> int | None:
    """The node at an end: in the water near it, or on the nearest open boundary where it lies outside the mesh."""
    outside = mesh.find(at[None])[0] < 0
    nodes = np.flatnonzero(usable & (shape.open_node if outside else ~shape.open_node))
    if not nodes.size:
        return None
    away = np.hypot(*(mesh.node_xy[nodes] - at).T)
    nearest = int(away.argmin())
    return int(nodes[nearest]) if outside or away[nearest] <= _NEAR_EDGES * edge else None


def _shares(mesh: Mesh, shape: Topology, nodes: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    touched: dict[int, np.ndarray] = {}
    start, triangles_of = node_triangles(mesh)
    around = [triangles_of[start[n] : start[n + 1]] for n in nodes]
    around = [own[shape.triangles[own]] for own in around]
    for k, node in enumerate(nodes):
        ahead = mesh.node_xy[nodes[k + 1]] - mesh.node_xy[node] if k + 1 < len(nodes) else None
        back = mesh.node_xy[nodes[k - 1]] - mesh.node_xy[node] if k > 0 else None
        middle = mesh.node_xy[mesh.triangles[around[k]]].mean(axis=1) - mesh.node_xy[node]
        share = _fan(np.arctan2(middle[:, 1], middle[:, 0]), ahead, back, bool(shape.open_node[node]))
        for t, part in zip(around[k], share, strict=True):
            if part:
                corners = touched.setdefault(int(t), np.zeros(3))
                corners[int(np.flatnonzero(mesh.triangles[t] == node)[0])] = part
    triangles = np.array(sorted(touched), np.int32)
    return triangles, np.array([touched[int(t)] for t in triangles]).reshape(-1, 3)


def _fan(angle: np.ndarray, ahead: np.ndarray | None, back: np.ndarray | None, at_opening: bool) -> np.ndarray:
    """Share of the jump of each triangle round a node of the path, by its direction (rad) from the node.

    Inside the path those on its left have all of it. Round an end it rises evenly with the angle: from nothing on
    the right of the path, the long way round, to all of it on the left. At an open boundary the path just ends.
    """
    def turn(from_: np.ndarray) -> np.ndarray:
        return np.mod(angle - np.arctan2(from_[1], from_[0]), 2 * np.pi)

    if ahead is not None and back is not None:
        return (turn(ahead) < np.mod(np.arctan2(back[1], back[0]) - np.arctan2(ahead[1], ahead[0]), 2 * np.pi)).astype(float)
    if ahead is not None:
        return (turn(ahead) < np.pi).astype(float) if at_opening else 1 - turn(ahead) / (2 * np.pi)
    assert back is not None  # a path has two nodes at least
    return (turn(back) > np.pi).astype(float) if at_opening else turn(back) / (2 * np.pi)
