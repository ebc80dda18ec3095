"""Contour, area, volume and centre of a region, to better than a triangle."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import shapely

from .._kernels import contour
from ..streamfunction import StreamFunction
from ..streamfunction.solve import node_triangles
from .regions import Region


@dataclass(frozen=True, eq=False)
class Shape:
    """A region cut out of the mesh at its dividing level.

    Attributes
    ----------
    triangles : (t,) int32
        Triangles that it covers wholly or partly.
    areas : (t,) float64
        The part of each that it covers, m2.
    polygon : shapely Polygon or MultiPolygon
        Local metres.
    area_m2, volume_m3, max_depth_m : float
    """

    triangles: np.ndarray
    areas: np.ndarray
    polygon: shapely.Polygon | shapely.MultiPolygon
    area_m2: float
    volume_m3: float
    max_depth_m: float


def shape_of(sf: StreamFunction, region: Region, level: float | None = None) -> Shape:
    """The part of a region beyond ``level`` (default: its dividing level), m3/s."""
    mesh = sf.frame.mesh
    edge = region.level if level is None else level
    triangles = triangles_round(sf, region.nodes)
    values = region.sign * np.nan_to_num(sf.psi)
    if level is None:  # what is not of the region lies below it, round-off or not
        own = values[region.nodes]
        values = np.minimum(values, region.sign * edge)
        values[region.nodes] = own
    corners, number, area, volume, deepest = contour.cut(
        mesh.node_xy, mesh.triangles, triangles, values, region.sign * edge, sf.frame.depth
    )
    held = (number >= 3) & (area > 0)
    polygon = _joined(corners[held], number[held])
    return Shape(
        triangles[held], area[held], polygon, float(area[held].sum()), float(volume[held].sum()),
        float(deepest[held].max(initial=0.0)),
    )


def triangles_round(sf: StreamFunction, nodes: np.ndarray) -> np.ndarray:
    """Domain triangles (t,) int32 with a corner among the nodes."""
    start, around = node_triangles(sf.frame.mesh)
    count = start[nodes + 1] - start[nodes]
    place = np.repeat(start[nodes] - np.concatenate([[0], np.cumsum(count)[:-1]]), count) + np.arange(count.sum())
    found = np.unique(around[place])
    return found[sf.domain[found]]


def peak_of(sf: StreamFunction, region: Region) -> tuple[np.ndarray, float]:
    """Place (2,) and value of the extremum, from the quadratic that fits psi best round its node.

    Where the node is a wall (water that goes round an island), or the fit has no extremum near, the
    node's own.
    """
    wall = sf.shape.wall_of_node[region.peak]
    if wall >= 0:
        return sf.frame.mesh.node_xy[sf.walls[wall].nodes].mean(axis=0), float(sf.psi[region.peak])
    return _stationary(sf, region.peak, lambda h: np.linalg.det(h) > 0 and region.sign * h[0, 0] < 0)


def saddle_of(sf: StreamFunction, node: int) -> np.ndarray:
    """Place (2,) of the saddle of psi near a node, by the same fit."""
    return _stationary(sf, node, lambda h: np.linalg.det(h) < 0)[0]


def _stationary(sf: StreamFunction, node: int, wanted: Callable[[np.ndarray], bool]) -> tuple[np.ndarray, float]:
    """Place and value where the gradient of the best quadratic round a node is zero; the node's own failing that."""
    mesh = sf.frame.mesh
    own = mesh.node_xy[node], float(sf.psi[node])
    near = np.unique(mesh.triangles[triangles_round(sf, np.array([node]))])
    ring = np.unique(mesh.triangles[triangles_round(sf, near[sf.shape.wall_of_node[near] < 0])])
    d = mesh.node_xy[ring] - own[0]
    size = float(np.hypot(*d.T).max())
    x, y = d.T / size
    weight = np.exp(-2.0 * (x * x + y * y))
    table = np.column_stack([np.ones_like(x), x, y, x * x, x * y, y * y])
    if len(ring) < 8:
        return own
    c = np.linalg.lstsq(table * weight[:, None], sf.psi[ring] * weight, rcond=None)[0]
    hessian = np.array([[2 * c[3], c[4]], [c[4], 2 * c[5]]])
    if not wanted(hessian):
        return own
    step = -np.linalg.solve(hessian, c[1:3])
    if np.hypot(*(step * size)) > np.hypot(*(mesh.node_xy[near] - own[0]).T).max():
        return own
    return own[0] + step * size, float(c[0] + c[1:3] @ step / 2)


def _joined(corners: np.ndarray, number: np.ndarray):
    """One outline of pieces that share sides exactly."""
    pieces = []
    for n in (3, 4):
        rings = corners[number == n, :n]
        if len(rings):
            pieces.append(shapely.polygons(np.concatenate([rings, rings[:, :1]], axis=1)))
    return shapely.coverage_union_all(np.concatenate(pieces)) if pieces else shapely.Polygon()
