"""Door for CF structured grids in NetCDF: rectilinear or curvilinear, values of cells or at points.

Cells: where the coordinates have bounds, or cell_methods (or the mapping) say that depth is an area mean.
Else values stand at the grid's points, which are joined by quads. Cells or points without bed are no
part of the mesh.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..mesh import Mesh, build_mesh
from ..run import Note, Run
from . import faults
from .assemble import Asked
from .crs import ground_of
from .lattice import corners_from_centres, quads, weld
from .mapping import Said
from .names import Placed
from .netcdf import Piece, join, read_piece, read_places
from .store import Store, Stored
from .times import depth_is


@dataclass(frozen=True, eq=False)
class Grid:
    """Coordinates of a grid as (rows, columns) arrays, and the dimensions that count rows and columns."""

    x: Stored
    y: Stored
    dimensions: tuple[str, str]
    xs: np.ndarray
    ys: np.ndarray


def open_grids(stores: list[Store], asked: Asked) -> Run:
    """A run from files on one structured grid.

    Raises ``ValueError`` with one sentence for anything that is wrong.
    """
    grid = read_grid(stores[0])
    for other in stores[1:]:
        theirs = read_grid(other)
        pairs = ((grid.xs, theirs.xs), (grid.ys, theirs.ys))
        if not all(np.array_equal(ours, again, equal_nan=True) for ours, again in pairs):
            raise ValueError(
                f"{other.path.name} has another grid than {stores[0].path.name}; the files of one run must share it."
            )
    placed = [_placed(s, grid) for s in stores]
    cells = _are_cells(grid, placed[0], asked.said)
    location = "face" if cells else "node"
    placed = [[Placed(p.variable, location, p.dimensions, p.size) for p in one] for one in placed]
    pieces, notes = [], []
    for store, one in zip(stores, placed, strict=True):
        piece, more = read_piece(store, one, asked.said)
        pieces.append(piece)
        notes += more
    ground = ground_of(stores[0], grid.x, grid.y, [p.variable for p in placed[0]], asked.said)
    mesh, kept = _mesh(stores[0], grid, cells, _has_bed(pieces[0], location), ground.factor, asked.origin)
    what = "cells" if cells else "points of the grid, joined by quads"
    text = f"values are those of {what}; banks and piers are stair steps, there are no edges of the model"
    notes.append(Note(text, grid.x.name))
    return join(pieces, mesh, ground, asked, notes=notes, keep={location: kept})


def is_grid(store: Store) -> bool:
    """Whether a file has coordinates of a structured grid."""
    x, y = _coordinate(store, "x"), _coordinate(store, "y")
    return x is not None and y is not None and (x.dimensions != y.dimensions or len(x.shape) == 2)


def read_grid(store: Store) -> Grid:
    """The grid's coordinates.

    Raises ``ValueError`` when there are none or they do not fit each other.
    """
    x, y = _coordinate(store, "x"), _coordinate(store, "y")
    if x is None or y is None:
        raise ValueError(
            f"{store.path.name} has neither a mesh nor grid coordinates; export the results with a UGRID mesh."
        )
    if len(x.shape) == 1 and len(y.shape) == 1 and x.dimensions != y.dimensions:
        xs, ys = np.meshgrid(x.values(), y.values())
        dimensions = (y.dimensions[0], x.dimensions[0])
    elif len(x.shape) == 2 and x.dimensions == y.dimensions:
        xs, ys, dimensions = x.values(), y.values(), (x.dimensions[0], x.dimensions[1])
    else:
        raise ValueError(f"{x} and {y.name} do not make a grid ({x.shape} and {y.shape}); export them again.")
    if min(xs.shape) < 2:
        raise ValueError(f"{x}: the grid has {xs.shape[0]} by {xs.shape[1]} places; a 2D model needs at least 2 by 2.")
    return Grid(x, y, dimensions, *(np.where(np.isfinite(v), v, np.nan) for v in (xs, ys)))


def _coordinate(store: Store, axis: str) -> Stored | None:
    """The coordinate along an axis, by standard name, else by its axis attribute."""
    degrees = {"x": "longitude", "y": "latitude"}[axis]
    for wanted in (f"projection_{axis}_coordinate", degrees):
        named = [v for v in store.variables.values() if v.text("standard_name") == wanted]
        if named:
            return min(named, key=lambda v: -len(v.shape))
    return next((v for v in store.variables.values() if v.text("axis").upper() == axis.upper()), None)


def _placed(store: Store, grid: Grid) -> list[Placed]:
    """Variables on the grid; those on staggered dimensions are left for the sentence about what is missing."""
    bounds = {v.text("bounds") for v in (grid.x, grid.y)}
    out = []
    for v in store.variables.values():
        if v.name in {grid.x.name, grid.y.name, *bounds} or v.dtype.kind not in "iuf":
            continue
        if set(grid.dimensions) <= set(v.dimensions):
            out.append(Placed(v, "face", grid.dimensions, grid.xs.size))
    return out


def _are_cells(grid: Grid, placed: list[Placed], said: Said) -> bool:
    if grid.x.text("bounds") and grid.y.text("bounds"):
        return True
    if said.get("depth", "is"):
        return said.get("depth", "is") == "mean"
    return any(depth_is(p.variable, ()) == "mean" for p in placed)


def _has_bed(piece: Piece, location: str) -> np.ndarray:
    """Places (p,) of the grid that have a bed, given or derived from the first frame."""
    bed = piece.choices.get(f"{location} bed")
    if bed is not None:
        return np.isfinite(read_places(bed, piece.times.dimension, 0))
    depth, level = piece.choices.get("depth"), piece.choices.get("level")
    if depth is None or level is None:
        raise ValueError(
            f"{piece.store.path.name} has no bed level that can be recognised; export it, or name it with "
            "mapping.bed.variable."
        )
    return np.isfinite(sum(read_places(c, piece.times.dimension, 0) for c in (depth, level)))


def _mesh(store, grid: Grid, cells: bool, has_bed: np.ndarray, factor: float, origin) -> tuple[Mesh, np.ndarray]:
    """The mesh of the places with bed, and the numbers of those that it keeps."""
    file, names = store.path.name, f"{grid.x.name}, {grid.y.name}"
    there = has_bed & np.isfinite(grid.xs + grid.ys).ravel()
    if cells:
        xy, faces = _cells(store, grid)
        kept = np.flatnonzero(there & np.isfinite(xy[faces]).all(axis=(1, 2)))
        faces = faces[kept]
    else:
        xy = np.column_stack([grid.xs.ravel(), grid.ys.ravel()])
        faces = quads(grid.xs.shape[0] - 1, grid.xs.shape[1] - 1)
        faces, kept = faces[there[faces].all(axis=1)], np.arange(len(xy))
    if not len(faces):
        raise ValueError(f"{file}: no place of the grid has both coordinates {names} and a bed; check its fill values.")
    xy = xy * factor
    faults.check_coordinates(file, names, xy, faces)
    faults.check_faces(file, xy, faces)
    try:
        mesh = build_mesh(xy, faces.astype(np.int32), origin=origin, stepped=True)
    except ValueError as error:
        raise ValueError(f"{file}: {error}") from None
    faults.check_mesh(file, mesh)
    return mesh, kept


def _cells(store: Store, grid: Grid) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and quads of a grid's cells: from bounds where there are any, else midway between centres."""
    rows, columns = grid.xs.shape
    bounds = [store.variables.get(c.text("bounds")) for c in (grid.x, grid.y)]
    bx, by = bounds
    if bx is None or by is None:
        return corners_from_centres(grid.xs, grid.ys).reshape(-1, 2), quads(rows, columns)
    if bx.shape == (columns, 2) and by.shape == (rows, 2):
        across, along = np.meshgrid(_edges_of(bx), _edges_of(by))
        return np.column_stack([across.ravel(), along.ravel()]), quads(rows, columns)
    if bx.shape == by.shape == (rows, columns, 4):
        corners = np.stack([bx.values(), by.values()], axis=-1).reshape(-1, 2)
        finite = np.isfinite(corners).all(axis=1)
        size = np.nanmedian(np.linalg.norm(np.diff(corners.reshape(-1, 4, 2), axis=1), axis=2))
        points, number = weld(np.where(finite[:, None], corners, -1e30), 1e-4 * size)
        points[points[:, 0] == -1e30] = np.nan
        return points, number.reshape(-1, 4)
    raise ValueError(
        f"{bx} has shape {bx.shape}, which does not bound a grid of {rows} by {columns} cells; export it again."
    )


def _edges_of(bounds: Stored) -> np.ndarray:
    """Edges (n + 1,) of cells along one axis, in the order of the cells, whichever way that goes."""
    low, high = np.sort(bounds.values(), axis=1).T
    ahead, behind = (high, low) if len(low) < 2 or low[1] > low[0] else (low, high)
    apart = np.flatnonzero(np.abs(behind[1:] - ahead[:-1]) > 1e-6 * np.abs(high - low).max())
    if apart.size:
        raise ValueError(f"{bounds}: cells {apart[0]} and {apart[0] + 1} do not meet; export bounds that join.")
    return np.append(behind[:1], ahead)
