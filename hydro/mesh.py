"""The mesh: nodes, faces, oriented edges, triangles and neighbours, in an order that is kind to memory.

Everything is renumbered along a space-filling curve at load; ``file_node``, ``file_face`` and
``file_edge`` keep the file's own numbers. Coordinates are metres about ``origin``.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import coo_array, csr_array

from ._kernels import curve, locate, topology


@dataclass(frozen=True, eq=False)
class Mesh:
    """A 2D mesh of faces with 3 to 8 nodes, with the triangles that psi and tracks use.

    Attributes
    ----------
    node_xy : (n, 2) float64
        Local coordinates, m: world minus ``origin``.
    origin : tuple of two floats
        World coordinates of the local origin, m.
    face_nodes : (f, k) int32
        Nodes of each face, anticlockwise seen from above, padded with -1 at the end.
    face_count : (f,) int32
        Nodes of each face.
    edge_nodes, edge_faces : (e, 2) int32
        Directed edges; the faces left and right of each (-1: none).
    triangles : (m, 3) int32
        Nodes, anticlockwise; the triangles of one face are adjoining.
    triangle_face : (m,) int32
    face_first_triangle : (f + 1,) int32
        Triangles of face i are ``face_first_triangle[i]`` up to ``[i + 1]``.
    neighbours, triangle_edges : (m, 3) int32
        Across side k (corner k to k + 1): the triangle (-1: none), the edge (-1: inside a face).
    file_node, file_face, file_edge : int32
        The file's number (from 0) of each node, face and edge here; nodes that no face uses are not here.
    turned_faces : int
        Faces that the file listed clockwise and that were turned.
    stepped : bool
        Whether the outline is no model's own but stair steps of cells, or the outermost of joined points: banks
        and piers then stand up to a cell away from where they are.
    """

    node_xy: np.ndarray
    origin: tuple[float, float]
    face_nodes: np.ndarray
    face_count: np.ndarray
    edge_nodes: np.ndarray
    edge_faces: np.ndarray
    triangles: np.ndarray
    triangle_face: np.ndarray
    face_first_triangle: np.ndarray
    neighbours: np.ndarray
    triangle_edges: np.ndarray
    file_node: np.ndarray
    file_face: np.ndarray
    file_edge: np.ndarray
    turned_faces: int = 0
    stepped: bool = False

    @property
    def n_nodes(self) -> int:
        return len(self.node_xy)

    @property
    def n_faces(self) -> int:
        return len(self.face_nodes)

    @property
    def n_edges(self) -> int:
        return len(self.edge_nodes)

    @property
    def n_triangles(self) -> int:
        return len(self.triangles)

    @cached_property
    def triangle_area(self) -> np.ndarray:
        """(m,) m2, positive."""
        a, b, c = (self.node_xy[self.triangles[:, k]] for k in range(3))
        return _frozen(((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]) / 2)

    @cached_property
    def face_area(self) -> np.ndarray:
        """(f,) m2, positive."""
        return _frozen(np.add.reduceat(self.triangle_area, self.face_first_triangle[:-1]))

    @cached_property
    def triangle_centroid(self) -> np.ndarray:
        """(m, 2) local m."""
        a, b, c = (self.node_xy[self.triangles[:, k]] for k in range(3))
        return _frozen((a + b + c) / 3)

    @cached_property
    def face_centroid(self) -> np.ndarray:
        """(f, 2) local m: the centre of area."""
        return _frozen(self.triangle_to_face(self.triangle_centroid))

    @cached_property
    def edge_length(self) -> np.ndarray:
        """(e,) m."""
        return _frozen(np.hypot(*(self.node_xy[self.edge_nodes[:, 1]] - self.node_xy[self.edge_nodes[:, 0]]).T))

    @cached_property
    def boundary_edges(self) -> np.ndarray:
        """Edges with a face on one side only."""
        return _frozen(np.flatnonzero(self.edge_faces.min(axis=1) < 0).astype(np.int32))

    @cached_property
    def node_faces(self) -> tuple[np.ndarray, np.ndarray]:
        """Compressed lists (start, faces): the faces round each node."""
        face = np.repeat(np.arange(self.n_faces, dtype=np.int32), self.face_count)
        node = self.face_nodes[self.face_nodes >= 0]
        start, order = topology.grouped(node, self.n_nodes)
        return _frozen(start), _frozen(face[order])

    @cached_property
    def bounds(self) -> tuple[float, float, float, float]:
        """Local (west, south, east, north), m."""
        low, high = self.node_xy.min(axis=0), self.node_xy.max(axis=0)
        return float(low[0]), float(low[1]), float(high[0]), float(high[1])

    @cached_property
    def _locator(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        return locate.seed_grid(self.node_xy, self.triangles)

    def find(self, xy: np.ndarray) -> np.ndarray:
        """Triangle (k,) int32 that holds each local point (k, 2); -1 outside the mesh."""
        points = np.ascontiguousarray(np.atleast_2d(xy), dtype=np.float64)
        grid, start, items = self._locator
        return locate.find_points(self.node_xy, self.triangles, self.neighbours, grid, start, items, points)

    def to_local(self, xy: np.ndarray) -> np.ndarray:
        """World coordinates (..., 2) to local ones, m."""
        return np.asarray(xy, float) - self.origin

    def to_world(self, xy: np.ndarray) -> np.ndarray:
        """Local coordinates (..., 2) to world ones, m."""
        return np.asarray(xy, float) + self.origin

    @cached_property
    def node_graph(self) -> csr_array:
        """Ones (n, n) between each node, itself and the nodes that an edge joins it to."""
        i, j = self.edge_nodes.T
        own = np.arange(self.n_nodes)
        rows, columns = np.concatenate([i, j, own]), np.concatenate([j, i, own])
        return coo_array((np.ones(len(rows)), (rows, columns)), shape=(self.n_nodes, self.n_nodes)).tocsr()

    def triangle_to_face(self, values: np.ndarray) -> np.ndarray:
        """Area-weighted mean (f, ...) of values (m, ...) on triangles."""
        if self.n_triangles == self.n_faces:
            return values.copy()
        weight = self.triangle_area.reshape(-1, *([1] * (values.ndim - 1)))
        total = np.add.reduceat(values * weight, self.face_first_triangle[:-1])
        return total / self.face_area.reshape(-1, *([1] * (values.ndim - 1)))


def default_origin(xy: np.ndarray) -> tuple[float, float]:
    """Local origin for world coordinates (n, 2): the south-west corner, cut to whole 10 km.

    Meshes of one reach get the same origin, so their lines and figures can be laid over each other.
    """
    low = np.floor(np.nanmin(xy, axis=0) / 10_000.0) * 10_000.0
    return float(low[0]), float(low[1])


def build_mesh(
    node_xy: np.ndarray,
    face_nodes: np.ndarray | Sequence[Sequence[int]],
    *,
    edge_nodes: np.ndarray | None = None,
    origin: tuple[float, float] | None = None,
    stepped: bool = False,
) -> Mesh:
    """A mesh from world coordinates and faces.

    Parameters
    ----------
    node_xy : (n, 2) array_like
        World coordinates, m.
    face_nodes : (f, k) int array or sequence of sequences
        Node numbers from 0; shorter faces padded at the end with a negative number.
    edge_nodes : (e, 2) int array, optional
        The file's edges, which fixes their numbers and directions. Edges of faces that it lacks are
        an error.
    origin : pair of floats, optional
        World coordinates of the local origin; default :func:`default_origin`.
    stepped : bool
        See :class:`Mesh`.

    Raises
    ------
    ValueError
        A node number out of range, a face of fewer than three nodes or of no area, a side with
        more than two faces or two faces on the same side of it, an edge list that does not fit.
    """
    world = np.asarray(node_xy, float)
    faces, count = _padded(face_nodes, len(world))
    used = np.zeros(len(world), bool)
    used[faces[faces >= 0]] = True
    place = origin if origin is not None else default_origin(world[used])
    xy = world - place
    areas = topology.signed_areas(xy[:, 0], xy[:, 1], faces, count)
    _refuse_flat(areas, np.ptp(xy[used], axis=0).max(), faces, count, world)
    turned = int(topology.turn_clockwise(faces, count, areas))

    file_face = curve.hilbert_order(topology.corner_means(xy, faces, count)).astype(np.int32)
    faces, count = faces[file_face], count[file_face]
    file_node = topology.number_by_use(faces, count, len(world))  # leaves out nodes that no face uses
    xy = np.ascontiguousarray(xy[file_node])

    side_edge, edges, edge_faces, file_edge = _edges(faces, count, edge_nodes, file_node, file_face, world)
    x, y = np.ascontiguousarray(xy.T)
    triangles, first = topology.triangulate(x, y, faces, count)
    start, order = topology.grouped(triangles.ravel(), len(xy))
    neighbours = topology.triangle_neighbours(triangles, start, order)
    triangle_face = np.repeat(np.arange(len(faces), dtype=np.int32), np.diff(first))
    triangle_edges = _triangle_edges(triangles, triangle_face, faces, count, side_edge)
    made = Mesh(
        xy, (float(place[0]), float(place[1])), faces, count, edges, edge_faces, triangles, triangle_face, first, neighbours,
        triangle_edges, file_node, file_face, file_edge, turned, stepped,
    )
    for array in vars(made).values():
        if isinstance(array, np.ndarray):
            _frozen(array)
    return made


def _frozen(array: np.ndarray) -> np.ndarray:
    array.setflags(write=False)
    return array


def _padded(face_nodes, n_nodes: int) -> tuple[np.ndarray, np.ndarray]:
    if isinstance(face_nodes, np.ndarray):
        faces = np.array(face_nodes, dtype=np.int32)
    else:
        width = max((len(f) for f in face_nodes), default=0)
        faces = np.array([list(f) + [-1] * (width - len(f)) for f in face_nodes], dtype=np.int32)
    if faces.ndim != 2 or not len(faces):
        raise ValueError("the mesh has no faces; export the face-node connectivity.")
    count = (faces >= 0).sum(axis=1).astype(np.int32)
    few = np.flatnonzero(count < 3)
    if few.size:
        raise ValueError(f"face {few[0]} has {count[few[0]]} nodes (and {few.size - 1} more); a face needs at least 3.")
    high = np.flatnonzero(faces.max(axis=1) >= n_nodes)
    if high.size:
        raise ValueError(
            f"face {high[0]} names node {faces[high[0]].max()}, but there are only {n_nodes} nodes numbered from 0; "
            "check start_index of the connectivity."
        )
    return faces, count


def _refuse_flat(areas, span, faces, count, world) -> None:
    flat = np.flatnonzero(np.abs(areas) <= 1e-14 * span * span)
    if flat.size:
        x, y = world[faces[flat[0], : count[flat[0]]]].mean(axis=0)
        raise ValueError(
            f"face {flat[0]} at {x:.2f} E, {y:.2f} N has no area (and {flat.size - 1} more); remove or mend it."
        )


def _edges(faces, count, edge_nodes, file_node, file_face, world):
    """Edges with the file's numbers where it has them: (edge of each side, nodes, faces, file numbers)."""
    a, b, of = topology.face_sides(faces, count)
    start, order = topology.grouped(np.minimum(a, b), len(file_node))
    side_edge, edges, edge_faces, bad = topology.pair_sides(a, b, of, start, order)
    if bad >= 0:
        x, y = world[file_node[[a[bad], b[bad]]]].mean(axis=0)
        raise ValueError(
            f"the side at {x:.2f} E, {y:.2f} N of face {file_face[of[bad]]} is shared by more than two faces or by two "
            "on the same side of it; the mesh overlaps itself there: mend it and export again."
        )
    if edge_nodes is None:
        return side_edge, edges, edge_faces, np.arange(len(edges), dtype=np.int32)
    return side_edge, *_like_file(edges, edge_faces, np.asarray(edge_nodes), file_node)


