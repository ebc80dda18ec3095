"""How much of the river's flow comes through a pass, and what it competes with at its entrance."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely

from ..frame import Frame
from ..reach import NamedLine
from .water import triangles_of


@dataclass(frozen=True, slots=True)
class EntranceShare:
    """Discharge through a pass beside the rest of the river, m3/s; ``share`` of the through-discharge."""

    name: str
    discharge_m3_s: float
    competing_m3_s: float

    @property
    def share(self) -> float:
        total = self.discharge_m3_s + self.competing_m3_s
        return self.discharge_m3_s / total if total > 0 else float("nan")


def entrance_share(frame: Frame, entrance: NamedLine, through_m3_s: float) -> EntranceShare:
    """Share of the through-discharge that crosses a line drawn over a pass.

    The sign of the crossing does not matter; the competing flow is the through-discharge less this. Raises
    ``ValueError`` where the feature is no line.
    """
    if entrance.geometry.geom_type != "LineString":
        raise ValueError(f"entrance {entrance.name!r} is a {entrance.geometry.geom_type}; draw a line across the pass.")
    own = abs(_discharge_across(frame, np.asarray(entrance.geometry.coords)[:, :2]))
    return EntranceShare(entrance.name, own, max(through_m3_s - own, 0.0))


def _discharge_across(frame: Frame, line: np.ndarray) -> float:
    """Discharge over a polyline, m3/s: each triangle's constant unit discharge over the piece of line in it.

    A piece along a side that two triangles share would count twice, so it counts for half in each.
    """
    total = 0.0
    for a, b in zip(line[:-1], line[1:]):
        segment = shapely.LineString([a, b])
        under = triangles_of(frame.mesh, segment)
        polygons = shapely.polygons(frame.mesh.node_xy[frame.mesh.triangles[under]])
        length = shapely.length(shapely.intersection(segment, polygons))
        length = np.where(shapely.touches(segment, polygons), length / 2, length)
        normal = np.array([b[1] - a[1], a[0] - b[0]]) / np.hypot(*(b - a))
        total += float(length @ (frame.triangle_unit_discharge[under] @ normal))
    return total
