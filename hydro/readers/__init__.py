"""Doors in: one module a kind of file; each gives a run with a mesh, its times and its frames.

What a person may say about a file that its metadata does not is described in :mod:`.mapping`.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from ..run import Run
from ..settings import Settings
from .assemble import Asked
from .features import open_features
from .grids import is_grid, open_grids
from .mapping import check_mapping
from .rasters import open_rasters
from .store import open_store, sniff
from .tables import open_tables
from .ugrid import mesh_names
from .unstructured import open_ugrid

_SUFFIXES = (".nc", ".nc4", ".tif", ".tiff", ".gpkg", ".csv", ".parquet")


def open_run(
    paths: str | Path | Iterable[str | Path],
    *,
    mesh: str | None = None,
    mapping: Mapping[str, Any] | None = None,
    settings: Settings | None = None,
    origin: tuple[float, float] | None = None,
    kind: str | None = None,
    name: str | None = None,
) -> Run:
    """Open results, whatever door their content asks for; frames are read when they are used.

    Parameters
    ----------
    paths : path or paths
        One file, or the files of one run split by time, in any order; a folder of rasters.
    mesh : str, optional
        Which of several meshes in the file, or layers of a GeoPackage.
    mapping : dict, optional
        Which variable holds what, and its unit: see :mod:`hydro.readers.mapping`.
    settings : Settings, optional
    origin : pair of floats, optional
        World coordinates of the local origin, to share it with other runs.
    kind : "instant", "mean" or "maximum", optional
        What the frames are, where the file does not say or is wrong.
    name : str, optional
        A label; default the file's title, else its name.

    Raises
    ------
    FileNotFoundError
        A file that is not there.
    ValueError
        Anything else that is wrong, in one sentence: what, where, and what to do.
    """
    files = [Path(p) for p in ([paths] if isinstance(paths, (str, Path)) else paths)]
    if not files:
        raise ValueError("no file was given; give the results file or files of one run.")
    if kind not in (None, "instant", "mean", "maximum"):
        raise ValueError(f"kind of frame is {kind!r}; say one of instant, mean, maximum.")
    files = _listed(files)
    asked = Asked(check_mapping(mapping), settings or Settings(), origin, kind, name)
    found = {sniff(f) for f in files}
    if found <= {"hdf5", "classic"}:
        stores = [open_store(f) for f in files]
        if mesh is None and not any(mesh_names(s) for s in stores) and is_grid(stores[0]):
            return open_grids(stores, asked)
        return open_ugrid(stores, asked, mesh=mesh)
    if found == {"tiff"}:
        return open_rasters(files, asked)
    if found == {"geopackage"}:
        if len(files) > 1:
            raise ValueError(f"{files[1].name}: give one GeoPackage a run; its layers may hold several times.")
        return open_features(files[0], asked, layer=mesh)
    if found <= {"text", "parquet"}:
        return open_tables(files, asked)
    if len(found) > 1:
        raise ValueError(
            f"{files[0].name} and {files[1].name} are of different kinds; give the files of one run, all of a kind."
        )
    raise ValueError(
        f"{files[0].name} is no results file that can be read; give NetCDF, GeoTIFF, GeoPackage, CSV or Parquet."
    )


def _listed(files: list[Path]) -> list[Path]:
    """A folder stands for the files in it that a door can read."""
    out: list[Path] = []
    for f in files:
        inside = sorted(p for p in f.iterdir() if p.suffix.lower() in _SUFFIXES) if f.is_dir() else [f]
        if not inside:
            raise ValueError(f"{f} holds no results files; give a folder with NetCDF or GeoTIFF files, or a file.")
        out += inside
    return out
