"""Doors in: one module a kind of file; each gives a run with a mesh, its times and its frames.

What a person may say about a file that its metadata does not is described in :mod:`.mapping`.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from ..run import Run
from ..settings import Settings
from .mapping import check_mapping
from .store import open_store, sniff
from .unstructured import open_ugrid


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
        One file, or the files of one run split by time, in any order.
    mesh : str, optional
        Which of several meshes in the file.
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
    said = check_mapping(mapping)
    kinds = {sniff(f) for f in files}
    if kinds <= {"hdf5", "classic"}:
        stores = [open_store(f) for f in files]
        return open_ugrid(
            stores, mesh=mesh, said=said, settings=settings or Settings(), origin=origin, kind=kind, name=name
        )
    raise ValueError(f"{files[0].name} is not a NetCDF file; export the results as NetCDF with a UGRID mesh.")
