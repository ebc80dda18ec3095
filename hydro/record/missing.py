"""What a record still lacks: documents not received, queries not answered, checks that cannot be answered, runs not readable."""

from __future__ import annotations

from dataclasses import dataclass

from ..checks import read_checks
from ..queries import queries
from ..review import Review


@dataclass(frozen=True, slots=True)
class Lack:
    """One thing that is missing, and the part of the record that it belongs to."""

    part: str
    sentence: str


def missing(review: Review) -> tuple[Lack, ...]:
    """Everything that can be told without reading a result; no verdict on what it matters."""
    out = [Lack("documents", f"{d.name} was not received.") for d in review.contents.documents if not d.received]
    for entry in review.runs:
        try:
            review.paths(entry)
        except ValueError as error:
            out.append(Lack("runs", f"{entry.label} cannot be read: {error}"))
    out += [Lack("queries", f"Query {q.number} is not answered: {q.text}") for q in queries(review.folder) if q.state == "asked"]
    reach = review.reach
    known = {name for place in reach.layer("receptors") for name in (place.id, place.name)}
    known |= {name for structure in reach.structures for name in (structure.id, structure.name)}
    for check in read_checks(review.checks):
        if check.place and check.place not in known:
            out.append(Lack("checks", f"{check.name} has no answer: its place, {check.place!r}, is not in the review's lines."))
    return tuple(out)


def choose_parts(review: Review, chosen: list[str], known: list[str], *, who: str) -> Review:
    """Write into review.toml which parts the record holds, in the record's own order.

    Raises
    ------
    ValueError
        For no part, an unknown one, or a review.toml that somebody else saved meanwhile.
    """
    if unknown := sorted(set(chosen) - set(known)):
        raise ValueError(f"there is no part {unknown[0]!r}; the parts are {', '.join(known)}.")
    if not chosen:
        raise ValueError("a record needs at least one part; choose one.")
    parts = [name for name in known if name in chosen]

    def change(document) -> None:
        if "record" not in document:
            document.add("record", {})
        document["record"]["parts"] = parts

    return review.edit(change, who=who, what=f"The record holds {', '.join(parts)}.")
