"""A new review round results files: their entries with hashes, and a first centre line read from the flow itself."""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import shapely

from .contours import psi_lines
from .provenance import files_hash
from .reach import CentreLine
from .readers import open_run
from .review import Review, new_review
from .run import Run
from .streamfunction import stream_function

_SIMPLER = 0.05  # share of the river's mean width by which thinning may move the line


def begin_review(folder: Path, title: str, files: Sequence[Path], *, who: str) -> Review:
    """Make a review folder for results files that stay where they are.

    review.toml lists each file with its path from the folder and its hash; lines.gpkg gets a centre line
    proposed from the first run, to be looked at and redrawn where it is wrong.

    Raises
    ------
    ValueError
        A folder that is a review already, a file that is not there or cannot be read.
    """
    runs = [open_run([path]) for path in files]
    line = proposed_course(runs[0])
    review = new_review(folder, title)
    origin = runs[0].mesh.origin
    layer = geopandas.GeoDataFrame(
        {"id": ["c1"], "name": ["Centre line, proposed from the flow"]},
        geometry=[shapely.LineString(np.round(line.points + origin, 3))], crs=runs[0].crs,
    )
    layer.to_file(review.folder / "lines.gpkg", layer="centre_line", driver="GPKG")
    ids = _ids(files)

    def add(document: Any) -> None:
        document["runs"] = [
            {"id": id_, "file": os.path.relpath(path.resolve(), review.folder.resolve()).replace(os.sep, "/"), "sha256": files_hash([path])}
            for id_, path in zip(ids, files, strict=True)
        ]

    return review.edit(add, who=who, what=f"began the review with {len(files)} results files")


def proposed_course(run: Run) -> CentreLine:
    """The streamline that parts the through-flow of the first frame in two, thinned; downstream.

    Raises
    ------
    ValueError
        A run of maxima, or one without through-flow: it has no such streamline; draw the line by hand.
    """
    if "maximum" in run.times.kinds:
        raise ValueError(f"{run.name} holds maxima, which have no streamlines; begin with a run of instants or means.")
    sf = stream_function(run.frame(run.n_frames - 1), boundary_sets=run.boundary_sets)
    if not sf.through_discharge_m3_s > 0:
        raise ValueError(f"no water passes through {run.name}; draw its centre line in lines.gpkg by hand.")
    banks = [w.psi_m3_s for w in sf.walls]
    level = (min(banks) + max(banks)) / 2
    lines = psi_lines(sf, level)
    longest = max(lines, key=lambda p: float(np.hypot(*np.diff(p, axis=0).T).sum()))
    width = float(run.mesh.face_area.sum()) / float(np.hypot(*np.diff(longest, axis=0).T).sum())
    thin = shapely.get_coordinates(shapely.LineString(longest).simplify(_SIMPLER * width))
    return CentreLine(thin if _downstream(run, sf.frame.unit_discharge, thin) else thin[::-1])


def _downstream(run: Run, flow: np.ndarray, line: np.ndarray) -> bool:
    """Whether the water follows a line's direction on the whole."""
    middle = (line[:-1] + line[1:]) / 2
    triangle = run.mesh.find(middle)
    q = flow[run.mesh.triangles[triangle]].mean(axis=1)[triangle >= 0]
    return float((q * np.diff(line, axis=0)[triangle >= 0]).sum()) > 0


def _ids(files: Sequence[Path]) -> list[str]:
    """Ids from the files' names, told apart where two are alike."""
    stems = [path.stem for path in files]
    return [stem if stems.count(stem) == 1 else f"{stem}-{i + 1}" for i, stem in enumerate(stems)]
