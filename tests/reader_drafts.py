"""Drafts of NetCDF files for tests: sound ones to spoil, and how to write them in either format."""

from __future__ import annotations

import copy
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import h5netcdf
import numpy as np
import pyproj
from scipy.io import netcdf_file

CRS = pyproj.CRS.from_proj4("+proj=tmerc +lat_0=52 +lon_0=-28 +k=0.9996 +x_0=500000 +y_0=100000 +ellps=GRS80 +units=m")
CORNER = np.array([500_100.0, 100_200.0])
TIMES = np.array([0.0, 60.0, 180.0])


@dataclass
class Draft:
    """A NetCDF file before it is written: ``variables[name] = (dimensions, values, attributes)``."""

    variables: dict[str, tuple[tuple[str, ...], np.ndarray, dict[str, Any]]] = field(default_factory=dict)
    attributes: dict[str, Any] = field(default_factory=dict)
    chunks: dict[str, tuple[int, ...]] = field(default_factory=dict)

    def put(self, name: str, dimensions: tuple[str, ...], values: Any, **attributes: Any) -> Draft:
        """Add or replace a variable."""
        self.variables[name] = (dimensions, np.asarray(values), attributes)
        return self

    def drop(self, *names: str) -> Draft:
        for name in names:
            del self.variables[name]
        return self

    def say(self, name: str, **attributes: Any) -> Draft:
        """Change a variable's attributes; None removes one."""
        own = self.variables[name][2]
        for key, value in attributes.items():
            own.pop(key, None) if value is None else own.update({key: value})
        return self

    def values(self, name: str) -> np.ndarray:
        return self.variables[name][1]

    def set(self, name: str, values: Any) -> Draft:
        """Replace a variable's values."""
        dimensions, _, attributes = self.variables[name]
        self.variables[name] = (dimensions, np.asarray(values), attributes)
        return self

    def copy(self) -> Draft:
        return copy.deepcopy(self)

    def write(self, path: Path, form: str = "netcdf4") -> Path:
        """Write the file as ``netcdf4`` or ``classic``."""
        (self._netcdf4 if form == "netcdf4" else self._classic)(path)
        return path

    def _sizes(self) -> dict[str, int]:
        return {d: n for dims, values, _ in self.variables.values() for d, n in zip(dims, values.shape, strict=True)}

    def _netcdf4(self, path: Path) -> None:
        with h5netcdf.File(path, "w") as file:
            file.attrs.update(self.attributes)
            file.dimensions = self._sizes()
            for name, (dimensions, values, attributes) in self.variables.items():
                rest = dict(attributes)
                options = {"fillvalue": rest.pop("_FillValue")} if "_FillValue" in rest else {}
                if name in self.chunks:
                    options.update(chunks=self.chunks[name], compression="gzip", shuffle=True)
                made = file.create_variable(name, dimensions, data=values, **options)
                made.attrs.update(rest)

    def _classic(self, path: Path) -> None:
        with netcdf_file(str(path), "w") as file:
            for name, value in self.attributes.items():
                setattr(file, name, value)
            for name, size in sorted(self._sizes().items(), key=lambda item: item[0] != "time"):
                file.createDimension(name, None if name == "time" else size)
            # scipy writes scalars over the first record, so they become lists of one.
            file.createDimension("one", 1)
            for name, (dimensions, values, attributes) in self.variables.items():
                narrow = {"int64": "int32", "uint32": "int32", "bool": "int8"}.get(values.dtype.name, values.dtype.name)
                made = file.createVariable(name, np.dtype(narrow), dimensions or ("one",))
                for key, value in attributes.items():
                    setattr(made, key, np.int32(value) if isinstance(value, np.int64) else value)
                made[:] = values.astype(narrow) if dimensions else [values]


def faces_of_channel(nx: int = 4, ny: int = 3) -> tuple[np.ndarray, np.ndarray]:
    """Nodes of a lattice of 10 m by 5 m cells, and faces: quads in the left half, triangles in the right (pads -1)."""
    x, y = np.meshgrid(10.0 * np.arange(nx + 1), 5.0 * np.arange(ny + 1))
    xy = np.column_stack([x.ravel(), y.ravel()]) + CORNER
    faces = []
    for j in range(ny):
        for i in range(nx):
            a = j * (nx + 1) + i
            b, c, d = a + 1, a + nx + 2, a + nx + 1
            faces += [[a, b, c, d]] if i < nx // 2 else [[a, b, c, -1], [a, c, d, -1]]
    return xy, np.array(faces, np.int32)


