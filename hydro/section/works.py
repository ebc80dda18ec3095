"""Weirs, bridge openings and named places over the frames of a run, and envelopes of a run: one table each."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import pandas as pd
import shapely

from ..cautions import OWED
from ..ledger.export import write_package
from ..ledger.report import source_of, time_text
from ..mesh import Mesh
from ..reach import NamedLine, Reach, Structure
from ..run import Run
from .crossings import bridge_openings, weir_line
from .receptors import series

ENVELOPE = "maximum over the frames of the run, each figure at its own moment; depth times speed at one moment"


def weir_table(
    run: Run, reach: Reach, frames: Iterable[int], *, relation: str, heads_away: float = 4.0, crest_length_m: float = 0.0,
) -> pd.DataFrame:
    """Every weir with a crest level in every frame: section heads, fall, discharge, and that of the relation picked.

    Raises
    ------
    ValueError
        A review without a centre line or without a weir that has a crest level, an unknown relation.
    """
    if reach.centre_line is None:
        raise ValueError("weirs are read beside a centre line; draw one in the review's lines.gpkg.")
    weirs = [s for s in reach.structures if s.kind == "weir" and "crest_m" in s.levels]
    if not weirs:
        raise ValueError("the review has no weir with a crest level; give kind weir and crest_m in its lines.gpkg.")
    rows = []
    for index in frames:
        frame = run.frame(index)
        for weir in weirs:
            w = weir_line(
                frame, weir, reach.centre_line, relation=relation, heads_away=heads_away, crest_length_m=crest_length_m,
            )
            rows.append({
                "weir": w.name, **_when(frame), "crest_m": w.crest_m, "upstream_head_m": w.upstream_head_m,
                "downstream_head_m": w.downstream_head_m, "fall_m": w.fall_m, "discharge_m3_s": w.discharge_m3_s,
                "relation": w.reading.relation, "relation_discharge_m3_s": w.reading.discharge_m3_s,
                "drowned_factor": w.reading.drowned_factor, "upstream_section_m": w.stations[0], "downstream_section_m": w.stations[1],
                "outside_range": "; ".join(w.reading.outside), "source": w.reading.source,
            })
    return pd.DataFrame(rows)


def opening_table(run: Run, reach: Reach, frames: Iterable[int]) -> pd.DataFrame:
    """Every opening of the review in every frame: flow, share, approach, freeboard under the deck above it.

    Where the level stands above the soffit the figures of a free surface are None and the flag says so.

    Raises
    ------
    ValueError
        A review without a centre line or without openings.
    """
    openings = reach.layer("openings")
    if reach.centre_line is None or not openings:
        raise ValueError("openings are read beside a centre line; draw both in the review's lines.gpkg (layers centre_line, openings).")
    rows = []
    for index in frames:
        frame = run.frame(index)
        for group, soffit in _under_decks(openings, reach.structures):
            for o in bridge_openings(frame, group, reach.centre_line, soffit_m=soffit):
                under = o.freeboard_m is not None and o.freeboard_m < 0
                rows.append({
                    "opening": o.name, **_when(frame), "discharge_m3_s": o.discharge_m3_s, "share": o.share,
                    "width_m": None if under else o.width_m, "mean_velocity_m_s": None if under else o.mean_velocity_m_s,
                    "max_velocity_m_s": None if under else o.max_velocity_m_s, "approach_deg": o.approach_deg,
                    "highest_level_m": o.highest_level_m, "soffit_m": soffit, "freeboard_m": o.freeboard_m, "flags": "; ".join(o.flags),
                })
    return pd.DataFrame(rows)


def place_table(run: Run, places: Sequence[NamedLine], *, depth_m: float) -> pd.DataFrame:
    """Named places over a whole run: peaks with their times, time above a depth, when it is first passed, percentiles.

    Parameters
    ----------
    depth_m : float
        The depth that duration and arrival are counted from, m.

    Raises
    ------
    ValueError
        No place. One that lies outside the mesh has a row with a note.
    """
    if not places:
        raise ValueError("the review names no places; draw points or polygons in layer receptors of its lines.gpkg.")
    rows = []
    for place in places:
        row: dict[str, Any] = {"place": place.name, "note": ""}
        try:
            s = series(run, place)
        except ValueError as outside:  # one place off the model must not hide the others
            rows.append(row | {"note": str(outside)})
            continue
        for figure, unit in (("depth_max", "m"), ("level_mean", "m"), ("speed_max", "m_s"), ("depth_speed_max", "m2_s")):
            value, at = s.peak(figure)
            row |= {f"peak_{figure}_{unit}": value, f"peak_{figure}_s": at}
        row |= {
            "above_depth_m": depth_m, "time_above_s": s.duration_above("depth_max", depth_m), "first_above_s": s.arrival("depth_max", depth_m),
            "median_depth_m": s.percentile("depth_max", 50), "depth_95_percent_m": s.percentile("depth_max", 95),
            "speed_95_percent_m_s": s.percentile("speed_max", 95), "greatest_wet_share": float(s.values["wet_share"].max()),
        }
        rows.append(row)
    return pd.DataFrame(rows)


def envelope(run: Run) -> pd.DataFrame:
    """Greatest depth, level, speed and depth times speed (at one moment) of every face over a run, one row a face.

    ``first_wet_s`` is the first frame in which a face is wet, ``wet_time_s`` the time that its wet frames stand
    for. Made by this tool from the frames; what happens between frames is not in it.

    Raises
    ------
    ValueError
        A run whose frames are maxima already.
    """
    if "maximum" in run.times.kinds:
        raise ValueError(f"{run.name} holds maxima already; an envelope is made from instants.")
    n, s = run.mesh.n_faces, run.times.seconds
    weights = run.window(float(s[0]), float(s[-1]))[1]
    best = {name: np.full(n, -np.inf) for name in ("depth_m", "level_m", "speed_m_s", "depth_speed_m2_s")}
    first, wet_time = np.full(n, np.nan), np.zeros(n)
    for i in range(run.n_frames):
        frame = run.frame(i)
        wet = frame.face_depth > frame.wet_depth_m
        speed = np.hypot(*frame.face_velocity.T)
        for name, value in (
            ("depth_m", frame.face_depth), ("level_m", frame.face_bed + frame.face_depth), ("speed_m_s", speed),
            ("depth_speed_m2_s", frame.face_depth * speed),
        ):
            best[name] = np.where(wet, np.maximum(best[name], value), best[name])
        first = np.where(np.isnan(first) & wet, s[i], first)
        wet_time += np.where(wet, weights[i], 0.0)
    table = pd.DataFrame({f"max_{name}": np.where(np.isfinite(v), v, np.nan) for name, v in best.items()})
    return table.assign(first_wet_s=first, wet_time_s=wet_time)


def write_envelope(path: Path, run: Run) -> None:
    """Layer ``envelope`` of a GeoPackage: the wet faces with their greatest figures, in the run's CRS."""
    table = envelope(run)
    wet = table["wet_time_s"].to_numpy() > 0
    layer = geopandas.GeoDataFrame(table[wet].reset_index(drop=True), geometry=_faces(run.mesh)[wet])
    write_package(path, {"envelope": layer}, run.crs, {"source": source_of(run), "kind": ENVELOPE}, OWED["envelope"])


