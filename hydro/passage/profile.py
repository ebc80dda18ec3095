"""A route point by point: what the fish meets, how it swims, and where and by how much it is barred."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .._kernels import route as kernel
from .._kernels.swim import LEAST_DEPTH
from .legs import LegChain, Search
from .water import barycentric

TOO_FAST, TOO_SHALLOW, DROP, TOO_LONG = "too fast", "too shallow", "drop", "too long without rest"
_THIN_M = 1e-6


@dataclass(frozen=True, eq=False)
class Profile:
    """Values along a route, one a point; those of a stretch stand at its end.

    Attributes
    ----------
    xy : (k, 2) local m
    distance_m : (k,) along the route from the start
    leg : (k,) int, from 1
    resting : (k,) bool
        The stretch to this point lies in a resting area.
    depth_m, bed_m, level_m, head_m, speed_m_s : (k,)
        The water's; head is level plus u2/2g.
    against_m_s : (k,)
        Current against the heading, positive when it has to be swum against.
    swim_speed_m_s, ground_speed_m_s : (k,)
        Through the water and over the ground; the ground speed is 0 where the way is barred.
    fatigue : (k,)
        Since the leg began; barred stretches are left out.
    seconds : (k,)
        Swimming time from the start of the route, barred stretches at the highest speed of the data.
    beyond : (k, 3)
        Speed excess, depth deficit (shares of the limits) and drop (1: barred) of the stretch to this point.
    rise_m : (k,)
        Rise of the level that bars the triangle of the stretch; 0 where it bars none.
    """

    xy: np.ndarray
    distance_m: np.ndarray
    leg: np.ndarray
    resting: np.ndarray
    depth_m: np.ndarray
    bed_m: np.ndarray
    level_m: np.ndarray
    head_m: np.ndarray
    speed_m_s: np.ndarray
    against_m_s: np.ndarray
    swim_speed_m_s: np.ndarray
    ground_speed_m_s: np.ndarray
    fatigue: np.ndarray
    seconds: np.ndarray
    beyond: np.ndarray
    rise_m: np.ndarray

    @property
    def barred(self) -> np.ndarray:
        """(k,) bool: the stretch to this point is beyond the fish."""
        return np.any(self.beyond > 0, axis=1)


@dataclass(frozen=True, slots=True)
class Barrier:
    """What stops the fish on the least barred way.

    Attributes
    ----------
    kind : str
        "too fast", "too shallow", "drop" or "too long without rest".
    leg : int
        From 1.
    xy : tuple of float
        Local m: the worst point, or where the endurance is used up.
    value, limit : float
        In ``unit``: speed needed and highest of the data (m/s); depth and least depth (m); rise of the level and
        greatest drop (m); fatigue of the leg and 1 (-).
    length_m : float
        How far it goes on along the route; for a leg, its length.
    depth_m, speed_m_s : float
        Of the water there.
    """

    kind: str
    leg: int
    xy: tuple[float, float]
    value: float
    limit: float
    unit: str
    length_m: float
    depth_m: float
    speed_m_s: float

    @property
    def beyond(self) -> float:
        """By how much, in ``unit``."""
        return abs(self.value - self.limit)


def profile(search: Search, chain: LegChain) -> Profile:
    """The route of a chain with everything that is met along it."""
    parts = [_leg_profile(search, leg, i) for i, leg in enumerate(chain.legs)]
    joined = {name: np.concatenate([p[name] for p in parts]) for name in parts[0]}
    step = np.hypot(*np.diff(joined["xy"], axis=0, prepend=joined["xy"][:1]).T)
    joined["distance_m"] = np.cumsum(step)
    joined["seconds"] = np.cumsum(joined["seconds"])
    return Profile(**joined)


def _leg_profile(search: Search, leg, index: int) -> dict[str, np.ndarray]:
    frame, mesh = search.water.frame, search.water.frame.mesh
    path = leg.path
    within = leg.within
    own = search.areas.items.index(leg.from_area)
    resting = np.concatenate([[True], search.areas.of_triangle[within] == own])
    at = np.concatenate([within[:1], within])
    weight = barycentric(mesh, at, path)
    corners = mesh.triangles[at]
    h, q, bed = (np.einsum("ij,ij...->i...", weight, v[corners]) for v in (frame.depth, search.water.flow, frame.bed))
    u = np.where(h[:, None] > _THIN_M, q / np.maximum(h, _THIN_M)[:, None], 0.0)
    points = np.column_stack([path, h, u])
    swimmer = search.fish.swimmer(search.settings)
    swimmer[LEAST_DEPTH] *= 1 - 1e-9  # a route along the very limit is not barred by round-off
    links = kernel.walked(points, within, resting[1:], search.drops.barred, swimmer)
    links = np.vstack([np.zeros((1, 7)), links])
    links[0, 2:4] = links[min(1, len(links) - 1), 2:4]
    barred = (links[:, 4:] > 0).any(axis=1)
    heading = np.diff(path, axis=0, prepend=path[:1])
    heading[0] = heading[min(1, len(path) - 1)]
    length = np.maximum(np.hypot(*heading.T), 1e-12)
    speed = np.hypot(*u.T)
    return {
        "xy": path, "leg": np.full(len(path), index + 1), "resting": resting, "depth_m": h, "bed_m": bed,
        "level_m": bed + h, "head_m": bed + h + speed**2 / (2 * search.settings["gravity_m_s2"]), "speed_m_s": speed,
        "against_m_s": -np.einsum("ij,ij->i", u, heading) / length, "swim_speed_m_s": links[:, 2],
        "ground_speed_m_s": links[:, 3], "fatigue": np.cumsum(np.where(barred, 0.0, links[:, 0])),
        "seconds": links[:, 1], "beyond": links[:, 4:], "rise_m": search.drops.rise_m[at],
    }


def barriers(search: Search, chain: LegChain, route: Profile) -> tuple[Barrier, ...]:
    """Everything that bars a chain, in the order in which the fish meets it."""
    found: list[tuple[float, Barrier]] = []
    step = np.diff(route.distance_m, prepend=0.0)
    for number in range(1, len(chain.legs) + 1):
        own = route.leg == number
        for column, kind in enumerate((TOO_FAST, TOO_SHALLOW, DROP)):
            for run in _runs(own & (route.beyond[:, column] > 0), route.distance_m, 3 * search.fish.length_m):
                found.append((route.distance_m[run[0]], _barrier(search, route, run, column, kind, number, step)))
        tired = np.flatnonzero(own & (route.fatigue >= 1.0))
        if tired.size:
            i, swum = tired[0], step[own & ~route.resting].sum()
            found.append((route.distance_m[i], Barrier(
                TOO_LONG, number, _point(route.xy[i]), float(route.fatigue[own].max()), 1.0, "-", float(swum),
                float(route.depth_m[i]), float(route.speed_m_s[i]),
            )))
    return tuple(b for _, b in sorted(found, key=lambda pair: pair[0]))


def _barrier(search: Search, route: Profile, run: np.ndarray, column: int, kind: str, leg: int, step) -> Barrier:
    fish = search.fish
    worst = run[np.argmax(route.rise_m[run] if kind == DROP else route.beyond[run, column])]
    value, limit, unit = {
        TOO_FAST: (fish.top_speed_m_s * (1 + route.beyond[worst, 0]), fish.top_speed_m_s, "m/s"),
        TOO_SHALLOW: (fish.least_depth_m * (1 - route.beyond[worst, 1]), fish.least_depth_m, "m"),
        DROP: (route.rise_m[run].max(), fish.greatest_drop_m, "m"),
    }[kind]
    return Barrier(
        kind, leg, _point(route.xy[worst]), float(value), limit, unit, float(step[run].sum()),
        float(route.depth_m[run].min()), float(route.speed_m_s[run].max()),
    )


def _runs(chosen: np.ndarray, distance: np.ndarray, gap: float) -> list[np.ndarray]:
    """Indices of chosen points in groups; those less than ``gap`` m apart along the route belong together."""
    index = np.flatnonzero(chosen)
    return [part for part in np.split(index, np.flatnonzero(np.diff(distance[index]) > gap) + 1) if part.size]


def _point(xy: np.ndarray) -> tuple[float, float]:
    return float(xy[0]), float(xy[1])
