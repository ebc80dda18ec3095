"""The whole audit of what has arrived: every group of findings in turn."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..figure import Figure
from ..reach import Reach
from ..run import Run
from .finding import GRADES, Finding, Material, point
from .levels import level_findings
from .mass import mass_findings
from .mesh import mesh_findings
from .reading import section_findings
from .structures import structure_findings
from .surface import surface_findings
from .times import time_findings

WORKS_WIDTHS = 3.0  # least distance of works from an open boundary in river widths (common practice, no source)


def audit(run: Run, reach: Reach | None = None, *, progress: Callable[[str], None] = lambda text: None) -> list[Finding]:
    """Every finding on a run, gravest first.

    Parameters
    ----------
    reach : Reach, optional
        The review's lines for the run's design; without a centre line places are coordinates only and
        sections along the reach are left out.

    Raises
    ------
    ValueError
        If a frame cannot be read.
    """
    reach = reach or Reach(run.mesh.origin)
    m = Material(run, reach)
    found = _reading(m)
    for name, group in _GROUPS.items():
        progress(name)
        found += group(m)
    return sorted(found, key=lambda f: -GRADES.index(f.grade))


_GROUPS: dict[str, Callable[[Material], list[Finding]]] = {
    "mesh": mesh_findings,
    "structures": structure_findings,
    "times": time_findings,
    "water balance": mass_findings,
    "levels": level_findings,
    "surface": surface_findings,
    "sections": section_findings,
    "boundaries": lambda m: _distance(m),
}


def _reading(m: Material) -> list[Finding]:
    """What the reader mended or derived, and what the file does not say."""
    run = m.run
    out = [
        Finding("reading", "note", f"{n.text[:1].upper()}{n.text[1:]}{f' ({n.variable})' if n.variable else ''}.", "Done on reading; the file is not changed.", "Is that right?")
        for n in run.notes
    ]
    for missing, text, question in (
        (run.crs is None, "The file names no coordinate system.", "Which projected coordinate system are the coordinates in?"),
        (not run.datum, "The file names no vertical datum.", "Which vertical datum do bed and level refer to?"),
        (run.roughness is None, "The file states no roughness.", "Which Manning's n does the model use, and where?"),
    ):
        if missing:
            out.append(Finding("not stated", "ask", text, "Figures that hang on it cannot be derived again.", question))
    return out


def _distance(m: Material) -> list[Finding]:
    """Works too near an open boundary, in widths of the river."""
    centre = m.reach.centre_line
    if centre is None or "maximum" in m.run.times.kinds:
        return []
    sf = m.sf(m.chosen()[-1])
    mesh, wet = m.run.mesh, sf.frame.wet_faces
    width = float(mesh.face_area[wet].sum()) / max(centre.length, 1.0)
    out = []
    for s in m.reach.structures:
        if s.kind not in ("pier", "weir"):
            continue
        at = np.asarray(s.geometry.representative_point().coords[0])
        chainage = float(centre.locate(at)[0][0])
        for b in sf.open_boundaries:
            middle = mesh.node_xy[mesh.edge_nodes[b.edges]].mean(axis=(0, 1))
            away = float(np.hypot(*(middle - at))) / width
            if away < WORKS_WIDTHS:
                out.append(Finding(
                    "boundary too near", "ask", f"{s.name} (chainage {chainage:.0f} m) stands {away:.1f} river widths from the open boundary {b.name}.",
                    "The boundary condition shapes the flow at the structure.", "Was the model tried with the boundary further away?",
                    Figure("distance in widths", away, "", place=m.place(at)), point(at),
                ))
    return out
