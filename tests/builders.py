"""Small meshes, frames and runs for tests; every builder takes world coordinates and SI units."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import shapely
from scipy.spatial import Delaunay

from hydro.frame import Frame, RawFrame, face_bed_and_node_bed, make_frame
from hydro.mesh import Mesh, build_mesh
from hydro.run import Run, TimeAxis
from hydro.settings import Settings

Field = float | np.ndarray | Callable[[np.ndarray, np.ndarray], np.ndarray]


def channel(
    nx: int = 20, ny: int = 8, length: float = 100.0, width: float = 20.0,
    *, quads: bool = False, origin: tuple[float, float] = (0.0, 0.0), corner: tuple[float, float] = (0.0, 0.0),
) -> Mesh:
    """A rectangle of ``nx`` by ``ny`` cells, x from ``corner``; triangles with alternating diagonals, or quads."""
    x, y = np.linspace(0, length, nx + 1) + corner[0], np.linspace(0, width, ny + 1) + corner[1]
    xy = np.stack(np.meshgrid(x, y), axis=-1).reshape(-1, 2)
    i, j = (a.ravel() for a in np.meshgrid(np.arange(nx), np.arange(ny)))
    a = j * (nx + 1) + i
    b, c, d = a + 1, a + nx + 2, a + nx + 1
    if quads:
        return build_mesh(xy, np.column_stack([a, b, c, d]), origin=origin)
    rising = ((i + j) % 2 == 0)[:, None]
    first = np.where(rising, np.column_stack([a, b, c]), np.column_stack([a, b, d]))
    second = np.where(rising, np.column_stack([a, c, d]), np.column_stack([b, c, d]))
    return build_mesh(xy, np.stack([first, second], axis=1).reshape(-1, 3), origin=origin)


def free_mesh(
    outline: shapely.Polygon, size: float, *, finer: Sequence[tuple[shapely.Polygon, float]] = (),
    origin: tuple[float, float] = (0.0, 0.0),
) -> Mesh:
    """Triangles of about ``size`` (edge, m) inside a polygon with holes; ``finer`` areas get their own size."""
    areas = [(outline, size), *finer]

    def size_at(points: np.ndarray) -> np.ndarray:
        found = np.full(len(points), size)
        for area, fine in areas[1:]:
            found[shapely.contains_xy(area, points)] = fine
        return found

    rings = [_resampled(np.asarray(r.coords), size_at) for r in (outline.exterior, *outline.interiors)]
    domain = shapely.Polygon(rings[0], rings[1:])
    kept = np.vstack(rings)
    for k, (area, edge) in reversed(list(enumerate(areas))):
        seeds = _lattice(area.intersection(domain), edge)
        for other, _ in areas[k + 1 :]:
            seeds = seeds[~shapely.contains_xy(other, seeds)]
        far = shapely.distance(domain.boundary, shapely.points(seeds)) > 0.6 * edge
        seeds = seeds[far]
        for other, fine in areas[k + 1 :]:
            seeds = seeds[shapely.distance(other, shapely.points(seeds)) > 0.4 * (edge + fine)]
        kept = np.vstack([kept, seeds])
    triangles = Delaunay(kept).simplices
    inside = shapely.contains_xy(domain, kept[triangles].mean(axis=1))
    triangles = triangles[inside]
    p, q, r = (kept[triangles[:, k]] for k in range(3))
    area = np.abs((q - p)[:, 0] * (r - p)[:, 1] - (q - p)[:, 1] * (r - p)[:, 0])
    return build_mesh(kept, triangles[area > 1e-9 * size * size], origin=origin)


def disc(radius: float = 10.0, size: float = 1.0, **options) -> Mesh:
    """A disc about (0, 0)."""
    return free_mesh(shapely.Point(0, 0).buffer(radius, quad_segs=max(8, int(radius / size * 1.6))), size, **options)


def with_hole(
    length: float = 60.0, width: float = 24.0, size: float = 1.0, *, hole: shapely.Polygon | None = None, **options
) -> Mesh:
    """A channel from (0, 0) to (length, width) with a hole (default: a disc of radius 2 at a third of its length)."""
    if hole is None:
        hole = shapely.Point(length / 3, width / 2).buffer(2.0, quad_segs=16)
    return free_mesh(shapely.box(0, 0, length, width).difference(hole), size, **options)


def frame_of(
    mesh: Mesh, depth: Field, velocity: tuple[Field, Field] | Callable, *, bed: Field = 0.0, stored_on: str = "face",
    kind: str = "instant", seconds: float = 0.0, index: int = 0, wet_depth_m: float = 0.05,
    edge_discharge: np.ndarray | None = None,
) -> Frame:
    """A frame from depth (m) and velocity (m/s), each a number, an array or a function of world x, y."""
    raw = raw_of(mesh, depth, velocity, stored_on=stored_on, edge_discharge=edge_discharge)
    node_bed, face_bed = face_bed_and_node_bed(mesh, on_points(bed, mesh.to_world(mesh.node_xy)), None)
    return make_frame(
        mesh, raw, node_bed, face_bed, index=index, seconds=seconds, time=None, kind=kind, wet_depth_m=wet_depth_m
    )


def raw_of(mesh: Mesh, depth: Field, velocity, *, stored_on: str = "face", edge_discharge=None) -> RawFrame:
    """What a reader would hand over, in the mesh's numbering."""
    places = mesh.to_world(mesh.face_centroid if stored_on == "face" else mesh.node_xy)
    h = on_points(depth, places)
    if callable(velocity):
        u, v = velocity(places[:, 0], places[:, 1])
    else:
        u, v = (on_points(part, places) for part in velocity)
    q = h[:, None] * np.column_stack([on_points(u, places), on_points(v, places)])
    return RawFrame(stored_on, h, q, edge_discharge)


