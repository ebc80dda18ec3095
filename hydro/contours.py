"""Contours of node values, and the levels that cut a stream function into equal tubes."""

from __future__ import annotations

import numpy as np

from ._kernels import contour
from .mesh import Mesh
from .streamfunction import StreamFunction


def contour_lines(mesh: Mesh, values: np.ndarray, level: float, domain: np.ndarray) -> list[np.ndarray]:
    """Lines of one level of a field that is linear between nodes.

    Parameters
    ----------
    mesh : Mesh
    values : (n,) array
        Finite at every node of the domain.
    level : float
    domain : (m,) bool
        Triangles to draw in.

    Returns
    -------
    list of (k, 2) float64
        Local metres; higher values on the left, so lines of psi run downstream. A closed line repeats
        its first point.
    """
    points, first = contour.lines(mesh.node_xy, mesh.triangles, mesh.neighbours, domain, values, float(level))
    return [points[first[i] : first[i + 1]] for i in range(len(first) - 1)]


def psi_lines(sf: StreamFunction, level: float) -> list[np.ndarray]:
    """Lines of one level of psi, m3/s, over its whole domain; at a link's path they break, as psi does.

    As :func:`contour_lines` otherwise.
    """
    mesh, (beside, _) = sf.frame.mesh, sf.seam
    if not beside.size:
        return contour_lines(mesh, sf.psi, level, sf.domain)
    away = sf.domain.copy()
    away[beside] = False
    points, first = contour.lines(
        mesh.node_xy[mesh.triangles[beside].ravel()], np.arange(3 * len(beside), dtype=np.int32).reshape(-1, 3),
        np.full((len(beside), 3), -1, np.int32), np.ones(len(beside), bool), sf.corners(beside).ravel(), float(level),
    )
    return contour_lines(mesh, sf.psi, level, away) + [points[first[i] : first[i + 1]] for i in range(len(first) - 1)]


def tube_levels(sf: StreamFunction, count: int) -> np.ndarray:
    """Levels of psi between stream tubes, m3/s: equal steps of the through-discharge over ``count``.

    Levels run on at the same step where eddies take psi beyond its values on the banks. A closed basin
    has ``count`` steps over its whole range. Empty where nothing moves.
    """
    low, high = float(np.nanmin(sf.psi)), float(np.nanmax(sf.psi))
    whole = sf.through_discharge_m3_s or high - low
    if not whole > 0:
        return np.zeros(0)
    step = whole / count
    start = min((w.psi_m3_s for w in sf.walls if w.reaches_open), default=low)
    k = np.arange(np.ceil((low - start) / step), np.floor((high - start) / step) + 1)
    levels = start + k * step
    bank = np.array([w.psi_m3_s for w in sf.walls if w.reaches_open])
    if bank.size:
        levels = levels[np.abs(levels[:, None] - bank).min(axis=1) > 1e-9 * whole]
    return levels
