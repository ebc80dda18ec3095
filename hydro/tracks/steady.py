"""Streamlines of one frame: exactly along psi, or by Runge-Kutta on the nodal velocity."""

from __future__ import annotations

import numpy as np

from .._kernels import along as kernel
from ..streamfunction import StreamFunction
from ..transfer import barycentric
from .lines import Traced, Track, open_sides

_WHY = {
    kernel.LEFT: "left", kernel.WALL: "at a wall", kernel.LIMIT: "limit reached", kernel.CLOSED: "closed", kernel.STILL: "still water",
}


def streamlines(
    sf: StreamFunction, starts: np.ndarray, *, direction: str = "both", most_points: int = 200_000
) -> Traced:
    """Streamlines that conserve: each is a contour of psi, crossed triangle by triangle.

    A closed streamline closes to the bit. Travel times come from depth over unit discharge.

    Parameters
    ----------
    starts : (k, 2) array_like
        Local points, m.
    direction : "down", "up" or "both"
        Along the flow, against it, or both ways joined at the start (time negative upstream).
    most_points : int
        Points after which a line is cut, with "limit reached".

    Returns
    -------
    Traced
        One track a start, in order; a start outside the water has one point and says so.

    Raises
    ------
    ValueError
        Unknown direction, or a frame whose psi says too little to be drawn.
    """
    if direction not in ("down", "up", "both"):
        raise ValueError(f"direction {direction!r} is not known; say down, up or both.")
    if not sf.drawn:
        raise ValueError("storage explains more than half of this frame's flow; it has no stream function to trace along.")
    mesh = sf.frame.mesh
    starts = np.atleast_2d(np.asarray(starts, float))
    found = mesh.find(starts)
    sides = open_sides(mesh, sf.open_boundaries)
    return Traced(tuple(
        _one(sf, i, starts[i], int(found[i]), sides, direction, most_points) for i in range(len(starts))
    ))


def _one(sf: StreamFunction, number: int, start, t: int, sides, direction: str, most: int) -> Track:
    mesh = sf.frame.mesh
    if t < 0 or not sf.domain[t]:
        return Track("streamline", number, start[None], np.zeros(1), np.array([t], np.int32), "outside the water")
    corners = mesh.triangles[t]
    level = float(barycentric(mesh.node_xy, corners[None], start[None])[0] @ sf.corners(np.array([t]))[0])
    parts = {}
    for way in (("down", "up") if direction == "both" else (direction,)):
        parts[way] = _follow(sf, start, t, level, way == "down", sides, most)
        if parts[way][3] == kernel.CLOSED:
            break
    if len(parts) == 1:
        way, (xy, time, tri, why) = next(iter(parts.items()))
        if way == "up":
            xy, time, tri = xy[::-1], -time[::-1], tri[::-1]
        return Track("streamline", number, xy, time, tri, _WHY[why], psi=level, error_m=0.0)
    down, up = parts["down"], parts["up"]
    xy = np.vstack([up[0][:0:-1], down[0]])
    time = np.concatenate([-up[1][:0:-1], down[1]])
    return Track(
        "streamline", number, xy, time, np.concatenate([up[2][:0:-1], down[2]]), _WHY[down[3]], psi=level, error_m=0.0
    )


def _seen_by_triangles(sf: StreamFunction):
    """Nodes, triangles, psi and depth; triangles beside a link's path have corners of their own, with psi's jump in them.

    Returns (xy, triangles, psi, depth, which triangles those are).
    """
    mesh, (beside, _) = sf.frame.mesh, sf.seam
    psi, marked = np.where(np.isnan(sf.psi), np.inf, sf.psi), np.zeros(mesh.n_triangles, bool)
    if not beside.size:
        return mesh.node_xy, mesh.triangles, psi, sf.frame.depth, marked
    marked[beside] = True
    old = mesh.triangles[beside].ravel()
    triangles = mesh.triangles.copy()
    triangles[beside] = mesh.n_nodes + np.arange(len(old), dtype=triangles.dtype).reshape(-1, 3)
    return (
        np.vstack([mesh.node_xy, mesh.node_xy[old]]), triangles, np.concatenate([psi, sf.corners(beside).ravel()]),
        np.concatenate([sf.frame.depth, sf.frame.depth[old]]), marked,
    )


def _follow(sf: StreamFunction, start, t, level, forward, sides, most):
    room = 2048
    xy_of, triangles, psi, depth, beside = _seen_by_triangles(sf)
    while True:
        room = min(room, most)
        xy, time, tri = np.empty((room, 2)), np.empty(room), np.empty(room, np.int32)
        n, why = kernel.follow(
            xy_of, triangles, sf.frame.mesh.neighbours, sf.domain, psi, depth, sides, beside, t, start[0], start[1], level, forward,
            xy, time, tri,
        )
        if why != kernel.LIMIT or room >= most:
            return xy[:n].copy(), time[:n].copy(), tri[:n].copy(), why
        room *= 8
