"""What a zone is called: its kind, the wall or structure it belongs to, and its name."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import shapely

from ..reach import Reach, Structure
from ..streamfunction import StreamFunction
from .contact import Contact
from .outer import narrow_of
from .shape import Shape
from .zone import Zone

_BAY = 0.6  # share of the outline on the wall from which an eddy at a bank lies in a bay


def setting_of(
    sf: StreamFunction, reach: Reach, shape: Shape, contact: Contact | None, along: np.ndarray
) -> tuple[str, int | None, Structure | None]:
    """Kind of a zone, its wall (a place in ``sf.walls``) and its structure.

    A zone that touches a wall belongs to it. One that does not may still lie by a bank, within half its own
    width, or behind a structure: in its lee and no farther off than the structure is wide.
    """
    by_id = {s.id: s for s in reach.structures}
    if contact is not None:
        wall = sf.walls[contact.wall]
        if not wall.reaches_open:
            return "behind structure", contact.wall, by_id.get(wall.structure_id or "")
        closed = not sf.open_boundaries or sf.through_discharge_m3_s == 0
        bay = contact.length_m > _BAY * shape.polygon.length and not closed
        return ("side bay" if bay else "at bank"), contact.wall, None
    for distance, w in sorted((d, w) for w, d in _wall_distances(sf, shape)):
        wall = sf.walls[w]
        if wall.reaches_open:
            if distance <= narrow_of(shape.polygon)[0] / 2:
                return "at bank", w, None
        elif _in_lee(sf.frame.mesh.node_xy[wall.nodes], distance, shape, along):
            return "behind structure", w, by_id.get(wall.structure_id or "")
    structure = _outline_before(sf, reach, shape, along)
    return ("behind structure", None, structure) if structure is not None else ("free", None, None)


def _wall_distances(sf: StreamFunction, shape: Shape) -> list[tuple[int, float]]:
    xy = sf.frame.mesh.node_xy
    west, south, east, north = shape.polygon.bounds
    reach = max(east - west, north - south)
    found = []
    for w, wall in enumerate(sf.walls):
        p = xy[wall.nodes]
        near = (p[:, 0] > west - reach) & (p[:, 0] < east + reach) & (p[:, 1] > south - reach) & (p[:, 1] < north + reach)
        if near.any():
            found.append((w, float(shapely.distance(shape.polygon, shapely.points(p[near])).min())))
    return found


def _in_lee(outline: np.ndarray, distance: float, shape: Shape, along: np.ndarray) -> bool:
    """Whether a zone lies downstream of the middle of an outline, and no farther off than the outline is wide."""
    hull = shapely.convex_hull(shapely.multipoints(outline))
    centre = np.asarray(shape.polygon.centroid.coords)[0]
    middle = np.asarray(hull.centroid.coords)[0]
    return bool((centre - middle) @ along > 0) and distance <= narrow_of(hull)[0]


def _outline_before(sf: StreamFunction, reach: Reach, shape: Shape, along: np.ndarray) -> Structure | None:
    """A structure without a wall (resistance, raised bed) within its own width, upstream of the zone."""
    walled = {w.structure_id for w in sf.walls}
    best, nearest = None, np.inf
    for s in reach.structures:
        if s.id in walled or s.geometry.geom_type not in ("Polygon", "MultiPolygon") or s.kind in ("opening", "deck"):
            continue
        distance = float(shape.polygon.distance(s.geometry))
        if distance < nearest and _in_lee(shapely.get_coordinates(s.geometry), distance, shape, along):
            best, nearest = s, distance
    return best


def named(sf: StreamFunction, reach: Reach, zones: list[Zone]) -> tuple[Zone, ...]:
    """The zones in order along the reach, with ids and names that are not used twice."""
    def place(zone: Zone) -> tuple[float, float]:
        # To the millimetre, left first, so that round-off cannot change the order of twins.
        x, y = zone.centre
        along, left = x, y
        if zone.chainage_m is not None and zone.offset_m is not None:
            along, left = zone.chainage_m, zone.offset_m
        return round(float(along), 3), -round(float(left), 3)

    ordered = sorted(zones, key=place)
    made: list[Zone] = []
    used: dict[str, int] = {}
    for k, zone in enumerate(ordered):
        name = _name(sf, reach, zone)
        used[name] = used.get(name, 0) + 1
        unique = name if used[name] == 1 else f"{name} ({used[name]})"
        made.append(replace(zone, id=f"E{k + 1}", name=unique))
    return tuple(made)


def _name(sf: StreamFunction, reach: Reach, zone: Zone) -> str:
    where = f", chainage {zone.chainage_m:.0f} m" if zone.chainage_m is not None else ""
    if zone.kind == "behind structure" and zone.wall is not None:
        return f"{zone.wall}, {_side(sf, reach, zone)}"
    if zone.kind in ("at bank", "side bay"):
        return f"{zone.wall}{' bay' if zone.kind == 'side bay' else ''}{where}"
    return f"free eddy{where}"


def _side(sf: StreamFunction, reach: Reach, zone: Zone) -> str:
    """"left rear" and the like, seen facing downstream from the middle of the structure."""
    middle = _middle(sf, reach, zone.wall)
    along = zone.along
    if reach.centre_line is not None:
        along = reach.centre_line.direction(reach.centre_line.locate(middle)[0])[0]
    away = zone.centre - middle
    side = "left" if along[0] * away[1] - along[1] * away[0] > 0 else "right"
    return f"{side} {'rear' if away @ along > 0 else 'front'}"


def _middle(sf: StreamFunction, reach: Reach, wall: str | None) -> np.ndarray:
    for w in sf.walls:
        if w.id == wall:
            p = sf.frame.mesh.node_xy[w.nodes]
            return (p.min(axis=0) + p.max(axis=0)) / 2
    return next(np.asarray(s.geometry.centroid.coords)[0] for s in reach.structures if s.name == wall)
