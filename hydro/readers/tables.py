"""Door for plain tables, CSV and Parquet: points with values, or faces with values beside a table of nodes.

Columns are headed by the quantity and its unit, ``depth [m]``, ``velocity_x [m/s]``, ``bed [m]``, ``x [m]``,
``y [m]`` and, for several frames, ``time [s]`` or dates; other headings are named by the mapping. Points
on a rectangular lattice are joined by quads, scattered ones by triangles. A table whose columns
``node_1``, ``node_2`` ... (or those of mapping ``nodes``) list the nodes of faces needs a second table
with the columns ``node``, ``x`` and ``y``; its values then stand on faces.
"""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pandas as pd
import pyarrow
import pyarrow.parquet

from ..mesh import Mesh, build_mesh
from ..run import Note, Run
from . import faults
from .assemble import Asked, Parts, make_run
from .columns import Column, column_of, fields_of, split_heading, time_axis, values_of
from .crs import Ground, ground, read_system, system_factor
from .lattice import LONGEST_SIDE, lattice_of, triangles_of
from .mapping import Said


def open_tables(files: list[Path], asked: Asked) -> Run:
    """A run from a table of points, or from a table of faces and one of nodes.

    Raises ``ValueError`` with one sentence for anything that is wrong.
    """
    tables = [read_table(f) for f in files]
    faces = [i for i, t in enumerate(tables) if _node_columns(t, asked.said)]
    if len(files) > 2 or (len(files) == 2 and len(faces) != 1) or (len(files) == 1 and faces):
        raise ValueError(
            f"{files[0].name}: give one table of points, or a table of faces (with columns node_1, node_2, node_3) and "
            "one of "
            "nodes (with columns node, x, y); several times belong in one table with a time column."
        )
    if faces:
        main, other = faces[0], 1 - faces[0]
        return _run([files[main], files[other]], tables[main], tables[other], asked)
    return _run(files, tables[0], None, asked)


def _run(files: list[Path], table: pd.DataFrame, nodes: pd.DataFrame | None, asked: Asked) -> Run:
    """A run from a table of points, or of faces beside its table of nodes."""
    path, said = files[0], asked.said
    axis, frame, notes = time_axis(path.name, table, said, asked.kind)
    if nodes is None:
        xy, place = places(path.name, table, said)
        mesh, location, more = mesh_of_points(path.name, xy, asked.origin)
    else:
        mesh, place, location = *_mesh_of_faces(path.name, table, nodes, files[1].name, said, asked.origin), "face"
        more = [Note("the table has no edges; edge discharges cannot be given", "")]
    n_places = len(xy) if nodes is None else mesh.n_faces
    fields = fields_of(path.name, table, said, location, place, frame, n_places)
    parts = Parts(
        asked.name or path.stem, tuple(files), mesh, fields, axis,
        table_ground(path.name, table if nodes is None else nodes, said), asked.settings,
        said.get("depth", "is") or ("point" if location == "node" else "mean"), [*notes, *more],
    )
    return make_run(parts)


def table_ground(file: str, table: pd.DataFrame, said: Said) -> Ground:
    """The ground of a table: a table names no coordinate system, so the mapping's or local metres."""
    system = read_system(said.plain["crs"], "mapping.crs") if "crs" in said.plain else None
    column = column_of(file, table, "x", said)
    if system is not None and abs(column.factor / system_factor(system) - 1) > 1e-9:
        raise ValueError(
            f"{file}: column {column.heading!r} is in another unit than mapping.crs; correct the one that is wrong."
        )
    return ground(system, column.factor, said.plain.get("datum", ""), column.heading, file)


def read_table(path: Path) -> pd.DataFrame:
    """A table with its headings as text; units that Parquet stores with its fields are kept in ``attrs``.

    Raises ``ValueError`` when it cannot be read or is empty.
    """
    try:
        if path.suffix.lower() in (".parquet", ".pq"):
            arrow = pyarrow.parquet.read_table(path)
            table = arrow.to_pandas()
            units = {f.name: (f.metadata or {}).get(b"units", b"").decode() for f in arrow.schema}
            table.attrs["units"] = {k: v for k, v in units.items() if v}
        else:
            table = pd.read_csv(path, sep=None, engine="python", skipinitialspace=True, comment="#")
    except (ValueError, OSError, pyarrow.ArrowException, UnicodeDecodeError) as error:
        first = (str(error).splitlines() or [type(error).__name__])[0].rstrip(".")
        raise ValueError(
            f"{path.name} cannot be read as a table ({first}); export it again as CSV or Parquet."
        ) from None
    table.columns = [str(c).strip() for c in table.columns]
    if not len(table):
        raise ValueError(f"{path.name} has headings but no rows; export it again.")
    return table


