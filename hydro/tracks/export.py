"""Traced lines as GeoPackage, CSV and Parquet, in world coordinates."""

from __future__ import annotations

from pathlib import Path

import geopandas
import numpy as np
import pandas as pd
import shapely

from ..cautions import OWED, told
from ..ledger.export import csv_heading, write_package
from ..ledger.report import source_of
from ..reach import CentreLine
from ..review import write_whole
from ..run import Run
from .lines import Traced


def points_table(run: Run, traced: Traced, centre_line: CentreLine | None = None) -> pd.DataFrame:
    """One row a point: kind, line, x, y (world, m), seconds, chainage and offset where there is a centre line."""
    tracks = [t for t in traced.tracks if len(t.xy)]
    if not tracks:
        return pd.DataFrame(columns=["kind", "line", "x_m", "y_m", "seconds"])
    xy = np.vstack([t.xy for t in tracks])
    world = run.mesh.to_world(xy)
    table = pd.DataFrame({
        "kind": np.concatenate([[t.kind] * len(t.xy) for t in tracks]),
        "line": np.concatenate([[t.number] * len(t.xy) for t in tracks]),
        "x_m": world[:, 0], "y_m": world[:, 1], "seconds": np.concatenate([t.seconds for t in tracks]),
    })
    if centre_line is not None:
        table["chainage_m"], table["offset_m"] = centre_line.locate(xy)
    return table


def lines_table(run: Run, traced: Traced) -> geopandas.GeoDataFrame:
    """One row a line of two points or more, with why it ended, its length, time, psi and error."""
    kept = [t for t in traced.tracks if len(t.xy) > 1]
    return geopandas.GeoDataFrame(
        {
            "kind": [t.kind for t in kept], "line": [t.number for t in kept], "ended": [t.ended for t in kept],
            "length_m": [t.length_m for t in kept], "seconds": [float(t.seconds[-1] - t.seconds[0]) for t in kept],
            "psi_m3_s": [t.psi for t in kept], "error_m": [t.error_m for t in kept], "touches": [t.touches for t in kept],
        },
        geometry=[shapely.LineString(run.mesh.to_world(t.xy)) for t in kept],
    )


def write_tracks(folder: Path, run: Run, traced: Traced, centre_line: CentreLine | None = None) -> list[Path]:
    """tracks.gpkg (lines), points.csv and points.parquet in ``folder``."""
    folder.mkdir(parents=True, exist_ok=True)
    table = points_table(run, traced, centre_line)
    source = source_of(run)
    write_whole(folder / "points.csv", csv_heading(source, run.settings, OWED["tracks"]) + table.to_csv(index=False))
    # pandas keeps attrs in the file's metadata.
    table.attrs = {"source": source, "cautions": told(OWED["tracks"])}
    table.to_parquet(folder / "points.parquet")
    about = {"source": source, "warnings": traced.warnings}
    write_package(folder / "tracks.gpkg", {"lines": lines_table(run, traced)}, run.crs, about, OWED["tracks"])
    return [folder / n for n in ("points.csv", "points.parquet", "tracks.gpkg")]
