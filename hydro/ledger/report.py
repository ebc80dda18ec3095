"""The ledger as plain values: the JSON of schema leewater/eddies/1, and the rows of its tables."""

from __future__ import annotations

import datetime
import math
from collections.abc import Iterable, Mapping
from dataclasses import asdict
from typing import Any

import numpy as np

from ..balance import Balance
from ..cautions import OWED, told
from ..eddies import Zone
from ..eddies.survival import Residence
from ..eddies.travelling import Traveller
from ..figure import printed
from ..mesh import Mesh
from ..provenance import command_line, file_hash, versions
from ..run import Run
from ..settings import Settings
from .follow import Life
from .frames import FrameLedger
from .summary import FrameSummary
from .windows import Instants

SCHEMA = "leewater/eddies/1"


def ledger_json(
    run: Run, frames: Iterable[FrameLedger | FrameSummary], settings: Settings | None = None, *,
    lives: Iterable[Life] = (), instants: Mapping[str, Instants] | None = None, stopped_after: int | None = None,
    mean: FrameLedger | None = None,
) -> dict[str, Any]:
    """The ledger of a run as a dict of schema leewater/eddies/1.

    Places are world coordinates, m; keys carry their unit; what is not available is None.

    Parameters
    ----------
    frames : entries or summaries of frames
    lives : the eddies followed through those frames; the zones' ids are theirs
    instants : for the zones of a mean, by id, what the instants of its window say
    stopped_after : frames done, where the work was stopped before its end
    mean : the mean flow of the whole run, for its balance: single moments hold no undeclared sources
    """
    entries = [f.values if isinstance(f, FrameSummary) else frame_json(run, f) for f in frames]
    known = instants or {}
    for entry in entries:
        for zone in entry["zones"]:
            if zone["id"] in known:
                zone["instants"] = _plain(asdict(known[zone["id"]]))
    whole: dict[str, Any] = {
        "schema": SCHEMA,
        "source": source_of(run),
        "settings": dict(settings or run.settings),
        "frames": entries,
        "cautions": told(OWED["eddies"]),
    }
    eddies = [_plain(asdict(life)) for life in lives]
    if eddies:
        whole["eddies"] = eddies
    if mean is not None:
        whole["balance_of_the_mean"] = _balance(run, mean.balance)
    if stopped_after is not None:
        whole["stopped_after_frames"] = stopped_after
    return whole


def source_of(run: Run) -> dict[str, Any]:
    """Where the figures come from: files with their hashes, versions, and the command that repeats them."""
    return {
        "run": run.name,
        "files": [{"name": p.name, "sha256": file_hash(p)} for p in run.files],
        "hash": run.hash if run.files else None,
        "crs": run.crs,
        "vertical_datum": run.datum,
        "versions": versions(),
        "made": datetime.datetime.now(datetime.UTC).isoformat(timespec="seconds"),
        "command": command_line(),
    }


def frame_json(run: Run, entry: FrameLedger) -> dict[str, Any]:
    """One entry of ``frames``."""
    sf, frame = entry.sf, entry.frame
    split = sf.misfit
    return {
        "index": frame.index,
        "time": time_text(frame.time),
        "seconds": frame.seconds,
        "kind": frame.kind,
        "interval_s": frame.interval_s,
        "window_s": list(entry.window_s) if entry.window_s else None,
        "field": frame.field_name,
        "inflow_m3_s": sf.inflow_m3_s,
        "outflow_m3_s": sf.outflow_m3_s,
        "storage_m3_s": sf.storage_m3_s,
        "through_discharge_m3_s": sf.through_discharge_m3_s,
        "misfit": {
            "total": split.total, "storage": split.storage, "walls": split.walls, "unexplained": split.unexplained,
        },
        "open_boundaries": [{"name": b.name, "discharge_m3_s": b.discharge_m3_s} for b in sf.open_boundaries],
        "balance": _balance(run, entry.balance),
        "links": [
            {"name": link.path.name, "discharge_m3_s": link.discharge_m3_s,
             "path": run.mesh.to_world(run.mesh.node_xy[link.path.nodes]).round(3).tolist()}
            for link in sf.links
        ],
        "links_left_out": list(sf.links_left_out),
        "storage_dominates": not sf.drawn,
        "walls": [{"id": w.id, "psi_m3_s": w.psi_m3_s} for w in sf.walls],
        "dry_specks": sf.n_specks,
        "thin_faces": sf.thin_faces,
        "zones": [zone_json(frame.mesh, z) for z in entry.zones.zones],
        "travelling": [traveller_json(frame.mesh, t) for t in entry.zones.travelling],
        "small_zones": len(entry.zones.small),
        "open_to_the_boundary": len(entry.zones.open_to_boundary),
        "notes": list(entry.zones.notes),
    }