def places(file: str, table: pd.DataFrame, said: Said) -> tuple[np.ndarray, np.ndarray]:
    """The different places (n, 2) of a table, world m, in order of first appearance, and the place of each row."""
    xy = np.column_stack([
        values_of(file, table, column_of(file, table, axis, said)) for axis in "xy"
    ])
    missing = np.flatnonzero(~np.isfinite(xy).all(axis=1))
    if missing.size:
        raise ValueError(
            f"{file}: row {missing[0] + 1} has no coordinates (and {missing.size - 1} more); fill or remove them."
        )
    found, first, place = np.unique(xy, axis=0, return_index=True, return_inverse=True)
    order = np.argsort(first)
    rank = np.empty(len(order), int)
    rank[order] = np.arange(len(order))
    return found[order], rank[place.ravel()]


def mesh_of_points(file: str, xy: np.ndarray, origin: tuple[float, float] | None) -> tuple[Mesh, str, list[Note]]:
    """A mesh whose nodes are the points, where values stand, and what the door cannot give."""
    cells = lattice_of(xy)
    if cells is not None:
        text = "points stand on a lattice and are joined by quads; banks and piers are stair steps, there are no edges"
        notes = [Note(text, "")]
    else:
        try:
            cells, spanning = triangles_of(xy)
        except ValueError as error:
            raise ValueError(f"{file}: {error}; give points all over the water.") from None
        text = (
            f"points are joined by triangles; those with a side over {LONGEST_SIDE:g} times the local spacing are left "
            "out as "
            "gaps, so check banks and piers; there are no edges of the model"
        )
        notes = [Note(text, "", spanning)]
    faults.check_coordinates(file, "x, y", xy, cells)
    mesh = build_mesh(xy, cells.astype(np.int32), origin=origin, stepped=True)
    if mesh.n_nodes < len(xy):
        notes.append(Note("points that belong to no face are left out", "", len(xy) - mesh.n_nodes))
    return mesh, "node", notes


def _node_columns(table: pd.DataFrame, said: Said) -> list[str]:
    named = said.variable("nodes")
    if named is not None:
        wanted = [named] if isinstance(named, str) else named
        return [h for h in table.columns if h in wanted]
    found = [h for h in table.columns if re.fullmatch(r"node_\d+", h)]
    return sorted(found, key=lambda h: int(h.split("_")[1]))


def _numbered(file: str, nodes: pd.DataFrame, heading: str) -> dict[int, int]:
    """The row of each node number; ``ValueError`` for a row without one, or a number that stands twice."""
    values = values_of(file, nodes, Column(heading, 1.0))
    wrong = np.flatnonzero(~np.isfinite(values) | (values != np.round(values)))
    if wrong.size:
        raise ValueError(f"{file}: row {wrong[0] + 1} has no whole number in column {heading!r}; number every node.")
    found, count = np.unique(values, return_counts=True)
    if (count > 1).any():
        raise ValueError(f"{file}: node {int(found[count > 1][0])} stands twice in column {heading!r}; keep one row of it.")
    return {int(n): i for i, n in enumerate(values)}


def _mesh_of_faces(file, table, nodes, node_file, said, origin) -> tuple[Mesh, np.ndarray]:
    """The mesh of a face table and a node table, and the face of each row."""
    heading = said.variable("node") or next((h for h in nodes.columns if split_heading(h)[0] == "node"), None)
    if heading is None or heading not in nodes.columns:
        raise ValueError(
            f"{node_file} has no column 'node'; number its nodes or name the column with mapping.node.variable."
        )
    xy = np.column_stack([
        values_of(node_file, nodes, column_of(node_file, nodes, axis, said)) for axis in "xy"
    ])
    number = _numbered(node_file, nodes, heading)
    listed = np.column_stack([values_of(file, table, Column(h, 1.0)) for h in _node_columns(table, said)])
    rows, first, place = np.unique(np.nan_to_num(listed, nan=-1.0), axis=0, return_index=True, return_inverse=True)
    faces = np.full(rows.shape, -1, np.int32)
    for i, row in enumerate(rows):
        for k, value in enumerate(row[row >= 0]):
            if int(value) not in number:
                raise ValueError(
                    f"{file}: row {first[i] + 1} names node {int(value)}, which {node_file} lacks; correct it."
                )
            faces[i, k] = number[int(value)]
    faults.check_coordinates(node_file, "x, y", xy, faces)
    faults.check_faces(file, xy, faces)
    try:
        mesh = build_mesh(xy, faces, origin=origin)
    except ValueError as error:
        raise ValueError(f"{file}: {error}") from None
    faults.check_mesh(file, mesh)
    return mesh, place.ravel()
