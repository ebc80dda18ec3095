"""Differences of two frames on one mesh, and the ground that becomes wet or is no longer wet."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..frame import Frame
from ..transfer import Transfer


@dataclass(frozen=True, eq=False)
class MapChange:
    """b minus a on a's mesh.

    ``level`` (n,) m and ``speed`` (n,) m/s at nodes wet in both, else NaN; ``depth`` (f,) m and
    ``unit_discharge`` (f,) m2/s (of the sizes) on faces, carried conservatively; ``newly_wet`` and
    ``no_longer_wet`` (f,) bool with their areas in m2.
    """

    level: np.ndarray
    speed: np.ndarray
    depth: np.ndarray
    unit_discharge: np.ndarray
    newly_wet: np.ndarray
    no_longer_wet: np.ndarray
    newly_wet_m2: float
    no_longer_wet_m2: float


def map_change(a: Frame, b: Frame) -> MapChange:
    """Differences of frame b from frame a.

    Levels and velocities are interpolated; depth and unit discharge are carried by shared area. Faces
    of a that b's mesh does not cover to 99 % are neither newly wet nor newly dry.
    """
    move = Transfer(a.mesh, b.mesh)
    velocity = move.interpolate(b.velocity)
    both = a.wet_nodes & (move.interpolate(b.wet_nodes.astype(float)) > 0.999)
    speed = np.where(both, np.hypot(*velocity.T) - a.speed, np.nan)
    level = np.where(both, move.interpolate(np.where(b.wet_nodes, b.bed + b.depth, b.bed)) - a.bed - a.depth, np.nan)
    depth, q = move.conserve(b.face_depth), move.conserve(b.face_unit_discharge)
    covered = move.coverage > 0.99
    wet_b = depth > b.wet_depth_m
    newly, gone = covered & wet_b & ~a.wet_faces, covered & ~wet_b & a.wet_faces
    area = a.mesh.face_area
    return MapChange(
        level, speed, np.where(covered, depth - a.face_depth, np.nan),
        np.where(covered, np.hypot(*q.T) - np.hypot(*a.face_unit_discharge.T), np.nan),
        newly, gone, float(area[newly].sum()), float(area[gone].sum()),
    )
