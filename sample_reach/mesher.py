"""Triangles for the reach: seeds spaced by a size function, relaxed by springs, then by area.

Fixed nodes lie along the outline, along the contours of the banks and along the weir crest. The
method is the usual one (Persson & Strang 2004 for the springs, Lloyd 1982 for the last sweeps).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import shapely
from scipy.ndimage import map_coordinates
from scipy.spatial import Delaunay, cKDTree
from shapely.geometry import LineString, Polygon, box
from shapely.geometry.base import BaseGeometry

from . import geometry as geo
from .kernels import hilbert_key, thin_seeds

_GROWTH = 0.20  # edge length gained per metre of distance from a fine place


@dataclass(frozen=True)
class Sizes:
    """Edge lengths wanted, m."""

    base: float
    bank: float
    weir: float
    basin: float
    finest: float
    rows: bool  # lay node rows along the banks' contours
    soft_pier: float = 0.7  # round a pier that is resistance


SIZES = {
    ("existing", "fine"): Sizes(3.2, 1.75, 1.0, 1.9, 0.34, True),
    ("proposed", "fine"): Sizes(3.2, 1.75, 1.0, 1.9, 0.26, True),
    ("existing", "coarse"): Sizes(4.4, 3.0, 1.5, 2.8, 0.75, False, 1.0),
    ("proposed", "coarse"): Sizes(4.4, 3.0, 1.5, 2.8, 0.60, False),
}


@dataclass(frozen=True)
class Triangles:
    """Nodes (n, 2), local m, and anticlockwise triangles (m, 3) in an order kind to memory."""

    xy: np.ndarray
    cells: np.ndarray


def wake_box(pier: geo.Pier) -> Polygon:
    """From the pier's middle to some widths behind its tail, along the flow there."""
    reach, half = (5.0, 1.35) if pier.width > 3 else (3.0, 1.1)
    s, n = geo.course().locate(np.array([pier.outline.centroid.coords[0]]))
    ends = [(0.0, -1), (pier.length / 2 + reach * pier.width, -1), (pier.length / 2 + reach * pier.width, 1), (0.0, 1)]
    return Polygon(np.vstack([geo.course().at(s[0] + ds, n[0] + side * half * pier.width) for ds, side in ends]))


class SizeField:
    """Wanted edge length at any place, tabulated over the whole and, finely, at the bridge."""

    def __init__(self, place: geo.Place, sizes: Sizes) -> None:
        self.sizes = sizes
        self.fine: list[tuple[BaseGeometry, float]] = []
        for pier in place.piers:
            if pier.hole:
                self.fine += [(pier.outline, 1.25 * sizes.finest), (wake_box(pier), sizes.finest)]
            else:
                self.fine.append((pier.outline.buffer(0.6), sizes.soft_pier))
        corners = ((-1.5, -20.5), (4, -20.5), (4, 20.5), (-1.5, 20.5))
        band = Polygon(np.vstack([geo.course().at(geo.WEIR + s, n) for s, n in corners]))
        s = np.arange(0.0, geo.LENGTH + 1, 2.0)
        c, edge = geo.course(), geo.half_bottom(s) + geo.BANK_WIDTH / 2
        banks = shapely.union_all([LineString(c.at(s, side * edge)).buffer(geo.BANK_WIDTH / 2) for side in (-1, 1)])
        self.fine += [
            (band, sizes.weir), (place.ramp_outline, sizes.weir), (banks, sizes.bank), (geo.basin_outline(), sizes.basin),
            (geo.tributary_outline(), sizes.basin),
        ]
        self.fine += [(a, min(1.2, sizes.bank)) for a in place.abutments]
        bounds = place.domain.bounds
        near = shapely.union_all([*(wake_box(p) for p in place.piers), *(p.outline for p in place.piers)]).buffer(3.0)
        self.tables = [self._table(near.bounds, 0.15, near), self._table(bounds, 0.8, None)]

    def _table(self, bounds, step, inside):
        x = np.arange(bounds[0] - 2 * step, bounds[2] + 3 * step, step)
        y = np.arange(bounds[1] - 2 * step, bounds[3] + 3 * step, step)
        gx, gy = np.meshgrid(x, y, indexing="ij")
        points = shapely.points(gx.ravel(), gy.ravel())
        size = np.full(gx.size, self.sizes.base)
        for shape, wanted in self.fine:
            shapely.prepare(shape)
            near = shapely.intersects_xy(shapely.buffer(shapely.box(*shape.bounds), 16.0), gx.ravel(), gy.ravel())
            size[near] = np.minimum(size[near], wanted + _GROWTH * shapely.distance(points[near], shape))
        return (x[0], y[0], step, size.reshape(gx.shape), box(*bounds))

    def __call__(self, xy: np.ndarray) -> np.ndarray:
        x0, y0, step, table, _ = self.tables[1]
        size = map_coordinates(table, [(xy[:, 0] - x0) / step, (xy[:, 1] - y0) / step], order=1, mode="nearest")
        x0, y0, step, table, area = self.tables[0]
        near = shapely.contains_xy(area, xy[:, 0], xy[:, 1])
        size[near] = map_coordinates(
            table, [(xy[near, 0] - x0) / step, (xy[near, 1] - y0) / step], order=1, mode="nearest"
        )
        return size


