"""Named places (points and polygons): what stands there in a frame, and its peaks and durations over a run."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely

from ..frame import Frame
from ..reach import NamedLine
from ..run import Run
from ..transfer import barycentric


@dataclass(frozen=True, slots=True)
class Reading:
    """One place in one frame: means over its wet part, and the greatest; m, m/s, m2/s.

    ``depth_speed_max`` is the greatest product of depth and speed at one spot and one time.
    ``wet_share`` is the share of the place that is wet. NaN where nothing is wet.
    """

    depth_mean: float
    depth_max: float
    level_mean: float
    speed_mean: float
    speed_max: float
    depth_speed_max: float
    wet_share: float


@dataclass(frozen=True, eq=False)
class Series:
    """One place over a run: (frames,) arrays of the readings' figures by name, with the frames' seconds."""

    name: str
    seconds: np.ndarray
    values: dict[str, np.ndarray]

    def peak(self, figure: str) -> tuple[float, float]:
        """Greatest value and its time, s; NaN where never wet."""
        v = self.values[figure]
        if not np.isfinite(v).any():
            return float("nan"), float("nan")
        i = int(np.nanargmax(v))
        return float(v[i]), float(self.seconds[i])

    def duration_above(self, figure: str, limit: float) -> float:
        """Seconds above a limit, linear between frames."""
        v = np.nan_to_num(self.values[figure], nan=0.0) - limit
        total = 0.0
        for a, b, dt in zip(v[:-1], v[1:], np.diff(self.seconds), strict=True):
            if a > 0 and b > 0:
                total += dt
            elif a > 0 or b > 0:
                total += dt * max(a, b) / (abs(a) + abs(b))
        return float(total)

    def arrival(self, figure: str, limit: float) -> float | None:
        """First time at which the figure passes a limit, s, linear between frames; None if never."""
        v = np.nan_to_num(self.values[figure], nan=0.0)
        above = np.flatnonzero(v > limit)
        if not above.size:
            return None
        i = int(above[0])
        if i == 0:
            return float(self.seconds[0])
        f = (limit - v[i - 1]) / (v[i] - v[i - 1])
        return float(self.seconds[i - 1] + f * (self.seconds[i] - self.seconds[i - 1]))

    def percentile(self, figure: str, share: float) -> float:
        """Percentile in time (each frame stands for half the gaps beside it); wet times only."""
        v = self.values[figure]
        gaps = np.diff(self.seconds) / 2
        weight = np.concatenate([gaps, [0]]) + np.concatenate([[0], gaps]) if len(v) > 1 else np.ones(1)
        used = np.isfinite(v)
        if not used.any():
            return float("nan")
        order = np.argsort(v[used])
        cumulated = np.cumsum(weight[used][order])
        return float(np.interp(share / 100 * cumulated[-1], cumulated - weight[used][order] / 2, v[used][order]))


def reading(frame: Frame, place: NamedLine) -> Reading:
    """What stands at a place in a frame.

    Raises ``ValueError`` when the place lies outside the mesh.
    """
    if place.geometry.geom_type == "Point":
        depth, level, speed, weight = _at_point(frame, place)
    else:
        depth, level, speed, weight = _in_polygon(frame, place)
    wet = depth > frame.wet_depth_m
    if not wet.any():
        nan = float("nan")
        return Reading(nan, nan, nan, nan, nan, nan, 0.0)
    w = weight[wet] / weight[wet].sum()
    return Reading(
        float(w @ depth[wet]), float(depth[wet].max()), float(w @ level[wet]), float(w @ speed[wet]),
        float(speed[wet].max()), float((depth * speed)[wet].max()), float(weight[wet].sum() / weight.sum()),
    )


def series(run: Run, place: NamedLine) -> Series:
    """A place over every frame of a run, one frame held at a time."""
    rows = [reading(run.frame(i), place) for i in range(run.n_frames)]
    names = Reading.__dataclass_fields__
    return Series(place.name, run.times.seconds, {n: np.array([getattr(r, n) for r in rows]) for n in names})


def _at_point(frame: Frame, place: NamedLine):
    xy = np.array([[place.geometry.x, place.geometry.y]])
    t = int(frame.mesh.find(xy)[0])
    if t < 0:
        x, y = frame.mesh.to_world(xy)[0]
        raise ValueError(f"{place.name} at {x:.1f} E, {y:.1f} N lies outside the mesh; move it onto the model.")
    corners = frame.mesh.triangles[t : t + 1]
    w = barycentric(frame.mesh.node_xy, corners, xy)[0]
    depth = max(float(w @ frame.depth[corners[0]]), 0.0)
    q = w @ frame.unit_discharge[corners[0]]
    speed = float(np.hypot(*q)) / depth if depth > frame.wet_depth_m else 0.0
    bed = float(w @ frame.bed[corners[0]])
    return np.array([depth]), np.array([bed + depth]), np.array([speed]), np.ones(1)


def _in_polygon(frame: Frame, place: NamedLine):
    mesh = frame.mesh
    shapely.prepare(place.geometry)
    inside = shapely.contains_xy(place.geometry, mesh.face_centroid[:, 0], mesh.face_centroid[:, 1])
    if not inside.any():
        raise ValueError(f"{place.name} holds no face of the mesh; draw it larger, or as a point on the model.")
    depth = frame.face_depth[inside]
    speed = np.hypot(*frame.face_velocity[inside].T)
    return depth, frame.face_bed[inside] + depth, speed, mesh.face_area[inside]
