"""What can be wrong with a mesh or its data, each told in one sentence: what, where, and what to do."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely

from .._kernels import meshcheck
from ..frame import RawFrame
from ..mesh import Mesh
from ..run import Note

# Bounds that no river reaches; beyond them a unit or a fill value is wrong. Common practice, no source.
DEEPEST_M = 500.0
FASTEST_M_S = 50.0
HIGHEST_BED_M = 9000.0
LOWEST_BED_M = -500.0
ROUGHEST = 1.0


def check_coordinates(file: str, names: str, xy: np.ndarray, faces: np.ndarray) -> None:
    """Every node that a face uses has coordinates; ``ValueError`` names the first that has none."""
    used = np.zeros(len(xy), bool)
    used[faces[faces >= 0]] = True
    missing = np.flatnonzero(used & ~(np.isfinite(xy[:, 0]) & np.isfinite(xy[:, 1])))
    if missing.size:
        raise ValueError(
            f"{file}: coordinates {names} are missing at node {missing[0]} (and {missing.size - 1} more that faces "
            "use); "
            "export them again."
        )
    span = np.ptp(xy[used], axis=0)
    if span.max() > 2e6 or span.max() < 1e-3:
        raise ValueError(
            f"{file}: the mesh spans {span[0]:.3g} by {span[1]:.3g} m by coordinates {names}, which no river model "
            "does; "
            "check their unit."
        )


def check_faces(file: str, xy: np.ndarray, faces: np.ndarray) -> None:
    """Faces do not cross themselves; ``ValueError`` names the first that does."""
    if faces.shape[1] == 3:
        return
    count = (faces >= 0).sum(axis=1).astype(np.int32)
    crossed = meshcheck.self_crossing(np.ascontiguousarray(xy), faces, count)
    if crossed >= 0:
        x, y = xy[faces[crossed, : count[crossed]]].mean(axis=0)
        raise ValueError(
            f"{file}: face {crossed} at {x:.2f} E, {y:.2f} N crosses itself; list its nodes in order round it."
        )


def check_mesh(file: str, mesh: Mesh) -> list[Note]:
    """No overlaps and no hanging nodes; what is unusual but sound comes back as notes.

    Raises ``ValueError`` naming the first overlap or hanging node.
    """
    grid, start, items = mesh._locator
    kind, node, triangle = meshcheck.stray_nodes(mesh.node_xy, mesh.triangles, grid, start, items)
    if kind:
        x, y = mesh.to_world(mesh.node_xy[node])
        where = f"node {mesh.file_node[node]} at {x:.2f} E, {y:.2f} N"
        face = mesh.file_face[mesh.triangle_face[triangle]]
        if kind == 1:
            raise ValueError(
                f"{file}: {where} hangs on a side of face {face} without being one of its nodes; give the face that "
                "node, "
                "or split it."
            )
        raise ValueError(
            f"{file}: {where} lies inside face {face}: faces overlap there; mend the mesh and export it again."
        )
    _check_boundary(file, mesh)
    return _twins(file, mesh)


def _check_boundary(file: str, mesh: Mesh) -> None:
    """Boundary sides cross nowhere."""
    sides = shapely.linestrings(mesh.node_xy[mesh.edge_nodes[mesh.boundary_edges]])
    tree = shapely.STRtree(sides)
    pairs = tree.query(sides, predicate="crosses")
    if pairs.size:
        a, b = pairs[:, 0]
        at = shapely.intersection(sides[a], sides[b]).centroid
        x, y = mesh.to_world(np.array([at.x, at.y]))
        faces = [int(mesh.file_face[mesh.edge_faces[mesh.boundary_edges[s]].max()]) for s in (a, b)]
        raise ValueError(
            f"{file}: faces {faces[0]} and {faces[1]} overlap at {x:.2f} E, {y:.2f} N; mend the mesh and export it "
            "again."
        )


def _twins(file: str, mesh: Mesh) -> list[Note]:
    """Nodes that stand on one another: slits if few, a mesh that was never joined if many; twin faces are refused."""
    order = np.lexsort(mesh.node_xy.T)
    same = (np.diff(mesh.node_xy[order], axis=0) == 0).all(axis=1)
    twins = int(np.count_nonzero(same))
    if not twins:
        return []
    centre = mesh.triangle_centroid
    rank = np.lexsort(centre.T)
    again = np.flatnonzero((np.diff(centre[rank], axis=0) == 0).all(axis=1))
    if again.size:
        f, g = (int(mesh.file_face[mesh.triangle_face[rank[again[0] + k]]]) for k in (0, 1))
        x, y = mesh.to_world(centre[rank[again[0]]])
        raise ValueError(f"{file}: faces {f} and {g} lie on one another at {x:.2f} E, {y:.2f} N; remove one of them.")
    if twins > mesh.n_nodes / 3:
        raise ValueError(
            f"{file}: {twins} of {mesh.n_nodes} nodes stand on another node, so faces are not joined; export a mesh "
            "whose "
            "faces share their nodes."
        )
    x, y = mesh.to_world(mesh.node_xy[order[np.flatnonzero(same)[0]]])
    text = (
        f"nodes that stand on another node (first at {x:.2f} E, {y:.2f} N): the faces there are not joined, as at a "
        "slit"
    )
    return [Note(text, "", twins)]


def check_bed(file: str, name: str, location: str, bed: np.ndarray, mesh: Mesh) -> None:
    """A bed level everywhere and within bounds; ``ValueError`` names the first place where it is not."""
    missing = np.flatnonzero(~np.isfinite(bed))
    if missing.size:
        raise ValueError(
            f"{file}: bed {name} is missing at {place(mesh, location, missing[0])} (and {missing.size - 1} more); "
            "export a bed "
            "level for every one, dry ones too."
        )
    wrong = np.flatnonzero((bed > HIGHEST_BED_M) | (bed < LOWEST_BED_M))
    if wrong.size:
        raise ValueError(
            f"{file}: bed {name} is {bed[wrong[0]]:.4g} m at {place(mesh, location, wrong[0])} (and beyond bounds at "
            f"{wrong.size - 1} more); check its unit and its fill value."
        )


def check_roughness(file: str, name: str, values: np.ndarray, mesh: Mesh) -> None:
    """Manning's n between 0 and 1 s/m^(1/3); ``ValueError`` names the first that is not."""
    wrong = np.flatnonzero(~((values > 0) & (values < ROUGHEST)))
    if wrong.size:
        raise ValueError(
            f"{file}: roughness {name} is {values[wrong[0]]:.4g} at {place(mesh, 'face', wrong[0])} (and "
            f"{wrong.size - 1} more), "
            "which no Manning's n is; check what it holds."
        )


