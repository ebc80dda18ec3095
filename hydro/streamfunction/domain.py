"""The domain of psi: the wet region, thin sheets that carry flow, and dry specks too small to be walls."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import shapely

from .._kernels import labels
from ..frame import Frame
from ..reach import Structure
from ..settings import Settings


@dataclass(frozen=True, eq=False)
class Domain:
    """Which triangles psi stands on.

    Attributes
    ----------
    triangles : (m,) bool
    specks : (m,) bool
        Triangles of small dry patches; they belong to the domain with no flow.
    n_specks : int
        Small dry patches.
    thin_faces : int
        Faces under the wet threshold that belong to the domain because they carry flow.
    """

    triangles: np.ndarray
    specks: np.ndarray
    n_specks: int
    thin_faces: int


def domain_of(
    frame: Frame, through_discharge: float, settings: Settings, structures: Iterable[Structure] = ()
) -> Domain:
    """The domain of psi in one frame.

    ``through_discharge`` (m3/s; 0 for a closed basin) sets which thin faces carry enough to belong.

    Raises ``ValueError`` where no face is in the domain.
    """
    mesh = frame.mesh
    wet = frame.wet_faces
    thin = _carrying(frame, settings["carrying_share"] * through_discharge) if through_discharge > 0 else wet & False
    inside = wet | thin
    if not inside.any():
        raise ValueError(
            f"the frame at {frame.seconds:g} s has no depth above {frame.wet_depth_m:g} m anywhere; "
            "there is no flow to draw: check the depth variable or lower the wet threshold."
        )
    specks, count = _specks(frame, inside, settings["hole_faces"], structures)
    inside = inside | specks
    of = mesh.triangle_face
    return Domain(inside[of], specks[of], count, int(np.count_nonzero(thin & ~wet)))


def _carrying(frame: Frame, least: float) -> np.ndarray:
    """Faces (f,) bool under the wet threshold through which more than ``least`` m3/s goes."""
    mesh = frame.mesh
    q = frame.face_unit_discharge
    size = np.hypot(*q.T)
    found = np.zeros(mesh.n_faces, bool)
    thin = np.flatnonzero(~frame.wet_faces & (size > 0))
    nodes = mesh.face_nodes[thin]
    normal = np.column_stack([-q[thin, 1], q[thin, 0]]) / size[thin, None]
    across = np.einsum("fkx,fx->fk", mesh.node_xy[nodes], normal)
    across = np.where(nodes >= 0, across, across[:, :1])
    found[thin] = size[thin] * np.ptp(across, axis=1) > least
    return found


def _specks(frame: Frame, inside: np.ndarray, most_faces: float, structures: Iterable[Structure]):
    """Faces (f,) bool of dry patches that are no walls, and the number of such patches.

    A dry patch is a wall if it reaches the mesh's edge (a bank, a hole of the mesh), holds an outline
    of the review, or has more than ``most_faces`` faces.
    """
    mesh = frame.mesh
    dry = ~inside
    pair = mesh.edge_faces
    both = (pair.min(axis=1) >= 0) & dry[pair[:, 0]] & dry[pair[:, 1]]
    patch, count = labels.of_pairs(pair[both, 0], pair[both, 1], dry)
    if not count:
        return np.zeros(mesh.n_faces, bool), 0
    wall = np.bincount(patch[dry], minlength=count) > most_faces
    at_edge = mesh.edge_faces[mesh.boundary_edges].max(axis=1)
    wall[patch[at_edge[dry[at_edge]]]] = True
    small = np.flatnonzero(dry & ~wall[patch])
    if small.size:
        wall[_patches_with_outline(frame, patch, small, structures)] = True
    speck = dry & ~wall[patch]
    return speck, int(np.count_nonzero(~wall))


def _patches_with_outline(frame: Frame, patch: np.ndarray, small: np.ndarray, structures: Iterable[Structure]):
    centres = frame.mesh.face_centroid[small]
    found = [np.zeros(0, int)]
    for s in structures:
        if s.geometry.geom_type in ("Polygon", "MultiPolygon") and s.represented_as in ("hole", "dry", "unknown"):
            found.append(patch[small[shapely.contains_xy(s.geometry, centres)]])
            middle = frame.mesh.find(np.asarray(s.geometry.representative_point().coords))[0]
            if middle >= 0:
                own = frame.mesh.triangle_face[middle]
                found.append(patch[[own]] if own in small else np.zeros(0, int))
    return np.unique(np.concatenate(found))
