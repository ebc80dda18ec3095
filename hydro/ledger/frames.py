"""One frame's entry in the ledger: its stream function and its zones, read in several ways."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from weakref import WeakKeyDictionary

import numpy as np

from ..balance import Balance, Gauges, balance_of
from ..eddies import Zone, ZoneSet, find_zones
from ..eddies.sensitivity import Readings
from ..eddies.travelling import Traveller, swirl_cores, travelling_eddies
from ..frame import Frame
from ..reach import Reach
from ..run import Run
from ..settings import Settings
from ..streamfunction import Plan, StreamFunction, stream_function

# Three more solutions a frame; on meshes above this they would take longer than the answer is worth waiting for.
_MOST_READ_NODES = 300_000
# A plan's other readings keep their factors for as long as the plan lives.
_READINGS: WeakKeyDictionary[Plan, Readings] = WeakKeyDictionary()


@dataclass(frozen=True, eq=False)
class FrameLedger:
    """Stream function and zones of one frame or of the mean over a window.

    ``window_s`` (t1, t2) is given for a mean formed here; ``balance`` is the water balance along the reach.
    """

    frame: Frame
    sf: StreamFunction
    zones: ZoneSet
    window_s: tuple[float, float] | None = None
    balance: Balance | None = None


class FrameReader:
    """Reads frames of a run into ledger entries with one plan: same open boundaries, factors reused."""

    def __init__(
        self, run: Run, *, reach: Reach | None = None, settings: Settings | None = None, plan: Plan | None = None,
        sensitivity: bool = True,
    ) -> None:
        """The open boundaries are judged by the first frame that has no maxima, unless ``plan`` is given."""
        self.run, self.reach, self.settings = run, reach, settings or run.settings
        first = next((i for i, kind in enumerate(run.times.kinds) if kind != "maximum"), 0)
        self.plan = plan or plan_for(run, run.frame(first), reach, self.settings)
        wanted = sensitivity and run.mesh.n_nodes <= _MOST_READ_NODES
        self.readings = _READINGS.setdefault(self.plan, Readings(self.plan)) if wanted else None
        self.left_out = sensitivity and self.readings is None
        self._gauges: Gauges | None = None

    def frame(self, index: int) -> FrameLedger:
        """The entry of frame ``index``."""
        frame = self.run.frame(index)
        return self._entry(frame, depth_rate(self.run, frame.index, frame), None)

    def mean(self, t1: float, t2: float) -> FrameLedger:
        """The entry of the mean flow between t1 and t2, s from the first frame."""
        chosen, _ = self.run.window(t1, t2)
        rate = None
        if len(chosen) > 1:
            first, last = self.run.frame(int(chosen[0])), self.run.frame(int(chosen[-1]))
            rate = (last.face_depth - first.face_depth) / (last.seconds - first.seconds)
        return self._entry(self.run.mean(t1, t2), rate, (float(t1), float(t2)))

    def _entry(self, frame: Frame, rate: np.ndarray | None, window: tuple[float, float] | None) -> FrameLedger:
        sf = stream_function(frame, plan=self.plan, depth_rate=rate)
        found = find_zones(sf, reach=self.reach, settings=self.settings, roughness=self.run.roughness)
        if self.readings is not None:
            found = replace(found, zones=tuple(self.readings.of(sf, found.zones)))
        elif self.left_out:
            note = (
                f"the mesh has more than {_MOST_READ_NODES} nodes: ranges leave out the other field and other wet "
                "thresholds"
            )
            found = replace(found, notes=(*found.notes, note))
        found = replace(found, notes=(*found.notes, *_bare_piers(found, self.reach)))
        length = window[1] - window[0] if window else frame.interval_s
        if frame.kind == "mean" and length:
            found = replace(found, zones=tuple(with_periods(z, length, self.settings) for z in found.zones))
        moment = window is None and frame.kind == "instant" and self.run.n_frames > 1
        if moment:
            found = replace(found, travelling=self._travelling(sf, found.zones))
        return FrameLedger(frame, sf, found, window, balance_of(sf, self._gauges_for(frame), rate, moment=moment))

    def _travelling(self, sf: StreamFunction, zones: Sequence[Zone]) -> tuple[Traveller, ...]:
        """Travelling eddies of a moment, their speed from the frame after it (at the run's end, before it)."""
        frame, run = sf.frame, self.run
        cores = swirl_cores(frame, sf.domain, self.settings)
        beside = frame.index + 1 if frame.index + 1 < run.n_frames else frame.index - 1
        if not cores or run.times.kinds[beside] != "instant":
            return travelling_eddies(sf, zones, cores)
        other = run.frame(beside)
        later = swirl_cores(other, other.wet_triangles, self.settings)
        return travelling_eddies(sf, zones, cores, later=later, gap_s=other.seconds - frame.seconds)

    def _gauges_for(self, frame: Frame) -> Gauges | None:
        """Automatic sections of the run's mesh, made once; None without a centre line."""
        centre = self.reach.centre_line if self.reach else None
        if centre is not None and self._gauges is None:
            self._gauges = Gauges(frame, centre, max(centre.length / self.settings["automatic_sections"], 1.0))
        return self._gauges


def _bare_piers(found: ZoneSet, reach: Reach | None) -> list[str]:
    """Piers without an eddy, and whether this mesh has them as something that water passes through."""
    out = []
    for pier in reach.structures if reach else ():
        if pier.kind != "pier" or any(zone.name.startswith(pier.name) for zone in found.zones):
            continue
        how = "" if pier.represented_as in ("hole", "dry") else f"; it is not solid in this mesh: water passes through it ({pier.represented_as})"
        out.append(f"no eddy is kept behind {pier.name}{how}")
    return out


def with_periods(zone: Zone, window_s: float, settings: Settings) -> Zone:
    """A zone of a mean flow, flagged where the window holds fewer shedding periods than ``least_periods``."""
    if zone.wake is None:
        return zone
    periods = window_s / zone.wake.expected_period_s
    if periods >= settings["least_periods"]:
        return zone
    return replace(zone, flags=(*zone.flags, f"mean over {periods:.1f} expected shedding periods"))


def plan_for(run: Run, frame: Frame, reach: Reach | None = None, settings: Settings | None = None) -> Plan:
    """The plan that all frames of a run share, judged by one of them."""
    return Plan(
        frame, structures=reach.structures if reach else (), settings=settings or run.settings,
        centre_line=reach.centre_line if reach else None, boundary_sets=run.boundary_sets,
    )


def frame_ledger(
    run: Run, index: int, *, reach: Reach | None = None, settings: Settings | None = None, plan: Plan | None = None,
    sensitivity: bool = True,
) -> FrameLedger:
    """Stream function and zones of frame ``index``.

    Without a ``plan`` the open boundaries are judged by this frame. Raises ``ValueError`` for a frame that is
    not there, holds maxima or has no water.
    """
    plan = plan or plan_for(run, run.frame(index), reach, settings)
    return FrameReader(run, reach=reach, settings=settings, plan=plan, sensitivity=sensitivity).frame(index)


def mean_ledger(
    run: Run, t1: float, t2: float, *, reach: Reach | None = None, settings: Settings | None = None,
    plan: Plan | None = None, sensitivity: bool = True,
) -> FrameLedger:
    """Stream function and zones of the mean flow between t1 and t2, s from the first frame."""
    return FrameReader(run, reach=reach, settings=settings, plan=plan, sensitivity=sensitivity).mean(t1, t2)


def depth_rate(run: Run, index: int, frame: Frame | None = None) -> np.ndarray | None:
    """Rise of depth (f,) of faces at a frame, m/s, by the parabola through it and its neighbours.

    None where the run has one frame, or its neighbours are of another kind. At the run's ends, the
    difference to the one neighbour.
    """
    kinds = run.times.kinds
    near = [i for i in (index - 1, index, index + 1) if 0 <= i < run.n_frames and kinds[i] == kinds[index]]
    if len(near) < 2:
        return None
    t = run.times.seconds[near] - run.times.seconds[index]
    depths = [(frame if frame is not None and i == index else run.frame(i)).face_depth for i in near]
    if len(near) == 2:
        return (depths[1] - depths[0]) / (t[1] - t[0])
    a, b = t[0], t[2]
    weights = (-b / (a * (a - b)), -(a + b) / (a * b), -a / (b * (b - a)))
    return weights[0] * depths[0] + weights[1] * depths[1] + weights[2] * depths[2]
