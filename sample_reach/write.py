"""Result files: UGRID 1.0 in CF NetCDF, packed, with what a reviewer has to know in the attributes."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

import h5netcdf
import numpy as np
from pyproj.crs import GeographicCRS, ProjectedCRS
from pyproj.crs.coordinate_operation import TransverseMercatorConversion

from . import geometry as geo
from .runs import ALPHA, Fields
from .solver import Model

EPOCH = "seconds since 2031-03-02T06:00:00Z"
_DEPTH_STEP, _SPEED_STEP = 0.001, {True: 0.001, False: 0.002}  # of the packed integers: m; m/s of means, of instants
_NO_SPEED_BELOW = 0.002  # m: thinner water is written with no velocity


def crs_wkt() -> str:
    """The invented grid: a transverse Mercator about a point of open ocean."""
    axis = TransverseMercatorConversion(
        latitude_natural_origin=48, longitude_natural_origin=-30, false_easting=50000, false_northing=30000,
        scale_factor_natural_origin=1,
    )
    return ProjectedCRS(axis, name="Leewater sample grid (invented)", geodetic_crs=GeographicCRS(name="WGS 84")).to_wkt()


@dataclass(frozen=True)
class Story:
    """What a file says of its run: a title, and how its frames came about."""

    title: str
    design: str
    event: str
    mesh: str
    comment: str
    edges: bool  # store edge discharges


def write_run(path: Path, model: Model, node_bed: np.ndarray, frames: Iterable[Fields], story: Story) -> None:
    """Write one run whole or not at all; ``frames`` are taken one at a time."""
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_suffix(".part")
    with h5netcdf.File(beside, "w") as f:
        _attributes(f, model, story)
        _mesh(f, model, node_bed)
        _static(f, model, node_bed)
        _frames(f, model, list(frames), story)
    beside.replace(path)


def _attributes(f, model: Model, story: Story) -> None:
    t, at = model.topology, geo.CULVERT
    world = [geo.course().at(s, n)[0] + geo.ORIGIN for s, n in at]
    f.attrs.update(
        Conventions="CF-1.11 UGRID-1.0", title=story.title, institution="none (invented place)",
        source="demonstration data, invented place, made by sample_reach: finite volumes on triangles, second order, HLLC with "
        "hydrostatic reconstruction (Audusse et al. 2004), Heun's method",
        references="Audusse, Bouchut, Bristeau, Klein & Perthame 2004, SIAM J. Sci. Comput. 25(6), 2050-2065",
        comment=story.comment, design=story.design, event=story.event,
        eddy_viscosity=f"nu = {ALPHA} h u*, u* = sqrt(g) n |u| / h^(1/6), n taken as at most 0.05; banks slip, piers hold the water",
        mesh_note=f"{story.mesh} mesh: {len(t.cells)} triangles, edges {t.length.min():.2f} to {t.length.max():.2f} m",
        vertical_datum=geo.DATUM, local_origin=f"{geo.ORIGIN[0]:.0f} {geo.ORIGIN[1]:.0f}",
        links=f"mill culvert: culvert_discharge leaves face {model.link[0]} ({world[0][0]:.1f} E, {world[0][1]:.1f} N) and enters "
        f"face {model.link[1]} ({world[1][0]:.1f} E, {world[1][1]:.1f} N); faces counted from 0",
    )


def _variable(f, name, dims, data, attrs, dtype=None, fill=None, **options):
    data = np.asarray(data, dtype)
    packing = {"compression": "gzip", "compression_opts": 6, "shuffle": True} if data.ndim else {}
    v = f.create_variable(name, dims, data.dtype, data=data, fillvalue=fill, **(packing | options))
    v.attrs.update(attrs)
    return v


def _mesh(f, model: Model, node_bed: np.ndarray) -> None:
    t = model.topology
    f.dimensions = {
        "mesh2d_node": len(t.xy), "mesh2d_face": len(t.cells), "mesh2d_edge": len(t.edges), "three": 3, "two": 2,
    }
    _variable(f, "mesh2d", (), np.int32(0), {
        "cf_role": "mesh_topology", "topology_dimension": np.int32(2), "long_name": "triangles of the reach",
        "node_coordinates": "mesh2d_node_x mesh2d_node_y", "face_node_connectivity": "mesh2d_face_nodes",
        "edge_node_connectivity": "mesh2d_edge_nodes", "edge_face_connectivity": "mesh2d_edge_faces",
        "face_coordinates": "mesh2d_face_x mesh2d_face_y", "face_dimension": "mesh2d_face", "edge_dimension": "mesh2d_edge",
    })
    wkt = crs_wkt()
    _variable(f, "crs", (), np.int32(0), {
        "grid_mapping_name": "transverse_mercator", "crs_wkt": wkt, "latitude_of_projection_origin": 48.0,
        "longitude_of_central_meridian": -30.0, "false_easting": 50000.0, "false_northing": 30000.0,
        "scale_factor_at_central_meridian": 1.0, "semi_major_axis": 6378137.0, "inverse_flattening": 298.257223563,
        "geopotential_datum_name": geo.DATUM,
    })
    for where, dim, xy in (("node", "mesh2d_node", t.xy), ("face", "mesh2d_face", t.centre)):
        for k, axis in enumerate("xy"):
            _variable(f, f"mesh2d_{where}_{axis}", (dim,), xy[:, k] + geo.ORIGIN[k], {
                "standard_name": f"projection_{axis}_coordinate", "units": "m", "long_name": f"{axis} of {where}s",
            })
    index = {"start_index": np.int32(0)}
    _variable(f, "mesh2d_face_nodes", ("mesh2d_face", "three"), t.cells, {
        "cf_role": "face_node_connectivity", "long_name": "nodes of each face, anticlockwise", **index}, np.int32)
    _variable(f, "mesh2d_edge_nodes", ("mesh2d_edge", "two"), t.edges, {
        "cf_role": "edge_node_connectivity", "long_name": "first and second node of each directed edge", **index}, np.int32)
    _variable(f, "mesh2d_edge_faces", ("mesh2d_edge", "two"), np.column_stack([t.left, t.right]), {
        "cf_role": "edge_face_connectivity", "long_name": "faces left and right of each directed edge", **index}, np.int32, fill=-1)


def _static(f, model: Model, node_bed: np.ndarray) -> None:
    def at(where):
        return {"mesh": "mesh2d", "location": where, "grid_mapping": "crs"}

    bed = {"standard_name": "ground_level_altitude", "units": "m", "long_name": "bed level", "vertical_datum": geo.DATUM}
    _variable(f, "node_bed", ("mesh2d_node",), node_bed, bed | at("node"), np.float32)
    _variable(f, "face_bed", ("mesh2d_face",), model.bed, bed | at("face") | {"cell_methods": "area: mean"}, np.float32)
    _variable(f, "roughness", ("mesh2d_face",), model.roughness, {
        "long_name": "Manning's n", "units": "s m-1/3"} | at("face"), np.float32)
    _variable(f, "boundary", ("mesh2d_edge",), model.kind, {
        "long_name": "kind of edge", "flag_values": np.arange(6, dtype=np.int8),
        "flag_meanings": "interior wall river_inflow tributary_inflow outflow pier_wall"} | at("edge"), np.int8)


def _frames(f, model: Model, frames: list[Fields], story: Story) -> None:
    mean = frames[0].interval > 0
    method = {"cell_methods": "time: mean area: mean" if mean else "time: point area: mean"}
    f.dimensions["time"] = len(frames)
    clock = {"standard_name": "time", "units": EPOCH, "calendar": "standard", "axis": "T"}
    seconds = np.array([x.seconds for x in frames])
    _variable(f, "time", ("time",), seconds, clock | ({"bounds": "time_bounds"} if mean else {}), np.float64)
    if mean:
        half = np.array([[-0.5, 0.5]]) * np.array([[x.interval] for x in frames])
        _variable(f, "time_bounds", ("time", "two"), seconds[:, None] + half, {}, np.float64)
    _variable(f, "culvert_discharge", ("time",), [x.culvert for x in frames], {
        "long_name": "discharge through the mill culvert, from its inlet face to its outlet face", "units": "m3 s-1",
        "cell_methods": "time: mean" if mean else "time: point"}, np.float64)
    place = {"mesh": "mesh2d", "location": "face", "grid_mapping": "crs", "coordinates": "mesh2d_face_x mesh2d_face_y"} | method
    depth = np.stack([np.round(x.depth / _DEPTH_STEP) for x in frames])
    chunk = {"chunks": (1, depth.shape[1])}
    _variable(f, "depth", ("time", "mesh2d_face"), depth, {
        "long_name": "water depth", "units": "m", "scale_factor": _DEPTH_STEP, "add_offset": 0.0} | place, np.int16, **chunk)
    for k, axis in enumerate("xy"):
        speed = np.stack([_speed(x, k) for x in frames])
        _variable(f, f"velocity_{axis}", ("time", "mesh2d_face"), np.round(speed / _SPEED_STEP[mean]), {
            "standard_name": f"sea_water_{axis}_velocity", "units": "m s-1", "scale_factor": _SPEED_STEP[mean], "add_offset": 0.0,
            "long_name": f"depth-averaged river velocity, {axis}",
            "comment": "unit discharge from the edge discharges, divided by depth"} | place, np.int16, **chunk)
    if story.edges:
        _variable(f, "edge_discharge", ("time", "mesh2d_edge"), np.stack([x.edge_discharge for x in frames]), {
            "long_name": "discharge through each edge, positive from the left to the right of the edge directed from its first "
            "to its second node", "units": "m3 s-1", "mesh": "mesh2d", "location": "edge", "grid_mapping": "crs",
            "cell_methods": "time: mean" if mean else "time: point"}, np.float32)


def _speed(frame: Fields, axis: int) -> np.ndarray:
    wet = frame.depth > _NO_SPEED_BELOW
    return np.where(wet, frame.flow[:, axis] / np.where(wet, frame.depth, 1.0), 0.0).clip(-30, 30)
