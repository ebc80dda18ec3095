"""The mean flow over a window beside its instants: ranges, shares of time, shedding periods."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from scipy.signal import lombscargle

from ..eddies import Zone
from ..frame import Frame
from ..mesh import Mesh
from .follow import RANGED, overlap, time_weights
from .frames import FrameLedger, FrameReader
from .summary import FrameSummary

_LEAST_SHARE = 0.2  # overlap of an instant's core with the mean's zone
_STRONG = 0.3  # share of a signal's variance that one period must hold to be called measured
_STILL = 0.02  # cross-flow weaker than this share of the approach speed is no shedding


@dataclass(frozen=True, slots=True)
class Instants:
    """What the instants of a window say about a zone of the mean flow.

    Attributes
    ----------
    frames : int
        Instants in the window.
    seen : int
        Those that hold a zone of the same sense over the mean's core.
    share_of_time : float
    ranges : mapping of figure to (least, greatest)
        Over the instants that hold it; empty where none does.
    expected_period_s, measured_period_s : float or None
        From the structure's width and approach speed; from the cross-flow where the wake closes.
    periods : float or None
        Periods in the window: measured where one is, else expected.
    cross_flow_m_s : float or None
        Spread of the cross-flow there.
    """

    frames: int
    seen: int
    share_of_time: float
    ranges: dict[str, tuple[float, float]] = field(default_factory=dict)
    expected_period_s: float | None = None
    measured_period_s: float | None = None
    periods: float | None = None
    cross_flow_m_s: float | None = None


def instants_of(
    reader: FrameReader, mean: FrameLedger, summaries: Sequence[FrameSummary]
) -> dict[str, Instants]:
    """For each zone of a mean flow, by id, what the instants of its window say.

    ``summaries`` are those of every frame in the window, in order of time.
    """
    run = reader.run
    seconds = np.array([s.seconds for s in summaries])
    weights = time_weights(seconds)
    area = lumped_area(run.mesh)
    probes = {z.id: run.mesh.find(z.reattachment)[0] for z in mean.zones.zones if z.reattachment is not None and z.wake}
    signals = _signals(reader, summaries, {i: t for i, t in probes.items() if t >= 0}, mean)
    out = {}
    for zone in mean.zones.zones:
        twins = [twin_of(zone, s.zones, area) for s in summaries]
        held = np.array([t is not None for t in twins])
        own = [t for t in twins if t is not None]
        ranges = {n: (min(getattr(t, n) for t in own), max(getattr(t, n) for t in own)) for n in RANGED} if own else {}
        share = float(weights[held].sum() / weights.sum()) if weights.sum() > 0 else float(held.mean())
        expected = zone.wake.expected_period_s if zone.wake else None
        measured = cross = None
        if zone.id in signals and zone.wake:
            cross = float(np.std(signals[zone.id]))
            if cross > _STILL * zone.wake.approach_speed_m_s:
                measured = measured_period(seconds, signals[zone.id])
        period = measured or expected
        periods = (seconds[-1] - seconds[0]) / period if period and len(seconds) > 1 else None
        out[zone.id] = Instants(len(summaries), len(own), share, ranges, expected, measured, periods, cross)
    return out


def measured_period(seconds: np.ndarray, signal: np.ndarray) -> float | None:
    """The period that holds most of a signal's variance, s, by least squares on uneven times; None if none stands out.

    References
    ----------
    .. [1] N. R. Lomb, Least-squares frequency analysis of unequally spaced data, Astrophys. Space Sci. 39 (1976) 447-462.
    """
    if len(seconds) < 8:
        return None
    length, step = seconds[-1] - seconds[0], float(np.median(np.diff(seconds)))
    shortest, longest = 2.2 * step, length / 1.5
    if not longest > shortest:
        return None
    frequency = np.linspace(1 / longest, 1 / shortest, max(200, int(20 * length / shortest)))
    y = signal - signal.mean()
    if not np.any(y):
        return None
    power = lombscargle(seconds, y, 2 * np.pi * frequency, normalize=True)
    k = int(power.argmax())
    return float(1 / frequency[k]) if power[k] > _STRONG else None


def lumped_area(mesh: Mesh) -> np.ndarray:
    """Area (n,) that each node stands for, m2: a third of its triangles."""
    return np.bincount(mesh.triangles.ravel(), np.repeat(mesh.triangle_area / 3, 3), minlength=mesh.n_nodes)


def twin_of(zone: Zone, others: Sequence[Zone], area: np.ndarray) -> Zone | None:
    """Which of a moment's zones is this zone of the mean: the one whose core shares most of it; None for none."""
    shares = [(overlap(zone, other, area), k) for k, other in enumerate(others)]
    best = max(shares, default=(0.0, -1))
    return others[best[1]] if best[0] > _LEAST_SHARE else None


def _signals(reader: FrameReader, summaries, probes: dict[str, int], mean: FrameLedger) -> dict[str, np.ndarray]:
    """Cross-flow (k,) at each zone's probe, m/s, positive to the left of its outer flow."""
    mesh = reader.run.mesh
    along = {z.id: z.along for z in mean.zones.zones}
    found: dict[str, list[float]] = {i: [] for i in probes}
    for s in summaries if probes else ():
        frame: Frame = reader.run.frame(s.index)
        for i, t in probes.items():
            u = frame.velocity[mesh.triangles[t]].mean(axis=0)
            found[i].append(float(-along[i][1] * u[0] + along[i][0] * u[1]))
    return {i: np.array(v) for i, v in found.items()}
