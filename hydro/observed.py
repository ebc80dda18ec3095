"""Observed data against a model: levels and flood marks, gauge series, velocity transects, drogues and dye fronts.

References
----------
.. [1] Liu, Y. and Weisberg, R.H. 2011, Evaluation of trajectory modeling in different dynamic regions using normalized
   cumulative Lagrangian separation, J. Geophys. Res. 116, C09013 (from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely

from .frame import Frame
from .run import Run
from .section import cut
from .section.figures import verticals
from .streamfunction import OpenBoundary
from .tracks import pathlines
from .transfer import barycentric


@dataclass(frozen=True, eq=False)
class Comparison:
    """Model minus observed at places or times that both have, (k,) each.

    ``bias`` mean difference, ``rmse`` root of the mean square, ``worst`` the greatest by size with its
    index; ``within`` the share of differences no larger than the accuracy stated with the data (NaN
    where none is stated). ``left_out`` counts observations where the model is dry or has no mesh.
    """

    model: np.ndarray
    observed: np.ndarray
    left_out: int
    accuracy: np.ndarray

    @property
    def difference(self) -> np.ndarray:
        return self.model - self.observed

    @property
    def bias(self) -> float:
        return float(self.difference.mean()) if self.difference.size else float("nan")

    @property
    def rmse(self) -> float:
        return float(np.sqrt((self.difference**2).mean())) if self.difference.size else float("nan")

    @property
    def worst(self) -> tuple[int, float]:
        if not self.difference.size:
            return -1, float("nan")
        i = int(np.abs(self.difference).argmax())
        return i, float(self.difference[i])

    @property
    def within(self) -> float:
        known = np.isfinite(self.accuracy)
        return float((np.abs(self.difference)[known] <= self.accuracy[known]).mean()) if known.any() else float("nan")


def levels(frame: Frame, xy: np.ndarray, observed_m: np.ndarray, accuracy_m: np.ndarray | float = np.nan) -> Comparison:
    """Observed levels or flood marks (k,) m above the run's datum at local points (k, 2) against a frame."""
    xy = np.atleast_2d(np.asarray(xy, float))
    observed, accuracy = np.asarray(observed_m, float), np.broadcast_to(np.asarray(accuracy_m, float), len(xy))
    model = _at(frame, xy)
    known = np.isfinite(model) & np.isfinite(observed)
    return Comparison(model[known], observed[known], int((~known).sum()), accuracy[known])


def gauge(run: Run, at: np.ndarray, seconds: np.ndarray, observed_m: np.ndarray, accuracy_m: float = np.nan) -> Comparison:
    """A gauge's level series at a local point (2,) against the run, linear between frames.

    Observations outside the run's time are left out.
    """
    s = run.times.seconds
    series = np.array([_at(run.frame(i), np.atleast_2d(at))[0] for i in range(run.n_frames)])
    wanted = np.asarray(seconds, float)
    model = np.where((wanted >= s[0]) & (wanted <= s[-1]), np.interp(wanted, s, series), np.nan)
    observed = np.asarray(observed_m, float)
    known = np.isfinite(model) & np.isfinite(observed)
    return Comparison(model[known], observed[known], int((~known).sum()), np.full(known.sum(), accuracy_m))


def transect(frame: Frame, line: np.ndarray, distance_m: np.ndarray, velocity_m_s: np.ndarray, accuracy_m_s: float = np.nan) -> Comparison:
    """Depth-averaged velocity across a line, measured from a moving boat at distances from its left end."""
    b, d, v = verticals(cut(frame, line))
    wanted, observed = np.asarray(distance_m, float), np.asarray(velocity_m_s, float)
    inside = (wanted >= b[0]) & (wanted <= b[-1])
    model = np.where(inside, np.interp(wanted, b, np.where(d > frame.wet_depth_m, v, np.nan)), np.nan)
    known = np.isfinite(model) & np.isfinite(observed)
    return Comparison(model[known], observed[known], int((~known).sum()), np.full(known.sum(), accuracy_m_s))


@dataclass(frozen=True, eq=False)
class DrogueComparison:
    """A drogue beside a parcel let go at its first place and time.

    ``separation`` (k,) m at the drogue's times; ``skill`` = max(0, 1 - c), c the sum of separations over the
    sum of the drogue's path lengths so far [1]_; ``travel_time_error`` s at the drogue's last place along its
    path (model minus observed; NaN where the parcel never gets there).
    """

    seconds: np.ndarray
    observed: np.ndarray
    model: np.ndarray
    separation: np.ndarray
    skill: float
    travel_time_error: float


def drogue(run: Run, xy: np.ndarray, seconds: np.ndarray, *, boundaries: tuple[OpenBoundary, ...] = ()) -> DrogueComparison:
    """Compare a drogue's track, local points (k, 2) at seconds (k,) of the run, with the model.

    Raises ``ValueError`` for a track of fewer than two points or with times that do not grow.
    """
    xy, t = np.asarray(xy, float), np.asarray(seconds, float)
    if len(xy) < 2 or not (np.diff(t) > 0).all():
        raise ValueError("a drogue track needs at least two points with growing times; check the file's times.")
    step = float(np.diff(t).min())
    track = pathlines(run, xy[:1], begin=float(t[0]), end=float(t[-1]), every=step, boundaries=boundaries).tracks[0]
    model = np.column_stack([np.interp(t, track.seconds, track.xy[:, i], right=np.nan) for i in range(2)])
    separation = np.hypot(*(model - xy).T)
    path = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(xy, axis=0).T))])
    known = np.isfinite(separation)
    whole = path[known].sum()
    c = float(separation[known].sum() / whole) if whole > 0 else float("inf")
    reached = np.flatnonzero(np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(track.xy, axis=0).T))]) >= path[-1])
    late = float(track.seconds[reached[0]] - t[-1]) if reached.size else float("nan")
    return DrogueComparison(t, xy, model, separation, max(0.0, 1.0 - c), late)


def dye_front(run: Run, source: np.ndarray, begin_s: float, front: np.ndarray, at_s: float, *, boundaries: Sequence[OpenBoundary] = ()) -> np.ndarray:
    """Distances (k,) m from modelled parcels let go along a line ``source`` (k, 2) to an observed dye front at its time."""
    found = pathlines(
        run, source, begin=begin_s, end=at_s, every=max((at_s - begin_s) / 50, 1e-6), boundaries=tuple(boundaries)
    ).tracks
    line = shapely.LineString(np.asarray(front, float))
    return np.array([line.distance(shapely.Point(t.xy[-1])) for t in found])


def _at(frame: Frame, xy: np.ndarray) -> np.ndarray:
    """Level (k,) at local points; NaN where dry or off the mesh."""
    t = frame.mesh.find(xy)
    corners = frame.mesh.triangles[np.maximum(t, 0)]
    w = barycentric(frame.mesh.node_xy, corners, xy)
    depth = np.einsum("kc,kc->k", w, frame.depth[corners])
    bed = np.einsum("kc,kc->k", w, frame.bed[corners])
    return np.where((t >= 0) & (depth > frame.wet_depth_m), bed + depth, np.nan)
