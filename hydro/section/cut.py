"""A line cut through a frame: where it runs in which triangle, and what stands at each station."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .._kernels import crossing
from ..frame import Frame
from ..reach import CentreLine
from ..transfer import barycentric


@dataclass(frozen=True, eq=False)
class Section:
    """A cross-section, left bank first, seen looking downstream.

    The line is cut into pieces, one a triangle that it runs through. Station arrays (k, 2) hold the
    value at a piece's start and end: within a triangle everything is linear.

    Attributes
    ----------
    frame : Frame
    points : (n, 2) float64
        The line, local m, left bank to right bank.
    turned : bool
        True when the line was given from right to left and was turned.
    triangle : (k,) int32
        Triangle of each piece.
    distance : (k, 2) float64
        From the left end along the line, m.
    xy : (k, 2, 2) float64
        Local points of the stations.
    bed, depth : (k, 2) float64
        m; depth 0 where dry.
    flow : (k, 2) float64
        Unit discharge across the line, m2/s, positive downstream; linear between nodes.
    face_flow : (k,) float64
        The same from the field that psi uses, constant in each piece.
    normal : (k, 2) float64
        Unit vector across the line, downstream.
    """

    frame: Frame
    points: np.ndarray
    turned: bool
    triangle: np.ndarray
    distance: np.ndarray
    xy: np.ndarray
    bed: np.ndarray
    depth: np.ndarray
    flow: np.ndarray
    face_flow: np.ndarray
    normal: np.ndarray

    @property
    def length(self) -> float:
        """Of the line, m."""
        return float(np.hypot(*np.diff(self.points, axis=0).T).sum())

    @property
    def widths(self) -> np.ndarray:
        """(k,) length of each piece, m."""
        return np.diff(self.distance, axis=1)[:, 0]

    @property
    def wet(self) -> np.ndarray:
        """(k,) bool: pieces whose face is wet."""
        return self.frame.wet_triangles[self.triangle]

    @property
    def level(self) -> np.ndarray:
        """(k, 2) water level, m above datum; NaN where dry."""
        return np.where(self.wet[:, None] & (self.depth > 0), self.bed + self.depth, np.nan)


def cut(frame: Frame, points: np.ndarray, *, centre_line: CentreLine | None = None) -> Section:
    """Cut a line through a frame.

    Parameters
    ----------
    points : (n, 2) array_like
        Local points of a line across or along the flow.
    centre_line : CentreLine, optional
        It alone decides which end is left; without it the line is taken as given, left end first.

    Raises
    ------
    ValueError
        Fewer than two different points, or a line that meets no triangle of the mesh.
    """
    line = np.asarray(points, float).reshape(-1, 2)
    line = line[np.concatenate([[True], np.hypot(*np.diff(line, axis=0).T) > 0])] if len(line) else line
    if len(line) < 2 or not np.isfinite(line).all():
        raise ValueError("a section needs at least two different points with two coordinates each.")
    turned = centre_line is not None and runs_right_to_left(line, centre_line)
    if turned:
        line = line[::-1]
    mesh = frame.mesh
    of, low, high, segment = _pieces(mesh, line)
    if not of.size:
        x, y = mesh.to_world(line).mean(axis=0)
        raise ValueError(f"the section near {x:.1f} E, {y:.1f} N does not meet the mesh; move it onto the water.")
    start = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(line, axis=0).T))])
    step = np.diff(line, axis=0)[segment]
    ends = np.stack([low, high], axis=1)
    xy = line[segment][:, None, :] + ends[..., None] * step[:, None, :]
    distance = start[segment][:, None] + ends * np.diff(start)[segment][:, None]
    corners = np.repeat(mesh.triangles[of], 2, axis=0)
    weight = barycentric(mesh.node_xy, corners, xy.reshape(-1, 2))

    def at(values: np.ndarray) -> np.ndarray:
        return np.einsum("ij,ij...->i...", weight, values[corners]).reshape(len(of), 2, *values.shape[1:])

    # Walking from left to right bank, downstream is to the left of the walker.
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1) / np.hypot(*step.T)[:, None]
    return Section(
        frame, line, turned, of, distance, xy, at(frame.bed), np.maximum(at(frame.depth), 0.0),
        np.einsum("kij,kj->ki", at(frame.unit_discharge), normal),
        np.einsum("kj,kj->k", frame.triangle_unit_discharge[of], normal), normal,
    )


def runs_right_to_left(line: np.ndarray, centre_line: CentreLine) -> bool:
    """Whether a line (n, 2) begins right of where it ends: offset is positive to the left.

    A line along the flow, whose ends differ less in offset than in chainage, is never turned.
    """
    s, n = centre_line.locate(line[[0, -1]])
    return bool(n[0] < n[1] and abs(n[1] - n[0]) > abs(s[1] - s[0]))


def _pieces(mesh, line: np.ndarray):
    grid, start, items = mesh._locator
    found = []
    for k in range(len(line) - 1):
        of, low, high = crossing.pieces(mesh.node_xy, mesh.triangles, grid, start, items, *line[k], *line[k + 1])
        found.append((of, low, high, np.full(of.size, k)))
    return tuple(np.concatenate([f[i] for f in found]) for i in range(4))
