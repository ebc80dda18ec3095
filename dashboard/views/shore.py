"""The waterline of a frame: where wet water ends, on the mesh's edge and inside it."""

from __future__ import annotations

import numpy as np

from hydro.contours import contour_lines
from hydro.frame import Frame


def shoreline(frame: Frame, open_edges: np.ndarray | None = None) -> list[np.ndarray]:
    """Lines (k, 2), local m, with the water on their left.

    Parameters
    ----------
    frame : Frame
    open_edges : (k,) int, optional
        Mesh edges where water enters or leaves; no bank is drawn there.
    """
    mesh = frame.mesh
    inside = contour_lines(
        mesh, np.ascontiguousarray(frame.depth), frame.wet_depth_m, np.ones(mesh.n_triangles, bool)
    )
    edges = mesh.boundary_edges
    if open_edges is not None and len(open_edges):
        edges = np.setdiff1d(edges, open_edges)
    wet = frame.wet_nodes[mesh.edge_nodes[edges]].all(axis=1)
    edges = edges[wet]
    nodes = mesh.edge_nodes[edges].copy()
    turn = mesh.edge_faces[edges, 0] < 0  # the face lies right of the edge: water on the left after turning
    nodes[turn] = nodes[turn][:, ::-1]
    return inside + [mesh.node_xy[chain] for chain in chains(nodes)]


def chains(pairs: np.ndarray) -> list[np.ndarray]:
    """Directed pairs (k, 2) joined end to start into runs of nodes; a closed run repeats its first."""
    following: dict[int, list[int]] = {}
    for a, b in pairs.tolist():
        following.setdefault(a, []).append(b)
    entered = {b for _, b in pairs.tolist()}
    starts = [a for a in following if a not in entered]
    out = []
    for start in [*starts, *list(following)]:
        while following.get(start):
            chain = [start]
            while following.get(chain[-1]):
                chain.append(following[chain[-1]].pop())
                if chain[-1] == start:
                    break
            out.append(np.array(chain))
    return out
