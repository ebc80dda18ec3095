"""How well section discharge can be read from what has arrived, by whichever door it came."""

from __future__ import annotations

import numpy as np

from ..figure import Figure, percent, printed
from ..section import cut
from ..section.error import reading_error
from .finding import Finding, Material

ASK_SHARE = 0.05  # of the discharge (common practice, no source)


def section_findings(m: Material) -> list[Finding]:
    """The error of reading a section's discharge, by the median of sections along the river, in the last frame."""
    if "maximum" in m.run.times.kinds:
        return []
    frame = m.run.frame(m.chosen()[-1])
    rows = []
    for _, line in m.sections():
        try:
            section = cut(frame, line)
        except ValueError:  # the line falls between two arms of the mesh
            continue
        discharge = abs(float(section.face_flow @ section.widths))
        if discharge > 0:
            e = reading_error(section)
            rows.append((e.total_m3_s / discharge, e.total_m3_s, e.banks_m3_s, discharge, e.cell_m))
    if not rows:
        return []
    share, total, banks, discharge, cell = np.median(np.array(rows), axis=0)
    steps = f", {printed(banks, digits=2)} m3/s of it because banks are stair steps or joined points" if frame.mesh.stepped else ""
    return [Finding(
        "section reading", "ask" if share > ASK_SHARE else "note",
        f"Discharge across a section reads within {printed(total, digits=2)} m3/s ({percent(share, 1)} of about {printed(discharge)} m3/s){steps}, "
        f"by the median of {len(rows)} sections in frame {frame.index}; faces there are about {printed(cell, digits=2)} m wide.",
        "Two readings of this file compared; the model's own error is not included.",
        "Can the discharge through the model's own edges be sent, or a finer export?",
        Figure("error of section discharge", float(total), "m3/s", cautions=("section-discharge", "sensitivity")), frame=frame.index,
    )]