def _resampled(ring: np.ndarray, size: SizeField) -> np.ndarray:
    """A closed ring redrawn with nodes one wanted edge apart; corners above 20 degrees stay."""
    p = ring[:-1]
    before, after = p - np.roll(p, 1, axis=0), np.roll(p, -1, axis=0) - p
    turn = np.abs(np.arctan2(before[:, 0] * after[:, 1] - before[:, 1] * after[:, 0], np.sum(before * after, axis=1)))
    corners = np.flatnonzero(turn > np.deg2rad(20))
    if not corners.size:
        corners = np.array([0])
    p = np.roll(p, -corners[0], axis=0)
    marks = [*(corners - corners[0]), len(p)]
    p = np.vstack([p, p[:1]])
    out = []
    for a, b in pairwise(marks):
        stretch = p[a : b + 1]
        along = np.concatenate([[0], np.cumsum(np.hypot(*np.diff(stretch, axis=0).T))])
        t = np.linspace(0, along[-1], max(int(along[-1] / 0.05), 2))
        dense = np.column_stack([np.interp(t, along, stretch[:, k]) for k in (0, 1)])
        rate = 1 / size(dense)
        count = np.concatenate([[0], np.cumsum((rate[1:] + rate[:-1]) / 2 * np.diff(t))])
        n = max(int(round(count[-1])), 1)
        at = np.interp(np.arange(n) * count[-1] / n, count, t)
        out.append(np.column_stack([np.interp(at, along, stretch[:, k]) for k in (0, 1)]))
    return np.vstack(out)


def _rows(place: geo.Place, size: SizeField, sizes: Sizes, outline: Polygon) -> np.ndarray:
    """Nodes along the banks' contours and along the weir crest."""
    c, rows = geo.course(), []
    if sizes.rows:
        pitch, lift = 2.3, geo.BANK_WIDTH / 4
        for side in (-1, 1):
            for k in range(4):
                s = np.arange(pitch + (k % 2) * pitch / 2, geo.LENGTH - pitch / 2, pitch)
                rows.append(c.at(s, side * (geo.half_bottom(s) + k * lift)))
    banks = np.vstack(rows) if rows else np.empty((0, 2))
    if len(banks):
        s, _ = c.locate(banks)
        mouth = shapely.union(geo.tributary_outline(), geo.basin_outline()).buffer(3.0)
        keep = (size(banks) > 0.97 * sizes.bank) & ~shapely.contains_xy(mouth, banks[:, 0], banks[:, 1])
        banks = banks[keep & (np.abs(s - geo.WEIR - 1) > 5.5)]
    crest = []
    for k, d in enumerate((-1.0, 0.0, 1.0)):
        n = np.arange(-19.0, 19.01, sizes.weir) + (k % 2) * sizes.weir / 2
        crest.append(c.at(np.full(len(n), geo.WEIR + d), n))
    points = np.vstack([banks, *crest])
    inner = outline.buffer(-0.7)
    return points[shapely.contains_xy(inner, points[:, 0], points[:, 1])]


