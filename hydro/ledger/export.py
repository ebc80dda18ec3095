"""The ledger as files: a GeoPackage with maps, a CSV with rows; both name their source."""

from __future__ import annotations

import csv
import io
import json
import os
import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import pandas as pd
import pyogrio
import shapely

from ..cautions import OWED, caution
from ..contours import psi_lines, tube_levels
from ..review import write_whole
from ..run import Run
from ..settings import Settings
from .all_frames import summary_of
from .follow import Life
from .frames import FrameLedger
from .page import page_text
from .report import ledger_json
from .summary import FrameSummary
from .windows import Instants

_POINTS = ("centre", "separation", "reattachment")


def write_tables(
    folder: Path, run: Run, frames: Sequence[FrameLedger | FrameSummary], settings: Settings | None = None, *,
    lives: Sequence[Life] = (), instants: Mapping[str, Instants] | None = None,
) -> list[Path]:
    """Write eddies.gpkg, eddies.csv and eddies.html into a folder, each whole or not at all; the paths written.

    Layers of the GeoPackage: zones, centres, separation, reattachment, and for frames whose field is at hand
    stream_tubes and walls; tracks of the cores where eddies were followed. Each has the run's CRS and
    a column for the frame.
    """
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    settings = settings or run.settings
    whole = ledger_json(run, frames, settings, lives=lives, instants=instants)
    layers = _layers(run, frames, settings, lives)
    package, table, page = folder / "eddies.gpkg", folder / "eddies.csv", folder / "eddies.html"
    write_package(package, layers, run.crs, {"source": whole["source"], "settings": whole["settings"]}, OWED["eddies"])
    write_whole(table, csv_text(rows_of(whole), whole["source"], settings, OWED["eddies"]))
    write_whole(page, page_text(whole, settings))
    return [package, table, page]


def rows_of(whole: Mapping[str, Any]) -> list[dict[str, Any]]:
    """One flat row a zone and frame of a ledger; places as x and y in world coordinates."""
    rows = []
    for entry in whole["frames"]:
        for zone in entry["zones"]:
            row = {"frame": entry["index"], "time": entry["time"], "seconds": entry["seconds"], "frame_kind": entry["kind"]}
            for key, value in zone.items():
                if key in _POINTS:
                    row[f"{key}_x_m"], row[f"{key}_y_m"] = value or (None, None)
                elif key == "sensitivity":
                    for name, (low, high) in value.items():
                        row[f"{name}_low"], row[f"{name}_high"] = low, high
                elif isinstance(value, dict):
                    row.update({f"{key}_{k}": v for k, v in value.items() if not isinstance(v, dict)})
                elif value is not None or key not in ("wake", "instants"):
                    row[key] = "; ".join(value) if isinstance(value, list) else value
            rows.append(row)
    return rows


def csv_text(rows: Sequence[Mapping[str, Any]], source: Mapping[str, Any], settings: Settings, cautions: Sequence[str]) -> str:
    """Rows as CSV, headed by :func:`csv_heading`."""
    names = list(dict.fromkeys(name for row in rows for name in row))
    out = io.StringIO()
    out.write(csv_heading(source, settings, cautions))
    writer = csv.DictWriter(out, names, restval="", lineterminator="\n")
    writer.writeheader()
    writer.writerows({k: ("" if v is None else v) for k, v in row.items()} for row in rows)
    return out.getvalue()


def csv_heading(source: Mapping[str, Any], settings: Settings, cautions: Sequence[str]) -> str:
    """Comment lines above a CSV: where it comes from, and the cautions that it owes."""
    crs = source["crs"].splitlines()[0][:80] if source["crs"] else "local metres"
    lines = [
        f"run: {source['run']}; SHA-256: {source['hash']}; settings: {settings.digest()}",
        f"made by leewater {source['versions']['leewater']}, {source['made']}: {source['command']}",
        f"coordinates: {crs}; levels above: {source['vertical_datum'] or 'not named'}",
        *(caution(id_).text for id_ in cautions),
    ]
    return "".join(f"# {line}\n" for line in lines)


def write_package(
    path: Path, layers: dict[str, geopandas.GeoDataFrame], crs: str | None, about: dict[str, Any], cautions: Sequence[str]
) -> None:
    """Write layers to a GeoPackage with a table of their provenance and the cautions owed, whole or not at all."""
    handle, name = tempfile.mkstemp(dir=path.parent, suffix=".gpkg")
    os.close(handle)
    os.unlink(name)
    try:
        for layer, table in layers.items():
            if len(table):
                table.set_crs(crs).to_file(name, layer=layer, driver="GPKG", engine="pyogrio")
        text = json.dumps(about, sort_keys=True, default=str)
        told = [caution(id_).text for id_ in cautions]
        note = pd.DataFrame({"key": ["provenance", *["caution"] * len(told)], "value": [text, *told]})
        pyogrio.write_dataframe(note, name, layer="provenance", driver="GPKG")
        os.replace(name, path)
    finally:
        if os.path.exists(name):
            os.unlink(name)


