"""How each structure stands in this run, against what the review says, and crest levels against the bed."""

from __future__ import annotations

import numpy as np
import shapely

from ..figure import Figure, signed
from ..frame import Frame
from ..reach import Structure
from .finding import Finding, Material, point
from .mesh import boundary_nodes_inside

CREST_TOLERANCE_M = 0.10  # common practice, no source


def structure_findings(m: Material) -> list[Finding]:
    """Findings on structures."""
    frame = m.run.frame(m.chosen()[-1])
    out = []
    for s in m.reach.structures:
        out += [f for f in (_represented(m, frame, s), _crest(m, s), _link(m, s)) if f is not None]
    return out


def found_representation(frame: Frame, roughness: np.ndarray | None, structure: Structure) -> str:
    """What the run makes of an outline: hole, dry, resistance, raised bed or absent ("unknown" for lines)."""
    shape = structure.geometry
    if shape.geom_type != "Polygon":
        return "unknown"
    mesh = frame.mesh
    shapely.prepare(shape)
    inside = shapely.contains_xy(shape, *mesh.face_centroid.T)
    covered = float(mesh.face_area[inside].sum() / shape.area)
    if covered < 0.5:
        return "hole" if boundary_nodes_inside(frame, shape).size else "unknown"
    ring = shape.buffer(0.5 * np.sqrt(shape.area)).difference(shape)
    shapely.prepare(ring)
    beside = shapely.contains_xy(ring, *mesh.face_centroid.T)
    if not frame.wet_faces[inside].any() and frame.wet_faces[beside].any():
        return "dry"
    if roughness is not None and beside.any() and np.median(roughness[inside]) > 1.5 * np.median(roughness[beside]):
        return "resistance"
    rise = np.median(frame.face_bed[inside]) - np.median(frame.face_bed[beside]) if beside.any() else 0.0
    return "raised bed" if rise > 0.1 else "absent"


def _represented(m: Material, frame: Frame, s: Structure) -> Finding | None:
    if s.kind not in ("pier", "weir"):
        return None
    found = found_representation(frame, m.run.roughness, s)
    at = np.asarray(s.geometry.representative_point().coords[0])
    if s.represented_as not in ("unknown", found) and found != "unknown":
        return Finding(
            "structure not as stated", "resolve before use", f"{s.name} is stated as {s.represented_as}, but in this run it is {found}.",
            "Flow at the structure is not what the review assumes.", f"How is {s.name} modelled, and is the file the right one?",
            Figure("representation", None, "", note=found, place=m.place(at)), point(at),
        )
    if s.kind == "pier" and found in ("resistance", "absent", "raised bed"):
        return Finding(
            "pier not solid", "ask", f"{s.name} is {found} in this run: water passes through it.",
            "A wake behind it has no separation point; its eddy is not that of a solid pier.", f"Why is {s.name} not a hole in the mesh?",
            Figure("representation", None, "", note=found, place=m.place(at)), point(at),
        )
    return None


def _crest(m: Material, s: Structure) -> Finding | None:
    """Crest level of the lines against the highest bed under them (the middle of what the line meets)."""
    crest = s.levels.get("crest_m")
    if crest is None or s.kind != "weir" or s.geometry.geom_type != "LineString":
        return None
    points = np.array([s.geometry.interpolate(f, normalized=True).coords[0] for f in np.linspace(0.02, 0.98, 49)])[:, :2]
    t = m.run.mesh.find(points)
    if (t < 0).all():
        return None
    bed = m.run.node_bed[m.run.mesh.triangles[t[t >= 0]]].max(axis=1)
    apart = float(np.median(bed)) - crest
    if abs(apart) <= CREST_TOLERANCE_M:
        return None
    at = points[len(points) // 2]
    return Finding(
        "crest level", "resolve before use", f"The bed under {s.name} stands {signed(apart, 2)} m from the crest level {crest:.3f} m of the lines.",
        "Either the bed, the datum or the crest level is wrong; heads over the weir hang on it.", "Which datum are bed and crest given in, and which level was built?",
        Figure("bed minus crest", apart, "m", place=m.place(at)), point(at),
    )


def _link(m: Material, s: Structure) -> Finding | None:
    if s.represented_as != "link":
        return None
    if s.discharge_variable in m.run.series:
        return None
    at = np.asarray(s.geometry.representative_point().coords[0])
    return Finding(
        "link left out", "resolve before use", f"{s.name} is stated as a link, but the file holds no discharge for it.",
        "Discharge that passes through it is missing from sections and from psi.", f"What discharge passes through {s.name}, and between which cells?",
        Figure("representation", None, "", note="absent", place=m.place(at)), point(at),
    )
