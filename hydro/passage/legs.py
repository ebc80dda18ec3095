"""Chains of legs from the start over resting areas to the goal: the least worst leg first, then the least time."""

from __future__ import annotations

import heapq
import math
from dataclasses import dataclass, replace

import numpy as np

from .._kernels import route as kernel
from ..frame import Frame
from ..settings import Settings
from .areas import Area, Areas, Places, around, find_areas
from .fish import Fish
from .water import Drops, Routes, Water, find_drops, gathered, make_routes, make_water

_BAND_RINGS = 3  # triangles either side of a route that its first refinement may use; later ones use one
_BAND_POINTS = 7  # points a side there
_ROUNDS, _CLOSEST = 16, 0.125  # refinements at most; share of a side over which the points of the last ones spread
_OVER = 1e9  # s; in the choice by time, a leg over the limit weighs more than any swim


@dataclass(frozen=True, eq=False)
class Leg:
    """A swim without rest between two areas.

    Attributes
    ----------
    from_area, to_area : Area
    fatigue : float
        Share of endurance used, 1: exhausted. Water that bars the fish counts BARRED a body length and more.
    seconds : float
        Swimming time.
    path : (k, 2) float64
        Local m.
    within : (k - 1,) int32
        The mesh's triangle that each link of the path lies in.
    """

    from_area: Area
    to_area: Area
    fatigue: float
    seconds: float
    path: np.ndarray
    within: np.ndarray


@dataclass(frozen=True, eq=False)
class LegChain:
    """Legs from start to goal in order.

    ``moved`` is the share by which the worst leg's fatigue fell in the last refinement of headings (the direction
    error shown), ``first_worst`` the worst leg on the first net. ``relaxed``: barred water was let through to find
    the least barred way.
    """

    legs: tuple[Leg, ...]
    relaxed: bool
    recovering: bool
    first_worst: float
    moved: float

    @property
    def worst(self) -> float:
        return max(leg.fatigue for leg in self.legs)

    @property
    def worst_index(self) -> int:
        """Place of the worst leg in ``legs``."""
        return int(np.argmax([leg.fatigue for leg in self.legs]))

    @property
    def seconds(self) -> float:
        return sum(leg.seconds for leg in self.legs)


