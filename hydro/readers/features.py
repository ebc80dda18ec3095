"""Door for GeoPackage: polygons as faces, or points joined as a table's are, with a column a quantity.

Columns are headed and mapped as those of plain tables (:mod:`.tables`). A layer holds one frame, or
several with a ``time`` column, each place once a time.
"""

from __future__ import annotations

import warnings
from pathlib import Path

import geopandas
import numpy as np
import pyogrio
import shapely
from pyogrio.errors import DataLayerError, DataSourceError

from ..mesh import Mesh, build_mesh
from ..run import Note, Run
from . import faults
from .assemble import Asked, Parts, make_run
from .columns import fields_of, time_axis
from .connectivity import MOST_CORNERS
from .crs import ground, read_system, system_factor
from .lattice import weld
from .tables import mesh_of_points

_JOINED_WITHIN_M = 1e-3  # corners nearer than this are one node: a millimetre is below any survey


def open_features(path: Path, asked: Asked, *, layer: str | None = None) -> Run:
    """A run from a layer of polygons or points.

    Raises ``ValueError`` with one sentence for anything that is wrong.
    """
    said = asked.said
    table = _layer(path, layer)
    where = f"{path.name}, layer {table.attrs['layer']}"
    system = read_system(said.plain["crs"], "mapping.crs") if "crs" in said.plain else table.crs
    if system is None and table.attrs["unread"]:
        raise ValueError(f"{where}: its coordinate system cannot be read ({table.attrs['unread']}); correct it or give mapping.crs.")
    factor = 1.0 if system is None else system_factor(system)
    place_of = ground(system, factor, said.plain.get("datum", ""), "geometry", where)
    axis, frame, notes = time_axis(where, table.drop(columns=[table.geometry.name]), said, asked.kind)
    kinds = set(table.geometry.geom_type)
    if kinds == {"Point"}:
        xy = table.geometry.get_coordinates().to_numpy() * factor
        found, first, row_place = np.unique(xy, axis=0, return_index=True, return_inverse=True)
        mesh, location, more = mesh_of_points(where, found, asked.origin)
        place, n_places = row_place.ravel(), len(found)
    elif kinds <= {"Polygon", "MultiPolygon"}:
        mesh, place = _mesh_of_polygons(where, table.geometry.values, factor, asked.origin)
        location, n_places = "face", mesh.n_faces
        more = [Note("polygons carry no edge discharges and no numbers of the model's own nodes", "")]
    else:
        raise ValueError(f"{where} holds {', '.join(sorted(kinds))}; give polygons (faces) or points.")
    fields = fields_of(where, table, said, location, place, frame, n_places)
    parts = Parts(
        asked.name or path.stem, (path,), mesh, fields, axis, place_of, asked.settings,
        said.get("depth", "is") or ("point" if location == "node" else "mean"), [*notes, *more],
    )
    return make_run(parts)


def _layer(path: Path, layer: str | None) -> geopandas.GeoDataFrame:
    """The layer named, or the only one."""
    try:
        with warnings.catch_warnings(record=True) as heard:
            warnings.simplefilter("always", RuntimeWarning)
            names = [str(n) for n, geometry in pyogrio.list_layers(path) if geometry is not None]
            if layer is None and len(names) != 1:
                several = f"several layers: {', '.join(names)}; pick one with mesh"
                what = several if names else "no layer with geometry; export one"
                raise ValueError(f"{path.name} holds {what}.")
            if layer is not None and layer not in names:
                raise ValueError(f"{path.name} has no layer {layer!r}; it has {', '.join(names)}.")
            chosen = layer or names[0]
            table = geopandas.read_file(path, layer=chosen, engine="pyogrio")
    except (DataSourceError, DataLayerError, shapely.errors.GEOSException) as error:
        first = str(error).splitlines()[0].rstrip(".")
        raise ValueError(f"{path.name} cannot be read as a GeoPackage ({first}); export it again.") from None
    missing = np.flatnonzero(table.geometry.isna() | table.geometry.is_empty)
    if not len(table) or missing.size:
        what = f"feature {missing[0] + 1} has no geometry" if missing.size else "it has no features"
        raise ValueError(f"{path.name}, layer {chosen}: {what}; export it again.")
    at, of = shapely.get_coordinates(table.geometry.values, return_index=True)
    if not np.isfinite(at).all():
        row = int(of[~np.isfinite(at).all(axis=1)][0])
        raise ValueError(f"{path.name}, layer {chosen}: feature {row + 1} has coordinates that are no numbers; export it again.")
    table.attrs["layer"] = chosen
    table.attrs["unread"] = next((str(w.message)[:60] for w in heard if "srs" in str(w.message).lower()), "")
    return table


def _mesh_of_polygons(where: str, shapes, factor: float, origin) -> tuple[Mesh, np.ndarray]:
    """The mesh of polygons whose corners are joined where they meet, and the face of each row."""
    polygons = np.array([_single(where, i, s) for i, s in enumerate(shapes)])
    _, first, place = np.unique(shapely.to_wkb(shapely.normalize(polygons)), return_index=True, return_inverse=True)
    polygons = polygons[first]
    corners = [np.asarray(p.exterior.coords)[:-1, :2] * factor for p in polygons]
    count = np.array([len(c) for c in corners])
    many = np.flatnonzero(count > MOST_CORNERS)
    if many.size:
        raise ValueError(
            f"{where}: feature {first[many[0]] + 1} has {count[many[0]]} corners; faces of 3 to {MOST_CORNERS} are "
            "read: split it."
        )
    xy, number = weld(np.vstack(corners), _JOINED_WITHIN_M)
    faces = np.full((len(polygons), int(count.max())), -1, np.int32)
    faces[np.arange(count.max()) < count[:, None]] = number
    faults.check_coordinates(where, "of the polygons", xy, faces)
    faults.check_faces(where, xy, faces)
    try:
        mesh = build_mesh(xy, faces, origin=origin)
    except ValueError as error:
        raise ValueError(f"{where}: {error}") from None
    faults.check_mesh(where, mesh)
    return mesh, place.ravel()


def _single(where: str, row: int, shape) -> shapely.Polygon:
    if shape.geom_type == "MultiPolygon" and len(shape.geoms) == 1:
        shape = shape.geoms[0]
    if shape.geom_type != "Polygon" or len(shape.interiors):
        raise ValueError(f"{where}: feature {row + 1} has several parts or holes; a face is one ring: split it.")
    return shape

