"""UGRID 1.0: the mesh of a file and the variables that stand on it, by roles and attributes, never by names.

Requirements U1 to U15 in the comments are those of the UGRID 1.0 conventions, one by one.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

import numpy as np

from ..run import Note
from .connectivity import MOST_CORNERS, read_table, stated_start
from .names import Placed
from .store import Store, Stored

LOCATIONS = ("node", "face", "edge")


@dataclass(frozen=True, eq=False)
class Topology:
    """A mesh as the file lists it: ``faces`` (f, k) and ``edges`` (e, 2) count nodes from 0, pads -1."""

    name: str
    store: Store
    x: Stored
    y: Stored
    faces: np.ndarray
    edges: np.ndarray | None
    dimensions: dict[str, str]
    sizes: dict[str, int]
    notes: tuple[Note, ...]


def mesh_names(store: Store) -> list[str]:
    """Variables of a file that describe a mesh (U1)."""
    return [v.name for v in store.variables.values() if v.text("cf_role") == "mesh_topology"]


def read_topology(store: Store, mesh: str | None) -> Topology:
    """The 2D mesh of a file: the one named, or the only one.

    Raises ``ValueError`` for no mesh, several without a choice, an unknown choice, and every way in
    which the topology can be incomplete or wrong.
    """
    variable = _pick(store, mesh)
    x, y = _coordinates(store, variable)
    table = _required(store, variable, "face_node_connectivity")
    if len(table.shape) != 2:
        raise ValueError(f"{table} has {len(table.shape)} dimensions; a face-node table has two.")
    notes: list[Note] = []
    face_dimension = _face_dimension(store, variable, table, notes)
    faces = read_table(table, face_dimension, x.shape[0], what="face")
    dimensions = {"node": x.dimensions[0], "face": face_dimension}
    sizes = {"node": x.shape[0], "face": len(faces.rows)}
    edges, more = _edges(store, variable, x.shape[0], dimensions, sizes)
    _name_missing(store, variable, notes)
    notes += [*faces.notes, *more]
    return Topology(variable.name, store, x, y, faces.rows, edges, dimensions, sizes, tuple(notes))


def placed_variables(topology: Topology, store: Store) -> tuple[list[Placed], list[Note]]:
    """Variables of a file that stand on the mesh (U10, U11), and what was left out (U15).

    Variables without mesh and location are placed by their dimensions, and that is noted.
    """
    out: list[Placed] = []
    notes: list[Note] = []
    elsewhere: Counter[str] = Counter()
    mesh = topology.store.variables[topology.name]
    own = {topology.name, *(n for value in mesh.attributes.values() if isinstance(value, str) for n in value.split())}
    by_dimension = {d: location for location, d in topology.dimensions.items()}
    for variable in store.variables.values():
        if variable.name in own or variable.text("cf_role") or variable.name in variable.dimensions:
            continue
        if is_index_set(topology, variable):
            continue
        placed = _placed(topology, variable, by_dimension, notes, elsewhere)
        if placed is not None:
            out.append(placed)
    for location, count in elsewhere.items():
        notes.append(Note(f"variables on {location!r} are not used; data on nodes, faces and edges are", "", count))
    return out, notes


def is_index_set(topology: Topology, variable: Stored) -> bool:
    """Whether a variable lists numbers of places: by its role, or as integers on no dimension of the mesh."""
    return variable.text("cf_role") == "location_index_set" or (
        variable.dtype.kind in "iu"
        and len(variable.shape) == 1
        and variable.text("location") in topology.sizes
        and variable.dimensions[0] not in topology.dimensions.values()
    )


def _pick(store: Store, mesh: str | None) -> Stored:
    names = mesh_names(store)
    if not names:
        hint = f"; its groups {', '.join(store.groups)} are not read" if store.groups else ""
        raise ValueError(
            f"{store.path.name} has no mesh: no variable has cf_role = 'mesh_topology'{hint}; export the results with "
            "a "
            "UGRID mesh."
        )
    if mesh is not None:
        if mesh not in names:
            raise ValueError(f"{store.path.name} has no mesh {mesh!r}; it has {', '.join(names)}.")
        chosen = [mesh]
    else:
        # Networks of one dimension may stand beside the mesh (U2).
        chosen = [n for n in names if store.variables[n].text("topology_dimension") != "1"] or names
    if len(chosen) > 1:
        raise ValueError(f"{store.path.name} holds several meshes: {', '.join(chosen)}; pick one with mesh.")
    variable = store.variables[chosen[0]]
    dimension = variable.text("topology_dimension")
    if dimension not in ("2", "2.0", ""):
        raise ValueError(
            f"{variable} has topology_dimension {dimension}; a depth-averaged model needs a mesh of faces (2)."
        )
    return variable


def _required(store: Store, variable: Stored, attribute: str) -> Stored:
    name = variable.text(attribute)
    if not name:
        raise ValueError(f"{variable} lacks the attribute {attribute}; export the complete UGRID mesh.")
    if name not in store.variables:
        raise ValueError(
            f"{variable}: {attribute} names {name!r}, which is not in the file; export the complete UGRID mesh."
        )
    return store.variables[name]


def _coordinates(store: Store, variable: Stored) -> tuple[Stored, Stored]:
    """The node coordinates, x first (U12)."""
    names = variable.text("node_coordinates").split()
    if len(names) < 2:
        raise ValueError(
            f"{variable} lacks the attribute node_coordinates with two names; export the complete UGRID mesh."
        )
    for name in names[:2]:
        if name not in store.variables:
            raise ValueError(f"{variable}: node_coordinates names {name!r}, which is not in the file; export it.")
    x, y = (store.variables[n] for n in names[:2])
    if _is_y(x) and not _is_y(y):
        x, y = y, x
    if len(x.shape) != 1 or x.dimensions != y.dimensions:
        raise ValueError(
            f"{x} and {y.name} do not stand on one list of nodes ({x.shape} and {y.shape}); export them again."
        )
    return x, y


def _is_y(variable: Stored) -> bool:
    named = variable.text("standard_name") in ("projection_y_coordinate", "latitude")
    return named or variable.text("axis").upper() == "Y"


def _face_dimension(store: Store, mesh: Stored, table: Stored, notes: list[Note]) -> str:
    """The dimension that counts faces (U8): as declared, else by the data that stand on faces, else by size."""
    stated = mesh.text("face_dimension")
    if stated:
        if stated not in table.dimensions:
            raise ValueError(
                f"{mesh}: face_dimension is {stated!r}, but {table.name} has {' and '.join(table.dimensions)}; correct "
                "it."
            )
        return stated
    first, second = table.dimensions
    rows, columns = table.shape
    on_faces = [v for v in store.variables.values() if v.text("location") == "face" and v.text("mesh") == mesh.name]
    used = {d for v in on_faces for d in v.dimensions}
    for name in mesh.text("face_coordinates").split():
        used |= set(store.variables[name].dimensions) if name in store.variables else set()
    transposed = second in used and first not in used
    if not transposed and first not in used:
        # A face has 3 to 8 nodes, so the longer side counts faces wherever only one way is possible.
        transposed = columns < 3 or (3 <= rows <= MOST_CORNERS < columns)
    if transposed:
        text = f"{table.name} is stored nodes first without face_dimension; {second} is taken to count faces"
        notes.append(Note(text, table.name))
        return second
    return first


def _edges(store, mesh, n_nodes, dimensions, sizes):
    """The file's own edges, where it lists them (U9)."""
    name = mesh.text("edge_node_connectivity")
    if not name or name not in store.variables:
        return None, []
    table = store.variables[name]
    if len(table.shape) != 2 or 2 not in table.shape:
        raise ValueError(f"{table} has shape {table.shape}; an edge has exactly two nodes.")
    stated = mesh.text("edge_dimension")
    dimension = stated if stated in table.dimensions else table.dimensions[0 if table.shape[1] == 2 else 1]
    if table.shape[1 - table.dimensions.index(dimension)] != 2:
        raise ValueError(f"{table} has shape {table.shape}; along {dimension!r} each edge needs exactly two nodes.")
    edges = read_table(table, dimension, n_nodes, what="edge", width=2)
    dimensions["edge"] = dimension
    sizes["edge"] = len(edges.rows)
    return edges.rows, list(edges.notes)