def _layers(run: Run, frames, settings: Settings, lives: Sequence[Life]) -> dict[str, geopandas.GeoDataFrame]:
    entries = [summary_of(run, f) if isinstance(f, FrameLedger) else f for f in frames]
    flat = [
        {k: v for k, v in row.items() if not k.endswith(("_x_m", "_y_m"))}
        for row in rows_of({"frames": [e.values for e in entries]})
    ]
    zones = [z for e in entries for z in e.zones]

    def table(geometry: list, records: list[dict]) -> geopandas.GeoDataFrame:
        kept = [(g, r) for g, r in zip(geometry, records, strict=True) if g is not None]
        world = [shapely.transform(g, run.mesh.to_world) for g, _ in kept]
        return geopandas.GeoDataFrame([r for _, r in kept], geometry=world)

    def points(name: str) -> geopandas.GeoDataFrame:
        place = [getattr(z, name) for z in zones]
        short = [{k: r[k] for k in ("frame", "time", "seconds", "id", "name")} for r in flat]
        return table([None if p is None else shapely.Point(p) for p in place], short)

    held = [f for f in frames if isinstance(f, FrameLedger)]
    tubes = [t for entry in held for t in _tubes(entry, settings)]
    walls = [w for entry in held for w in _walls(entry)]
    tracks = _tracks(entries, lives)
    moving = [
        (t, {"frame": e.index, "seconds": e.seconds, **{k: v for k, v in row.items() if k not in ("centre", "speed_m_s")}})
        for e in entries for t, row in zip(e.travelling, e.values["travelling"], strict=True)
    ]
    return {
        "travelling": table([shapely.Point(t.core.centre) for t, _ in moving], [r for _, r in moving]),
        "travelling_contours": table([t.contour for t, _ in moving], [r for _, r in moving]),
        "travelling_tracks": table(*_moving_tracks(entries)),
        "zones": table([z.contour for z in zones], flat),
        "zones_inner": table([z.inner for z in zones], [{k: r[k] for k in ("frame", "id", "name")} for r in flat]),
        "centres": points("centre"),
        "separation": points("separation"),
        "reattachment": points("reattachment"),
        "tracks": table([g for g, _ in tracks], [r for _, r in tracks]),
        "stream_tubes": table([g for g, _ in tubes], [r for _, r in tubes]),
        "walls": table([g for g, _ in walls], [r for _, r in walls]),
    }


def _moving_tracks(entries: Sequence[FrameSummary]) -> tuple[list, list[dict]]:
    """The path of each travelling eddy's core that is seen in more than one frame."""
    paths: dict[str, list] = {}
    for e in entries:
        for t in e.travelling:
            paths.setdefault(t.id, []).append((e.seconds, t.core.centre))
    kept = {id_: path for id_, path in paths.items() if len(path) > 1}
    records = [{"id": id_, "first_s": path[0][0], "last_s": path[-1][0]} for id_, path in kept.items()]
    return [shapely.LineString([at for _, at in path]) for path in kept.values()], records


def _tracks(entries: Sequence[FrameSummary], lives: Sequence[Life]) -> list[tuple]:
    """The path of each followed eddy's centre, for those seen at more than one place."""
    made = []
    for life in lives:
        path = [z.centre for e in entries for z in e.zones if z.id == life.id]
        if life.followed and len(path) > 1 and np.ptp(path, axis=0).any():
            record = {
                "id": life.id, "name": life.name, "first_s": life.first_s, "last_s": life.last_s,
                "share_of_time": life.share_of_time,
            }
            made.append((shapely.LineString(path), record))
    return made


def _tubes(entry: FrameLedger, settings: Settings) -> list[tuple]:
    sf, made = entry.sf, []
    for level in tube_levels(sf, int(settings["tubes"])):
        for line in psi_lines(sf, float(level)):
            if len(line) > 1:
                made.append((shapely.LineString(line), {"frame": entry.frame.index, "psi_m3_s": float(level)}))
    return made


def _walls(entry: FrameLedger) -> list[tuple]:
    s, mesh = entry.sf.shape, entry.frame.mesh
    shut = s.opening < 0
    sides = shapely.linestrings(np.stack([mesh.node_xy[s.a[shut]], mesh.node_xy[s.b[shut]]], axis=1))
    of = s.wall_of_node[s.a[shut]]
    made = []
    for k, wall in enumerate(entry.sf.walls):
        line = shapely.line_merge(shapely.multilinestrings(sides[of == k]))
        made.append((line, {"frame": entry.frame.index, "id": wall.id, "psi_m3_s": wall.psi_m3_s}))
    return made
