"""How far a zone's figures move with choices that the file leaves open: a reading of this file only."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
import shapely

from ..frame import Frame
from ..streamfunction import Plan, StreamFunction, stream_function
from .regions import Region, closed_regions
from .shape import peak_of, shape_of
from .zone import Zone

_BESIDE = 0.02  # share of the zone's size within which its outline lies on a wall
_SAME = 0.3  # least overlap of the smaller one for two readings to be of one zone


def from_outline(
    area: float, volume: float, length: float, width: float, depth: float, flow: float, *, free_outline: float,
    size: float, noise: float, inner_area: float, inner_volume: float,
) -> dict[str, tuple[float, float]]:
    """Ranges from the dividing level moved by the noise of psi, and from half a triangle along the outline.

    Parameters
    ----------
    area, volume, length, width, depth, flow : float
        The zone's figures (mean depth; recirculating discharge).
    free_outline : float
        Length of the outline that is not a wall, m.
    size : float
        Side of a triangle, m.
    noise : float
        m3/s.
    inner_area, inner_volume : float
        At the level moved inwards by the noise. Moved outwards the level leaves the closed streamlines, so
        the loss inside is taken as the gain outside.
    """
    half = size / 2
    by_area = max(area - inner_area, free_outline * half)
    by_volume = max(volume - inner_volume, free_outline * half * depth)
    weak = max(flow - noise, 1e-300)

    def about(value: float, by: float) -> tuple[float, float]:
        return max(value - by, 0.0), value + by

    return {
        "area_m2": about(area, by_area),
        "volume_m3": about(volume, by_volume),
        "length_m": about(length, size),
        "width_m": about(width, size),
        "recirculating_discharge_m3_s": about(flow, noise),
        "rotation_time_s": (max(volume - by_volume, 0.0) / (flow + noise), (volume + by_volume) / weak),
    }


def range_outlines(sf: StreamFunction, zone: Zone) -> tuple[list[np.ndarray], list[np.ndarray]]:
    """Lines (k, 2), local m, along which the zone's outline would run at the least and at the greatest of its areas.

    The part of the outline that is no wall is moved in and out by the distance that makes up the difference;
    a wall stays where it is. A picture of the range, not of any one reading.
    """
    low, high = zone.sensitivity.get("area_m2", (zone.area_m2, zone.area_m2))
    walls = _walls_near(sf, zone.contour).buffer(_BESIDE * np.sqrt(zone.area_m2))
    free = [shapely.LineString(p.exterior.coords).difference(walls) for p in shapely.get_parts(zone.contour)]
    parts = [p for f in free for p in shapely.get_parts(f) if p.length > 0]
    length = sum(p.length for p in parts)
    if not length:
        return [], []
    most_in = 0.9 * float(np.sqrt(zone.area_m2 / np.pi))
    return (
        _moved(parts, min((zone.area_m2 - low) / length, most_in), zone.contour, outward=False),
        _moved(parts, (high - zone.area_m2) / length, zone.contour, outward=True),
    )


def _walls_near(sf: StreamFunction, outline: shapely.Geometry) -> shapely.Geometry:
    s, xy = sf.shape, sf.frame.mesh.node_xy
    west, south, east, north = outline.bounds
    middle = (xy[s.a] + xy[s.b]) / 2
    near = (s.opening < 0) & (middle > [west - 1, south - 1]).all(axis=1) & (middle < [east + 1, north + 1]).all(axis=1)
    return shapely.multilinestrings(shapely.linestrings(np.stack([xy[s.a[near]], xy[s.b[near]]], axis=1)))


def _moved(parts: Sequence[shapely.Geometry], by: float, outline: shapely.Geometry, *, outward: bool) -> list[np.ndarray]:
    """Lines moved to one side of an outline, m."""
    if not by > 0:
        return []
    out = []
    for part in parts:
        for side in (by, -by):
            line = part.offset_curve(side)
            if not line.is_empty and outline.contains(line.interpolate(0.5, normalized=True)) != outward:
                out += [shapely.get_coordinates(piece) for piece in shapely.get_parts(line)]
                break
    return [points for points in out if len(points) > 1]


def widened(
    one: Mapping[str, tuple[float, float]], values: Mapping[str, float | None]
) -> dict[str, tuple[float, float]]:
    """Ranges that hold these values too."""
    out = dict(one)
    for name, value in values.items():
        if value is not None and np.isfinite(value):
            low, high = out.get(name, (value, value))
            out[name] = (min(low, value), max(high, value))
    return out


def other_field(frame: Frame) -> Frame:
    """The frame read the other way: node values where the faces' own are used, face means where nodes are."""
    other = "face" if frame.stored_on == "node" else "node"
    return replace(frame, stored_on=other, edge_discharge=None)


