"""The outer flow round a zone, and the extents of the zone along and across it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely

from ..streamfunction import StreamFunction
from .shape import Shape

_SLACK = 0.1  # a mean flow weaker than this share of the mean size of q has no direction to speak of


@dataclass(frozen=True, slots=True)
class Extent:
    """Extents of a zone.

    ``along`` is the unit vector of the outer flow, or the long axis of the outline where ``aligned`` is False
    because no outer flow can be told.
    """

    along: tuple[float, float]
    aligned: bool
    length_m: float
    width_m: float
    narrow_m: float


def extent_of(sf: StreamFunction, shape: Shape, in_zones: np.ndarray) -> Extent:
    """Length and width of a zone, along and across the outer flow.

    The outer flow is the mean unit discharge in a band as wide as the zone round it; ``in_zones``
    (m,) bool marks the triangles of all zones, which are left out.
    """
    narrow, axis = narrow_of(shape.polygon)
    q, mean_size = mean_flow(sf, band_of(sf, shape.polygon, narrow) & ~in_zones)
    size = float(np.hypot(*q))
    aligned = size > _SLACK * mean_size and size > 0
    along = q / size if aligned else axis
    points = shapely.get_coordinates(shape.polygon)
    return Extent(
        (float(along[0]), float(along[1])), bool(aligned), float(np.ptp(points @ along)),
        float(np.ptp(points @ np.array([-along[1], along[0]]))), narrow,
    )


def narrow_of(polygon: shapely.Geometry) -> tuple[float, np.ndarray]:
    """Least extent of an outline, m, and the unit vector of its long axis."""
    box = shapely.minimum_rotated_rectangle(polygon)
    if box.geom_type != "Polygon":
        return 0.0, np.array([1.0, 0.0])
    c = np.asarray(box.exterior.coords)
    one, two = c[1] - c[0], c[2] - c[1]
    if np.hypot(*one) < np.hypot(*two):
        one, two = two, one
    return float(np.hypot(*two)), one / np.hypot(*one)


def band_of(sf: StreamFunction, polygon: shapely.Geometry, width: float) -> np.ndarray:
    """Triangles (m,) bool of the domain whose centre lies outside the outline, no farther than ``width``."""
    centre = sf.frame.mesh.triangle_centroid
    west, south, east, north = polygon.bounds
    near = (
        sf.domain
        & (centre[:, 0] > west - width) & (centre[:, 0] < east + width)
        & (centre[:, 1] > south - width) & (centre[:, 1] < north + width)
    )
    index = np.flatnonzero(near)
    shapely.prepare(polygon)
    points = shapely.points(centre[index])
    near[index] = shapely.dwithin(polygon, points, width) & ~shapely.intersects(polygon, points)
    return near


def mean_flow(sf: StreamFunction, chosen: np.ndarray) -> tuple[np.ndarray, float]:
    """Area-weighted mean unit discharge (2,) over triangles (m,) bool, and the mean of its size, m2/s."""
    area = sf.frame.mesh.triangle_area[chosen]
    if not area.size:
        return np.zeros(2), 0.0
    q = sf.frame.triangle_unit_discharge[chosen]
    return (area @ q) / area.sum(), float(area @ np.hypot(*q.T) / area.sum())