def _name_missing(store: Store, mesh: Stored, notes: list[Note]) -> None:
    """Optional variables that the mesh names and the file lacks (U3)."""
    for attribute, value in mesh.attributes.items():
        if attribute.endswith(("_connectivity", "_coordinates")) and isinstance(value, str):
            for name in value.split():
                if name not in store.variables:
                    notes.append(Note(f"{attribute} names {name}, which is not in the file; done without", mesh.name))


def _placed(topology: Topology, variable: Stored, by_dimension, notes, elsewhere) -> Placed | None:
    if variable.dtype.kind not in "iuf":
        return None
    if variable.text("location_index_set"):
        return _on_index_set(topology, variable, notes)
    mesh, location = variable.text("mesh"), variable.text("location")
    if mesh and mesh != topology.name:
        return None
    if location and location not in LOCATIONS:
        elsewhere[location] += 1
        return None
    here = [d for d in variable.dimensions if d in by_dimension]
    if location:
        dimension = topology.dimensions.get(location)
        if dimension is None and location == "edge":
            text = (
                f"{variable.name} stands on edges, but the mesh has no edge_node_connectivity to number them; not used"
            )
            notes.append(Note(text, variable.name))
            return None
        if dimension not in variable.dimensions:
            raise ValueError(
                f"{variable} is said to stand on {location}s but has the dimensions "
                f"{', '.join(variable.dimensions) or 'none'} "
                f"without {dimension}: its size does not fit the mesh; export it again."
            )
    elif len(here) == 1:
        location, dimension = by_dimension[here[0]], here[0]
        if variable.text("standard_name").startswith("projection_") or variable.text("bounds"):
            return None
        notes.append(Note(f"{variable.name} has no location; by its dimension it stands on {location}s", variable.name))
    else:
        return None
    return Placed(variable, location, (dimension,), topology.sizes[location])