def _like_file(edges, edge_faces, edge_nodes, file_node):
    """Number and direct edges as the file does; edges of the file that no face uses are left out."""
    if not len(edge_nodes):
        raise ValueError("edge_node_connectivity lists no edges; export all edges or none.")
    n = int(max(file_node.max(), edge_nodes.max())) + 1
    key = np.sort(file_node[edges].astype(np.int64), axis=1) @ np.array([n, 1])
    theirs = np.sort(edge_nodes.astype(np.int64), axis=1) @ np.array([n, 1])
    order = np.argsort(theirs, kind="stable")
    at = np.searchsorted(theirs[order], key)
    found = (at < len(theirs)) & (theirs[order][np.minimum(at, len(theirs) - 1)] == key)
    if not found.all():
        i, j = file_node[edges[np.flatnonzero(~found)[0]]]
        raise ValueError(
            f"edge_node_connectivity lacks the side between nodes {i} and {j} (and {np.count_nonzero(~found) - 1} more); "
            "export all edges or none."
        )
    file_edge = order[at].astype(np.int32)
    against = file_node[edges[:, 0]] != edge_nodes[file_edge, 0]
    edges[against] = edges[against][:, ::-1]
    edge_faces[against] = edge_faces[against][:, ::-1]
    return edges, edge_faces, file_edge


def _triangle_edges(triangles, triangle_face, faces, count, side_edge) -> np.ndarray:
    """Edge of each triangle side; -1 for the cuts inside a face."""
    first_side = np.concatenate([[0], np.cumsum(count)]).astype(np.int64)
    out = np.full(triangles.shape, -1, np.int32)
    own, own_count = faces[triangle_face], count[triangle_face]
    for k in range(3):
        i, j = triangles[:, k], triangles[:, (k + 1) % 3]
        for c in range(faces.shape[1]):
            following = own[np.arange(len(own)), (c + 1) % np.maximum(own_count, 1)]
            hit = (c < own_count) & (own[:, c] == i) & (following == j)
            out[hit, k] = side_edge[first_side[triangle_face[hit]] + c]
    return out
