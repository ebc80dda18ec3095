"""Where a fish may start, rest and arrive: areas of triangles, labelled at the points of routes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from .._kernels.route import FREE
from ..frame import Frame
from ..mesh import Mesh
from ..reach import NamedLine, Reach
from .fish import Fish
from .water import Drops, Routes, triangles_of, widened

LAYER = "fish"
ROLES = ("start", "rest", "goal", "entrance")


@dataclass(frozen=True, eq=False)
class Area:
    """A place without fatigue: where the fish starts, rests or arrives.

    ``kind`` is "start", "goal", "resting water" (found by speed and depth) or "declared" (drawn by the user).
    """

    name: str
    kind: str
    triangles: np.ndarray  # the mesh's numbers
    area_m2: float
    centre: tuple[float, float]  # local m


@dataclass(frozen=True, eq=False)
class Areas:
    """All areas of one frame for one fish; the first is the start, the second the goal.

    ``of_triangle`` (m,) int32 holds the area of each triangle of the mesh, -1 for none.
    """

    items: tuple[Area, ...]
    of_triangle: np.ndarray

    START, GOAL = 0, 1

    def ends(self) -> Areas:
        """Start and goal alone, as for a fish that does not recover."""
        return Areas(self.items[:2], np.where(self.of_triangle < 2, self.of_triangle, FREE).astype(np.int32))

    def labels(self, routes: Routes) -> np.ndarray:
        """(p,) int32 area of each point of routes, -1 for none; where areas touch the first in the list has it."""
        own = self.of_triangle[routes.triangles]
        label = np.full(routes.n_points, FREE, np.int32)
        points = routes.triangle_points()
        order = np.argsort(-own[own >= 0], kind="stable")  # written last is the first in the list
        chosen = np.flatnonzero(own >= 0)[order]
        label[points[chosen].ravel()] = np.repeat(own[chosen], points.shape[1])
        return label

    def rims(self, routes: Routes, label: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Points of each area from which a link leaves it, as compressed lists (start, points)."""
        points = routes.triangle_points()
        around = label[points]
        mixed = around.min(axis=1) != around.max(axis=1)
        rim = np.unique(points[mixed])
        rim = rim[label[rim] >= 0]
        order = np.argsort(label[rim], kind="stable")
        start = np.zeros(len(self.items) + 1, np.int64)
        np.cumsum(np.bincount(label[rim], minlength=len(self.items)), out=start[1:])
        return start, rim[order].astype(np.int32)


@dataclass(frozen=True, slots=True)
class Places:
    """Start, goal and declared resting places of a review, local metres."""

    start: NamedLine
    goal: NamedLine
    rests: tuple[NamedLine, ...] = ()


def places_of(reach: Reach) -> Places:
    """The start, goal and resting places of the reach's layer ``fish``, by their attribute ``role``.

    Raises ``ValueError`` when there is not exactly one start and one goal, or a role is unknown.
    """
    by_role: dict[str, list[NamedLine]] = {role: [] for role in ROLES}
    for item in reach.layer(LAYER):
        role = str(item.attributes.get("role", ""))
        if role not in by_role:
            raise ValueError(f"fish feature {item.name!r} has role {role!r}; give it one of {', '.join(ROLES)}.")
        by_role[role].append(item)
    for role in ("start", "goal"):
        if len(by_role[role]) != 1:
            raise ValueError(
                f"layer {LAYER} has {len(by_role[role])} features with role {role!r}; passage needs exactly one: draw it "
                "in lines.gpkg."
            )
    return Places(by_role["start"][0], by_role["goal"][0], tuple(by_role["rest"]))


def find_areas(frame: Frame, flow: np.ndarray, fish: Fish, places: Places, drops: Drops) -> Areas:
    """Start, goal and every resting area for a fish in one frame.

    A triangle is resting water where all its nodes are slow and deep enough and no heading through it is barred by a
    drop (``flow`` is that of the water); triangles that share a node are one area. Only water deep enough counts as start or goal.

    Raises
    ------
    ValueError
        The start or goal lies outside the mesh. One that is dry or too shallow is left without triangles: it is the
        answer's business to say so.
    """
    mesh = frame.mesh
    deep = (frame.depth >= fish.least_depth_m)[mesh.triangles].any(axis=1)
    speed = fish.position_factor * np.hypot(*flow.T) / np.maximum(frame.depth, 1e-6)
    slow = (speed <= fish.rest_speed_m_s) & (frame.depth >= fish.rest_depth_m)
    resting = slow[mesh.triangles].all(axis=1) & (drops.barred == 0)
    of_triangle = np.full(mesh.n_triangles, FREE, np.int32)
    items: list[Area] = []
    for kind, place in (("start", places.start), ("goal", places.goal)):
        hit = triangles_of(mesh, place.geometry)
        if not hit.size:
            x, y = mesh.to_world(np.array(place.geometry.centroid.coords[0]))
            raise ValueError(f"{kind} {place.name!r} at {x:.1f} E, {y:.1f} N lies outside the mesh; move it in lines.gpkg.")
        items.append(_area(mesh, place.name, kind, hit[deep[hit]]))
    names = [(f"Rest {i + 1}", "resting water", group) for i, group in enumerate(_groups(mesh, resting))]
    for place in places.rests:
        hit = triangles_of(mesh, place.geometry)
        names.append((place.name, "declared", hit[deep[hit]]))
    items += [_area(mesh, *row) for row in names]
    for number in reversed(range(len(items))):  # start and goal last, so that they keep their triangles
        of_triangle[items[number].triangles] = number
    return Areas(tuple(items), of_triangle)


def _area(mesh: Mesh, name: str, kind: str, triangles: np.ndarray) -> Area:
    weight = mesh.triangle_area[triangles]
    total = float(weight.sum())
    centre = (mesh.triangle_centroid[triangles] * weight[:, None]).sum(axis=0) / total if total else np.full(2, np.nan)
    return Area(name, kind, triangles, total, (float(centre[0]), float(centre[1])))


def _groups(mesh: Mesh, chosen: np.ndarray) -> list[np.ndarray]:
    """Triangles in groups joined by shared nodes, in the order of the file's lowest face number, so that renumbering
    in memory does not rename an area."""
    kept = np.flatnonzero(chosen)
    if not kept.size:
        return []
    node = mesh.triangles[kept]
    row = np.repeat(np.arange(len(kept)), 3)
    graph = coo_matrix((np.ones(row.size, np.int8), (row, len(kept) + node.ravel())), shape=(len(kept) + mesh.n_nodes,) * 2)
    _, of = connected_components(graph, directed=False)
    of = np.unique(of[: len(kept)], return_inverse=True)[1]
    order = np.argsort(of, kind="stable")
    groups = np.split(kept[order], np.flatnonzero(np.diff(of[order])) + 1)
    return sorted(groups, key=lambda g: int(mesh.file_face[mesh.triangle_face[g]].min()))


def outline(mesh: Mesh, area: Area) -> shapely.Geometry:
    """The area as a polygon, local m; empty where it has no triangles."""
    return shapely.union_all(shapely.polygons(mesh.node_xy[mesh.triangles[area.triangles]]))


def around(mesh: Mesh, triangles: np.ndarray, rings: int) -> np.ndarray:
    """(m,) bool: these triangles and ``rings`` rings of triangles about them."""
    chosen = np.zeros(mesh.n_triangles, bool)
    chosen[triangles] = True
    return widened(mesh, chosen, rings)
