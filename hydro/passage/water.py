"""The water a fish route runs through: points on the sides of triangles, with depth, velocity and drops of the level."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
import shapely
from scipy.spatial import KDTree

from .._kernels import topology
from .._kernels.route import SECTORS, Net
from ..frame import Frame
from ..mesh import Mesh

_THIN_M = 1e-6  # no velocity is read from less water than this


@dataclass(frozen=True, eq=False)
class Routes:
    """Points and triangles that a route may use: all of a mesh, or some of its triangles.

    Attributes
    ----------
    mesh : Mesh
    net : Net
        Triangles and points, numbered within this part.
    nodes : (n,) int32
        The mesh's number of each node here.
    triangles : (m,) int32
        The mesh's number of each triangle here.
    shares : (s, per_side) float64
        Place of the points along each side, rising from 0 at its first node to 1 at its second.
    """

    mesh: Mesh
    net: Net
    nodes: np.ndarray
    triangles: np.ndarray
    shares: np.ndarray

    @property
    def n_points(self) -> int:
        return len(self.nodes) + len(self.net.side_nodes) * self.net.per_side

    def at_points(self, node_values: np.ndarray) -> np.ndarray:
        """Values (p, ...) at the points, linear along sides, of values at the mesh's nodes."""
        own = node_values[self.nodes]
        a, b = (own[self.net.side_nodes[:, k]] for k in (0, 1))
        share = self.shares.reshape(*self.shares.shape, *([1] * (own.ndim - 1)))
        between = a[:, None] + share * (b - a)[:, None]
        return np.concatenate([own, between.reshape(-1, *own.shape[1:])])

    def points_of(self, chosen: np.ndarray) -> np.ndarray:
        """Points on triangles chosen (m,) bool."""
        hit = np.zeros(self.n_points, bool)
        hit[self.net.triangles[chosen].ravel()] = True
        m = self.net.per_side
        sides = np.unique(self.net.triangle_sides[chosen])
        hit[(len(self.nodes) + sides[:, None] * m + np.arange(m)).ravel()] = True
        return np.flatnonzero(hit).astype(np.int32)

    def triangle_points(self) -> np.ndarray:
        """(m, 3 + 3 per_side) points on each triangle."""
        m = self.net.per_side
        along = len(self.nodes) + self.net.triangle_sides[:, :, None] * m + np.arange(m, dtype=np.int32)
        return np.concatenate([self.net.triangles, along.reshape(len(self.net.triangles), -1)], axis=1)