def _seeds(size: SizeField, outline: Polygon, fixed: np.ndarray) -> np.ndarray:
    """Free nodes at least 0.8 of the wanted edge from every other: hexagonal lattices, finest first."""
    candidates = []
    smallest = size.sizes.finest
    level = 0
    while smallest * 2**level < size.sizes.base:
        d = 0.8 * smallest * 2**level
        # Only the surroundings of the piers are finer than the weir.
        areas = [(size.tables[0][4].bounds)] if smallest * 2 ** (level + 1) <= size.sizes.weir else [outline.bounds]
        for x0, y0, x1, y1 in areas:
            gx, gy = np.meshgrid(np.arange(x0, x1, d), np.arange(y0, y1, d * 0.8660254))
            gx = gx + (np.arange(len(gx))[:, None] % 2) * d / 2
            xy = np.column_stack([gx.ravel(), gy.ravel()])
            wanted = size(xy)
            xy = xy[(wanted >= smallest * 2**level * 0.999) & (wanted < smallest * 2 ** (level + 1))]
            candidates.append(xy[shapely.contains_xy(outline, xy[:, 0], xy[:, 1])])
        level += 1
    points = np.vstack(candidates)
    all_points = np.vstack([fixed, points])
    kept = thin_seeds(all_points, 0.8 * size(all_points), len(fixed))
    return all_points[kept][len(fixed) :]


def _bars(xy: np.ndarray, outline: Polygon) -> tuple[np.ndarray, np.ndarray]:
    """Triangles inside the outline and their distinct sides."""
    cells = Delaunay(xy).simplices
    middle = xy[cells].mean(axis=1)
    cells = cells[shapely.contains_xy(outline, middle[:, 0], middle[:, 1])]
    a, b, c = (xy[cells[:, k]] for k in range(3))
    area = np.abs((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0])
    cells = cells[area > 1e-3 * np.sum((b - a) ** 2, axis=1)]  # slivers between nodes of a straight side
    sides = np.sort(cells[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2), axis=1)
    return cells, np.unique(sides, axis=0)


def _springs(xy: np.ndarray, fixed: int, size: SizeField, outline: Polygon, sweeps: int = 60) -> np.ndarray:
    """Bars pushed towards 1.12 of the wanted length; long ones split, short ones lose an end."""
    for sweep in range(sweeps):
        _, bars = _bars(xy, outline)
        d = xy[bars[:, 1]] - xy[bars[:, 0]]
        length = np.hypot(*d.T)
        wanted = size((xy[bars[:, 0]] + xy[bars[:, 1]]) / 2)
        if sweep in (15, 28, 40):
            free = bars[:, 1] >= fixed
            drop = np.unique(bars[free & (length < 0.6 * wanted), 1])
            middle = (xy[bars[:, 0]] + xy[bars[:, 1]])[length > 1.45 * wanted] / 2
            middle = middle[shapely.contains_xy(outline.buffer(-0.3 * size.sizes.finest), *middle.T)]
            stays = np.ones(len(xy), bool)
            stays[drop] = False
            apart = thin_seeds(np.vstack([xy[stays], middle]), 0.75 * size(np.vstack([xy[stays], middle])), stays.sum())
            xy = np.vstack([xy[stays], middle])[apart]
            continue
        push = np.maximum(1.12 * wanted - length, 0) / length
        move = np.zeros_like(xy)
        np.add.at(move, bars[:, 0], -push[:, None] * d)
        np.add.at(move, bars[:, 1], push[:, None] * d)
        xy = _moved(xy, 0.2 * move, fixed, outline)
    return xy


