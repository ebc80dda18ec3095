"""The file's own level against bed plus depth, where the file stores all three."""

from __future__ import annotations

import numpy as np

from ..figure import Figure, percent, signed
from ..frame import Frame
from ..run import StoredLevel
from .finding import Finding, Material, first_of_each, point

APART_M = 0.02  # twice a centimetre, the step that levels are often rounded to (common practice, no source)
CARRIED_APART_M = 0.10  # where level and depth stand on different places and one is carried to the other
LEAST_FACES = 2.0  # a patch of less than this many faces is a rounded waterline (common practice, no source)


def level_findings(m: Material) -> list[Finding]:
    """Findings on the stored level, in the frames that stand for the run; none where the file stores no level."""
    stored = m.run.stored_level
    if stored is None:
        return []
    return first_of_each([f for i in m.chosen() if (f := _frame(m, stored, i)) is not None])


def _frame(m: Material, stored: StoredLevel, index: int) -> Finding | None:
    frame = m.run.frame(index)
    mesh = frame.mesh
    xy, area, wet, level = _views(frame, stored.location)
    apart = stored.read(index) - level
    off = np.abs(apart) > APART_M if stored.beside_depth else _inside(frame, stored.location) & (np.abs(apart) > CARRIED_APART_M)
    off &= wet
    least = LEAST_FACES * float(np.median(mesh.face_area))
    if float(area[off].sum()) < least:
        return None
    worst = int(np.where(off, np.abs(apart) * area, 0).argmax())
    at, share = xy[worst], float(area[off].sum() / area[wet].sum())
    return Finding(
        "level against depth", "resolve before use",
        f"The file's own level ({stored.name}) stands {signed(apart[worst], 2)} m from bed plus depth at {m.where(at)}, and differs on "
        f"{area[off].sum():.0f} m2 ({percent(share)} of the water) in frame {index}.",
        "One of bed, depth and level is not of this run, this time or this datum; every level here is bed plus depth.",
        "Which of the three is right there; does the bed move in time, and do bed and level share one datum?",
        Figure("stored level minus bed and depth", float(apart[worst]), "m", place=m.place(at)), point(at), index,
    )


def _views(frame: Frame, location: str) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Places (k, 2), the area that each stands for, where it is wet, and bed plus depth (k,), on faces or nodes."""
    mesh = frame.mesh
    if location == "face":
        return mesh.face_centroid, mesh.face_area, frame.wet_faces, frame.face_bed + frame.face_depth
    third = np.repeat(mesh.triangle_area / 3, 3)
    area = np.bincount(mesh.triangles.ravel(), weights=third, minlength=mesh.n_nodes)
    return mesh.node_xy, area, frame.wet_nodes, frame.bed + frame.depth


def _inside(frame: Frame, location: str) -> np.ndarray:
    """Places (k,) bool away from the waterline, where depth is carried between faces and nodes without a kink."""
    mesh = frame.mesh
    if location == "face":
        return ~np.any((mesh.face_nodes >= 0) & ~frame.wet_nodes[mesh.face_nodes], axis=1)
    start, around = mesh.node_faces
    return np.logical_and.reduceat(frame.wet_faces[around], start[:-1])