def _on_index_set(topology: Topology, variable: Stored, notes: list[Note]) -> Placed | None:
    """A variable on part of a location, through its index set (U11)."""
    store, name = variable.store, variable.text("location_index_set")
    if name not in store.variables:
        raise ValueError(f"{variable}: location_index_set names {name!r}, which is not in the file; export it.")
    index = store.variables[name]
    if index.text("mesh") != topology.name or index.text("location") not in topology.sizes:
        return None
    location = index.text("location")
    size = topology.sizes[location]
    if len(index.shape) != 1 or index.dimensions[0] not in variable.dimensions:
        raise ValueError(f"{variable} does not have the dimension of its index set {name}; export it again.")
    subset = read_index_set(index, size)
    text = f"{variable.name} covers {len(subset)} of {size} {location}s; the rest is taken as dry"
    notes.append(Note(text, variable.name))
    return Placed(variable, location, index.dimensions, size, subset)


def read_index_set(index: Stored, size: int) -> np.ndarray:
    """The numbers, from 0, in a location index set (U4, U11); ``ValueError`` when out of range."""
    numbers = index.raw().astype(np.int64) - stated_start(index)
    wrong = np.flatnonzero((numbers < 0) | (numbers >= size))
    if wrong.size:
        raise ValueError(
            f"{index}: entry {wrong[0]} is outside the {size} {index.text('location')}s of the mesh; correct it."
        )
    return numbers