def _moved(xy: np.ndarray, move: np.ndarray, fixed: int, outline: Polygon) -> np.ndarray:
    """Free nodes moved, unless that takes them out of the outline."""
    new = xy.copy()
    new[fixed:] += move[fixed:]
    inside = shapely.contains_xy(outline, new[:, 0], new[:, 1])
    inside[:fixed] = True
    new[~inside] = xy[~inside]
    return new


def _lloyd(xy: np.ndarray, fixed: int, size: SizeField, outline: Polygon, sweeps: int = 12) -> np.ndarray:
    """Free nodes to the mean of their triangles' centres, weighted by area / size^3."""
    for _ in range(sweeps):
        cells, _ = _bars(xy, outline)
        a, b, c = (xy[cells[:, k]] for k in range(3))
        middle = (a + b + c) / 3
        area = np.abs((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]) / 2
        weight = area / size(middle) ** 3
        total, moment = np.zeros(len(xy)), np.zeros_like(xy)
        for k in range(3):
            np.add.at(total, cells[:, k], weight)
            np.add.at(moment, cells[:, k], weight[:, None] * middle)
        used = total > 0
        move = np.zeros_like(xy)
        move[used] = moment[used] / total[used, None] - xy[used]
        xy = _moved(xy, move, fixed, outline)
    return xy


def _clear_of_sides(xy: np.ndarray, rings: list[np.ndarray]) -> np.ndarray:
    """Nodes with none inside the circle over a side of the outline: then Delaunay has that side."""
    nodes = np.vstack(rings)
    following = np.vstack([np.roll(r, -1, axis=0) for r in rings])
    middle, radius = (nodes + following) / 2, np.hypot(*(following - nodes).T) / 2
    tree = cKDTree(xy)
    near = np.unique(np.concatenate(tree.query_ball_point(middle, 1.02 * radius)).astype(int))
    stays = np.ones(len(xy), bool)
    stays[near[near >= len(nodes)]] = False
    return xy[stays]


def make_mesh(place: geo.Place, sizes: Sizes) -> Triangles:
    """Mesh one design.

    Raises ``RuntimeError`` when a side of the outline is missing from the triangles.
    """
    size = SizeField(place, sizes)
    rings = [np.asarray(r.coords) for r in (place.domain.exterior, *place.domain.interiors)]
    rings = [_resampled(r, size) for r in rings]
    outline = Polygon(rings[0], rings[1:])
    shapely.prepare(outline)
    ring_nodes = np.vstack(rings)
    fixed = _clear_of_sides(np.vstack([ring_nodes, _rows(place, size, sizes, outline)]), rings)
    free = _seeds(size, outline, fixed)
    xy = _springs(np.vstack([fixed, free]), len(fixed), size, outline)
    xy = _lloyd(_clear_of_sides(xy, rings), len(fixed), size, outline)
    xy = _clear_of_sides(xy, rings)
    cells, bars = _bars(xy, outline)
    have = set(map(tuple, bars))
    start = 0
    for ring in rings:
        n = len(ring)
        for i in range(n):
            pair = sorted((start + i, start + (i + 1) % n))
            if tuple(pair) not in have:
                raise RuntimeError(f"no triangle has the outline's side near {xy[pair[0]].round(1)}; refine the mesh there.")
        start += n
    return _ordered(xy, cells)


def _ordered(xy: np.ndarray, cells: np.ndarray) -> Triangles:
    """Cells and nodes along a Hilbert curve, cells anticlockwise, unused nodes left out."""
    a, b, c = (xy[cells[:, k]] for k in range(3))
    area = (b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]
    cells = np.where(area[:, None] > 0, cells, cells[:, ::-1])
    cells = cells[np.argsort(hilbert_key((a + b + c) / 3), kind="stable")]
    used = np.unique(cells)
    used = used[np.argsort(hilbert_key(xy[used]), kind="stable")]
    number = np.full(len(xy), -1)
    number[used] = np.arange(len(used))
    return Triangles(xy[used], number[cells].astype(np.int32))
