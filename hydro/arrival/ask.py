"""The request sheet for the modelling firm: what to export, so that a file made to the letter raises no question."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from ..cautions import caution
from ..reach import Reach
from ..run import Run
from .finding import Finding, Material
from .times import PER_PERIOD, expected_period

_FILE = (
    "NetCDF-4 with UGRID 1.0 and CF 1.11: faces of 3 to 8 nodes, start_index stated, padding with its _FillValue.",
    "Coordinates as double precision, in a projected system in metres named by grid_mapping with crs_wkt.",
    "The vertical datum by its name (geopotential_datum_name or geoid_name), one for bed and level.",
    "Bed level on nodes or faces, Manning's n on faces, each with its units attribute.",
    "Depth and both components of depth-averaged velocity on faces, of the same instants, with units; or unit discharge.",
    "Discharge through edges (m3 s-1), with edge_node_connectivity, positive from left to right of the edge: it lets water be accounted for exactly.",
    "A flag variable on edges that names each open boundary (flag_values, flag_meanings).",
    "Discharge of every culvert, pump or pipe as a time series in m3 s-1, with both ends as points.",
)
_FRAMES = (
    "cell_methods on depth and velocity: time: point, time: mean or time: maximum. Maxima may be added but do not replace instants.",
    "Time as seconds since a date, with Z for UTC, growing; no frame left out or written twice.",
)
_WORDS = (
    "The version of the model code, its time step, the eddy viscosity (value and law) and the least depth for velocity.",
    "Each structure: its outline as built in the model, how it is represented (hole, raised bed, resistance, crest edge, link), crest, soffit and road levels.",
    "Boundary conditions: discharges, levels or ratings, and where they act.",
    "How long each run went on, and why it is taken as settled.",
)


def request_sheet(run: Run | None = None, reach: Reach | None = None, findings: Sequence[Finding] = ()) -> str:
    """The sheet as plain text with headings; about two pages.

    Parameters
    ----------
    run, reach : optional
        With piers in the reach, the sheet says how far apart frames should stand, from each pier's width
        and approach speed.
    findings : sequence of Finding
        Their questions are added, gravest first.
    """
    parts = ["# Request to the modelling firm", "", "## The file", *_items(_FILE), "", "## The frames", *_items(_FRAMES)]
    parts += _items(_spacing(run, reach))
    parts += ["", "## In words", *_items(_WORDS)]
    asked = [f for f in findings if f.grade != "note"]
    if asked:
        parts += ["", "## About the file received"]
        parts += _items([f"{f.sentence} {f.question}" for f in asked])
    parts += ["", caution("screening").text, ""]
    return "\n".join(parts)


def write_sheet(folder: Path, text: str) -> list[Path]:
    """request.md and request.pdf in ``folder``."""
    import typst

    from ..review import write_whole

    folder.mkdir(parents=True, exist_ok=True)
    write_whole(folder / "request.md", text)
    source = folder / "request.typ"
    source.write_text(_typst(text), encoding="utf-8")
    try:
        typst.compile(str(source), output=str(folder / "request.pdf"), root=str(folder), pdf_standards=["ua-1"])
    finally:
        source.unlink(missing_ok=True)
    return [folder / "request.md", folder / "request.pdf"]


def _spacing(run: Run | None, reach: Reach | None) -> list[str]:
    piers = [p for p in (reach.structures if reach else ()) if p.kind == "pier" and p.geometry.geom_type == "Polygon"]
    if run is None or reach is None or not piers:
        return [f"Where piers shed eddies: a burst of at least six periods with {PER_PERIOD} frames a period, or a mean over at least five."]
    out = []
    m = Material(run, reach)
    for pier in piers:
        period = expected_period(m, pier)
        if period:
            out.append(
                f"{pier.name}: water comes at about {period[1]:.1f} m/s, so eddies may be shed every {period[0]:.0f} s (Strouhal number 0.2). "
                f"Send a burst with a frame every {period[0] / PER_PERIOD:.1f} s for {6 * period[0]:.0f} s, or a mean over at least {5 * period[0]:.0f} s."
            )
    return out


def _items(lines: Sequence[str]) -> list[str]:
    return [f"- {line}" for line in lines]


def _typst(text: str) -> str:
    """The sheet's text as a Typst source; every line is a string, so nothing in it can be markup."""
    body = [
        '#set document(title: "Request to the modelling firm")',
        '#set page(paper: "a4", margin: 20mm, numbering: "1")',
        '#set text(lang: "en", region: "GB", font: "Libertinus Serif", size: 10pt)',
    ]
    for line in text.splitlines():
        plain = line.lstrip("#- ").replace("\\", "\\\\").replace('"', '\\"')
        if line.startswith("#"):
            level = len(line) - len(line.lstrip("#"))
            body.append(f'#heading(level: {level}, "{plain}")')
        elif line.startswith("- "):
            body.append(f'#list("{plain}")')
        elif line:
            body.append(f'#par("{plain}")')
    return "\n".join(body)
