"""Jump fronts: where the flow across the steepest rise of depth passes from faster than its waves to slower.

An oblique front may leave the whole flow faster than its waves on both sides; only the part of the velocity that
crosses it passes Froude 1 (Ippen 1951).

References
----------
.. [1] Ippen, A.T. 1951, Mechanics of supercritical flow, Trans. ASCE 116, 268-295.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .._kernels import labels
from ..frame import Frame
from ..mesh import Mesh

LEAST_RISE = 1.1  # ratio of depths within a triangle and its neighbours (common practice, no source)
LEAST_TRIANGLES = 6  # fewer are not told from noise (common practice, no source)


@dataclass(frozen=True, eq=False)
class Front:
    """A jump front.

    Attributes
    ----------
    triangles : (k,) int32
        That it runs through.
    middle, along : (2,) float64
        Local m, and unit vector along the straight line that fits it best.
    length_m : float
        Extent along that line.
    angle_deg : float
        Between that line and the flow ahead of it: 90 for a jump square to the flow.
    depth_ratio : float
        Greatest over least depth of its triangles, by the median.
    """

    triangles: np.ndarray
    middle: np.ndarray
    along: np.ndarray
    length_m: float
    angle_deg: float
    depth_ratio: float


def jump_fronts(frame: Frame, *, gravity: float = 9.81) -> list[Front]:
    """Jump fronts of a frame, longest first.

    A triangle belongs to one when depth rises in it along the flow by a tenth or more, and the Froude number of the
    velocity along the rise, |u . n| / sqrt(g h), is above 1 at a corner and below 1 at another. Dry and nearly dry
    triangles are left out. The direction n of the rise is that of the gradient of depth about the triangle.
    """
    mesh, h = frame.mesh, frame.depth
    corners = mesh.triangles
    deep = h[corners]
    normal = _rise(mesh, h)
    q = np.einsum("mcj,mj->mc", frame.unit_discharge[corners], normal)
    safe = np.maximum(deep, 1e-9)
    froude = q / safe / np.sqrt(gravity * safe)
    found = (
        frame.wet_triangles & (deep.min(axis=1) > 2 * frame.wet_depth_m) & (deep.max(axis=1) > LEAST_RISE * deep.min(axis=1))
        & (froude.max(axis=1) > 1) & (froude.min(axis=1) < 1) & (q.min(axis=1) > 0)
    )
    return sorted((f for part in _parts(mesh, found) if (f := _front(frame, part)) is not None), key=lambda f: -f.length_m)


def _rise(mesh: Mesh, values: np.ndarray) -> np.ndarray:
    """Unit vector (m, 2) of the gradient of node values about each triangle: the mean over the triangles round its corners."""
    p, v = mesh.node_xy[mesh.triangles], values[mesh.triangles]
    turned = np.stack([p[:, [1, 2, 0], 1] - p[:, [2, 0, 1], 1], p[:, [2, 0, 1], 0] - p[:, [1, 2, 0], 0]], axis=2)
    weighted = np.einsum("mc,mcj->mj", v, turned)  # twice the area times the gradient
    at_nodes = np.zeros((mesh.n_nodes, 2))
    for c in range(3):
        np.add.at(at_nodes, mesh.triangles[:, c], weighted)
    about = at_nodes[mesh.triangles].sum(axis=1)
    size = np.hypot(*about.T)[:, None]
    return np.where(size > 0, about / np.where(size > 0, size, 1.0), 0.0)


def _parts(mesh: Mesh, found: np.ndarray) -> list[np.ndarray]:
    """Triangles of each connected part: those that share a corner belong together."""
    chosen = np.flatnonzero(found)
    if not chosen.size:
        return []
    corners = mesh.triangles[chosen]
    present = np.zeros(mesh.n_nodes, bool)
    present[corners] = True
    a, b = corners[:, [0, 1]].ravel(), corners[:, [1, 2]].ravel()
    part, count = labels.of_pairs(a, b, present)
    of = part[corners[:, 0]]
    return [chosen[of == k] for k in range(count) if np.count_nonzero(of == k) >= LEAST_TRIANGLES]


def _front(frame: Frame, triangles: np.ndarray) -> Front | None:
    mesh = frame.mesh
    at = mesh.triangle_centroid[triangles]
    middle = at.mean(axis=0)
    along = np.linalg.svd(at - middle, full_matrices=False)[2][0]
    s = (at - middle) @ along
    depth = frame.depth[mesh.triangles[triangles]]
    shallow = mesh.triangles[triangles, depth.argmin(axis=1)]
    flow = frame.unit_discharge[shallow].mean(axis=0)
    if not np.hypot(*flow) > 0:
        return None
    cosine = abs(float(flow @ along)) / float(np.hypot(*flow))
    return Front(
        triangles, middle, along, float(np.ptp(s)), float(np.degrees(np.arccos(min(cosine, 1.0)))),
        float(np.median(depth.max(axis=1) / depth.min(axis=1))),
    )
