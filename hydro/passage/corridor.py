"""How wide the water is that lets a fish keep to its route: metres and faces side by side."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .legs import Search
from .profile import Profile
from .water import barycentric

_PER_FACE = 4  # samples across the width of a face
_FARTHEST_FACES = 40  # nobody asks about the width of wider water


@dataclass(frozen=True, slots=True)
class Corridor:
    """The narrowest place of a route outside resting areas.

    ``width_m`` and ``faces`` count water deep and slow enough for the heading there, square to the route; ``at_least``:
    the water goes on beyond where it was looked at.
    """

    width_m: float
    faces: int
    xy: tuple[float, float]  # local m
    at_least: bool
    resolved: bool


def narrowest(search: Search, route: Profile) -> Corridor | None:
    """The narrowest place along the swum, unbarred part of a route; None where the whole route is at rest or barred.

    A width ends at the first sample that is too shallow, outside the mesh, or so fast that the heading could not be
    kept. Fatigue is not looked at: a corridor is where the fish is not barred, not where it would be just as quick.
    """
    chosen = np.flatnonzero(~route.resting & ~route.barred)
    chosen = chosen[chosen > 0]
    if not chosen.size:
        return None
    middle = (route.xy[chosen] + route.xy[chosen - 1]) / 2
    heading = route.xy[chosen] - route.xy[chosen - 1]
    length = np.hypot(*heading.T)
    chosen, middle, heading = chosen[length > 0], middle[length > 0], (heading / np.maximum(length, 1e-12)[:, None])[length > 0]
    mesh = search.water.frame.mesh
    face = mesh.triangle_face[np.maximum(mesh.find(middle), 0)]
    step = np.sqrt(mesh.face_area[face]) / _PER_FACE
    width, faces, open_end = np.full(len(middle), step), np.zeros(len(middle), int), np.zeros(len(middle), bool)
    for side in (1.0, -1.0):
        far, count, beyond = _one_side(search, middle, heading, side * step, face)
        width, faces, open_end = width + far, faces + count, open_end | beyond
    faces += 1  # the route's own
    worst = int(np.lexsort((faces, width))[0])
    least = int(search.settings["passage_corridor_faces"])
    fewest = int(faces.min())
    return Corridor(
        float(width[worst]), fewest, (float(middle[worst, 0]), float(middle[worst, 1])), bool(open_end[worst]), fewest >= least
    )


def _one_side(search: Search, middle, heading, step, own_face):
    """How far (m) the water goes on to one side, how many other faces it touches, and whether it went on beyond."""
    mesh = search.water.frame.mesh
    normal = np.column_stack([-heading[:, 1], heading[:, 0]])
    far, count = np.zeros(len(middle)), np.zeros(len(middle), int)
    going, last_face = np.ones(len(middle), bool), own_face.copy()
    for k in range(1, _PER_FACE * _FARTHEST_FACES + 1):
        i = np.flatnonzero(going)
        if not i.size:
            break
        xy = middle[i] + (k * step[i])[:, None] * normal[i]
        triangle = mesh.find(xy)
        fits = (triangle >= 0) & _fits(search, triangle, xy, heading[i])
        going[i[~fits]] = False
        i, face = i[fits], mesh.triangle_face[triangle[fits]]
        far[i] = k * np.abs(step[i])
        count[i] += face != last_face[i]
        last_face[i] = face
    return far, count, going


def _fits(search: Search, triangle: np.ndarray, xy: np.ndarray, heading: np.ndarray) -> np.ndarray:
    """(k,) bool: deep enough, and slow enough to keep the heading."""
    frame, fish = search.water.frame, search.fish
    weight, corner = barycentric(frame.mesh, triangle, xy), frame.mesh.triangles[np.maximum(triangle, 0)]
    h, q = (np.einsum("ij,ij...->i...", weight, v[corner]) for v in (frame.depth, search.water.flow))
    u = fish.position_factor * q / np.maximum(h, 1e-6)[:, None]
    along = np.einsum("ij,ij->i", u, heading)
    across = u[:, 0] * heading[:, 1] - u[:, 1] * heading[:, 0]
    need = np.where(along > 0, np.abs(across), np.hypot(along, across))
    return (h >= fish.least_depth_m) & (need < fish.top_speed_m_s)
