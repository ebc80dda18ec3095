"""Profiles along a line, a streamline or the thalweg: bed, surface, critical depth, head, loss and jumps."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..frame import Frame
from ..reach import CentreLine
from ..settings import Settings
from .cut import cut


@dataclass(frozen=True, eq=False)
class Profile:
    """What stands along a line, from its start, (k,) each.

    ``distance`` m along the line; ``xy`` (k, 2) local; ``bed``, ``level``, ``critical_level`` and
    ``head`` m above datum (NaN where dry); ``depth`` m; ``speed`` m/s; ``froude`` local,
    |u| / sqrt(g h). ``jumps``: distances where the flow passes from Froude above 1 to below along
    the flow.
    """

    distance: np.ndarray
    xy: np.ndarray
    bed: np.ndarray
    depth: np.ndarray
    level: np.ndarray
    critical_level: np.ndarray
    head: np.ndarray
    speed: np.ndarray
    froude: np.ndarray
    jumps: tuple[float, ...]

    def loss(self) -> float | None:
        """Head at the first wet station minus head at the last, m; None with fewer than two."""
        wet = np.flatnonzero(np.isfinite(self.head))
        return float(self.head[wet[0]] - self.head[wet[-1]]) if wet.size > 1 else None


def profile(frame: Frame, points: np.ndarray, *, settings: Settings | None = None) -> Profile:
    """The profile of a frame along local points (n, 2), in the order given.

    Stations stand at every side of a triangle that the line crosses. Raises ``ValueError`` as
    :func:`hydro.section.cut` does.
    """
    g = (settings or Settings())["gravity_m_s2"]
    s = cut(frame, points)
    distance, xy = s.distance.mean(axis=1), s.xy.mean(axis=1)
    bed, depth = s.bed.mean(axis=1), s.depth.mean(axis=1)
    corners = frame.mesh.triangles[s.triangle]
    q = _linear(frame, corners, xy, frame.unit_discharge)
    wet = s.wet & (depth > frame.wet_depth_m)
    flow = np.hypot(*q.T)
    speed = np.where(wet, flow / np.where(wet, depth, 1.0), 0.0)
    level = np.where(wet, bed + depth, np.nan)
    froude = np.where(wet, speed / np.sqrt(g * np.where(wet, depth, 1.0)), np.nan)
    critical = np.where(wet, bed + (flow**2 / g) ** (1 / 3), np.nan)
    along = np.einsum("kj,kj->k", q, np.gradient(xy, axis=0)) >= 0
    return Profile(
        distance, xy, bed, depth, level, critical, level + speed**2 / (2 * g), speed, froude,
        tuple(_jumps(distance, froude, along)),
    )


def thalweg(frame: Frame, centre_line: CentreLine, spacing_m: float) -> np.ndarray:
    """Local points (k, 2) of the deepest bed on sections square to the centre line, upstream first.

    Raises ``ValueError`` where no section meets water.
    """
    from ..reach import automatic_sections

    points = []
    for _, line in automatic_sections(centre_line, frame.mesh.node_xy, spacing_m):
        try:
            s = cut(frame, line)
        except ValueError:  # a section that leaves the mesh has no deepest point
            continue
        if s.wet.any():
            lowest = np.where(s.wet, s.bed.min(axis=1), np.inf).argmin()
            points.append(s.xy[lowest, s.bed[lowest].argmin()])
    if len(points) < 2:
        raise ValueError("fewer than two sections meet water; give a shorter spacing or a centre line along the river.")
    return np.array(points)


def _linear(frame: Frame, corners: np.ndarray, xy: np.ndarray, values: np.ndarray) -> np.ndarray:
    from ..transfer import barycentric

    return np.einsum("kc,kcj->kj", barycentric(frame.mesh.node_xy, corners, xy), values[corners])


def _jumps(distance, froude, along) -> list[float]:
    """Places where Froude falls from above 1 to below in the direction of the flow."""
    out = []
    for i in range(len(froude) - 1):
        a, b = (froude[i], froude[i + 1]) if along[i] else (froude[i + 1], froude[i])
        if a > 1 >= b:
            out.append(float((distance[i] + distance[i + 1]) / 2))
    return out