@dataclass(frozen=True, eq=False)
class Search:
    """One frame, fish and set of areas, ready to be searched."""

    water: Water
    fish: Fish
    areas: Areas
    drops: Drops
    settings: Settings

    def least_worst(self, *, bound: float = math.inf, recovering: bool = True, relaxed: bool = False) -> float:
        """Fatigue of the worst leg of the best chain; infinite where none keeps every leg within ``bound``."""
        areas, label = self._labels(recovering)
        return float(self._chain(areas, label, bound, relaxed).worst[Areas.GOAL])

    def best_chain(self, *, recovering: bool = True, relaxed: bool = False) -> LegChain | None:
        """The chain with the least worst leg and, among those, the least time; None where there is no way."""
        areas, label = self._labels(recovering)
        found = self._chain(areas, label, math.inf, relaxed)
        worst = float(found.worst[Areas.GOAL])
        if not math.isfinite(worst):
            return None
        if len(areas.items) == 2:
            legs: tuple[Leg, ...] = (self._only_leg(areas, found),)
        else:
            legs = self._quickest(areas, label, worst * (1 + 1e-9) + 1e-12, relaxed)
        return self._refined(areas, LegChain(legs, relaxed, recovering, worst, 0.0))

    def _labels(self, recovering: bool) -> tuple[Areas, np.ndarray]:
        """The areas that count, and the area of each point; without recovery only start and goal do."""
        areas = self.areas if recovering else self.areas.ends()
        return areas, areas.labels(self.water.routes)

    def _chain(self, areas: Areas, label: np.ndarray, bound: float, relaxed: bool) -> kernel.Chain:
        start, points = areas.rims(self.water.routes, label)
        return kernel.chain_of_legs(
            self.water.routes.net, self.water.points, self.water.drops, self.fish.swimmer(self.settings), label,
            start, points, Areas.START, Areas.GOAL, bound, relaxed,
        )

    def _only_leg(self, areas: Areas, found: kernel.Chain) -> Leg:
        """The leg from start to goal where there is no other area."""
        goal = Areas.GOAL
        points = np.ascontiguousarray(found.paths[found.path_start[goal] : found.path_end[goal]][::-1])
        cost = float(found.fatigue[goal]), float(found.seconds[goal])
        return Leg(areas.items[0], areas.items[1], *cost, *_path(self.water, points))

    def _quickest(self, areas: Areas, label: np.ndarray, bound: float, relaxed: bool) -> tuple[Leg, ...]:
        """Dijkstra over areas by time; a leg over the limit of 1 is taken only where nothing else leads on."""
        routes, points = self.water.routes, self.water.points
        start, rim = areas.rims(routes, label)
        arrival = {Areas.START: 0.0}
        sources = {Areas.START: rim[start[Areas.START] : start[Areas.START + 1]]}
        into: dict[int, tuple[int, Leg]] = {}
        queue, done = [(0.0, Areas.START)], set()
        swimmer = self.fish.swimmer(self.settings)
        while queue:
            _, at = heapq.heappop(queue)
            if at in done:
                continue
            done.add(at)
            if at == Areas.GOAL:
                break
            entry, cost, parent = kernel.legs_from(
                routes.net, points, self.water.drops, swimmer, label, len(areas.items), sources[at], at, -1, bound, relaxed
            )
            for other in np.flatnonzero(entry >= 0).tolist():
                fatigue, seconds = cost[entry[other]]
                when = arrival[at] + seconds + _OVER * max(0.0, fatigue - 1.0)
                if other not in done and when < arrival.get(other, math.inf):
                    arrival[other], sources[other] = when, entry[other : other + 1]
                    path = _path(self.water, kernel.traced(parent, entry[other]))
                    into[other] = at, Leg(areas.items[at], areas.items[other], float(fatigue), float(seconds), *path)
                    heapq.heappush(queue, (when, other))
        legs = []
        at = Areas.GOAL
        while at != Areas.START:
            at, leg = into[at]
            legs.append(leg)
        return tuple(reversed(legs))

    def _refined(self, areas: Areas, chain: LegChain) -> LegChain:
        """The same chain with its headings refined round the route until the worst leg settles."""
        share = 0.5
        for _ in range(_ROUNDS):
            before = max(self._effort(leg) for leg in chain.legs)
            if before == 0.0:
                break
            chain = self._again(areas, chain, share)
            moved = 1.0 - max(self._effort(leg) for leg in chain.legs) / before
            chain = replace(chain, moved=moved)
            if moved < self.settings["passage_direction_error"]:
                if share <= _CLOSEST:
                    break
                share /= 2
        return chain

    def _effort(self, leg: Leg) -> float:
        """What the choice of headings makes least: fatigue, with time at its small weight."""
        return leg.fatigue + self.settings["passage_time_weight"] * leg.seconds

    def _again(self, areas: Areas, chain: LegChain, share: float) -> LegChain:
        """Every leg that matters searched once more in a band round it; a leg that finds nothing better stays."""
        legs: list[Leg] = []
        most = max(self._effort(leg) for leg in chain.legs)
        for leg in chain.legs:
            better = None
            if self._effort(leg) > 0.1 * most:
                better = self._leg_again(areas, leg, legs[-1].path[-1] if legs else None, share, chain.relaxed)
            legs.append(leg if better is None or self._effort(better) > self._effort(leg) else better)
        return replace(chain, legs=tuple(legs))

    def _leg_again(self, areas: Areas, leg: Leg, begin: np.ndarray | None, share: float, relaxed: bool) -> Leg | None:
        """A leg on a denser net in a band round it, from ``begin`` or anywhere in the start; None if it fails."""
        mesh = self.water.frame.mesh
        routes = make_routes(mesh, _BAND_POINTS, around(mesh, leg.within, _BAND_RINGS if share == 0.5 else 1))
        if share < 0.5:
            routes = gathered(routes, leg.path, share)
        water = make_water(routes, self.water.frame, self.drops, self.water.flow)
        label = areas.labels(routes)
        own, target = areas.items.index(leg.from_area), areas.items.index(leg.to_area)
        sources = np.flatnonzero(label == own).astype(np.int32)
        if not sources.size:
            return None
        if begin is not None:
            sources = sources[[np.hypot(*(water.points[sources, :2] - begin).T).argmin()]]
        entry, cost, parent = kernel.legs_from(
            routes.net, water.points, water.drops, self.fish.swimmer(self.settings), label, len(areas.items), sources,
            own, target, math.inf, relaxed,
        )
        if entry[target] < 0:
            return None
        fatigue, seconds = cost[entry[target]]
        path = _path(water, kernel.traced(parent, entry[target]))
        return Leg(leg.from_area, leg.to_area, float(fatigue), float(seconds), *path)


def _path(water: Water, points: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Coordinates of points, and the mesh's triangles that the links between them lie in."""
    return water.points[points, :2], water.routes.triangles[kernel.triangles_between(points, water.routes.net)]


def prepare(
    frame: Frame, fish: Fish, places: Places, settings: Settings, *, sills: tuple[np.ndarray, ...] = (),
    routes: Routes | None = None,
) -> Search:
    """A search ready to run; ``routes`` of the frame's mesh are made where none are handed over to be shared."""
    if routes is None:
        routes = make_routes(frame.mesh, int(settings["passage_points_per_side"]))
    drops = find_drops(frame, fish.greatest_drop_m, 3 * fish.length_m, sills)
    water = make_water(routes, frame, drops)
    return Search(water, fish, find_areas(frame, water.flow, fish, places, drops), drops, settings)
