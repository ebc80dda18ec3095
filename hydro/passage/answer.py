"""Is the way upstream excluded for this fish in this frame, and if so, where, by how much and in which leg?"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from ..figure import Place, printed
from ..frame import Frame
from ..mesh import Mesh
from ..reach import Reach
from ..settings import Settings
from ..streamfunction.boundaries import open_boundaries, with_discharge
from .areas import Places, places_of
from .corridor import Corridor, narrowest
from .fish import Fish
from .legs import LegChain, Search, prepare
from .profile import TOO_LONG, Barrier, Profile, barriers, profile
from .sills import sills_of
from .water import Routes

NOT_EXCLUDED, EXCLUDED, NOT_ASSESSED = "not excluded", "excluded", "not assessed"
_CHANGE = 0.1  # flow that changes by more than this share during the swim is not steady


@dataclass(frozen=True, slots=True)
class LegFigures:
    """One leg in figures; lengths and extremes are those of its swum part, outside resting areas.

    ``fatigue`` leaves out barred stretches, whose length is ``barred_m``.
    """

    number: int
    from_area: str
    to_area: str
    length_m: float
    barred_m: float
    fatigue: float
    seconds: float
    greatest_speed_m_s: float
    least_depth_m: float
    place: Place  # where the water is fastest


@dataclass(frozen=True, slots=True)
class Stamp:
    """Which frame an answer belongs to; as in :class:`hydro.frame.Frame`."""

    index: int
    seconds: float
    time: np.datetime64 | None
    kind: str
    field: str


@dataclass(frozen=True, eq=False)
class Answer:
    """The answer for one fish and frame.

    Attributes
    ----------
    search : Search or None
        Water, areas and nets, for drawing; let go by :meth:`light`.
    status : str
        "not excluded" (by depth and mean speed), "excluded" or "not assessed".
    reason : str
        One sentence: the worst leg, the first barrier, or why nothing was assessed.
    discharge_m3_s : float
        Half the sum of what crosses the open boundaries.
    chain, route, legs, barriers, corridor
        The best chain, or the least barred one where the way is excluded; None or empty if not assessed.
    alone_status : str
        The answer without recovery at rest.
    alone_fatigue : float
        Fatigue of the whole way without recovery; infinite where it is barred.
    flags : tuple of str
    """

    fish: Fish
    mesh: Mesh
    stamp: Stamp
    search: Search | None
    status: str
    reason: str
    discharge_m3_s: float
    chain: LegChain | None
    route: Profile | None
    legs: tuple[LegFigures, ...]
    barriers: tuple[Barrier, ...]
    corridor: Corridor | None
    alone_status: str
    alone_fatigue: float
    flags: tuple[str, ...] = ()

    def light(self) -> Answer:
        """The same answer without the arrays of its water, for keeping many."""
        return replace(self, search=None)

    @property
    def worst_leg(self) -> LegFigures | None:
        return self.legs[self.chain.worst_index] if self.chain else None

    @property
    def transit_s(self) -> float:
        """Swimming time from start to goal, s; NaN where the way is excluded or not assessed."""
        return self.chain.seconds if self.chain and self.status == NOT_EXCLUDED else math.nan

    @property
    def sentence(self) -> str:
        """The answer in words, with its flow."""
        head = f"{self.fish.name} at {printed(self.discharge_m3_s)} m3/s: "
        if self.status == NOT_ASSESSED:
            return f"{head}not assessed; {self.reason}"
        words = "not excluded by depth and mean speed" if self.status == NOT_EXCLUDED else "excluded"
        alone = "also " if (self.alone_status == NOT_EXCLUDED) == (self.status == NOT_EXCLUDED) else ""
        alone_words = "not excluded" if self.alone_status == NOT_EXCLUDED else "excluded"
        return f"{head}{words}; {self.reason} Without recovery at rest: {alone}{alone_words}."


def through_discharge(frame: Frame, settings: Settings, boundary_sets=None) -> float:
    """Half the sum of |discharge| over the open boundaries, m3/s."""
    found = open_boundaries(frame, settings, boundary_sets)
    inside = np.ones(frame.mesh.n_triangles, bool)
    return 0.5 * sum(abs(b.discharge_m3_s) for b in with_discharge(frame, found, inside))


def assess(
    frame: Frame, fish: Fish, reach: Reach, settings: Settings, *, design: str | None = None, boundary_sets=None,
    routes: Routes | None = None, places: Places | None = None,
) -> Answer:
    """The answer for one fish and one frame, taken as steady.

    Parameters
    ----------
    frame : Frame
        An instant or a mean; maxima are refused.
    fish : Fish
    reach : Reach
        With a start and a goal in its layer ``fish``.
    settings : Settings
    design : str, optional
        Of the run: which structures stand.
    boundary_sets : mapping, optional
        Of the run, for its discharge.
    routes : Routes, optional
        Of the frame's mesh, when several answers share them.
    places : Places, optional
        Instead of those of the reach.

    Raises
    ------
    ValueError
        Maxima, no start or goal in the review, or one of them outside the mesh.
    """
    search = prepare(
        frame, fish, places or places_of(reach), settings, sills=sills_of(reach, design), routes=routes
    )
    discharge = through_discharge(frame, settings, boundary_sets)
    for area, word in zip(search.areas.items[:2], ("start", "goal")):
        if not area.triangles.size:
            return _not_assessed(search, discharge, f"the {word} {area.name!r} has no water of {fish.least_depth_m:g} m depth.")
    chain = search.best_chain() or search.best_chain(relaxed=True)
    if chain is None:
        return _not_assessed(search, discharge, "no water joins the start and the goal.")
    route = profile(search, chain)
    legs = tuple(_figures(search, chain, route, reach, i) for i in range(len(chain.legs)))
    found = barriers(search, chain, route)
    status = EXCLUDED if found or chain.worst >= 1.0 else NOT_EXCLUDED
    alone = chain if len(search.areas.items) == 2 else search.best_chain(recovering=False)
    alone_fatigue = math.inf if alone is None or alone.relaxed else alone.worst
    corridor = narrowest(search, route)
    flags = _flags(search, chain, corridor)
    reason = _reason(search, found, legs, legs[chain.worst_index], reach)
    return Answer(
        fish, frame.mesh, _stamp(frame), search, status, reason, discharge, chain, route, legs, found, corridor,
        NOT_EXCLUDED if alone_fatigue < 1.0 else EXCLUDED, alone_fatigue, flags,
    )


def unsteady_flag(answer: Answer, seconds: np.ndarray, discharge: np.ndarray) -> str | None:
    """What to say where the flow changes during the swim; None where the frame may count as steady.

    ``seconds`` and ``discharge`` (k,) are those of all frames of the run.
    """
    if len(seconds) < 2 or not math.isfinite(answer.transit_s):
        return None
    then = np.interp(answer.stamp.seconds + answer.transit_s, seconds, discharge)
    change = abs(then / np.interp(answer.stamp.seconds, seconds, discharge) - 1.0)
    return f"flow changes by {100 * change:.0f} % during the swim" if change > _CHANGE else None


def _stamp(frame: Frame) -> Stamp:
    return Stamp(frame.index, frame.seconds, frame.time, frame.kind, "velocity and depth linear between nodes")


def place_of(mesh: Mesh, reach: Reach | None, xy) -> Place:
    """World coordinates, chainage and offset of a local point."""
    x, y = mesh.to_world(np.asarray(xy, float))
    if reach is None or reach.centre_line is None:
        return Place(float(x), float(y))
    s, n = reach.centre_line.locate(np.atleast_2d(xy))
    return Place(float(x), float(y), float(s[0]), float(n[0]))


def _not_assessed(search: Search, discharge: float, reason: str) -> Answer:
    frame = search.water.frame
    return Answer(
        search.fish, frame.mesh, _stamp(frame), search, NOT_ASSESSED, reason, discharge, None, None, (), (), None,
        NOT_ASSESSED, math.nan,
    )


def _figures(search: Search, chain: LegChain, route: Profile, reach: Reach | None, index: int) -> LegFigures:
    leg = chain.legs[index]
    own = np.flatnonzero((route.leg == index + 1) & ~route.resting)
    if not own.size:
        own = np.flatnonzero(route.leg == index + 1)
    fastest = own[np.argmax(route.speed_m_s[own])]
    step = np.diff(route.distance_m, prepend=0.0)
    return LegFigures(
        index + 1, leg.from_area.name, leg.to_area.name, float(step[own].sum()), float(step[own][route.barred[own]].sum()),
        float(route.fatigue[own].max()) if chain.relaxed else leg.fatigue, leg.seconds,
        float(route.speed_m_s[fastest]), float(route.depth_m[own].min()),
        place_of(search.water.frame.mesh, reach, route.xy[fastest]),
    )


def _flags(search: Search, chain: LegChain, corridor: Corridor | None) -> tuple[str, ...]:
    flags = []
    if corridor is not None and not corridor.resolved:
        flags.append(f"corridor of {corridor.faces} faces not resolved")
    if chain.moved > search.settings["passage_direction_error"]:
        flags.append(f"headings not settled: {100 * chain.moved:.1f} %")
    small = [leg.from_area.name for leg in chain.legs[1:] if len(leg.from_area.triangles) < 3]
    if small:
        flags.append(f"under-resolved resting water: {', '.join(small)}")
    return tuple(flags)


def _reason(search: Search, found: tuple[Barrier, ...], legs: tuple[LegFigures, ...], worst: LegFigures, reach) -> str:
    """The worst leg, or the first barrier of the worst leg, in a sentence."""
    if not found:
        return (
            f"its worst leg, {worst.number} of {len(legs)}, uses {printed(worst.fatigue)} of its endurance over "
            f"{printed(worst.length_m)} m, up to {printed(worst.greatest_speed_m_s)} m/s in at least "
            f"{printed(worst.least_depth_m)} m of water{_where(worst.place)}."
        )
    first = next((b for b in found if b.leg == worst.number), found[0])
    place = _where(place_of(search.water.frame.mesh, reach, first.xy))
    more = f" ({len(found)} barriers in all.)" if len(found) > 1 else ""
    return f"leg {first.leg} of {len(legs)} is {barrier_words(first)}{place}.{more}"


def barrier_words(b: Barrier) -> str:
    """What a barrier is and by how much, in words."""
    if b.kind == TOO_LONG:
        return (
            f"too long without rest: {printed(b.length_m)} m use {printed(b.value)} times its endurance, which ends in "
            f"{printed(b.speed_m_s)} m/s and {printed(b.depth_m)} m of water"
        )
    if b.kind == "drop":
        return f"barred by a drop of {printed(b.value)} m, {printed(b.beyond)} m more than its greatest"
    if b.kind == "too fast":
        return (
            f"too fast: {printed(b.value)} m/s needed over {printed(b.length_m)} m in {printed(b.depth_m)} m of water, "
            f"{printed(b.beyond)} m/s beyond its data"
        )
    return (
        f"too shallow: {printed(b.value)} m over {printed(b.length_m)} m, {printed(b.beyond)} m less than it needs, "
        f"at {printed(b.speed_m_s)} m/s"
    )


def _where(place: Place) -> str:
    if place.chainage_m is None:
        return f" at {place.x:.1f} E, {place.y:.1f} N"
    return f" at chainage {place.chainage_m:.0f} m"
