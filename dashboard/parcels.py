"""A parcel of water let go at a place of the map: its path in time, and the streamline through the place."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from hydro.review import open_any
from hydro.run import Run
from hydro.streamfunction import OpenBoundary, StreamFunction
from hydro.tracks import Track, pathlines, streamlines

from .reading import Moment, Reading

Place = tuple[float, float, float]  # world x, y, m, and when it is let go, s from the first frame
A_TICK = 5  # points of a path from one tick to the next: each step of a path costs some 10 ms
_TICKS = (1.0, 5.0, 10.0, 60.0, 600.0, 3600.0, 6 * 3600.0, 86400.0)  # s between ticks; the first that gives few enough
_MOST_TICKS = 60


@dataclass(frozen=True, eq=False)
class Parcel:
    """Where a parcel goes: local ``xy`` (k, 2) with ``seconds`` of the run, a tick every ``A_TICK`` points; why it ended."""

    xy: np.ndarray
    seconds: np.ndarray
    ended: str
    tick_s: float
    steady: bool  # along a streamline, for want of other frames

    @property
    def length_m(self) -> float:
        return float(np.hypot(*np.diff(self.xy, axis=0).T).sum())

    def at(self, seconds: float) -> np.ndarray:
        """Local place at a moment; its start before it was let go, its end afterwards."""
        return np.array([np.interp(seconds, self.seconds, self.xy[:, k]) for k in (0, 1)])


class Parcels:
    """Parcels of one reading; each method answers at once or raises ``Working``."""

    def __init__(self, reading: Reading) -> None:
        self.reading = reading
        self._own: dict[str, Run] = {}

    def parcel(self, run_id: str, moment: Moment, place: Place) -> Parcel:
        """A pathline through the frames of a run; a streamline where there is one frame, or of a mean flow."""
        run = self.reading.run(run_id)
        start = run.mesh.to_local(np.array(place[:2]))[None]
        if run.n_frames == 1 or isinstance(moment, tuple):
            sf = self.reading.ledger(run_id, moment).sf
            key = ("parcel", run_id, moment, place[:2])
            return self.reading.results.get(key, lambda: _along(sf, start), label="Following the parcel.")
        boundaries = self.reading.ledger(run_id, moment).sf.open_boundaries
        # Loops over several cores run in the other thread, which has the file to itself: opened once more.
        return self.reading.long.get(
            ("parcel", run_id, place), lambda: _through(self._opened(run_id), start, place[2], boundaries), label="Following the parcel.",
        )

    def streamline(self, run_id: str, moment: Moment, place: Place) -> np.ndarray:
        """Local points (k, 2) of the streamline through the place at a moment, both ways; fewer than two where there is none."""
        start = self.reading.run(run_id).mesh.to_local(np.array(place[:2]))[None]
        sf = self.reading.ledger(run_id, moment).sf
        return self.reading.results.get(
            ("streamline", run_id, moment, place[:2]), lambda: streamlines(sf, start).tracks[0].xy, label="Drawing the streamline.",
        )

    def _opened(self, run_id: str) -> Run:
        if run_id not in self._own:
            review, run = open_any(self.reading.path)
            self._own[run_id] = review.open(run_id) if review is not None else run  # type: ignore[assignment]
        return self._own[run_id]


def _along(sf: StreamFunction, start: np.ndarray) -> Parcel:
    return _evenly(streamlines(sf, start, direction="down").tracks[0], 0.0)


def _through(run: Run, start: np.ndarray, begin: float, boundaries: tuple[OpenBoundary, ...]) -> Parcel:
    end = float(run.times.seconds[-1])
    if begin >= end:
        raise ValueError("the parcel is let go in the run's last frame: there is no later one to follow it through; choose an earlier time.")
    tick = _tick(end - begin)
    track = pathlines(run, start, begin=begin, end=end, every=tick / A_TICK, boundaries=boundaries).tracks[0]
    return Parcel(track.xy, track.seconds, track.ended, tick, steady=False)


def _evenly(track: Track, begin: float) -> Parcel:
    """A streamline with its points at even times, so that ticks can be counted."""
    last = float(track.seconds[-1])
    if len(track.xy) < 2 or last <= 0:
        return Parcel(track.xy[:1], np.array([begin]), track.ended, 0.0, steady=True)
    tick = _tick(last)
    even = np.append(np.arange(0, last, tick / A_TICK), last)
    xy = np.column_stack([np.interp(even, track.seconds, track.xy[:, k]) for k in (0, 1)])
    return Parcel(xy, begin + even, track.ended, tick, steady=True)


def _tick(span: float) -> float:
    return next((t for t in _TICKS if span <= _MOST_TICKS * t), _TICKS[-1])