def run_of(
    mesh: Mesh, times: Sequence[float], raws: Sequence[RawFrame] | Callable[[int], RawFrame], *, bed: Field = 0.0,
    name: str = "made for a test", settings: Settings | None = None, kinds: Sequence[str] | None = None,
    boundary_sets: dict[str, np.ndarray] | None = None, crs: str | None = None, instants: np.ndarray | None = None,
) -> Run:
    """A run without files; ``raws`` are its frames or a function of the frame's index."""
    node_bed, face_bed = face_bed_and_node_bed(mesh, on_points(bed, mesh.to_world(mesh.node_xy)), None)
    seconds = np.asarray(times, float)
    axis = TimeAxis(seconds, instants, tuple(kinds or ["instant"] * len(seconds)), np.full(len(seconds), np.nan))
    read = raws if callable(raws) else raws.__getitem__
    return Run(
        name, (), mesh, axis, node_bed, face_bed, crs, "", read, settings or Settings(),
        boundary_sets=boundary_sets or {},
    )


def sides(mesh: Mesh) -> dict[str, np.ndarray]:
    """Boundary edges on the west, east, south and north sides of a rectangle, by name."""
    middle = mesh.node_xy[mesh.edge_nodes[mesh.boundary_edges]].mean(axis=1)
    west, south, east, north = mesh.bounds
    near = 1e-6 * max(east - west, north - south)
    found = {
        "west": middle[:, 0] < west + near, "east": middle[:, 0] > east - near,
        "south": middle[:, 1] < south + near, "north": middle[:, 1] > north - near,
    }
    return {name: mesh.boundary_edges[chosen] for name, chosen in found.items()}


def on_points(value: Field, xy: np.ndarray) -> np.ndarray:
    """A number, array or function of (x, y) as an array over points (k, 2)."""
    if callable(value):
        value = value(xy[:, 0], xy[:, 1])
    return np.array(np.broadcast_to(value, len(xy)), dtype=float)


def flow_of_psi(psi: Callable[[np.ndarray, np.ndarray], np.ndarray], step: float = 1e-5) -> Callable:
    """Velocity function (depth 1 m) of a stream function by central differences: u = d psi/dy, v = -d psi/dx."""

    def velocity(x, y):
        u = (psi(x, y + step) - psi(x, y - step)) / (2 * step)
        v = -(psi(x + step, y) - psi(x - step, y)) / (2 * step)
        return u, v

    return velocity


def _resampled(ring: np.ndarray, size_at: Callable) -> np.ndarray:
    """A ring cut into pieces no longer than the size wanted there; its corners stay."""
    points = []
    for a, b in zip(ring[:-1], ring[1:], strict=True):
        n = max(1, int(np.ceil(np.hypot(*(b - a)) / size_at(((a + b) / 2)[None])[0] - 1e-6)))
        points.append(a + (b - a) * np.arange(n)[:, None] / n)
    return np.vstack(points)


def _lattice(area, edge: float) -> np.ndarray:
    west, south, east, north = area.bounds
    x = np.arange(west + edge / 4, east, edge)
    y = np.arange(south + edge / 4, north, edge * np.sqrt(3) / 2)
    grid = np.stack(np.meshgrid(x, y), axis=-1)
    grid[1::2, :, 0] += edge / 2
    points = grid.reshape(-1, 2)
    return points[shapely.contains_xy(area, points)]