def centres(xy: np.ndarray, faces: np.ndarray) -> np.ndarray:
    """Mean of the corners of each face, (f, 2)."""
    return np.array([xy[row[row >= 0]].mean(axis=0) for row in faces])


def bed(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """A bed that falls to the east, m."""
    return 12.0 - 0.002 * (x - CORNER[0]) + 0.001 * (y - CORNER[1])


def depth(x: np.ndarray, y: np.ndarray, t: float) -> np.ndarray:
    """A depth that grows to the east and in time, m."""
    return 1.5 + 0.01 * (x - CORNER[0]) + 0.001 * t


def velocity(x: np.ndarray, y: np.ndarray, t: float) -> tuple[np.ndarray, np.ndarray]:
    """A velocity, m/s."""
    return 1.0 + 0.002 * (y - CORNER[1]) + 0.0005 * t, 0.1 - 0.001 * (x - CORNER[0]) + 0 * y


def sound() -> Draft:
    """A sound UGRID file: depth and velocity on mixed faces at three times, bed on nodes, a projected system."""
    xy, faces = faces_of_channel()
    fx, fy = centres(xy, faces).T
    on_faces = {"mesh": "reach", "location": "face", "grid_mapping": "crs", "cell_methods": "time: point area: mean"}
    draft = Draft(attributes={"title": "a channel made for a test", "Conventions": "CF-1.11"})
    draft.put(
        "reach", (), np.int32(0), cf_role="mesh_topology", topology_dimension=np.int32(2), node_coordinates="node_x node_y",
        face_node_connectivity="face_nodes",
    )
    draft.put("crs", (), np.int32(0), crs_wkt=CRS.to_wkt())
    for k, axis in enumerate("xy"):
        draft.put(
            f"node_{axis}", ("node",), xy[:, k], units="m", standard_name=f"projection_{axis}_coordinate", grid_mapping="crs"
        )
    draft.put("face_nodes", ("face", "corner"), faces, start_index=np.int32(0), _FillValue=np.int32(-1))
    draft.put("time", ("time",), TIMES, units="seconds since 2031-03-02T06:00:00Z", calendar="standard")
    h = np.array([depth(fx, fy, t) for t in TIMES])
    u, v = (np.array([velocity(fx, fy, t)[k] for t in TIMES]) for k in (0, 1))
    draft.put("h", ("time", "face"), h, units="m", long_name="water depth", **on_faces)
    draft.put("u", ("time", "face"), u, units="m s-1", standard_name="sea_water_x_velocity", **on_faces)
    draft.put("v", ("time", "face"), v, units="m s-1", standard_name="sea_water_y_velocity", **on_faces)
    draft.put(
        "zb", ("node",), bed(*xy.T), units="m", standard_name="ground_level_altitude", mesh="reach", location="node",
        grid_mapping="crs",
    )
    return draft


def edges_of(faces: np.ndarray) -> np.ndarray:
    """Every side of the faces once, directed as first met, (e, 2)."""
    seen: dict[tuple[int, int], tuple[int, int]] = {}
    for row in faces:
        ring = [int(n) for n in row if n >= 0]
        for a, b in zip(ring, ring[1:] + ring[:1], strict=True):
            seen.setdefault((min(a, b), max(a, b)), (a, b))
    return np.array(list(seen.values()), np.int32)


def with_edges(draft: Draft) -> Draft:
    """The same draft with edges and the discharge of a uniform unit discharge (2, 1) m2/s through each."""
    faces, xy = draft.values("face_nodes"), np.column_stack([draft.values("node_x"), draft.values("node_y")])
    edges = edges_of(faces)
    along = xy[edges[:, 1]] - xy[edges[:, 0]]
    # From left to right of an edge along t the normal is (t_y, -t_x).
    q = 2.0 * along[:, 1] - 1.0 * along[:, 0]
    draft.say("reach", edge_node_connectivity="edge_nodes")
    draft.put("edge_nodes", ("edge", "two"), edges, start_index=np.int32(0))
    draft.put(
        "flux", ("time", "edge"), np.tile(q, (len(TIMES), 1)), units="m3 s-1", long_name="discharge through each edge",
        mesh="reach", location="edge",
    )
    return draft
