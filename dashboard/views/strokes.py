"""Small drawing geometry: lines cut to a view, bank ticks, turning marks, triangles, all in map metres."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
import shapely


def visible(lines: Iterable[np.ndarray], extent: tuple[float, float, float, float], step: float) -> list[np.ndarray]:
    """Lines (k, 2) cut to the extent and thinned to a third of a pixel; ``step`` is m a pixel."""
    shapes = [shapely.linestrings(line) for line in lines if len(line) > 1]
    if not shapes:
        return []
    cut = shapely.clip_by_rect(shapes, *extent)
    # Lines are only drawn: keeping their topology would take ten times as long.
    parts = shapely.get_parts(shapely.simplify(cut[~shapely.is_empty(cut)], step / 3, preserve_topology=False))
    parts = parts[shapely.get_type_id(parts) == 1]
    return [shapely.get_coordinates(p) for p in parts]


def joined(lines: Iterable[np.ndarray]) -> np.ndarray:
    """Many lines of one style as one (k, 2) with gaps of NaN between them."""
    gap = np.full((1, 2), np.nan)
    parts = [part for line in lines for part in (line, gap)]
    return np.vstack(parts[:-1]) if parts else np.empty((0, 2))


def along(line: np.ndarray, spacing: float, start: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Points (k, 2) every ``spacing`` along a line, and the unit directions there."""
    d = np.diff(line, axis=0)
    length = np.hypot(*d.T)
    keep = length > 0
    d, length, origin = d[keep], length[keep], line[:-1][keep]
    if not len(d):
        return np.empty((0, 2)), np.empty((0, 2))
    s = np.concatenate([[0.0], np.cumsum(length)])
    at = np.arange(start, s[-1], spacing)
    i = np.clip(np.searchsorted(s, at, side="right") - 1, 0, len(d) - 1)
    unit = d / length[:, None]
    return origin[i] + (at - s[i])[:, None] * unit[i], unit[i]


def bank_ticks(shore: Sequence[np.ndarray], step: float, line: float = 1.0) -> tuple[np.ndarray, np.ndarray]:
    """Starts and ends (k, 2) of ticks on the dry side, every 5 px, long 9 and short 4.5 px by turns.

    The shore's lines have the water on their left.
    """
    starts, ends = [], []
    for points in shore:
        p, t = along(points, 5 * line * step)
        reach = np.where(np.arange(len(p)) % 2 == 0, 9.0, 4.5) * line * step
        starts.append(p)
        ends.append(p + reach[:, None] * np.column_stack([t[:, 1], -t[:, 0]]))
    if not starts:
        return np.empty((0, 2)), np.empty((0, 2))
    return np.vstack(starts), np.vstack(ends)


def turning_mark(centre: np.ndarray, radius: float, rotation: str) -> list[np.ndarray]:
    """An open circle that turns, with a head of two strokes at its end."""
    sense = 1.0 if rotation == "anticlockwise" else -1.0
    angle = np.radians(90) + sense * np.radians(np.linspace(40, 330, 40))
    arc = centre + radius * np.column_stack([np.cos(angle), np.sin(angle)])
    tip, last = arc[-1], angle[-1]
    forward = sense * np.array([-np.sin(last), np.cos(last)])
    side = np.array([-forward[1], forward[0]])
    head = 0.62 * radius
    strokes = [np.array([tip - head * (forward - s * 0.75 * side) / 1.25, tip]) for s in (1.0, -1.0)]
    return [arc, *strokes]


def triangle(at: np.ndarray, towards: np.ndarray, size: float) -> np.ndarray:
    """A triangle (3, 2) standing at ``at`` and pointing along ``towards``."""
    t = np.asarray(towards, float) / (np.hypot(*towards) or 1.0)
    n = np.array([-t[1], t[0]])
    return np.array([at + size * t, at - 0.5 * size * t + 0.8 * size * n, at - 0.5 * size * t - 0.8 * size * n])


def bar(at: np.ndarray, angle: float, length: float) -> np.ndarray:
    """A line (2, 2) of ``length`` through ``at``."""
    half = length / 2 * np.array([np.cos(angle), np.sin(angle)])
    return np.array([at - half, at + half])


def cross_ticks(points: np.ndarray, every: int, size: float) -> list[np.ndarray]:
    """Cross ticks at every ``every``-th point of a line."""
    out = []
    for i in range(every, len(points) - 1, every):
        t = points[i + 1] - points[i - 1]
        t = t / (np.hypot(*t) or 1.0)
        n = size / 2 * np.array([-t[1], t[0]])
        out.append(np.array([points[i] - n, points[i] + n]))
    return out


def rings(shape: shapely.Geometry) -> tuple[list, list]:
    """x and y of a polygon or multipolygon as nested lists: parts, then rings, outer first."""
    polygons = [p for p in shapely.get_parts(shape) if p.geom_type == "Polygon" and not p.is_empty]
    xs = [[np.asarray(r.coords)[:, 0] for r in (p.exterior, *p.interiors)] for p in polygons]
    ys = [[np.asarray(r.coords)[:, 1] for r in (p.exterior, *p.interiors)] for p in polygons]
    return xs, ys