def check_velocity(file: str, name: str, index: int, velocity: Sequence[np.ndarray], wet: np.ndarray) -> None:
    """Some wet place (k,) bool has both components of velocity; ``ValueError`` when a frame has none."""
    if wet.any() and not (wet & np.isfinite(velocity[0]) & np.isfinite(velocity[1])).any():
        raise ValueError(
            f"{file}: velocity {name} is missing everywhere in the water of frame {index}; export it, or leave the "
            "frame out."
        )


def check_depth(file: str, mesh: Mesh, location: str, index: int, depth: np.ndarray) -> None:
    """Depths that a river can have; ``ValueError`` names the first place of a frame that is beyond."""
    if not depth.max(initial=0.0) > DEEPEST_M:
        return
    deep = np.flatnonzero(depth > DEEPEST_M)
    raise ValueError(
        f"{file}: the water is {depth[deep[0]]:.4g} m deep at {place(mesh, location, deep[0])} (and over {DEEPEST_M:g} m at "
        f"{deep.size - 1} more) in frame {index}; check the unit and fill value of depth or level, and the bed."
    )


def check_flow(file: str, mesh: Mesh, location: str, index: int, flow: np.ndarray, depth: np.ndarray, wet_m: float) -> None:
    """Unit discharge (k, 2) that a river can have; ``ValueError`` names the first place of a frame that is beyond.

    In water no deeper than ``wet_m`` a speed means little: there the bound is on what it carries.
    """
    i, count = meshcheck.too_fast(flow, depth, wet_m, FASTEST_M_S)
    if not count:
        return
    raise ValueError(
        f"{file}: the water moves at {np.abs(flow[i]).max() / depth[i]:.4g} m/s at {place(mesh, location, i)} (and over "
        f"{FASTEST_M_S:g} m/s at {count - 1} more) in frame {index}; check the unit and fill value of velocity."
    )


def check_edge_flow(file: str, name: str, mesh: Mesh, index: int, discharge: np.ndarray) -> None:
    """Edge discharges (e,) m3/s that a river can have; ``ValueError`` names the first edge that is beyond."""
    most = FASTEST_M_S * DEEPEST_M
    if max(discharge.max(initial=0.0), -discharge.min(initial=0.0)) <= most * mesh.edge_length.min():
        return
    beyond = np.flatnonzero(np.abs(discharge) > most * mesh.edge_length)
    if beyond.size:
        raise ValueError(
            f"{file}: {name} is {discharge[beyond[0]]:.4g} m3/s at edge {mesh.file_edge[beyond[0]]} (and beyond bounds at "
            f"{beyond.size - 1} more) in frame {index}; check its unit and fill value."
        )


def check_frame(mesh: Mesh, raw: RawFrame, wet_m: float) -> list[Note]:
    """What is unusual but sound in a first frame, as notes."""
    if raw.unit_discharge is None:
        return []
    location = "node" if raw.stored_on == "node" else "face"
    wet = raw.depth > wet_m
    notes = []
    if not wet.any():
        notes.append(Note(f"no water deeper than {wet_m:g} m in the first frame", ""))
    still = int(np.count_nonzero(np.isnan(raw.unit_discharge[wet]).any(axis=1)))
    if still:
        notes.append(Note(f"wet {location}s of the first frame without velocity; they carry no water", "", still))
    return notes


def place(mesh: Mesh, location: str, index: int) -> str:
    """A node or face of the mesh in words, by the file's number and world coordinates."""
    number = mesh.file_node[index] if location == "node" else mesh.file_face[index]
    x, y = mesh.to_world(mesh.node_xy[index] if location == "node" else mesh.face_centroid[index])
    return f"{location} {number} ({x:.2f} E, {y:.2f} N)"
