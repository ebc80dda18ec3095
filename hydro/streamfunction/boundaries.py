"""Open boundaries: which stretches of the mesh's edge let water in or out, and how much."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from .._kernels import labels
from ..frame import Frame
from ..mesh import Mesh
from ..settings import Settings

# A bank that bends makes the flow of a face beside it cross the face's own edge at a few degrees.
_CROSSING = 0.1
_CLOSED_WORDS = ("wall", "bank", "pier", "island", "land", "closed", "dry")


@dataclass(frozen=True, eq=False)
class OpenBoundary:
    """A stretch of the mesh's edge that water crosses.

    ``edges`` are mesh edges; ``discharge_m3_s`` is positive into the water.
    """

    name: str
    edges: np.ndarray
    discharge_m3_s: float = float("nan")


def outward_discharge(frame: Frame) -> np.ndarray:
    """Discharge (b,) out through each of ``mesh.boundary_edges``, m3/s, by the frame's own field."""
    mesh, edges = frame.mesh, frame.mesh.boundary_edges
    faces = mesh.edge_faces[edges]
    left = faces[:, 0] >= 0
    if frame.edge_discharge is not None:
        return np.where(left, 1.0, -1.0) * frame.edge_discharge[edges]
    along = mesh.node_xy[mesh.edge_nodes[edges, 1]] - mesh.node_xy[mesh.edge_nodes[edges, 0]]
    if frame.stored_on == "node":
        q = frame.unit_discharge[mesh.edge_nodes[edges]].mean(axis=1)
    else:
        q = frame.face_unit_discharge[faces.max(axis=1)]
    return np.where(left, 1.0, -1.0) * (q[:, 0] * along[:, 1] - q[:, 1] * along[:, 0])


def open_boundaries(
    frame: Frame, settings: Settings, boundary_sets: Mapping[str, np.ndarray] | None = None
) -> tuple[OpenBoundary, ...]:
    """The open boundaries of a run, judged by one frame.

    Parameters
    ----------
    frame : Frame
    settings : Settings
    boundary_sets : mapping of name to mesh edges, optional
        Stretches that the review or the file names; they are taken as they are, but for those whose
        name says that they are closed ("wall", "bank", "pier", "island", "land", "closed", "dry").
        Without any, boundaries are runs of adjoining edges that water crosses in one sense, whose
        summed discharge exceeds ``open_boundary_share`` of the largest; holes of the mesh that take
        in as much as they give are walls.
    """
    named = {
        name: np.asarray(edges, np.int32)
        for name, edges in (boundary_sets or {}).items()
        if len(edges) and not any(word in name.lower() for word in _CLOSED_WORDS)
    }
    if named:
        return tuple(OpenBoundary(name, edges) for name, edges in named.items())
    return _found(frame, settings)


def said_sets(
    mesh: Mesh, file_sets: Mapping[str, np.ndarray], opened: Mapping[str, tuple], closed: Sequence[str]
) -> dict[str, np.ndarray]:
    """Named stretches of boundary as a review says them.

    Parameters
    ----------
    file_sets : mapping of name to mesh edges
        What the file names.
    opened : mapping of name to two world points, m
        Boundary edges whose middle lies within their own length of the line between the points. With any, only
        these are open.
    closed : sequence of names of ``file_sets`` that are walls

    Raises
    ------
    ValueError
        A line that no boundary edge lies on, or a closed name that the file does not have.
    """
    unknown = next((name for name in closed if name not in file_sets), None)
    if unknown is not None:
        raise ValueError(
            f"review.toml, boundaries.closed: the file names no stretch {unknown!r}; it names {', '.join(file_sets) or 'none'}."
        )
    if not opened:
        return {name: edges for name, edges in file_sets.items() if name not in closed}
    return {name: _edges_on(mesh, name, np.array(points, float)) for name, points in opened.items()}


