"""Eddies followed through time by the overlap of their cores: lives, splits, mergers, gaps."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from ..eddies import Zone
from ..eddies.travelling import Traveller, matched
from ..settings import Settings

_LEAST_OVERLAP = 0.2  # of the smaller core's area
_STEADY_OVERLAP = 0.7  # cores that keep this much from frame to frame are not jumping about
_FRAMES_A_PERIOD = 4  # fewer frames than this in a shedding period cannot follow an eddy
_UNSTEADY = 0.1  # ratio of spread to mean of the recirculating discharge


@dataclass(frozen=True, slots=True)
class Life:
    """One eddy through time.

    Attributes
    ----------
    id, name, kind, rotation : str
    wall : str or None
    frames : tuple of int
        Frames in which it was seen.
    first_s, last_s : float
    share_of_time : float
        Of the run's time, each frame weighted by the time it stands for.
    parent : str or None
        The eddy that it split from.
    merged_into : str or None
    followed : bool
    why : str
        Why it is not followed.
    ranges : mapping of figure to (least, greatest)
        Over the frames in which it was seen.
    unsteady : bool
        Its recirculating discharge spreads by more than a tenth of its mean.
    """

    id: str
    name: str
    kind: str
    rotation: str
    wall: str | None
    frames: tuple[int, ...]
    first_s: float
    last_s: float
    share_of_time: float
    parent: str | None
    merged_into: str | None
    followed: bool
    why: str
    ranges: dict[str, tuple[float, float]]
    unsteady: bool


@dataclass
class _Open:
    """A life while it is being followed."""

    id: str
    parent: str | None = None
    merged_into: str | None = None
    moved: int = 0
    ended: bool = False
    seen: list[tuple[int, int]] = field(default_factory=list)  # (place of the frame, place of the zone in it)
    overlaps: list[float] = field(default_factory=list)


RANGED = (
    "area_m2", "volume_m3", "length_m", "width_m", "recirculating_discharge_m3_s", "rotation_time_s",
    "max_reverse_speed_m_s",
)


def follow(
    zones: Sequence[Sequence[Zone]], seconds: np.ndarray, node_area: np.ndarray, settings: Settings,
    frames: Sequence[int] | None = None,
) -> tuple[list[Life], list[tuple[Zone, ...]]]:
    """Follow zones from frame to frame.

    Two zones are one eddy when they turn the same way and their cores overlap, the greatest overlap
    first; an eddy may be missing for ``follow_gap_frames``. A zone left over that overlaps an eddy's core
    has split from it, an eddy left over has merged. Where a zone's centre moves by more than half its
    length between frames, the frames are too far apart: the eddy is not followed.

    Parameters
    ----------
    zones : the zones of each frame
    seconds : (k,) times of the frames, s
    node_area : (n,) area that each node stands for, m2
    settings : Settings
    frames : the frames' numbers (default: 0, 1, ...)

    Returns
    -------
    lives, and the zones of each frame with the ids of their lives.
    """
    numbers = list(range(len(zones))) if frames is None else list(frames)
    lives: list[_Open] = []
    for j, here in enumerate(zones):
        _step(lives, zones, j, here, node_area, int(settings["follow_gap_frames"]))
    weights = time_weights(seconds)
    closed = [_closed(life, zones, seconds, weights, numbers) for life in lives]
    named = [list(z) for z in zones]
    for life, whole in zip(lives, closed, strict=True):
        for j, k in life.seen:
            flags = named[j][k].flags
            flags += () if whole.followed else (f"not followed: {whole.why}",)
            flags += ("unsteady",) if whole.unsteady else ()
            named[j][k] = replace(named[j][k], id=whole.id, flags=flags)
    return closed, [tuple(z) for z in named]


def time_weights(seconds: np.ndarray) -> np.ndarray:
    """Time (k,) that each frame stands for, s: half the way to its neighbours; 1 for a single frame."""
    if len(seconds) < 2:
        return np.ones(len(seconds))
    half = np.diff(seconds) / 2
    return np.concatenate([half, [0.0]]) + np.concatenate([[0.0], half])


def overlap(a: Zone, b: Zone, node_area: np.ndarray) -> float:
    """Shared area of two cores over the smaller one's; 0 for eddies that turn opposite ways."""
    if a.rotation != b.rotation:
        return 0.0
    shared = np.intersect1d(a.core, b.core, assume_unique=True)
    return float(node_area[shared].sum() / min(node_area[a.core].sum(), node_area[b.core].sum()))


