"""Pathlines, streaklines and timelines: parcels moved by the frames, linear in time between them."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from .._kernels import move as kernel
from ..figure import percent
from ..frame import Frame
from ..run import Run
from ..streamfunction import OpenBoundary
from .lines import Traced, Track, open_sides

_WHY = {kernel.AFLOAT: "afloat", kernel.LEFT: "left", kernel.GROUNDED: "aground", kernel.OUTSIDE: "outside the water"}
TOLERANCE_M = 1e-3
_CHECKED = 100  # parcels traced again with a finer tolerance, for the error


@dataclass(eq=False)
class Parcels:
    """Parcels on a mesh, moved in place: positions (k,), triangles, states, and when each begins, s of the run."""

    x: np.ndarray
    y: np.ndarray
    triangle: np.ndarray
    state: np.ndarray
    begin: np.ndarray
    touches: np.ndarray
    step: np.ndarray
    length: np.ndarray

    @property
    def xy(self) -> np.ndarray:
        """(k, 2) positions now, a copy."""
        return np.column_stack([self.x, self.y])


def release(mesh, starts: np.ndarray, begin: np.ndarray | float) -> Parcels:
    """Parcels at local points (k, 2), each from its own time on; those outside the mesh stay and say so."""
    starts = np.atleast_2d(np.asarray(starts, float))
    k = len(starts)
    triangle = mesh.find(starts).astype(np.int32)
    state = np.where(triangle < 0, kernel.OUTSIDE, kernel.AFLOAT).astype(np.int64)
    return Parcels(
        starts[:, 0].copy(), starts[:, 1].copy(), triangle, state, np.broadcast_to(np.asarray(begin, float), k).copy(),
        np.zeros(k, np.int64), np.full(k, 1.0), np.zeros(k),
    )


def packed(frame: Frame) -> np.ndarray:
    """[q_x, q_y, h] of every node, (n, 3)."""
    return np.ascontiguousarray(np.column_stack([frame.unit_discharge, frame.depth]))


def advance(
    frame_a: Frame, frame_b: Frame, parcels: Parcels, until: float, *, sides: np.ndarray, tolerance_m: float = TOLERANCE_M,
    viewpoint: tuple[float, float] = (0.0, 0.0), held: tuple[np.ndarray, np.ndarray] | None = None,
) -> None:
    """Move parcels in place to ``until``, s of the run, between two frames (the same frame twice: steady).

    Runs backwards when ``until`` lies before the parcels' times. ``viewpoint`` m/s is subtracted from
    the velocity. Parcels that begin after ``until`` stay.
    """
    mesh = frame_a.mesh
    f0, f1 = held or (packed(frame_a), packed(frame_b))
    steady = frame_a is frame_b
    ta, tb = (0.0, 0.0) if steady else (frame_a.seconds, frame_b.seconds)
    now = parcels.begin
    sense = 1.0 if until >= float(now.min(initial=until)) else -1.0
    p = parcels
    kernel.move(
        mesh.node_xy, mesh.triangles, mesh.neighbours, sides, f0, f1, ta, tb, frame_a.wet_depth_m, viewpoint[0], viewpoint[1],
        tolerance_m, sense, p.begin, until, p.x, p.y, p.triangle, p.state, p.touches, p.step, p.length,
    )
    reached = sense * (until - p.begin) > 0
    p.begin[reached] = until


def pathlines(
    run: Run, starts: np.ndarray, *, begin: float | np.ndarray, end: float, every: float,
    boundaries: tuple[OpenBoundary, ...] = (), tolerance_m: float = TOLERANCE_M, viewpoint: tuple[float, float] = (0.0, 0.0),
    progress: Callable[[float], None] = lambda seconds: None,
) -> Traced:
    """Pathlines from local points (k, 2).

    Parameters
    ----------
    begin, end : s of the run
        ``begin`` may differ by parcel. A run of one frame is taken as steady.
    every : s
        Spacing of the points kept.
    boundaries : open boundaries, where parcels may leave.

    Returns
    -------
    Traced
        One track a start. Its error is the distance between ends traced with this tolerance and with one
        eight times finer, for up to 100 parcels spread over the release.

    Raises
    ------
    ValueError
        Times outside the run, or a spacing of nothing.
    """
    times = _times(run, begin, end, every)
    sides = open_sides(run.mesh, boundaries)
    kept, parcels = _through(run, starts, begin, times, sides, tolerance_m, viewpoint, progress)
    chosen = np.unique(np.linspace(0, len(parcels.x) - 1, min(_CHECKED, len(parcels.x))).astype(int))
    fine_start = np.atleast_2d(np.asarray(starts, float))[chosen]
    fine_begin = np.broadcast_to(np.asarray(begin, float), len(parcels.x))[chosen]
    _, fine = _through(run, fine_start, fine_begin, times, sides, tolerance_m / 8, viewpoint, lambda s: None)
    error = np.full(len(parcels.x), np.nan)
    error[chosen] = np.hypot(*(fine.xy - parcels.xy[chosen]).T)
    begins = np.broadcast_to(np.asarray(begin, float), len(parcels.x))
    return Traced(
        tuple(_track("pathline", i, kept, times, begins[i], parcels, error[i]) for i in range(len(parcels.x))),
        tuple(_warnings(run, kept, times)),
    )


def streaklines(
    run: Run, sources: np.ndarray, *, begin: float, at: float, every: float, boundaries: tuple[OpenBoundary, ...] = (),
    tolerance_m: float = TOLERANCE_M,
) -> Traced:
    """Streaklines at time ``at`` of parcels let go every ``every`` s from ``begin`` at local points (k, 2).

    The newest parcel comes first; ``seconds`` holds the time each was let go. Parcels that left or lie
    aground are left out of the line.
    """
    _times(run, begin, at, max(every, 1e-9))
    let_go = np.arange(begin, at + 1e-9, every)
    sources = np.atleast_2d(np.asarray(sources, float))
    starts = np.repeat(sources, len(let_go), axis=0)
    begins = np.tile(let_go, len(sources))
    sides = open_sides(run.mesh, boundaries)
    _, parcels = _through(run, starts, begins, np.array([begin, at]), sides, tolerance_m, (0.0, 0.0), lambda s: None)
    out = []
    for i in range(len(sources)):
        part = slice(i * len(let_go), (i + 1) * len(let_go))
        floats = parcels.state[part] == kernel.AFLOAT
        xy = parcels.xy[part][floats][::-1]
        ended = "afloat" if floats.any() else _WHY[int(parcels.state[part][0])]
        out.append(Track("streakline", i, xy, let_go[floats][::-1], parcels.triangle[part][floats][::-1], ended, released_s=begin))
    return Traced(tuple(out))


def timelines(
    run: Run, line: np.ndarray, *, begin: float, times: Sequence[float], boundaries: tuple[OpenBoundary, ...] = (),
    tolerance_m: float = TOLERANCE_M,
) -> Traced:
    """A line of parcels (k, 2) let go together, as it stands at each of ``times``, s of the run."""
    wanted = np.asarray(sorted(times), float)
    grid = np.concatenate([[begin], wanted[wanted > begin]])
    _times(run, begin, float(grid[-1]), 1.0)
    sides = open_sides(run.mesh, boundaries)
    kept, parcels = _through(run, line, begin, grid, sides, tolerance_m, (0.0, 0.0), lambda s: None)
    out = []
    for j, t in enumerate(grid):
        known = np.isfinite(kept[j]).all(axis=1)
        xy = kept[j][known]
        out.append(Track("timeline", j, xy, np.full(len(xy), t), run.mesh.find(xy), "afloat", released_s=begin))
    return Traced(tuple(out))


def _times(run: Run, begin, end: float, every: float) -> np.ndarray:
    first, last = float(np.min(begin)), float(end)
    low, high = float(run.times.seconds[0]), float(run.times.seconds[-1])
    if not every > 0:
        raise ValueError(f"points every {every:g} s make no line; give a spacing above 0.")
    if run.n_frames > 1 and not (low - 1e-9 <= first <= high + 1e-9 and low - 1e-9 <= last <= high + 1e-9):
        raise ValueError(f"times {first:g} to {last:g} s lie outside the run, which goes from {low:g} to {high:g} s.")
    n = max(1, int(np.ceil(abs(last - first) / every - 1e-9)))
    return first + np.sign(last - first) * np.minimum(np.arange(n + 1) * every, abs(last - first))


def _through(run: Run, starts, begin, times, sides, tolerance, viewpoint, progress):
    """Positions kept at ``times`` (j, k, 2), NaN before a parcel begins and after it left; and the parcels at the end."""
    parcels = release(run.mesh, starts, begin)
    kept = np.full((len(times), len(parcels.x), 2), np.nan)
    begins = parcels.begin.copy()
    pair = FramePair(run)
    kept[0, begins == times[0]] = parcels.xy[begins == times[0]]
    for j in range(1, len(times)):
        for until in pair.stops(times[j - 1], times[j]):
            a, b, held = pair.around(until, times[j] < times[j - 1])
            advance(a, b, parcels, until, sides=sides, tolerance_m=tolerance, viewpoint=viewpoint, held=held)
        there = (parcels.state != kernel.OUTSIDE) & (np.sign(times[j] - times[0] + 1e-300) * (times[j] - begins) >= 0)
        gone = (parcels.state == kernel.LEFT) & np.isnan(kept[j - 1, :, 0])
        kept[j, there & ~gone] = parcels.xy[there & ~gone]
        progress(float(times[j]))
    return kept, parcels


class FramePair:
    """The two frames round a time; a frame is read once while it is needed."""

    def __init__(self, run: Run) -> None:
        self.run = run
        self._frames: dict[int, Frame] = {}
        self._held: dict[int, np.ndarray] = {}

    def stops(self, t0: float, t1: float) -> list[float]:
        """Times of frames strictly between, then t1: no step goes over a frame."""
        s = self.run.times.seconds
        if self.run.n_frames == 1:
            return [t1]
        between = s[(s > min(t0, t1) + 1e-9) & (s < max(t0, t1) - 1e-9)]
        return [*(between if t1 > t0 else between[::-1]), t1]

    def around(self, until: float, backwards: bool):
        s = self.run.times.seconds
        if self.run.n_frames == 1:
            i = j = 0
        else:
            j = int(np.clip(np.searchsorted(s, until, side="right" if backwards else "left"), 1, len(s) - 1))
            i = j - 1
        for k in [k for k in self._frames if k not in (i, j)]:
            del self._frames[k], self._held[k]
        for k in (i, j):
            if k not in self._frames:
                self._frames[k] = self.run.frame(k)
                self._held[k] = packed(self._frames[k])
        return self._frames[i], self._frames[j], (self._held[i], self._held[j])


def _track(kind, i, kept, times, begin, parcels: Parcels, error) -> Track:
    known = np.isfinite(kept[:, i, 0])
    xy, seconds = kept[known, i], times[known]
    if not len(xy):
        xy, seconds = parcels.xy[i : i + 1], np.array([begin])
    triangle = np.full(len(xy), parcels.triangle[i], np.int32)
    return Track(
        kind, i, xy, seconds, triangle, _WHY[int(parcels.state[i])], int(parcels.touches[i]),
        error_m=None if np.isnan(error) else float(error), released_s=float(begin),
    )


def _warnings(run: Run, kept: np.ndarray, times: np.ndarray) -> list[str]:
    """Frames too far apart: parcels go further between frames than the flow stays alike."""
    s = run.times.seconds
    if len(s) < 2 or not np.isfinite(kept).any():
        return []
    gap = float(np.median(np.diff(s)))
    middle = int(np.clip(np.searchsorted(s, times[len(times) // 2]), 1, len(s) - 1))
    a, b = run.frame(middle - 1), run.frame(middle)
    wet = a.wet_nodes & b.wet_nodes & (a.speed > 0.1)
    if not wet.any():
        return []
    turned = np.hypot(*(b.velocity - a.velocity)[wet].T) / a.speed[wet]
    share = float((turned > 0.5).mean())
    if share < 0.05:
        return []
    return [
        f"frames stand {gap:g} s apart and the velocity changes by more than half between two of them on {percent(share)} of the "
        "water: paths there depend on what happened in between."
    ]