def _edges_on(mesh: Mesh, name: str, ends: np.ndarray) -> np.ndarray:
    edges = mesh.boundary_edges
    middle = mesh.to_world(mesh.node_xy[mesh.edge_nodes[edges]].mean(axis=1))
    along = ends[1] - ends[0]
    t = np.clip((middle - ends[0]) @ along / max(float(along @ along), 1e-12), 0, 1)
    away = np.hypot(*(middle - ends[0] - t[:, None] * along).T)
    found = edges[away < mesh.edge_length[edges]]
    if not found.size:
        raise ValueError(
            f"review.toml, boundaries.open.{name}: no edge of the mesh's boundary lies between ({ends[0, 0]:.1f}, {ends[0, 1]:.1f}) and "
            f"({ends[1, 0]:.1f}, {ends[1, 1]:.1f}); give two points on it, in the run's coordinates."
        )
    return found


def with_discharge(frame: Frame, boundaries: tuple[OpenBoundary, ...], inside: np.ndarray) -> tuple[OpenBoundary, ...]:
    """The same boundaries with this frame's discharge through the edges that lie in the domain (m,) bool."""
    mesh = frame.mesh
    out = np.zeros(mesh.n_edges)
    out[mesh.boundary_edges] = outward_discharge(frame)
    face_inside = inside[mesh.face_first_triangle[:-1]]
    held = face_inside[mesh.edge_faces.max(axis=1)]
    return tuple(
        OpenBoundary(b.name, b.edges, float(-np.sum(out[b.edges] * held[b.edges]))) for b in boundaries
    )


def _found(frame: Frame, settings: Settings) -> tuple[OpenBoundary, ...]:
    mesh, edges = frame.mesh, frame.mesh.boundary_edges
    flux = outward_discharge(frame)
    face = mesh.edge_faces[edges].max(axis=1)
    most = np.hypot(*frame.face_unit_discharge[face].T) * mesh.edge_length[edges]
    crossing = (np.abs(flux) > _CROSSING * most) & (np.abs(flux) > 1e-6 * max(np.abs(flux).max(), 1e-300))
    run = _runs(mesh, edges, np.sign(flux) * crossing)
    total = np.bincount(run[run >= 0], flux[run >= 0], minlength=1)
    if not run.size or not np.any(total):
        return ()
    least = settings["open_boundary_share"] * np.abs(total).max()
    closed = _closed_rings(mesh, edges, flux, least)
    kept = np.array([r for r in np.flatnonzero(np.abs(total) > least) if not closed[run == r].any()], int)
    order = sorted(kept, key=lambda r: (total[r] > 0, -abs(total[r])))
    made, inflows, outflows = [], 0, 0
    for r in order:
        if total[r] < 0:
            inflows += 1
            name = "inflow" if inflows == 1 else f"inflow {inflows}"
        else:
            outflows += 1
            name = "outflow" if outflows == 1 else f"outflow {outflows}"
        made.append(OpenBoundary(name, edges[run == r]))
    return tuple(made)


def _closed_rings(mesh: Mesh, edges: np.ndarray, flux: np.ndarray, least: float) -> np.ndarray:
    """Edges (b,) bool of holes of the mesh that take in as much as they give: piers and islands."""
    ends = mesh.edge_nodes[edges]
    present = np.zeros(mesh.n_nodes, bool)
    present[ends] = True
    part, count = labels.of_pairs(ends[:, 0], ends[:, 1], present)
    ring = part[ends[:, 0]]
    spans = [np.prod(np.ptp(mesh.node_xy[ends[ring == r].ravel()], axis=0)) for r in range(count)]
    shut = np.abs(np.bincount(ring, flux, minlength=count)) <= least
    shut[int(np.argmax(spans))] = False
    return shut[ring]


def _runs(mesh: Mesh, edges: np.ndarray, sense: np.ndarray) -> np.ndarray:
    """Number (b,) of the run of adjoining edges with one sense that each belongs to; -1 for none."""
    run = np.full(len(edges), -1)
    offset = 0
    for sign in (-1.0, 1.0):
        chosen = np.flatnonzero(sense == sign)
        ends = mesh.edge_nodes[edges[chosen]]
        present = np.zeros(mesh.n_nodes, bool)
        present[ends] = True
        part, count = labels.of_pairs(ends[:, 0], ends[:, 1], present)
        run[chosen] = part[ends[:, 0]] + offset
        offset += count
    return run
