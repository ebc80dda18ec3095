"""What the mesh itself gives away: angles, size jumps, triangles across piers and banks, stored coordinates."""

from __future__ import annotations

import numpy as np
import shapely

from ..figure import Figure, printed
from ..frame import Frame
from ..section import cut
from .finding import Finding, Material, point

SMALL_ANGLE_DEG = 10.0  # common practice, no source
SIZE_JUMP = 4.0  # ratio of areas of neighbours; common practice, no source
ACROSS_PIER = 8.0  # triangles; common practice, no source
ACROSS_RIVER = 10.0  # triangles; common practice, no source


def mesh_findings(m: Material) -> list[Finding]:
    """Findings on the mesh."""
    found = [_angles(m), _jumps(m), _coordinates(m), _river(m), *_piers(m)]
    return [f for f in found if f is not None]


def smallest_angles(xy: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """Smallest angle (m,) of each triangle, degrees."""
    p = xy[triangles]
    sides = np.stack([np.hypot(*(p[:, (k + 2) % 3] - p[:, (k + 1) % 3]).T) for k in range(3)], axis=1)
    a, b, c = np.sort(sides, axis=1).T
    return np.degrees(np.arccos(np.clip((b**2 + c**2 - a**2) / (2 * b * c), -1, 1)))


def _angles(m: Material) -> Finding | None:
    mesh = m.run.mesh
    if (mesh.face_count > 4).all():
        return None
    angle = smallest_angles(mesh.node_xy, mesh.triangles)
    whole = mesh.face_count[mesh.triangle_face] == 3
    bad = whole & (angle < SMALL_ANGLE_DEG)
    if not bad.any():
        return None
    i = int(np.where(whole, angle, np.inf).argmin())
    at = mesh.triangle_centroid[i]
    return Finding(
        "small angles", "ask", f"{bad.sum()} faces have an angle under {SMALL_ANGLE_DEG:g} degrees; the smallest, {angle[i]:.1f} degrees, is at {m.where(at)}.",
        "Slender faces blur gradients and shorten the time step.", "Why are the faces there so slender, and was the result checked on a better mesh?",
        Figure("smallest angle", float(angle[i]), "deg", place=m.place(at)), point(at),
    )


def _jumps(m: Material) -> Finding | None:
    mesh = m.run.mesh
    both = mesh.edge_faces[(mesh.edge_faces >= 0).all(axis=1)]
    if not len(both):
        return None
    pair = mesh.face_area[both]
    ratio = pair.max(axis=1) / pair.min(axis=1)
    bad = ratio > SIZE_JUMP
    if not bad.any():
        return None
    i = int(ratio.argmax())
    at = mesh.face_centroid[both[i, 0]]
    return Finding(
        "size jumps", "note", f"{bad.sum()} pairs of neighbouring faces differ in area by more than {SIZE_JUMP:g} times, by up to {ratio[i]:.1f}, at {m.where(at)}.",
        "Abrupt changes of size add error where they stand.", "Are the jumps away from the places that matter?",
        Figure("ratio of neighbouring areas", float(ratio[i]), "-", place=m.place(at)), point(at),
    )


def _coordinates(m: Material) -> Finding | None:
    """Coordinates stored in single precision: every one is a float32, and their step is not small."""
    mesh = m.run.mesh
    world = np.concatenate([mesh.to_world(mesh.node_xy).ravel()])
    single = world.astype(np.float32)
    if not np.array_equal(single.astype(float), np.round(world, 9)):
        return None
    step = float(np.spacing(np.abs(single).max()))
    shortest = float(mesh.edge_length.min())
    if step < 1e-3 * shortest:
        return None
    at = mesh.node_xy[mesh.edge_nodes[int(mesh.edge_length.argmin())]].mean(axis=0)
    grade = "resolve before use" if step > 0.05 * shortest else "ask"
    return Finding(
        "coordinate step", grade, f"Coordinates are stored in steps of {printed(step)} m; the shortest edge is {printed(shortest)} m, at {m.where(at)}.",
        "Node positions, and so areas and angles, are rounded by that step.", "Please export the coordinates as double precision, or about a local origin.",
        Figure("coordinate step", step, "m", place=m.place(at)), point(at),
    )


def _river(m: Material) -> Finding | None:
    """Fewest faces from bank to bank, by the width of water over the local size, along the centre line."""
    if m.reach.centre_line is None:
        return None
    frame = m.run.frame(m.chosen()[-1])
    least, at = np.inf, None
    for _, line in m.sections():
        try:
            section = cut(frame, line)
        except ValueError:  # the line falls between two arms of the mesh
            continue
        faces = np.unique(m.run.mesh.triangle_face[section.triangle[section.wet]]).size
        width = section.widths[section.wet].sum()
        size = np.sqrt(2 * np.median(m.run.mesh.triangle_area[section.triangle[section.wet]])) if faces else 0.0
        across = width / size if size > 0 else np.inf
        if across < least:
            least, at = across, section.xy[section.wet].mean(axis=(0, 1))
    if at is None or least >= ACROSS_RIVER:
        return None
    return Finding(
        "few faces across the river", "ask", f"Only about {least:.0f} faces lie between the banks at {m.where(at)}.",
        "The spread of the flow over the width is not resolved there.", "Was the result compared with one on a finer mesh there?",
        Figure("faces bank to bank", float(least), "", place=m.place(at)), point(at),
    )


def _piers(m: Material) -> list[Finding]:
    """Triangles across each pier, and the width that the mesh gives it against its outline."""
    mesh, out = m.run.mesh, []
    for pier in (s for s in m.reach.structures if s.kind == "pier" and s.geometry.geom_type == "Polygon"):
        width = short_side(pier.geometry)
        around = pier.geometry.buffer(0.5 * width)
        shapely.prepare(around)
        near = shapely.contains_xy(around, *mesh.triangle_centroid.T)
        at = np.asarray(pier.geometry.centroid.coords[0])
        if not near.any():
            continue
        size = float(np.sqrt(2 * np.median(mesh.triangle_area[near])))
        across = width / size
        if across < ACROSS_PIER:
            out.append(Finding(
                "few triangles across a pier", "ask", f"{pier.name} is {width:.1f} m wide and only about {across:.1f} faces across; its wake will be under-resolved.",
                "Length and strength of the eddy behind it depend on the mesh.", f"Was a finer mesh tried at {pier.name}?",
                Figure("faces across", across, "", place=m.place(at)), point(at),
            ))
    return out


def short_side(shape) -> float:
    """Shorter side of the smallest rectangle round an outline, m."""
    corners = np.asarray(shape.minimum_rotated_rectangle.exterior.coords)
    return float(np.hypot(*np.diff(corners, axis=0).T).min())


def boundary_nodes_inside(frame: Frame, shape) -> np.ndarray:
    """Boundary edges (indices) whose middle lies within an outline, grown by a quarter of its width."""
    mesh = frame.mesh
    grown = shape.buffer(0.25 * short_side(shape))
    shapely.prepare(grown)
    middle = mesh.node_xy[mesh.edge_nodes[mesh.boundary_edges]].mean(axis=1)
    return mesh.boundary_edges[shapely.contains_xy(grown, middle[:, 0], middle[:, 1])]
