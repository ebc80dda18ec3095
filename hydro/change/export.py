"""A comparison as JSON, CSV and GeoPackage, from the same figures."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import pandas as pd
import shapely

from ..cautions import told
from ..ledger.export import csv_heading, write_package
from ..ledger.report import source_of, time_text
from ..review import write_whole
from ..run import Run
from .answers import Beside, answer_values, answers_table
from .levels import LevelChange
from .report import Change

SCHEMA = "leewater/change/1"


def change_json(change: Change, answers: Sequence[Beside] = ()) -> dict[str, Any]:
    """The comparison as plain values: b minus a; places are world coordinates, m; missing values None."""
    return {
        "schema": SCHEMA,
        "a": _side(change.a, change.ledger_a.frame),
        "b": _side(change.b, change.ledger_b.frame),
        "pair": {"a": change.pair.a, "b": change.pair.b, "rule": change.pair.rule, "miss": change.pair.miss},
        "differs_outside_the_works": [
            {"what": d.what, "sentence": d.sentence, "largest": d.largest, "unit": d.unit, "share": d.share, "at": _world(change.a, d.at)}
            for d in change.setup
        ],
        "levels": _levels(change),
        "newly_wet_m2": change.maps.newly_wet_m2,
        "no_longer_wet_m2": change.maps.no_longer_wet_m2,
        "zones": [
            {
                "name": z.name, "state": z.state, "a": z.a and z.a.id, "b": z.b and z.b.id, "overlap": z.overlap,
                "area_change_m2": z.area_change_m2, "discharge_change_m3_s": z.discharge_change_m3_s, "moved_m": z.moved_m,
                "told_apart": z.told_apart,
            }
            for z in change.zones
        ],
        "openings": {
            side: [{"name": o.name, "discharge_m3_s": o.discharge_m3_s, "share": _number(o.share), "freeboard_m": o.freeboard_m} for o in part]
            for side, part in zip(("a", "b"), change.openings, strict=True)
        },
        "answers": [answer_values(r) for r in answers],
        "findings": [{"sentence": f.sentence, "over_noise": f.over_noise, "at": _world(change.a, f.at)} for f in change.findings],
        "cautions": told(owed(change, answers)),
    }


def owed(change: Change, answers: Sequence[Beside]) -> tuple[str, ...]:
    """Ids of the cautions that a comparison owes with its answers."""
    return tuple(dict.fromkeys([*change.cautions, *(c for r in answers for f in (r.a, r.b) for c in f.cautions)]))


def write_change(folder: Path, change: Change, answers: Sequence[Beside] = ()) -> list[Path]:
    """levels.csv, answers.csv and change.gpkg (newly wet, no longer wet, findings) in ``folder``."""
    folder.mkdir(parents=True, exist_ok=True)
    out = []
    tables = {"levels": levels_table(change.levels)} if change.levels is not None else {}
    tables |= {"answers": answers_table(answers)} if answers else {}
    source = source_of(change.b) | {"run": f"{change.a.name} (a) and {change.b.name} (b)", "hash": f"{change.a.hash} and {change.b.hash}"}
    heading = csv_heading(source, change.b.settings, owed(change, answers))
    for name, table in tables.items():
        path = folder / f"{name}.csv"
        write_whole(path, heading + table.to_csv(index=False))
        out.append(path)
    path = folder / "change.gpkg"
    layers = {
        "newly_wet": _faces(change, change.maps.newly_wet),
        "no_longer_wet": _faces(change, change.maps.no_longer_wet),
        "findings": _points(change),
    }
    write_package(path, layers, change.a.crs, {"a": source_of(change.a), "b": source_of(change.b)}, owed(change, answers))
    return [*out, path]


def levels_table(levels: LevelChange) -> pd.DataFrame:
    """One row a section: chainage, both levels, rise, and whether it stands outside the works."""
    return pd.DataFrame({
        "chainage_m": levels.chainage, "level_a_m": levels.level_a, "level_b_m": levels.level_b, "rise_m": levels.rise,
        "outside_the_works": levels.outside,
    })


def _side(run: Run, frame) -> dict[str, Any]:
    return {**source_of(run), "frame": frame.index, "seconds": frame.seconds, "time": time_text(frame.time), "kind": frame.kind}


def _levels(change: Change) -> dict[str, Any] | None:
    levels = change.levels
    if levels is None:
        return None
    i = levels.headline
    return {
        "headline": None if i < 0 else {"chainage_m": float(levels.chainage[i]), "rise_m": float(levels.rise[i])},
        "told_apart": bool(levels.told_apart), "noise_m": levels.noise_m,
        "inflow_difference_m3_s": levels.inflow_difference_m3_s,
        "downstream_level_difference_m": levels.downstream_level_difference_m,
        "sections": levels_table(levels).to_dict("records"),
    }


def _faces(change: Change, chosen: np.ndarray) -> geopandas.GeoDataFrame:
    mesh = change.a.mesh
    rings = [mesh.to_world(mesh.node_xy[mesh.face_nodes[f][: mesh.face_count[f]]]) for f in np.flatnonzero(chosen)]
    whole = shapely.union_all([shapely.Polygon(r) for r in rings])
    parts = [g for g in shapely.get_parts(whole) if not g.is_empty]
    return geopandas.GeoDataFrame({"area_m2": [g.area for g in parts]}, geometry=parts)


def _points(change: Change) -> geopandas.GeoDataFrame:
    placed = [f for f in change.findings if f.at is not None]
    places = [shapely.Point(change.a.mesh.to_world(np.array(f.at))) for f in placed]
    return geopandas.GeoDataFrame({"sentence": [f.sentence for f in placed]}, geometry=places)


def _world(run: Run, at: tuple[float, float] | None) -> list[float] | None:
    return None if at is None else [float(v) for v in run.mesh.to_world(np.array(at))]


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
