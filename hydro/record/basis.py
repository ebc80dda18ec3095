"""Parts of the record that say what was reviewed and how: documents, runs, method, settings, provenance."""

from __future__ import annotations

from ..automatic import automatic_choices
from ..figure import Figure
from ..provenance import file_hash
from ..review import Document, Review
from ..review_log import told
from ..run import Run
from ..settings import REGISTRY
from .model import Part, Table

METHOD = (
    "The results are read from the files named in this record and from nothing else. Depth and unit discharge of each "
    "frame are taken as stored; where the file holds face values, psi and sections use them as they are.",
    "The stream function psi (m3/s) is found on the model's own triangles: continuous, linear in each triangle, "
    "constant on every wall with one unknown a wall (van Gijzen, Vreugdenhil and Oksuzoglu 1998), and nearest in the "
    "least-squares sense to the stored unit discharge. Facing downstream it rises towards the left bank; the "
    "difference between two points is the discharge that passes between them. What it cannot explain is reported as "
    "the misfit, split into storage, flow through walls, and the unexplained rest.",
    "A recirculation zone (eddy) is a connected region round an extremum of psi, bounded by a contour of psi that is "
    "closed, or closed by a wall, and that reaches no open boundary. It is found with a merge tree of psi, not by "
    "thresholds on velocity. Recirculating discharge is the difference of psi between its extremum and its edge; "
    "rotation time is volume over recirculating discharge.",
    "Ranges beside figures are sensitivities: the dividing level moved by the local noise, half a triangle along the "
    "outline, face against node reconstruction, thresholds halved and doubled. They are a reading of the file only; "
    "the model's own error is not included. Figures are rounded to them; full digits stand in record.json.",
)
SOURCES = (
    "van Gijzen, M.B., Vreugdenhil, C.B. and Oksuzoglu, H. (1998). The finite element discretization for stream-function "
    "problems on multiply connected domains. Journal of Computational Physics 140, 30-46.",
    "Zhou, J., Adrian, R.J., Balachandar, S. and Kendall, T.M. (1999). Mechanisms for generating coherent packets of "
    "hairpin vortices in channel flow. Journal of Fluid Mechanics 387, 353-396.",
    "ISO 748:2021. Hydrometry: measurement of liquid flow in open channels, velocity area methods.",
)


def documents(review: Review) -> Part:
    """Documents received and those still awaited."""
    got = [d for d in review.contents.documents if d.received]
    missing = [d for d in review.contents.documents if not d.received]
    tables = (
        Table(
            "documents", "Documents received", ("Document", "Version", "Date", "Received", "SHA-256"),
            tuple((d.name, d.version, d.date, d.received, _document_hash(review, d)) for d in got),
        ),
        Table(
            "documents-awaited", "Documents asked for and not received", ("Document", "Version", "Date"),
            tuple((d.name, d.version, d.date) for d in missing),
        ),
    )
    say = "" if review.contents.documents else "The review lists no documents; name those received under [[documents]]."
    return Part("documents", "Documents", (say,) if say else (), tables)


def _document_hash(review: Review, document: Document) -> str:
    """What identifies a document: the hash of its file in the review, else the one entered."""
    path = review.folder / document.file
    if not document.file or not path.is_file():
        missing = f"{document.file} is not in the review; " if document.file else ""
        return missing + (document.sha256[:16] or "hash not available")
    found = file_hash(path)
    changed = document.sha256 and document.sha256 != found
    return f"{found[:16]}, not the {document.sha256[:16]} that was entered" if changed else found[:16]


def runs(review: Review, opened: dict[str, Run]) -> Part:
    """Runs with their hashes, kinds of frame, times, coordinate system and datum."""
    rows, notes = [], []
    for entry in review.runs:
        run = opened[entry.id]
        t = run.times
        when = f"{t.seconds[-1] - t.seconds[0]:g} s" if len(t) > 1 else "one frame"
        start = "undated" if t.instants is None else f"{str(t.instants[0])[:19]}Z"
        rows.append((
            entry.label, entry.design, entry.event, "/".join(sorted(set(t.kinds))),
            Figure("frames", float(len(t)), "", decimals=0), when, start, run.hash[:16],
        ))
        notes += [(entry.label, n.text, n.variable) for n in run.notes]
    first = opened[review.runs[0].id] if review.runs else None
    system = (first.crs or "local metres, no coordinate system named").split(",")[0] if first else ""
    datum = (first.datum if first else "") or review.contents.datum or "not named"
    said = (f"Coordinate system: {system}. Vertical datum: {datum}.",) if first else ("The review lists no runs.",)
    tables = (
        Table("runs", "Runs", ("Run", "Design", "Event", "Kind", "Frames", "Span", "Starts", "SHA-256"), tuple(rows)),
        Table("reading-notes", "Mended, derived or assumed on reading", ("Run", "Note", "Variable"), tuple(notes)),
    )
    return Part("runs", "Runs", said, tables)


def method() -> Part:
    """How the figures are made, with sources."""
    table = Table("sources", "Sources of the method", ("Reference",), tuple((s,) for s in SOURCES))
    return Part("method", "Method", METHOD, (table,), cautions=("wake-detail", "sensitivity"))


def settings(review: Review) -> Part:
    """Every setting with its value, source and what it touches; automatic choices; the log of changes."""
    rows = tuple(
        (
            name, Figure(name, review.settings[name], rule.unit), rule.unit,
            "default" if review.settings[name] == rule.default else f"changed from {rule.default:g}",
            rule.source, rule.touches,
        )
        for name, rule in REGISTRY.items()
    )
    choices = tuple((c.sentence, c.standing, c.how) for c in automatic_choices(review))
    return Part(
        "settings", "Settings and choices", (),
        (
            Table("settings", "Settings", ("Setting", "Value", "Unit", "State", "Source", "Touches"), rows),
            Table("automatic-choices", "What Leewater chose by itself", ("Choice", "Standing", "Overruled by the entry"), choices),
            Table("settings-log", "Who changed what", ("When", "Who", "What", "Lines of review.toml"), tuple(told(review.logged()))),
        ),
    )
