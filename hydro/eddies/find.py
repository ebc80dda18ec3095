"""Recirculation zones of a stream function."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely

from .._kernels import contour, labels
from ..cautions import OWED
from ..reach import Reach, Structure
from ..settings import Settings
from ..streamfunction import StreamFunction
from .contact import Contact, contact_of
from .naming import named, setting_of
from .outer import Extent, extent_of, narrow_of
from .regions import Region, closed_regions, open_regions
from .sensitivity import from_outline
from .shape import Shape, peak_of, saddle_of, shape_of
from .wake import wake_of
from .zone import SmallRegion, Zone, ZoneSet

_STREAMLINES = 4  # drawn inside each zone
_TURNS_BACK = 0.5  # least share of psi's return flow that the field itself must have in a zone
_FINE_ACROSS = 8  # fewer triangles across than this: flagged


@dataclass(frozen=True, eq=False)
class _Candidate:
    """A region that passed the floors, with its shape."""

    region: Region
    shape: Shape
    centre: np.ndarray
    psi_centre: float
    noise: float
    across: float
    cores: int
    size: float


def find_zones(
    sf: StreamFunction, *, reach: Reach | None = None, settings: Settings | None = None,
    roughness: np.ndarray | None = None,
) -> ZoneSet:
    """Every recirculation zone of a frame.

    A zone is a maximal connected region round an extremum of psi, bounded by a psi contour that is
    closed or closed by a wall, that reaches no open boundary. It is kept when its recirculating
    discharge exceeds the noise of psi there and ``zone_share`` of the through-discharge, and it is
    at least ``zone_triangles_across`` wide.

    Parameters
    ----------
    sf : StreamFunction
    reach : Reach, optional
        Gives chainage, sides and the names of structures.
    settings : Settings
    roughness : (f,) array, optional
        Manning's n of faces, s/m^(1/3), for shallow-wake numbers.

    Returns
    -------
    ZoneSet
        Empty, with a note, where storage explains more than half of the flow.
    """
    settings = settings or Settings()
    reach = reach or Reach(sf.frame.mesh.origin)
    if not sf.drawn:
        return ZoneSet((), notes=("storage explains more than half of the flow; psi is not drawn and holds no zones",))
    kept: list = []
    small: list = []
    for region in closed_regions(sf):
        found = _candidate(sf, region, settings)
        (kept if isinstance(found, _Candidate) else small).append(found)
    in_zones = np.zeros(sf.frame.mesh.n_triangles, bool)
    for c in kept:
        in_zones[c.shape.triangles] = True
    zones = []
    for c in kept:
        zone = _zone(sf, reach, c, in_zones, settings, roughness)
        if _turned_back(sf, c.shape.triangles, zone.along) < _TURNS_BACK:
            small.append(_small(sf, c.region, zone.recirculating_discharge_m3_s, zone.area_m2, "the field itself does not turn back there"))
        else:
            zones.append(zone)
    return ZoneSet(named(sf, reach, zones), tuple(small), tuple(_cut_by_edge(sf, settings)))


def noise_of(sf: StreamFunction, triangles: np.ndarray) -> tuple[float, float]:
    """Noise of psi over triangles, m3/s (unexplained unit discharge times triangle size), and that size, m."""
    area = sf.frame.mesh.triangle_area[triangles]
    rms = float(np.sqrt(np.sum(area * sf.triangle_misfit[triangles] ** 2) / area.sum()))
    size = edge_size(float(area.mean()))
    return rms * size, size


def edge_size(area: float) -> float:
    """Side of an equilateral triangle of this area, m."""
    return float(np.sqrt(area * 4 / np.sqrt(3)))


def _candidate(sf: StreamFunction, region: Region, settings: Settings) -> _Candidate | SmallRegion:
    flow = abs(float(sf.psi[region.peak]) - region.level)
    if flow <= settings["zone_share"] * sf.through_discharge_m3_s:
        return _small(sf, region, flow, 0.0, "under the least share")
    shape = shape_of(sf, region)
    noise, size = noise_of(sf, shape.triangles)
    if flow <= noise:
        return _small(sf, region, flow, shape.area_m2, "weaker than the noise of psi")
    if np.isin(shape.triangles, sf.seam[0]).any():
        return _small(sf, region, flow, shape.area_m2, "cut by a link's path")
    across = narrow_of(shape.polygon)[0] / size
    if across < settings["zone_triangles_across"]:
        return _small(sf, region, flow, shape.area_m2, "too few triangles across")
    centre, psi_centre = peak_of(sf, region)
    cores = _cores_above(sf, region, shape, noise)
    return _Candidate(region, shape, centre, psi_centre, noise, across, cores, size)


def _turned_back(sf: StreamFunction, triangles: np.ndarray, along: np.ndarray) -> float:
    """Flow against the outer flow that the field itself has in a zone, over that of psi.

    Where a reach fills or empties, psi closes on itself along banks whose water all goes one way: what goes into
    storage is taken for flow along the bank. There the field has none of the return flow that psi draws.
    """
    mesh = sf.frame.mesh
    a, b, c = (mesh.node_xy[mesh.triangles[triangles, k]] for k in range(3))
    own = sf.corners(triangles)
    twice = mesh.triangle_area[triangles] * 2
    psi_x = (own[:, 0] * (b - c)[:, 1] + own[:, 1] * (c - a)[:, 1] + own[:, 2] * (a - b)[:, 1]) / twice
    psi_y = (own[:, 0] * (c - b)[:, 0] + own[:, 1] * (a - c)[:, 0] + own[:, 2] * (b - a)[:, 0]) / twice
    drawn = np.maximum(-(psi_y * along[0] - psi_x * along[1]), 0.0)
    field = np.maximum(-(sf.frame.triangle_unit_discharge[triangles] @ along), 0.0)
    whole = float(drawn @ twice)
    return float(field @ twice) / whole if whole > 0 else 1.0


def _small(sf: StreamFunction, region: Region, flow: float, area: float, why: str) -> SmallRegion:
    return SmallRegion(sf.frame.mesh.node_xy[region.peak], _rotation(region), flow, area, why)


def _rotation(region: Region) -> str:
    # psi rises to the left, so the flow round a maximum keeps it on its left: anticlockwise.
    return "anticlockwise" if region.sign > 0 else "clockwise"


def _cut_by_edge(sf: StreamFunction, settings: Settings) -> list[SmallRegion]:
    found = []
    for region in open_regions(sf):
        flow = abs(float(sf.psi[region.peak]) - region.level)
        if flow <= settings["zone_share"] * sf.through_discharge_m3_s:
            continue
        shape = shape_of(sf, region)
        if shape.triangles.size and flow > noise_of(sf, shape.triangles)[0]:
            found.append(_small(sf, region, flow, shape.area_m2, "open to the boundary"))
    return found


def _zone(
    sf: StreamFunction, reach: Reach, c: _Candidate, in_zones: np.ndarray, settings: Settings,
    roughness: np.ndarray | None,
) -> Zone:
    region, shape = c.region, c.shape
    contact = contact_of(sf, region, shape, c.noise)
    extent = extent_of(sf, shape, in_zones)
    along = np.array(extent.along)
    kind, wall, structure = setting_of(sf, reach, shape, contact, along)
    flow = abs(c.psi_centre - region.level)
    separation, reattachment = _ends(sf, region, shape, contact, kind, along)
    solid = structure is None or wall is not None
    inner = shape_of(sf, region, region.level + region.sign * min(c.noise, 0.5 * flow))
    wake = None
    if kind == "behind structure":
        wake = wake_of(sf, _outline(sf, wall, structure), along, reattachment, in_zones, settings, roughness)
    chainage = offset = None
    if reach.centre_line is not None:
        s, n = reach.centre_line.locate(c.centre)
        chainage, offset = float(s[0]), float(n[0])
    through = sf.through_discharge_m3_s
    depth = shape.volume_m3 / shape.area_m2
    free = shape.polygon.length - (contact.length_m if contact else 0.0)
    return Zone(
        id="", name="", kind=kind, wall=sf.walls[wall].id if wall is not None else structure.name if structure is not None else None,
        rotation=_rotation(region), centre=c.centre, chainage_m=chainage, offset_m=offset,
        area_m2=shape.area_m2, volume_m3=shape.volume_m3, length_m=extent.length_m, width_m=extent.width_m,
        mean_depth_m=depth, max_depth_m=shape.max_depth_m,
        psi_centre_m3_s=c.psi_centre, psi_edge_m3_s=region.level,
        psi_wall_m3_s=None if wall is None else sf.walls[wall].psi_m3_s,
        recirculating_discharge_m3_s=flow, share_of_through_discharge=flow / through if through > 0 else None,
        rotation_time_s=shape.volume_m3 / flow,
        separation=separation if solid else None, reattachment=reattachment if solid else None,
        triangles_across=c.across, max_reverse_speed_m_s=_reverse(sf, region, along),
        flags=_flags(sf, c, contact, extent, solid, settings), cautions=OWED["eddies"], wake=wake, contour=shape.polygon,
        inner=inner.polygon, streamlines=_streamlines(sf, c), along=along, noise_m3_s=c.noise, region=region,
        core=_core(sf, region, settings["core_share"]),
        sensitivity=from_outline(
            shape.area_m2, shape.volume_m3, extent.length_m, extent.width_m, depth, flow, free_outline=free,
            size=c.size, noise=c.noise, inner_area=inner.area_m2, inner_volume=inner.volume_m3,
        ),
    )


def _outline(sf: StreamFunction, wall: int | None, structure: Structure | None) -> np.ndarray:
    if wall is not None or structure is None:
        return sf.frame.mesh.node_xy[sf.walls[wall or 0].nodes]
    return shapely.get_coordinates(structure.geometry)


def _flags(
    sf: StreamFunction, c: _Candidate, contact: Contact | None, extent: Extent, solid: bool, settings: Settings
) -> tuple[str, ...]:
    flags = []
    floor = max(c.noise, settings["zone_share"] * sf.through_discharge_m3_s)
    if abs(c.psi_centre - c.region.level) < 2 * floor:
        flags.append("near the floor")
    if c.across < _FINE_ACROSS:
        flags.append("under-resolved")
    if not solid:
        flags.append("structure not solid")
    if contact is not None and contact.waterline:
        flags.append("at the waterline")
    if not extent.aligned:
        flags.append("no outer flow")
    if c.cores > 1:
        flags.append(f"{c.cores} cores")
    return tuple(flags)


def _ends(sf, region: Region, shape: Shape, contact: Contact | None, kind: str, along: np.ndarray):
    """Separation and reattachment, local m; None where there is none."""
    if contact is None:
        separation = other = None
    elif region.sign > 0:
        separation, other = contact.end, contact.start
    else:
        separation, other = contact.start, contact.end
    if kind != "behind structure":
        return separation, other
    return separation, _closing(sf, region, shape, contact, along)


def _closing(sf, region: Region, shape: Shape, contact: Contact | None, along: np.ndarray) -> np.ndarray:
    """Where a wake closes.

    For an eddy bounded by a saddle in its rear half, that saddle; else where, on the line through its rear
    end along the outer flow, the speed turns from backward to forward.
    """
    points = shapely.get_coordinates(shape.polygon)
    distance = points @ along
    if contact is None and sf.shape.wall_of_node[region.meets] < 0:
        saddle = saddle_of(sf, region.meets)
        if saddle @ along > (distance.min() + distance.max()) / 2:
            return saddle
    tip = points[int(distance.argmax())]
    size = edge_size(float(sf.frame.mesh.triangle_area[shape.triangles].mean()))
    t = np.linspace(-3 * size, 3 * size, 121)
    speed = _speed_along(sf, tip + t[:, None] * along, along)
    turns = np.flatnonzero((speed[:-1] < 0) & (speed[1:] >= 0))
    if not turns.size:
        return tip
    k = turns[np.abs(t[turns]).argmin()]
    return tip + (t[k] - speed[k] * (t[k + 1] - t[k]) / (speed[k + 1] - speed[k])) * along


def _speed_along(sf: StreamFunction, points: np.ndarray, along: np.ndarray) -> np.ndarray:
    """Component of the velocity along a unit vector at points, m/s; NaN outside the mesh."""
    mesh = sf.frame.mesh
    at = mesh.find(points)
    corner = mesh.node_xy[mesh.triangles[at]]
    one, two, rel = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0], points - corner[:, 0]
    twice = one[:, 0] * two[:, 1] - one[:, 1] * two[:, 0]
    b = (rel[:, 0] * two[:, 1] - rel[:, 1] * two[:, 0]) / twice
    c = (one[:, 0] * rel[:, 1] - one[:, 1] * rel[:, 0]) / twice
    u = sf.frame.velocity[mesh.triangles[at]] @ along
    return np.where(at >= 0, (1 - b - c) * u[:, 0] + b * u[:, 1] + c * u[:, 2], np.nan)


def _cores_above(sf: StreamFunction, region: Region, shape: Shape, noise: float) -> int:
    """Extrema that stand out from their neighbours by more than the noise of psi."""
    mesh, psi = sf.frame.mesh, region.sign * sf.psi
    triangles = mesh.triangles[shape.triangles]
    count, kept = 1, [region.cores[0]]
    for core in region.cores[1:]:
        above = np.zeros(mesh.n_nodes, bool)
        above[region.nodes] = psi[region.nodes] > psi[core] - noise
        sides = np.concatenate([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [2, 0]]])
        sides = sides[above[sides].all(axis=1)]
        part, _ = labels.of_pairs(sides[:, 0], sides[:, 1], above)
        if part[core] not in part[kept]:
            kept.append(core)
            count += 1
    return count


def _reverse(sf: StreamFunction, region: Region, along: np.ndarray) -> float:
    """Greatest speed against the outer flow at the zone's nodes, m/s."""
    return float(np.max(-(sf.frame.velocity[region.nodes] @ along), initial=0.0))


def _core(sf: StreamFunction, region: Region, share: float) -> np.ndarray:
    depth = region.sign * (sf.psi[region.nodes] - region.level)
    return region.nodes[depth >= share * depth.max()]


def _streamlines(sf: StreamFunction, c: _Candidate) -> list[np.ndarray]:
    mesh = sf.frame.mesh
    inside = np.zeros(mesh.n_triangles, bool)
    inside[c.shape.triangles] = True
    step = (float(sf.psi[c.region.peak]) - c.region.level) / (_STREAMLINES + 1)
    lines = []
    for k in range(1, _STREAMLINES + 1):
        points, first = contour.lines(
            mesh.node_xy, mesh.triangles, mesh.neighbours, inside, np.nan_to_num(sf.psi), c.region.level + k * step
        )
        lines += [points[first[i] : first[i + 1]] for i in range(len(first) - 1)]
    return lines


