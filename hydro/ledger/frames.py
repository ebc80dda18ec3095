"""One frame's entry in the ledger: its stream function and its zones."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..eddies import ZoneSet, find_zones
from ..frame import Frame
from ..reach import Reach
from ..run import Run
from ..settings import Settings
from ..streamfunction import Plan, StreamFunction, stream_function


@dataclass(frozen=True, eq=False)
class FrameLedger:
    """Stream function and zones of one frame or of the mean over a window.

    ``window_s`` (t1, t2) is given for a mean formed here.
    """

    frame: Frame
    sf: StreamFunction
    zones: ZoneSet
    window_s: tuple[float, float] | None = None


def plan_for(run: Run, frame: Frame, reach: Reach | None = None, settings: Settings | None = None) -> Plan:
    """The plan that all frames of a run share, judged by one of them."""
    return Plan(
        frame, structures=reach.structures if reach else (), settings=settings or run.settings,
        centre_line=reach.centre_line if reach else None, boundary_sets=run.boundary_sets,
    )


def frame_ledger(
    run: Run, index: int, *, reach: Reach | None = None, settings: Settings | None = None, plan: Plan | None = None
) -> FrameLedger:
    """Stream function and zones of frame ``index``.

    Raises ``ValueError`` for a frame that is not there, holds maxima or has no water.
    """
    frame = run.frame(index)
    plan = plan or plan_for(run, frame, reach, settings)
    sf = stream_function(frame, plan=plan, depth_rate=depth_rate(run, frame.index, frame))
    return FrameLedger(frame, sf, find_zones(sf, reach=reach, settings=plan.settings))


def mean_ledger(
    run: Run, t1: float, t2: float, *, reach: Reach | None = None, settings: Settings | None = None,
    plan: Plan | None = None,
) -> FrameLedger:
    """Stream function and zones of the mean flow between t1 and t2, s from the first frame."""
    chosen, _ = run.window(t1, t2)
    frame = run.mean(t1, t2)
    plan = plan or plan_for(run, frame, reach, settings)
    rate = None
    if len(chosen) > 1:
        first, last = run.frame(int(chosen[0])), run.frame(int(chosen[-1]))
        rate = (last.face_depth - first.face_depth) / (last.seconds - first.seconds)
    sf = stream_function(frame, plan=plan, depth_rate=rate)
    return FrameLedger(frame, sf, find_zones(sf, reach=reach, settings=plan.settings), (float(t1), float(t2)))


def depth_rate(run: Run, index: int, frame: Frame | None = None) -> np.ndarray | None:
    """Rise of depth (f,) of faces at a frame, m/s, by the parabola through it and its neighbours.

    None where the run has one frame. At the run's ends, the difference to the one neighbour.
    """
    near = [i for i in (index - 1, index, index + 1) if 0 <= i < run.n_frames]
    if len(near) < 2:
        return None
    t = run.times.seconds[near] - run.times.seconds[index]
    depths = [
        (frame if frame is not None and i == index else run.frame(i)).face_depth for i in near
    ]
    if len(near) == 2:
        return (depths[1] - depths[0]) / (t[1] - t[0])
    before, after = t[0], t[2]
    weights = np.array([
        -after / (before * (before - after)), -(before + after) / (before * after), -before / (after * (after - before)),
    ])
    return weights[0] * depths[0] + weights[1] * depths[1] + weights[2] * depths[2]
