"""A record made from a review: which parts, in which order, from which runs."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from ..change import Change
from ..drift.report import DriftAnswer
from ..drift.report import study as drift_study
from ..passage import Study
from ..passage import study as passage_study
from ..provenance import file_hash
from ..review import Review
from ..review_log import now
from ..run import Run
from . import basis
from . import review_parts as parts
from .eddies import Reading, eddies, read
from .in_time import InTime, persistence, read_in_time
from .model import Part, Record

LIMITS = (
    "This record says what was read in the files named in it. It is not an approval, and not an assessment of the "
    "model's fitness for any purpose that is not named here. Screening figures do not replace licensed judgement, "
    "local standards or codes."
)


@dataclass(frozen=True, eq=False)
class Material:
    """A review with its runs opened and read once, shared by all parts."""

    review: Review
    progress: Callable[[str], None] = lambda text: None

    @cached_property
    def runs(self) -> dict[str, Run]:
        """Runs by id."""
        return {e.id: self.review.open(e.id) for e in self.review.runs}

    @cached_property
    def readings(self) -> list[Reading]:
        """Every run that the record reads in full: all but those named in [record] leave_out."""
        left = set(self.review.contents.record.get("leave_out", ()))
        out = []
        for entry in self.review.runs:
            if entry.id not in left:
                self.progress(f"reading {entry.label}")
                out.append(read(self.review, entry, self.runs[entry.id]))
        return out

    @cached_property
    def still(self) -> list[Reading]:
        """The readings of means: what drift and passage take as steady flow."""
        return [r for r in self.readings if r.run.n_frames == 1]

    @cached_property
    def in_time(self) -> list[InTime]:
        """Runs of several frames, read through."""
        out = []
        for r in self.readings:
            if sum(kind != "maximum" for kind in r.run.times.kinds) > 1:
                self.progress(f"following the eddies of {r.entry.label}")
                out.append(read_in_time(r))
        return out

    @cached_property
    def changes(self) -> list[tuple[Reading, Reading, Change]]:
        """Every pair of designs compared."""
        self.progress("comparing designs")
        return parts.changes(self.readings)

    @cached_property
    def drift(self) -> list[DriftAnswer]:
        """Wood let go in the runs of [record] drift_runs; without it, in every bankfull mean."""
        wanted = self.review.contents.record.get("drift_runs")
        chosen = [self.review.entry(w) for w in wanted] if wanted else [r.entry for r in self.still if r.entry.event == "bankfull"]
        if not self.review.releases:
            return []
        return [drift_study(self.review, e, progress=lambda what, share: None) for e in chosen if "coarse" not in e.variant]

    @cached_property
    def passage(self) -> Study | None:
        """Passage in the means; None where the review names no fish."""
        if not self.review.fish:
            return None
        return passage_study(self.review, runs=[r.entry.id for r in self.still if "coarse" not in r.entry.variant])


PARTS: dict[str, Callable[[Material], Part]] = {
    "documents": lambda m: basis.documents(m.review),
    "runs": lambda m: basis.runs(m.review, m.runs),
    "method": lambda m: basis.method(),
    "arrival": lambda m: parts.arrival(m.review, m.readings),
    "queries": lambda m: parts.asked(m.review),
    "eddies": lambda m: eddies(m.readings),
    "persistence": lambda m: persistence(m.in_time),
    "sections": lambda m: parts.sections(m.readings),
    "change": lambda m: parts.change(m.changes),
    "checks": lambda m: parts.checks(m.review, m.readings, m.changes),
    "drift": lambda m: parts.drift_part(m.drift),
    "passage": lambda m: parts.passage_part(m.passage),
    "settings": lambda m: basis.settings(m.review),
}


def build_record(material: Material) -> Record:
    """The record of a review, from its material.

    Parts are those of ``[record] parts`` in review.toml, in that order; without it, all of them.

    Raises
    ------
    ValueError
        An unknown part, no runs, or a run whose file is missing or changed since it was reviewed.
    """
    review, progress = material.review, material.progress
    chosen = review.contents.record.get("parts", list(PARTS))
    unknown = next((p for p in chosen if p not in PARTS), None)
    if unknown:
        raise ValueError(f"review.toml, record.parts: there is no part {unknown!r}; the parts are {', '.join(PARTS)}.")
    if not review.runs:
        raise ValueError("the review lists no runs; add one under [[runs]] before making a record.")
    if changed := review.changed_inputs():
        raise ValueError(changed[0])
    made = []
    for name in chosen:
        progress(name)
        made.append(PARTS[name](material))
    return Record(
        title=review.title, front=_front(review, made), parts=tuple(made), inputs=tuple(_inputs(material)),
        settings=dict(review.settings), made=now(),
    )


def _front(review: Review, made: list[Part]) -> dict[str, str]:
    who = review.contents.reviewer
    missing = [d.name for d in review.contents.documents if not d.received]
    left = review.contents.record.get("leave_out", ())
    return {
        "Reviewer": who.name or "not named",
        "Role": who.role or "not named",
        "Organisation": who.organisation or "not named",
        "Date": now()[:10],
        "Place": review.contents.place or "not named",
        "What was reviewed": "; ".join(e.label for e in review.runs),
        "Done": ", ".join(p.title for p in made),
        "Still awaited": "; ".join(missing) or "nothing listed",
        "Left out": "; ".join(left) or "nothing",
        "Limits": review.contents.record.get("limits", LIMITS),
    }


def _inputs(material: Material) -> list[dict[str, Any]]:
    review = material.review
    out = [
        {"kind": "run", "id": e.id, "file": ", ".join(e.files), "sha256": material.runs[e.id].hash} for e in review.runs
    ]
    documents = [d.file for d in review.contents.documents if d.received and d.file]
    for name in ("review.toml", review.contents.lines, *documents):
        if (review.folder / name).is_file():
            out.append({"kind": "file", "id": name, "file": name, "sha256": file_hash(review.folder / name)})
    return out