def _step(lives: list[_Open], zones, j: int, here: Sequence[Zone], node_area: np.ndarray, gap: int) -> None:
    """Hand the zones of frame j to the lives, or begin new ones."""
    open_lives = [life for life in lives if not life.ended and j - life.seen[-1][0] <= gap + 1]
    pairs = []
    for life in open_lives:
        i, k = life.seen[-1]
        for n, zone in enumerate(here):
            share = overlap(zones[i][k], zone, node_area)
            if share > _LEAST_OVERLAP:
                pairs.append((share, life, n))
    pairs.sort(key=lambda p: (-p[0], p[1].id, p[2]))
    taken: dict[int, _Open] = {}
    given: dict[str, int] = {}
    for share, life, n in pairs:
        if n in taken or life.id in given:
            continue
        taken[n], given[life.id] = life, n
        last = zones[life.seen[-1][0]][life.seen[-1][1]]
        life.moved += np.hypot(*(here[n].centre - last.centre)) > 0.5 * max(last.length_m, last.width_m)
        life.seen.append((j, n))
        life.overlaps.append(share)
    for _, life, n in pairs:
        if life.id not in given:  # what it overlaps belongs to another life
            life.merged_into, life.ended = taken[n].id, True
    for n, zone in enumerate(here):
        if n in taken:
            continue
        parent = next((life.id for _, life, m in pairs if m == n), None)
        new = _Open(f"E{len(lives) + 1}", parent, seen=[(j, n)])
        lives.append(new)
        lost = [
            life for life in open_lives
            if life.id not in given and not life.ended and life.seen[-1][0] == j - 1 and parent is None
            and _kin(zones[life.seen[-1][0]][life.seen[-1][1]], zone)
        ]
        for life in lost:  # it may have jumped: neither can be told
            life.moved += 1
            new.moved += 1


def _kin(a: Zone, b: Zone) -> bool:
    return a.rotation == b.rotation and a.wall is not None and a.wall == b.wall


def _closed(life: _Open, zones, seconds: np.ndarray, weights: np.ndarray, numbers: Sequence[int]) -> Life:
    own = [zones[j][k] for j, k in life.seen]
    places = [j for j, _ in life.seen]
    w = weights[places]
    names = [z.name for z in own]
    kinds = [z.kind for z in own]
    walls = [z.wall for z in own]
    flow = np.array([z.recirculating_discharge_m3_s for z in own])
    mean = float(np.average(flow, weights=w)) if w.sum() > 0 else float(flow.mean())
    spread = float(np.sqrt(np.average((flow - mean) ** 2, weights=w))) if w.sum() > 0 else 0.0
    why = _why_lost(life, own, seconds[places])
    return Life(
        life.id, max(names, key=names.count), max(kinds, key=kinds.count), own[0].rotation, max(walls, key=walls.count),
        tuple(numbers[j] for j in places), float(seconds[places[0]]), float(seconds[places[-1]]),
        float(w.sum() / weights.sum()) if weights.sum() > 0 else 1.0, life.parent, life.merged_into, not why, why,
        {name: (min(getattr(z, name) for z in own), max(getattr(z, name) for z in own)) for name in RANGED},
        spread > _UNSTEADY * mean,
    )


def _why_lost(life: _Open, own: Sequence[Zone], times: np.ndarray) -> str:
    if life.moved:
        return "frames too far apart"
    periods = [z.wake.expected_period_s for z in own if z.wake is not None]
    steps = np.diff(times)
    jumps = life.overlaps and np.median(life.overlaps) < _STEADY_OVERLAP
    if periods and len(steps) and jumps and np.median(steps) > np.median(periods) / _FRAMES_A_PERIOD:
        return "frames too far apart"
    return ""


def follow_travelling(
    eddies: Sequence[Sequence[Traveller]], seconds: np.ndarray,
) -> list[tuple[Traveller, ...]]:
    """Travelling eddies of successive frames with lasting ids T1, T2 ...: each is the one that its core became.

    An eddy that is missing in one frame is another one when it comes back: its place meanwhile is a guess.
    """
    count, named = 0, []
    before: list[Traveller] = []
    for j, here in enumerate(eddies):
        gap = float(seconds[j] - seconds[j - 1]) if j else 0.0
        names: dict[int, str] = {}
        for old in before:
            core = matched(old.core, [e.core for e in here], gap)
            place = next((k for k, e in enumerate(here) if e.core is core), None)
            if place is not None:
                names.setdefault(place, old.id)
        own = []
        for k, eddy in enumerate(here):
            if k not in names:
                count += 1
                names[k] = f"T{count}"
            own.append(replace(eddy, id=names[k]))
        named.append(tuple(own))
        before = own
    return named