def make_routes(mesh: Mesh, per_side: int, chosen: np.ndarray | None = None) -> Routes:
    """Routes over a mesh, or over the triangles ``chosen`` (m,) bool, with ``per_side`` even points on every side."""
    if chosen is None:
        triangles, nodes, kept = mesh.triangles.copy(), np.arange(mesh.n_nodes), np.arange(mesh.n_triangles)
    else:
        kept = np.flatnonzero(chosen)
        nodes, inverse = np.unique(mesh.triangles[kept], return_inverse=True)
        triangles = np.ascontiguousarray(inverse.reshape(-1, 3).astype(np.int32))
    start, order = topology.grouped(triangles.ravel(), len(nodes))
    neighbours = mesh.neighbours if chosen is None else topology.triangle_neighbours(triangles, start, order)
    sides, side_nodes, side_triangles = _sides(triangles, neighbours)
    net = Net(triangles, sides, side_nodes, side_triangles, start, (order // 3).astype(np.int32), int(per_side))
    even = np.tile(np.arange(1, per_side + 1) / (per_side + 1), (len(side_nodes), 1))
    return Routes(mesh, net, nodes.astype(np.int32), kept.astype(np.int32), even)


def gathered(routes: Routes, route: np.ndarray, share: float) -> Routes:
    """The same routes with the points of every side drawn together round a route (k, 2), local m.

    On each side they spread over ``share`` of its length either way of its point nearest to the route.
    """
    a, b = (routes.mesh.node_xy[routes.nodes[routes.net.side_nodes[:, k]]] for k in (0, 1))
    step = float(np.median(np.hypot(*(b - a).T))) / 8
    dense = shapely.get_coordinates(shapely.segmentize(shapely.LineString(route), step))
    tries = np.linspace(0.0, 1.0, 9)
    places = a[:, None] + tries[None, :, None] * (b - a)[:, None]
    distance, nearest = KDTree(dense).query(places)
    closest = dense[nearest[np.arange(len(a)), distance.argmin(axis=1)]]
    near = np.einsum("ij,ij->i", closest - a, b - a) / np.einsum("ij,ij->i", b - a, b - a)
    half = min(share, 0.5)
    low = np.clip(near - half, 0.0, 1.0 - 2 * half)
    m = routes.net.per_side
    return replace(routes, shares=low[:, None] + 2 * half * np.arange(1, m + 1) / (m + 1))


def widened(mesh: Mesh, chosen: np.ndarray, rings: int) -> np.ndarray:
    """Triangles (m,) bool that are chosen or within ``rings`` rings of nodes of a chosen one."""
    for _ in range(rings):
        node = np.zeros(mesh.n_nodes, bool)
        node[mesh.triangles[chosen]] = True
        chosen = node[mesh.triangles].any(axis=1)
    return chosen


def _sides(triangles: np.ndarray, neighbours: np.ndarray):
    """Number the sides of triangles: (side of each triangle's side, its nodes, the triangles beside it)."""
    m = len(triangles)
    own = np.arange(m)[:, None]
    first = (neighbours < 0) | (neighbours > own)
    sides = np.full((m, 3), -1, np.int32)
    sides[first] = np.arange(np.count_nonzero(first), dtype=np.int32)
    t, k = np.nonzero(first)
    side_nodes = np.column_stack([triangles[t, k], triangles[t, (k + 1) % 3]]).astype(np.int32)
    side_triangles = np.column_stack([t, neighbours[t, k]]).astype(np.int32)
    t2, k2 = np.nonzero(~first)
    other = neighbours[t2, k2]
    back = np.argmax(neighbours[other] == t2[:, None], axis=1)
    sides[t2, k2] = sides[other, back]
    return sides, side_nodes, side_triangles


@dataclass(frozen=True, eq=False)
class Water:
    """Depth and velocity at the points of routes, for one frame.

    Attributes
    ----------
    routes : Routes
    frame : Frame
    flow : (n, 2) float64
        Unit discharge at the mesh's nodes, m2/s, as used here: see :func:`node_flow`.
    points : (p, 5) float64
        Local x, y (m), depth (m) and velocity (m/s) at each point.
    drops : (m,) int64
        One bit a heading sector and triangle of the routes: see :class:`Drops`.
    """

    routes: Routes
    frame: Frame
    flow: np.ndarray
    points: np.ndarray
    drops: np.ndarray = field(repr=False)


def make_water(routes: Routes, frame: Frame, drops: Drops, flow: np.ndarray | None = None) -> Water:
    """The water of a frame at the points of routes; ``flow`` from :func:`node_flow` where it is at hand.

    Raises ``ValueError`` for a frame of maxima, in which depth and speed belong to different moments.
    """
    if frame.kind == "maximum":
        raise ValueError(
            f"frame at {frame.seconds:g} s holds maxima of different moments; passage needs an instant or a mean."
        )
    flow = node_flow(frame) if flow is None else flow
    values = routes.at_points(np.column_stack([routes.mesh.node_xy, frame.depth, flow]))
    carries = values[:, 2] > _THIN_M
    values[:, 3:] = np.where(carries[:, None], values[:, 3:] / np.where(carries, values[:, 2], 1.0)[:, None], 0.0)
    return Water(routes, frame, flow, np.ascontiguousarray(values), drops.of(routes))


def node_flow(frame: Frame) -> np.ndarray:
    """(n, 2) unit discharge at nodes, m2/s, with no node faster than the fastest face round it.

    Values carried from faces to a node at the waterline may leave it next to no depth and so a speed that is nowhere
    in the file.
    """
    if frame.stored_on == "node":
        return frame.unit_discharge
    start, faces = frame.mesh.node_faces
    around = np.append(np.hypot(*frame.face_velocity.T)[faces], 0.0)
    most = np.where(np.diff(start) > 0, np.maximum.reduceat(around, start[:-1]), 0.0)
    speed = np.hypot(*frame.unit_discharge.T) / np.maximum(frame.depth, _THIN_M)
    return frame.unit_discharge * np.minimum(1.0, most / np.maximum(speed, 1e-300))[:, None]


@dataclass(frozen=True, eq=False)
class Drops:
    """Drops of the level that a fish cannot climb.

    ``barred`` (m,) int64: one bit a heading sector of each triangle of the mesh; ``rise_m`` (m,): the greatest rise of
    the level through a barred triangle, 0 elsewhere.
    """

    barred: np.ndarray
    rise_m: np.ndarray

    def of(self, routes: Routes) -> np.ndarray:
        """The bits for the triangles of routes."""
        return np.ascontiguousarray(self.barred[routes.triangles])


def find_drops(frame: Frame, greatest_drop_m: float, window_m: float, sills: tuple[np.ndarray, ...] = ()) -> Drops:
    """Headings barred by a drop that a fish cannot climb.

    Where the level rises in any heading by more than the greatest drop, every heading that does not lead down is
    barred: a drop is not climbed aslant.

    Parameters
    ----------
    frame : Frame
    greatest_drop_m : float
    window_m : float
        Length over which the drop counts: three body lengths, half ahead and half behind.
    sills : tuple of (k, 2) arrays
        Declared sill lines, local m; on the triangles under them the level is compared over a whole window ahead and
        behind, so a crest that the mesh smears still counts.

    Notes
    -----
    The level is read on a straight line through the triangle's centre; where that leaves the water the nearest
    tenth of the line still in it counts. Only triangles whose own slope could make the drop are looked at.
    """
    mesh = frame.mesh
    barred, most = np.zeros(mesh.n_triangles, np.int64), np.zeros(mesh.n_triangles)
    level = frame.level
    at_sill = _triangles_under(mesh, sills)
    steep = _slope(mesh, level) * window_m > greatest_drop_m
    for chosen, half in ((np.flatnonzero(steep & ~at_sill), window_m / 2), (np.flatnonzero(at_sill), window_m)):
        rise = _rises(mesh, level, chosen, half)
        high = rise.max(axis=1, initial=-np.inf)
        shut = high > greatest_drop_m
        barred[chosen] = (shut[:, None] & (rise > -0.01 * greatest_drop_m)) @ (1 << np.arange(SECTORS))
        most[chosen] = np.where(shut, high, 0.0)
    return Drops(barred, most)


def _slope(mesh: Mesh, level: np.ndarray) -> np.ndarray:
    """(m,) slope of the level in each triangle; infinite where a corner is dry, so that it is looked at, 0 if all are."""
    a, b, c = (mesh.triangles[:, k] for k in range(3))
    ab, ac = mesh.node_xy[b] - mesh.node_xy[a], mesh.node_xy[c] - mesh.node_xy[a]
    db, dc = level[b] - level[a], level[c] - level[a]
    twice = ab[:, 0] * ac[:, 1] - ab[:, 1] * ac[:, 0]
    gx = (db * ac[:, 1] - dc * ab[:, 1]) / twice
    gy = (dc * ab[:, 0] - db * ac[:, 0]) / twice
    slope = np.hypot(gx, gy)
    wet = np.isfinite(level[mesh.triangles])
    return np.where(wet.all(axis=1), slope, np.where(wet.any(axis=1), np.inf, 0.0))


def _rises(mesh: Mesh, level: np.ndarray, chosen: np.ndarray, half: float) -> np.ndarray:
    """(k, SECTORS) m: level ``half`` ahead less level ``half`` behind the centres of triangles, by heading; 0 if dry."""
    angle = 2 * np.pi * np.arange(SECTORS) / SECTORS
    ahead = np.column_stack([_level_along(mesh, level, chosen, half * np.array([np.cos(a), np.sin(a)])) for a in angle])
    behind = np.roll(ahead, SECTORS // 2, axis=1)
    return np.nan_to_num(ahead - behind)


def _level_along(mesh: Mesh, level: np.ndarray, chosen: np.ndarray, step: np.ndarray) -> np.ndarray:
    """Level at the far end of ``step`` from the centres of triangles, or as far along as there is water."""
    start = mesh.triangle_centroid[chosen]
    found = level_at(mesh, level, start)
    going = np.isfinite(found)
    for part in np.arange(1, 11) / 10:
        here = np.full(len(chosen), np.nan)
        here[going] = level_at(mesh, level, start[going] + part * step)
        going &= np.isfinite(here)
        found[going] = here[going]
    return found


def level_at(mesh: Mesh, level: np.ndarray, xy: np.ndarray) -> np.ndarray:
    """Level (k,) at local points, m; NaN outside the water. A dry corner is passed over, its weight shared out."""
    triangle = mesh.find(xy)
    weight = barycentric(mesh, triangle, xy)
    corners = level[mesh.triangles[np.maximum(triangle, 0)]]
    wet = np.isfinite(corners)
    share = np.where(wet, weight, 0.0).sum(axis=1)
    sum_ = np.where(wet, weight * np.where(wet, corners, 0.0), 0.0).sum(axis=1)
    return np.where((triangle >= 0) & (share > 0), sum_ / np.where(share > 0, share, 1.0), np.nan)


def barycentric(mesh: Mesh, triangle: np.ndarray, xy: np.ndarray) -> np.ndarray:
    """Weights (k, 3) of the corners of each point's triangle; 0 where there is none."""
    corner = mesh.node_xy[mesh.triangles[np.maximum(triangle, 0)]]
    a, b, c = corner[:, 0], corner[:, 1], corner[:, 2]

    def area(p, q, r):
        return (q[:, 0] - p[:, 0]) * (r[:, 1] - p[:, 1]) - (q[:, 1] - p[:, 1]) * (r[:, 0] - p[:, 0])

    whole = area(a, b, c)
    weight = np.column_stack([area(xy, b, c), area(a, xy, c), area(a, b, xy)]) / whole[:, None]
    return np.where((triangle >= 0)[:, None], np.clip(weight, 0.0, 1.0), 0.0)


def _triangles_under(mesh: Mesh, lines: tuple[np.ndarray, ...]) -> np.ndarray:
    """(m,) bool: triangles that a line crosses."""
    out = np.zeros(mesh.n_triangles, bool)
    for line in lines:
        out[triangles_of(mesh, shapely.LineString(line))] = True
    return out


def triangles_of(mesh: Mesh, geometry) -> np.ndarray:
    """Triangles (k,) that a point or line (local m) touches, or that a polygon shares ground with."""
    west, south, east, north = geometry.bounds
    corner = mesh.node_xy[mesh.triangles]
    low, high = corner.min(axis=1), corner.max(axis=1)
    near = (high[:, 0] >= west) & (low[:, 0] <= east) & (high[:, 1] >= south) & (low[:, 1] <= north)
    candidates = np.flatnonzero(near)
    if not candidates.size:
        return candidates
    polygons = shapely.polygons(corner[candidates])
    shapely.prepare(geometry)
    hit = shapely.intersects(geometry, polygons)
    if geometry.area > 0:
        hit &= ~shapely.touches(geometry, polygons)
    return candidates[hit]