def other_threshold(frame: Frame, factor: float) -> Frame:
    """The frame with another wet threshold, m: the domain of psi moves; depths and flows stay."""
    return replace(frame, wet_depth_m=frame.wet_depth_m * factor)


class Readings:
    """Other readings of the frames of a run: the other field, half and twice the wet threshold.

    Each keeps a plan of its own, so factors are reused from frame to frame.
    """

    def __init__(self, plan: Plan) -> None:
        self._made = (
            ("the other field", other_field, plan.sibling()),
            ("half the wet threshold", lambda f: other_threshold(f, 0.5), plan.sibling()),
            ("twice the wet threshold", lambda f: other_threshold(f, 2.0), plan.sibling()),
        )

    def of(self, sf: StreamFunction, zones: Sequence[Zone]) -> list[Zone]:
        """Zones with ranges widened by what the other readings give.

        A zone that a reading does not find is flagged, with the reading's name.
        """
        out = list(zones)
        for name, changed, plan in self._made:
            other = stream_function(changed(sf.frame), plan=plan, split=False)
            regions = closed_regions(other)
            for k, zone in enumerate(out):
                twin = _twin(zone, regions)
                if twin is None:
                    out[k] = replace(zone, flags=(*zone.flags, f"not found with {name}"))
                else:
                    out[k] = replace(zone, sensitivity=widened(zone.sensitivity, measured(other, twin, zone.along)))
        return out


def measured(sf: StreamFunction, region: Region, along: np.ndarray) -> dict[str, float | None]:
    """The figures whose sensitivity is given, of a region, with lengths along a given direction."""
    shape = shape_of(sf, region)
    centre_psi = peak_of(sf, region)[1]
    flow = abs(centre_psi - region.level)
    points = shapely.get_coordinates(shape.polygon)
    through = sf.through_discharge_m3_s
    reverse = -(sf.frame.velocity[region.nodes] @ along)
    return {
        "area_m2": shape.area_m2, "volume_m3": shape.volume_m3,
        "length_m": float(np.ptp(points @ along)),
        "width_m": float(np.ptp(points @ np.array([-along[1], along[0]]))),
        "mean_depth_m": shape.volume_m3 / shape.area_m2, "max_depth_m": shape.max_depth_m,
        "recirculating_discharge_m3_s": flow,
        "share_of_through_discharge": flow / through if through > 0 else None,
        "rotation_time_s": shape.volume_m3 / flow,
        "max_reverse_speed_m_s": float(np.max(reverse, initial=0.0)),
        "psi_edge_m3_s": region.level, "psi_centre_m3_s": centre_psi,
    }


def _twin(zone: Zone, regions: Sequence[Region]) -> Region | None:
    """The region of the same sense that shares most nodes with a zone, if it shares enough."""
    best, most = None, _SAME
    for other in regions:
        if other.sign == zone.region.sign:
            shared = np.intersect1d(zone.region.nodes, other.nodes, assume_unique=True).size
            share = shared / max(1, min(len(zone.region.nodes), len(other.nodes)))
            if share > most and shared > 1:
                best, most = other, share
    return best
