"""Where lines start: points, along a line at a spacing, inside a polygon at a density, or one a stream tube."""

from __future__ import annotations

import numpy as np
from shapely.geometry.base import BaseGeometry

from ..contours import tube_levels
from ..section import cut
from ..streamfunction import StreamFunction
from ..transfer import barycentric


def on_line(line: np.ndarray, spacing_m: float) -> np.ndarray:
    """Points (k, 2) along a line (n, 2), half a spacing from its ends, ``spacing_m`` apart.

    Raises ``ValueError`` for a spacing of nothing.
    """
    if not spacing_m > 0:
        raise ValueError(f"spacing is {spacing_m:g} m; give one above 0.")
    line = np.asarray(line, float)
    d = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(line, axis=0).T))])
    at = np.arange(min(spacing_m, d[-1]) / 2, d[-1], spacing_m)
    return np.column_stack([np.interp(at, d, line[:, 0]), np.interp(at, d, line[:, 1])])


def in_polygon(shape: BaseGeometry, density_m2: float) -> np.ndarray:
    """Points (k, 2) of a hexagonal pattern inside a polygon, one for every ``density_m2`` m2."""
    import shapely

    if not density_m2 > 0:
        raise ValueError(f"one point for {density_m2:g} m2 is no density; give an area above 0.")
    step = np.sqrt(density_m2 * 2 / np.sqrt(3))
    west, south, east, north = shape.bounds
    rows = np.arange(south + step / 2, north, step * np.sqrt(3) / 2)
    points = [_row(west, east, step, y, i % 2) for i, y in enumerate(rows)]
    xy = np.vstack(points) if points else np.zeros((0, 2))
    return xy[shapely.contains_xy(shape, xy[:, 0], xy[:, 1])]


def one_a_tube(sf: StreamFunction, line: np.ndarray, count: int) -> np.ndarray:
    """Points (k, 2) on a line across the flow in the middle of every stream tube, by discharge.

    Raises ``ValueError`` when no tube crosses the line.
    """
    section = cut(sf.frame, line)
    twice = np.repeat(section.triangle, 2)
    weights = barycentric(sf.frame.mesh.node_xy, sf.frame.mesh.triangles[twice], section.xy.reshape(-1, 2))
    psi = (weights * sf.corners(twice)).sum(axis=1).reshape(-1, 2)
    levels = tube_levels(sf, count)
    if len(levels) < 2:
        raise ValueError("the flow has no stream tubes: nothing passes through the model.")
    middle = np.append(levels, levels[-1] + (levels[1] - levels[0])) - (levels[1] - levels[0]) / 2
    found = []
    for level in middle:
        low, high = np.minimum(*psi.T), np.maximum(*psi.T)
        hits = np.flatnonzero((low <= level) & (level < high) & np.isfinite(psi).all(axis=1))
        for k in hits[:1]:
            f = (level - psi[k, 0]) / (psi[k, 1] - psi[k, 0])
            found.append(section.xy[k, 0] + f * (section.xy[k, 1] - section.xy[k, 0]))
    if not found:
        raise ValueError("no stream tube crosses the line; draw it from bank to bank.")
    return np.array(found)


def _row(west: float, east: float, step: float, y: float, odd: int) -> np.ndarray:
    x = np.arange(west + step * (0.25 + 0.5 * odd), east, step)
    return np.column_stack([x, np.full(x.size, y)])