def _faces(mesh: Mesh) -> np.ndarray:
    """Polygons (f,) of the faces, world coordinates."""
    triangles = shapely.polygons(mesh.to_world(mesh.node_xy)[mesh.triangles])
    first, count = mesh.face_first_triangle[:-1], np.diff(mesh.face_first_triangle)
    out = triangles[first]
    for i in np.flatnonzero(count > 1):
        out[i] = shapely.union_all(triangles[first[i] : first[i] + count[i]])
    return out


def _when(frame) -> dict[str, Any]:
    return {"frame": frame.index, "time": time_text(frame.time), "seconds": frame.seconds, "kind": frame.kind}


def _under_decks(openings: Sequence[NamedLine], structures: Sequence[Structure]) -> list[tuple[list[NamedLine], float | None]]:
    """Openings by the deck that they lie under, with its soffit; None where no deck with a soffit is drawn above."""
    decks = [s for s in structures if s.kind == "deck" and "soffit_m" in s.levels]
    groups: dict[str, tuple[list[NamedLine], float | None]] = {}
    for opening in openings:
        deck = next((d for d in decks if d.geometry.distance(opening.geometry) < 1.0), None)
        soffit = None if deck is None else deck.levels["soffit_m"]
        groups.setdefault(deck.id if deck else "", ([], soffit))[0].append(opening)
    return list(groups.values())