def traveller_json(mesh: Mesh, eddy: Traveller) -> dict[str, Any]:
    """One entry of ``travelling``: a core of swirl, and what the view that moves with it tells."""
    core = eddy.core
    return {
        "id": eddy.id, "rotation": core.rotation, "centre": mesh.to_world(core.centre).round(3).tolist(), "core_radius_m": core.radius_m,
        "swirl_1_s": core.swirl_1_s, "circulation_m2_s": core.circulation_m2_s, "speed_m_s": [float(v) for v in eddy.speed],
        "speed_from": eddy.speed_from, "misfit_of_its_view": eddy.misfit, "core_only": eddy.core_only, "area_m2": eddy.area_m2,
        "recirculating_discharge_m3_s": eddy.recirculating_discharge_m3_s,
    }


def _balance(run: Run, balance: Balance | None) -> dict[str, Any] | None:
    """The largest step between automatic sections and the compact sources; null where they were not looked for."""
    if balance is None:
        return None
    sources = None
    if balance.sources is not None:
        sources = [
            {"place": run.mesh.to_world(np.array(s.at)).round(3).tolist(), "discharge_m3_s": s.discharge_m3_s,
             "chainage_m": s.chainage_m, "offset_m": s.offset_m}
            for s in balance.sources
        ]
    return {"largest_section_difference": asdict(balance.step) if balance.step else None, "undeclared_sources": sources}


def balance_words(entry: Mapping[str, Any]) -> list[str]:
    """What an entry of ``frames`` says of the water balance: sections, undeclared sources, links, storage; no full stops."""
    found, out = entry["balance"] or {}, []
    step = found.get("largest_section_difference")
    if step:
        out.append(
            f"Adjacent sections differ by at most {printed(abs(step['difference_m3_s']))} m3/s ({100 * step['share']:.2g} % of the "
            f"flow), near chainage {step['chainage_m']:.0f} m"
        )
    for source in found.get("undeclared_sources") or ():
        x, y = source["place"]
        where = f"{x:.1f} E, {y:.1f} N" if source["chainage_m"] is None else f"chainage {source['chainage_m']:.0f} m"
        word = "appear" if source["discharge_m3_s"] > 0 else "vanish"
        out.append(f"{printed(abs(source['discharge_m3_s']))} m3/s {word} at {where}, undeclared")
    out += [f"{link['name']} carries {printed(link['discharge_m3_s'])} m3/s past the field" for link in entry["links"]]
    out += [f"{name} is left out: it has no water at an end, or no discharge in the file" for name in entry["links_left_out"]]
    if entry["storage_dominates"]:
        out.append("Storage explains more than half of the flow: psi is not drawn")
    return out


def zone_json(mesh: Mesh, zone: Zone) -> dict[str, Any]:
    """One entry of ``zones``."""
    plain = {
        name: _number(getattr(zone, name))
        for name in (
            "area_m2", "volume_m3", "length_m", "width_m", "mean_depth_m", "max_depth_m", "psi_centre_m3_s",
            "psi_edge_m3_s", "psi_wall_m3_s", "recirculating_discharge_m3_s", "share_of_through_discharge",
            "rotation_time_s",
        )
    }
    return {
        "id": zone.id,
        "name": zone.name,
        "kind": zone.kind,
        "wall": zone.wall,
        "rotation": zone.rotation,
        "centre": point(mesh, zone.centre),
        "chainage_m": _number(zone.chainage_m),
        "offset_m": _number(zone.offset_m),
        **plain,
        "separation": point(mesh, zone.separation),
        "reattachment": point(mesh, zone.reattachment),
        "triangles_across": zone.triangles_across,
        "max_reverse_speed_m_s": zone.max_reverse_speed_m_s,
        "wake": None if zone.wake is None else {k: _number(v) for k, v in asdict(zone.wake).items()},
        "flags": list(zone.flags),
        "sensitivity": {name: [_number(low), _number(high)] for name, (low, high) in zone.sensitivity.items()},
        "cautions": list(zone.cautions),
        **({} if zone.residence is None else {"residence": _residence(zone.residence)}),
    }


def _residence(found: Residence) -> dict[str, Any]:
    """How long water stays; the figures are None where nothing leaves, or where the time watched does not reach them."""
    stay = found.stay
    figures = {
        "parcels": stay.parcels, "left": stay.left, "watched_s": stay.watched_s, "median_s": stay.median_s,
        "median_low_s": stay.median_95_s[0], "median_high_s": stay.median_95_s[1], "mean_s": stay.mean_s,
        "mean_low_s": stay.mean_95_s[0], "mean_high_s": stay.mean_95_s[1],
    } if stay else {}
    return {"mixing_m2_s": found.mixing_m2_s, "words": found.words, **figures}


def point(mesh: Mesh, local: np.ndarray | None) -> list[float] | None:
    """World coordinates of a local point."""
    return None if local is None else [float(v) for v in mesh.to_world(local)]


def time_text(time: np.datetime64 | None) -> str | None:
    """ISO 8601 UTC to the second (to the millisecond where it has a fraction)."""
    if time is None or np.isnat(time):
        return None
    text = np.datetime_as_string(time.astype("datetime64[ms]"))
    return text.removesuffix(".000") + "Z"


def _plain(value: Any) -> Any:
    """Tuples to lists, NaN to None, through nested values."""
    if isinstance(value, dict):
        return {k: _plain(v) for k, v in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(v) for v in value]
    return _number(value) if isinstance(value, float) else value


def _number(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else float(value)
