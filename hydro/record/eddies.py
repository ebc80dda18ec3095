"""The record's ledger of recirculation zones, with its plates: an overview and one at 1:500 round the largest."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..cautions import OWED
from ..eddies import Zone
from ..figure import Figure, Place, Source, printed
from ..frame import Frame
from ..ledger import FrameLedger, frame_ledger
from ..ledger.report import time_text
from ..reach import Reach
from ..review import Review, RunEntry
from ..run import Run
from .model import Part, Plate, Table
from .plate import A3_MM, Window, fit, map_plate

COLUMNS = (
    "Eddy", "Where", "Turns", "Chainage, m", "Area, m2", "Takes round, m3/s", "Share of the river, %",
    "Length, m", "Once round, s", "Triangles across", "Flags",
)
_DETAIL_SCALE = 500


@dataclass(frozen=True, eq=False)
class Reading:
    """One run as the record reads it: the frame chosen for the ledger, with its zones."""

    entry: RunEntry
    run: Run
    reach: Reach
    ledger: FrameLedger


def read(review: Review, entry: RunEntry, run: Run) -> Reading:
    """The frame that speaks for a run: its only one, or the one at its peak.

    The peak is the frame that holds the most water.
    """
    reach = review.reach_for(run)
    return Reading(entry, run, reach, frame_ledger(run, peak_frame(run), reach=reach))


def peak_frame(run: Run) -> int:
    """Index of the frame that holds the most water."""
    if run.n_frames == 1:
        return 0
    area = run.mesh.face_area
    return int(np.argmax([float(run.frame(i).face_depth @ area) for i in range(run.n_frames)]))


def source(run: Run, frame: Frame) -> Source:
    """Where a figure of this frame was read."""
    return Source(
        run.name, run.hash, frame.kind, frame.seconds, time_text(frame.time), frame.field_name, run.settings.digest()
    )


def zone_row(zone: Zone, frame: Frame, source_: Source) -> tuple[str | Figure, ...]:
    """One line of the ledger."""
    x, y = frame.mesh.to_world(zone.centre)
    place = Place(float(x), float(y), zone.chainage_m, zone.offset_m)

    def figure(name: str, unit: str, factor: float = 1.0) -> Figure:
        value = getattr(zone, name)
        low, high = zone.sensitivity.get(name, (None, None))
        scaled = [None if v is None else float(v) * factor for v in (value, low, high)]
        return Figure(name, scaled[0], unit, scaled[1], scaled[2], zone.flags, zone.cautions, place, source_)

    return (
        zone.id, zone.name, zone.rotation, figure("chainage_m", "m"), figure("area_m2", "m2"),
        figure("recirculating_discharge_m3_s", "m3/s"), figure("share_of_through_discharge", "%", 100.0),
        figure("length_m", "m"), figure("rotation_time_s", "s"), figure("triangles_across", ""), ", ".join(zone.flags),
    )


def eddies(readings: Sequence[Reading]) -> Part:
    """The ledger of every run with its plates, one colour range over all of them."""
    top = common_top([r.ledger.frame for r in readings])
    tables, plates, says = [], [], []
    for r in readings:
        zones = sorted(r.ledger.zones.zones, key=lambda z: -z.area_m2)
        at = source(r.run, r.ledger.frame)
        tables.append(Table(
            f"eddies-{r.entry.id}", f"Recirculation zones, {r.entry.label} ({_when(r.ledger.frame)})", COLUMNS,
            tuple(zone_row(z, r.ledger.frame, at) for z in zones),
        ))
        tables.append(_balance(r, at))
        says.append(sentence(r.entry.label, r.ledger))
        plates += _plates(r, zones, top)
    return Part("eddies", "Recirculation zones", tuple(says), tuple(tables), tuple(plates), OWED["eddies"])


def sentence(label: str, ledger: FrameLedger) -> str:
    """What a run shows, in one or two sentences."""
    zones = ledger.zones.zones
    if not zones:
        return f"{label}: no recirculation zone above the floor was found. That is no evidence of harmless water."
    largest = max(zones, key=lambda z: z.area_m2)
    share = largest.share_of_through_discharge
    of = f", {100 * share:.2g} % of the river" if share is not None else ""
    count = "one recirculation zone" if len(zones) == 1 else f"{len(zones)} recirculation zones"
    return (
        f"{label}: {count}. The largest, {largest.name}, covers {largest.area_m2:.0f} m2 and takes "
        f"{printed(largest.recirculating_discharge_m3_s, digits=2)} m3/s round with it{of}."
    )


def common_top(frames: Sequence[Frame]) -> float:
    """Speed of the darkest shade on every plate: the 99th percentile of wet nodes, rounded up to 0.5 m/s."""
    fastest = max((float(np.percentile(f.speed[f.wet_nodes], 99)) for f in frames if f.wet_nodes.any()), default=0.5)
    return float(np.ceil(fastest / 0.5) * 0.5)


def _balance(r: Reading, at: Source) -> Table:
    sf = r.ledger.sf

    def figure(name: str, value: float | None, unit: str) -> Figure:
        return Figure(name, value, unit, source=at, note="not available: one frame" if value is None else "")

    rows = (
        ("Inflow, m3/s", figure("inflow_m3_s", sf.inflow_m3_s, "m3/s")),
        ("Outflow, m3/s", figure("outflow_m3_s", sf.outflow_m3_s, "m3/s")),
        ("Storage, m3/s", figure("storage_m3_s", sf.storage_m3_s, "m3/s")),
        ("Misfit of psi, share", figure("misfit", sf.misfit.total, "-")),
        ("of it storage", figure("misfit_storage", sf.misfit.storage, "-")),
        ("of it walls", figure("misfit_walls", sf.misfit.walls, "-")),
        ("unexplained", figure("misfit_unexplained", sf.misfit.unexplained, "-")),
    )
    return Table(f"balance-{r.entry.id}", f"Water balance and misfit, {r.entry.label}", ("Figure", "Value"), rows)


def _plates(r: Reading, zones: Sequence[Zone], top: float) -> list[Plate]:
    frame, sf = r.ledger.frame, r.ledger.sf
    tube = sf.through_discharge_m3_s / r.run.settings["tubes"]
    wet = frame.mesh.node_xy[frame.wet_nodes]
    whole = fit((*wet.min(axis=0), *wet.max(axis=0)), A3_MM)
    windows = [("overview", f"{r.entry.label}: the whole reach", whole)]
    if zones:
        x, y = zones[0].centre
        windows.append((
            "detail", f"{r.entry.label}: round {zones[0].name}",
            Window(float(x), float(y), _DETAIL_SCALE, (A3_MM[0] - 18.0, A3_MM[1] - 18.0)),
        ))
    return [
        map_plate(
            f"{name}-{r.entry.id}", title, frame, window, psi=sf.psi, tube_m3_s=tube, top_speed=top, reach=r.reach,
            zones=zones, subject=zones[0].id if zones else None, caption=f"{_when(frame)}. Narrow tubes are fast.",
        )
        for name, title, window in windows
    ]


def _when(frame: Frame) -> str:
    when = time_text(frame.time) or f"{frame.seconds:g} s"
    return {"instant": when, "mean": f"mean flow, {when}", "maximum": f"maximum, {when}"}[frame.kind]
