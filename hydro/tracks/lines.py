"""What a traced line is: its points with times, why it ended, and what stands along it."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from ..frame import Frame
from ..mesh import Mesh
from ..reach import CentreLine
from ..streamfunction import OpenBoundary
from ..transfer import barycentric

ENDS = (
    "left", "at a wall", "closed", "limit reached", "still water", "outside the water", "aground", "afloat",
)


@dataclass(frozen=True, eq=False)
class Track:
    """One line, local metres.

    Attributes
    ----------
    kind : "streamline", "pathline", "streakline" or "timeline"
    number : int
        Place of its start in the release; a start outside the water keeps its number.
    xy : (k, 2) float64
    seconds : (k,) float64
        Time along the line: from its start for a streamline, of the run for the others.
    triangle : (k,) int32
        Triangle of each point, -1 outside.
    ended : one of ENDS
    touches : int
        How often it slid along a wall.
    psi : float or None
        m3/s along a steady line.
    error_m : float or None
        Distance to the same line traced with a tolerance eight times finer (Runge-Kutta), or the drift
        of psi along the line over the unit discharge there (along psi: 0 by construction).
    """

    kind: str
    number: int
    xy: np.ndarray
    seconds: np.ndarray
    triangle: np.ndarray
    ended: str
    touches: int = 0
    psi: float | None = None
    error_m: float | None = None
    released_s: float = 0.0

    @property
    def length_m(self) -> float:
        return float(np.hypot(*np.diff(self.xy, axis=0).T).sum()) if len(self.xy) > 1 else 0.0


@dataclass(frozen=True, eq=False)
class Along:
    """What stands along a line in one frame, (k,) each; NaN where dry.

    ``loss`` m of head since the start; ``curvature`` 1/m, positive turning left; ``cross_slope`` of the
    water surface to the left, and ``bend_slope`` = -V^2 curvature / g, what steady frictionless flow asks for.
    """

    distance: np.ndarray
    depth: np.ndarray
    level: np.ndarray
    speed: np.ndarray
    head: np.ndarray
    loss: np.ndarray
    curvature: np.ndarray
    cross_slope: np.ndarray
    bend_slope: np.ndarray
    chainage: np.ndarray | None
    offset: np.ndarray | None


@dataclass(frozen=True, eq=False)
class Traced:
    """Tracks of one request with warnings about them."""

    tracks: tuple[Track, ...]
    warnings: tuple[str, ...] = field(default=())
    cautions: tuple[str, ...] = ("tracing",)


def along(track: Track, frame: Frame, *, centre_line: CentreLine | None = None, gravity: float = 9.81) -> Along:
    """Depth, level, speed, head, curvature and cross slope along a line."""
    mesh = frame.mesh
    corners = mesh.triangles[np.maximum(track.triangle, 0)]
    w = barycentric(mesh.node_xy, corners, track.xy)
    depth = np.maximum(np.einsum("kc,kc->k", w, frame.depth[corners]), 0.0)
    q = np.einsum("kc,kcj->kj", w, frame.unit_discharge[corners])
    bed = np.einsum("kc,kc->k", w, frame.bed[corners])
    wet = (depth > frame.wet_depth_m) & (track.triangle >= 0)
    speed = np.where(wet, np.hypot(*q.T) / np.where(wet, depth, 1.0), np.nan)
    level = np.where(wet, bed + depth, np.nan)
    head = level + speed**2 / (2 * gravity)
    distance = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(track.xy, axis=0).T))])
    curvature = _curvature(track.xy, distance)
    first = head[np.isfinite(head)][:1]
    s, n = centre_line.locate(track.xy) if centre_line is not None else (None, None)
    return Along(
        distance, depth, level, speed, head, (first[0] if first.size else np.nan) - head, curvature,
        _cross_slope(frame, corners, q), -(speed**2) * curvature / gravity, s, n,
    )


def open_sides(mesh: Mesh, boundaries: tuple[OpenBoundary, ...]) -> np.ndarray:
    """(3 m,) bool: sides of triangles that lie on an open boundary."""
    is_open = np.zeros(mesh.n_edges + 1, bool)
    for b in boundaries:
        is_open[b.edges] = True
    return is_open[mesh.triangle_edges].ravel()


def _curvature(xy: np.ndarray, distance: np.ndarray) -> np.ndarray:
    """Turning per metre by the circle through points a few steps apart; 0 for short lines."""
    if len(xy) < 5:
        return np.zeros(len(xy))
    even = np.linspace(0, distance[-1], max(len(xy) // 3, 5))
    x, y = np.interp(even, distance, xy[:, 0]), np.interp(even, distance, xy[:, 1])
    step = even[1] if even[1] > 0 else 1.0
    dx, dy = np.gradient(x, step), np.gradient(y, step)
    turn = (dx * np.gradient(dy, step) - dy * np.gradient(dx, step)) / np.maximum(np.hypot(dx, dy), 1e-12) ** 3
    return np.interp(distance, even, turn)


def _cross_slope(frame: Frame, corners: np.ndarray, q: np.ndarray) -> np.ndarray:
    """Slope of the water surface towards the left of the flow, from the plane of each triangle."""
    p = frame.mesh.node_xy[corners]
    z = (frame.bed + frame.depth)[corners]
    d1, d2 = p[:, 1] - p[:, 0], p[:, 2] - p[:, 0]
    area2 = d1[:, 0] * d2[:, 1] - d1[:, 1] * d2[:, 0]
    z1, z2 = z[:, 1] - z[:, 0], z[:, 2] - z[:, 0]
    gx = (z1 * d2[:, 1] - z2 * d1[:, 1]) / area2
    gy = (z2 * d1[:, 0] - z1 * d2[:, 0]) / area2
    size = np.maximum(np.hypot(*q.T), 1e-12)
    return (-gx * q[:, 1] + gy * q[:, 0]) / size
