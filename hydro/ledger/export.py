"""The ledger as files: a GeoPackage with maps, a CSV with rows; both name their source."""

from __future__ import annotations

import csv
import io
import json
import os
import tempfile
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import shapely

from ..contours import contour_lines, tube_levels
from ..review import write_whole
from ..run import Run
from ..settings import Settings
from .frames import FrameLedger
from .report import frame_json, source_of

_POINTS = ("centre", "separation", "reattachment")


def write_tables(folder: Path, run: Run, frames: Sequence[FrameLedger], settings: Settings | None = None) -> list[Path]:
    """Write eddies.gpkg and eddies.csv into a folder, each whole or not at all; the paths written.

    Layers: zones, centres, separation, reattachment, stream_tubes, walls; each with the run's CRS and a
    column for the frame.
    """
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    settings = settings or run.settings
    layers = _layers(run, frames, settings)
    package, table = folder / "eddies.gpkg", folder / "eddies.csv"
    write_package(package, layers, run.crs, {"source": source_of(run), "settings": dict(settings)})
    write_whole(table, csv_text(zone_rows(run, frames), run, settings))
    return [package, table]


def zone_rows(run: Run, frames: Sequence[FrameLedger]) -> list[dict[str, Any]]:
    """One flat row a zone and frame; places as x and y in world coordinates."""
    rows = []
    for entry in frames:
        whole = frame_json(run, entry)
        for zone in whole["zones"]:
            row = {"frame": whole["index"], "time": whole["time"], "seconds": whole["seconds"], "frame_kind": whole["kind"]}
            for key, value in zone.items():
                if key in _POINTS:
                    row[f"{key}_x_m"], row[f"{key}_y_m"] = value or (None, None)
                elif key == "wake":
                    row.update(value or {})
                elif key == "sensitivity":
                    for name, (low, high) in value.items():
                        row[f"{name}_low"], row[f"{name}_high"] = low, high
                else:
                    row[key] = "; ".join(value) if isinstance(value, list) else value
            rows.append(row)
    return rows


def csv_text(rows: Sequence[dict[str, Any]], run: Run, settings: Settings) -> str:
    """Rows as CSV, headed by comment lines that say where they come from."""
    names = list(dict.fromkeys(name for row in rows for name in row))
    out = io.StringIO()
    source = source_of(run)
    out.write(f"# run: {source['run']}; SHA-256: {source['hash']}; settings: {settings.digest()}\n")
    out.write(f"# made by leewater {source['versions']['leewater']}, {source['made']}: {source['command']}\n")
    out.write(f"# coordinates: {run.crs and run.crs.splitlines()[0][:80] or 'local metres'}; levels above: {run.datum or 'not named'}\n")
    writer = csv.DictWriter(out, names, restval="", lineterminator="\n")
    writer.writeheader()
    writer.writerows({k: ("" if v is None else v) for k, v in row.items()} for row in rows)
    return out.getvalue()


def write_package(path: Path, layers: dict[str, geopandas.GeoDataFrame], crs: str | None, about: dict[str, Any]) -> None:
    """Write layers and their provenance to a GeoPackage, whole or not at all."""
    handle, name = tempfile.mkstemp(dir=path.parent, suffix=".gpkg")
    os.close(handle)
    os.unlink(name)
    try:
        for layer, table in layers.items():
            if len(table):
                table.set_crs(crs).to_file(name, layer=layer, driver="GPKG", engine="pyogrio")
        text = json.dumps(about, sort_keys=True, default=str)
        note = geopandas.GeoDataFrame({"key": ["provenance"], "value": [text]}, geometry=[shapely.Point(0, 0)])
        note.set_crs(crs).to_file(name, layer="provenance", driver="GPKG", engine="pyogrio")
        os.replace(name, path)
    finally:
        if os.path.exists(name):
            os.unlink(name)


def _layers(run: Run, frames: Sequence[FrameLedger], settings: Settings) -> dict[str, geopandas.GeoDataFrame]:
    rows = zone_rows(run, frames)
    zones = [z for entry in frames for z in entry.zones.zones]
    flat = [{k: v for k, v in row.items() if not k.endswith(("_x_m", "_y_m"))} for row in rows]

    def table(geometry: list, records: list[dict]) -> geopandas.GeoDataFrame:
        kept = [(g, r) for g, r in zip(geometry, records, strict=True) if g is not None]
        world = [shapely.transform(g, run.mesh.to_world) for g, _ in kept]
        return geopandas.GeoDataFrame([r for _, r in kept], geometry=world)

    def points(name: str) -> geopandas.GeoDataFrame:
        place = [getattr(z, name) for z in zones]
        short = [{k: r[k] for k in ("frame", "time", "seconds", "id", "name")} for r in flat]
        return table([None if p is None else shapely.Point(p) for p in place], short)

    tubes = [t for entry in frames for t in _tubes(entry, settings)]
    walls = [w for entry in frames for w in _walls(entry)]
    return {
        "zones": table([z.contour for z in zones], flat),
        "centres": points("centre"),
        "separation": points("separation"),
        "reattachment": points("reattachment"),
        "stream_tubes": table([g for g, _ in tubes], [r for _, r in tubes]),
        "walls": table([g for g, _ in walls], [r for _, r in walls]),
    }


def _tubes(entry: FrameLedger, settings: Settings) -> list[tuple]:
    sf, made = entry.sf, []
    psi = np.nan_to_num(sf.psi)
    for level in tube_levels(sf, int(settings["tubes"])):
        for line in contour_lines(sf.frame.mesh, psi, float(level), sf.domain):
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
