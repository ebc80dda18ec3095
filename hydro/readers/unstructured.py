"""Door for UGRID files: topology, mesh, boundary stretches and the run, from one file or several."""

from __future__ import annotations

import numpy as np

from ..mesh import Mesh, build_mesh
from ..run import Note, Run
from . import faults
from .assemble import Asked
from .crs import Ground, ground_of
from .names import Placed
from .netcdf import join, read_piece
from .store import Store, Stored
from .ugrid import Topology, is_index_set, mesh_names, placed_variables, read_index_set, read_topology


def open_ugrid(stores: list[Store], asked: Asked, *, mesh: str | None = None) -> Run:
    """A run from UGRID files; files without a mesh of their own stand on the first file's that has one.

    Raises ``ValueError`` with one sentence for anything that is wrong.
    """
    with_mesh = [s for s in stores if mesh_names(s)] or stores[:1]
    topology = read_topology(with_mesh[0], mesh)
    for other in with_mesh[1:]:
        _same_mesh(topology, read_topology(other, mesh))
    notes = list(topology.notes)
    pieces, everything = [], []
    for store in stores:
        placed, more = placed_variables(topology, store)
        notes += more
        everything += placed
        if store is topology.store and len(stores) > 1 and not _has_flow(placed):
            continue  # the file that holds the mesh alone
        piece, more = read_piece(store, _with_constants(placed, everything), asked.said)
        pieces.append(piece)
        notes += more
    ground = ground_of(topology.store, topology.x, topology.y, [p.variable for p in everything], asked.said)
    built = _mesh(topology, ground, asked.origin, notes)
    sets = _boundary_sets(topology, everything, built, notes)
    return join(pieces, built, ground, asked, notes=notes, boundary_sets=sets)


def _has_flow(placed: list[Placed]) -> bool:
    names = " ".join(p.variable.text("standard_name") + " " + p.variable.text("long_name") for p in placed).lower()
    return any(word in names for word in ("velocity", "discharge", "flux"))


def _with_constants(placed: list[Placed], everything: list[Placed]) -> list[Placed]:
    """A file's own variables, and the constant ones of the files before it (a bed, say) that it does not repeat."""
    own = {p.variable.name for p in placed}
    constant = (p for p in everything if len(p.variable.shape) == 1 and p.subset is None)
    return [*placed, *(p for p in constant if p.variable.name not in own)]


def _same_mesh(first: Topology, other: Topology) -> None:
    same = (
        first.faces.shape == other.faces.shape
        and np.array_equal(first.faces, other.faces)
        and np.array_equal(first.x.values(), other.x.values(), equal_nan=True)
        and np.array_equal(first.y.values(), other.y.values(), equal_nan=True)
        and (first.edges is None) == (other.edges is None)
        and (first.edges is None or other.edges is None or np.array_equal(first.edges, other.edges))
    )
    if not same:
        raise ValueError(
            f"{other.store.path.name} has another mesh than {first.store.path.name}; the files of one run must share "
            "it: "
            "open them as two runs."
        )


def _mesh(topology: Topology, ground: Ground, origin: tuple[float, float] | None, notes: list[Note]) -> Mesh:
    xy = np.column_stack([topology.x.values(), topology.y.values()]) * ground.factor
    file, names = topology.store.path.name, f"{topology.x.name}, {topology.y.name}"
    faults.check_coordinates(file, names, xy, topology.faces)
    faults.check_faces(file, xy, topology.faces)
    try:
        mesh = build_mesh(xy, topology.faces, edge_nodes=topology.edges, origin=origin)
    except ValueError as error:
        raise ValueError(f"{file}: {error}") from None
    if mesh.turned_faces:
        notes.append(Note("faces listed clockwise were turned", topology.name, mesh.turned_faces))
    if topology.x.dtype.itemsize < 8:
        step = float(np.spacing(np.abs(xy[np.isfinite(xy)]).max().astype(np.float32)))
        notes.append(Note(f"coordinates are stored in steps of {step:.2g} m (single precision)", names))
    notes += faults.check_mesh(file, mesh)
    return mesh


def _boundary_sets(topology: Topology, placed: list[Placed], mesh: Mesh, notes: list[Note]) -> dict[str, np.ndarray]:
    """Stretches of boundary that the file names: flags on edges, and index sets of edges."""
    if topology.edges is None:
        return {}
    sets: dict[str, np.ndarray] = {}
    boundary = mesh.boundary_edges
    file_edge = mesh.file_edge[boundary]
    for p in placed:
        if p.location == "edge" and p.subset is None and p.variable.attributes.get("flag_meanings") is not None:
            flags = p.variable.raw().ravel()
            if len(flags) != p.size:
                continue
            for meaning, chosen in _flagged(p.variable, flags):
                _add(sets, meaning.replace("_", " "), boundary[chosen[file_edge]])
    for variable in topology.store.variables.values():
        on_edges = variable.text("mesh") == topology.name and variable.text("location") == "edge"
        if on_edges and is_index_set(topology, variable):
            chosen = np.zeros(topology.sizes["edge"], bool)
            chosen[read_index_set(variable, topology.sizes["edge"])] = True
            _add(sets, variable.text("long_name") or variable.name, boundary[chosen[file_edge]])
    if sets:
        notes.append(Note(f"boundary stretches named by the file: {', '.join(sets)}", "", len(sets)))
    return sets


def _flagged(variable: Stored, flags: np.ndarray) -> list[tuple[str, np.ndarray]]:
    """Meanings of a flag variable with the edges that carry each; masks take part bit by bit."""
    meanings = variable.text("flag_meanings").split()
    values, masks = variable.numbers("flag_values"), variable.numbers("flag_masks")
    if len(values) not in (0, len(meanings)) or len(masks) not in (0, len(meanings)) or not (len(values) or len(masks)):
        raise ValueError(f"{variable} has {len(meanings)} flag_meanings for {len(values)} flag_values; correct them.")
    if len(masks) and (flags.dtype.kind not in "iu" or masks.dtype.kind not in "iu"):
        raise ValueError(f"{variable} has flag_masks that are no whole numbers; correct them.")
    out = []
    for i, meaning in enumerate(meanings):
        part = flags & masks[i] if len(masks) else flags
        out.append((meaning, part == values[i] if len(values) else part != 0))
    return out


def _add(sets: dict[str, np.ndarray], name: str, edges: np.ndarray) -> None:
    if edges.size:
        sets[name] = np.union1d(sets[name], edges).astype(np.int32) if name in sets else edges.astype(np.int32)

