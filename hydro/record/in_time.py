"""The record's account of eddies in time: how long each was there, and the mean beside its instants."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..cautions import OWED
from ..figure import Figure, Source
from ..ledger import FrameLedger, FrameReader, FrameSummary, Instants, Life, follow, instants_of, lumped_area
from ..ledger.all_frames import summary_of
from .eddies import Reading, source
from .model import Part, Table

STEADY_SHARE = 0.05  # the window of the mean: through-discharge within this share of the peak frame's (Leewater's own)
_RANGES = (("area_m2", "m2"), ("recirculating_discharge_m3_s", "m3/s"), ("rotation_time_s", "s"))


@dataclass(frozen=True, eq=False)
class InTime:
    """A run of several frames read through: its eddies' lives, and the mean of a window with its instants."""

    reading: Reading
    frames: int
    span_s: float
    lives: tuple[Life, ...]
    mean: FrameLedger
    window: tuple[float, float]
    instants: dict[str, Instants]


def read_in_time(reading: Reading) -> InTime:
    """Every frame of a run read and followed, and the mean round its peak.

    The window of the mean is the longest stretch round the peak frame whose through-discharge stays within
    ``STEADY_SHARE`` of that frame's: a mean over a rising flood would mix different rivers.

    Raises
    ------
    ValueError
        If the run has one frame, or none but maxima.
    """
    run = reading.run
    wanted = [i for i in range(run.n_frames) if run.times.kinds[i] != "maximum"]
    if len(wanted) < 2:
        raise ValueError(f"{run.name} has {len(wanted)} frames with a stream function; eddies in time need two or more.")
    reader = FrameReader(run, reach=reading.reach, sensitivity=False)
    found, through = [], []
    for i in wanted:
        entry = reader.frame(i)
        found.append(summary_of(run, entry))
        through.append(entry.sf.through_discharge_m3_s)
    seconds = np.array([s.seconds for s in found])
    lives, zones = follow([s.zones for s in found], seconds, lumped_area(run.mesh), run.settings, wanted)
    first, last = steady_stretch(np.array(through), wanted.index(reading.ledger.frame.index))
    window = float(seconds[first]), float(seconds[last])
    mean = reader.mean(*window)
    named = tuple(replace(z, id=f"M{k + 1}") for k, z in enumerate(mean.zones.zones))
    mean = replace(mean, zones=replace(mean.zones, zones=named))
    inside: list[FrameSummary] = [s.with_zones(z) for s, z in zip(found, zones, strict=True)][first : last + 1]
    return InTime(
        reading, len(wanted), float(seconds[-1] - seconds[0]), tuple(lives), mean, window, instants_of(reader, mean, inside),
    )


def steady_stretch(through: np.ndarray, peak: int) -> tuple[int, int]:
    """First and last of the neighbours of ``peak`` whose discharge stays within ``STEADY_SHARE`` of its own.

    >>> steady_stretch(np.array([50.0, 97.0, 100.0, 96.0, 80.0, 99.0]), 2)
    (1, 3)
    """
    near = np.abs(through - through[peak]) <= STEADY_SHARE * abs(through[peak])
    first = last = peak
    while first > 0 and near[first - 1]:
        first -= 1
    while last < len(through) - 1 and near[last + 1]:
        last += 1
    return first, last


def persistence(found: Sequence[InTime]) -> Part:
    """Persistence of every eddy, and each mean with the range of its instants."""
    tables, says = [], []
    for one in found:
        r = one.reading
        says.append(_sentence(one))
        tables += [_lives(one, source(r.run, r.ledger.frame)), _means(one, source(r.run, one.mean.frame))]
    if not found:
        says = ["Every run read in this record holds one frame; nothing can be said of eddies in time."]
    return Part("persistence", "Eddies in time", tuple(says), tuple(tables), cautions=OWED["eddies"])


def _sentence(one: InTime) -> str:
    t1, t2 = one.window
    lost = sum(not life.followed for life in one.lives)
    text = (
        f"{one.reading.entry.label}: {one.frames} frames over {one.span_s:g} s hold {len(one.lives)} eddies. The mean is taken "
        f"from {t1:g} s to {t2:g} s, where the through-discharge stays within {100 * STEADY_SHARE:g} % of the peak frame's."
    )
    return text + (f" {lost} of them could not be followed from frame to frame." if lost else "")


def _lives(one: InTime, at: Source) -> Table:
    """When each eddy was there, the most lasting first."""
    rows = []

    def figure(name: str, value: float, unit: str) -> Figure:
        return Figure(name, value, unit, cautions=("wake-detail",), source=at)

    def when(name: str, value: float) -> Figure:
        return replace(figure(name, value, "s"), decimals=1)

    for life in sorted(one.lives, key=lambda v: (-v.share_of_time, v.id)):
        least, most = life.ranges["area_m2"]
        rows.append((
            life.id, life.name, when("first_s", life.first_s), when("last_s", life.last_s),
            figure("share_of_time", 100 * life.share_of_time, "%"), figure("least_area_m2", least, "m2"),
            figure("greatest_area_m2", most, "m2"), _notes(life),
        ))
    return Table(
        f"persistence-{one.reading.entry.id}", f"How long each eddy was there, {one.reading.entry.label}",
        ("Eddy", "Where", "First seen, s", "Last seen, s", "Share of time, %", "Least area, m2", "Greatest area, m2", "Notes"), tuple(rows),
    )


def _notes(life: Life) -> str:
    parts = [] if life.followed else [f"not followed: {life.why}"]
    parts += [f"split from {life.parent}"] if life.parent else []
    parts += [f"merged into {life.merged_into}"] if life.merged_into else []
    return "; ".join(parts + (["unsteady"] if life.unsteady else []))


def _means(one: InTime, at: Source) -> Table:
    """Eddies of the mean flow; beside each figure the least and greatest of its instants."""
    rows = []
    for zone in one.mean.zones.zones:
        told = one.instants[zone.id]
        cells: list[str | Figure] = [zone.id, zone.name]
        for name, unit in _RANGES:
            cells.append(Figure(name, getattr(zone, name), unit, cautions=("wake-detail",), source=at))
            low, high = told.ranges.get(name, (None, None))
            cells += [
                Figure(f"{which} {name} of the instants", value, unit, cautions=("wake-detail",), source=at, note="not seen")
                for which, value in (("least", low), ("greatest", high))
            ]
        cells += [
            Figure("share of the window's time", 100 * told.share_of_time, "%", source=at),
            Figure("periods", told.periods, "", source=at, note="no period known"),
        ]
        rows.append(tuple(cells))
    t1, t2 = one.window
    return Table(
        f"mean-{one.reading.entry.id}", f"Mean flow from {t1:g} s to {t2:g} s with its instants, {one.reading.entry.label}",
        (
            "Eddy", "Where", "Area, m2", "least", "greatest", "Takes round, m3/s", "least", "greatest", "Once round, s", "least",
            "greatest", "Seen, % of time", "Shedding periods",
        ), tuple(rows),
    )
