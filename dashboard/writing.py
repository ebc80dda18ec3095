"""What the reader writes into a review from the desk: queries and answers, saved views, the record's parts, packs."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from hydro.queries import ask, change
from hydro.record.build import PARTS
from hydro.record.missing import choose_parts
from hydro.review import Review

from .questions import QUESTIONS
from .stops import keep
from .studies import QUERIES

if TYPE_CHECKING:
    from .page import Page


def _review(page: Page, what: str) -> Review:
    review = page.reading.matter().review
    if review is None:
        raise ValueError(f"{what}; this is a results file alone: open a review.")
    return review


def write_query(page: Page, form: dict) -> None:
    review = _review(page, "queries are kept in a review")
    x, y = page.choices.view[:2] if page.choices.view else (None, None)
    page.name = str(form.get("who", ""))[:200]
    ask(
        review.folder, str(form.get("text", ""))[:2000], who=page.name, run=page.desk().run_id, x=x, y=y,
        seconds=page.choices.seconds, view=page.choices.query(),
        **{name: str(form[name])[:200] for name in ("importance", "asked_of", "due") if form.get(name)},
    )
    page.reading.results.tell(QUERIES)


def raise_finding(page: Page, number: str) -> None:
    """Make a finding a query."""
    desk, review = page.desk(), _review(page, "queries are kept in a review")
    finding = QUESTIONS["arrival"].findings(desk)[int(number) - 1]  # type: ignore[attr-defined]
    x, y = desk.run.mesh.to_world(np.array(finding.at)) if finding.at is not None else (None, None)
    grave = finding.grade == "resolve before use"
    ask(
        review.folder, f"{finding.sentence} {finding.question}"[:2000], who=page.name or "the desk", run=desk.run_id, x=x, y=y,
        seconds=page.choices.seconds, view=page.choices.with_(subject=number, view=None).query(),
        importance="could change the decision" if grave else "clarify",
    )
    page.reading.results.tell(QUERIES)


def answer_query(page: Page, form: dict) -> None:
    review = _review(page, "queries are kept in a review")
    page.name = str(form.get("who", ""))[:200]
    told = {name: str(form[name])[:2000] for name in ("state", "answer", "file_received") if form.get(name)}
    change(review.folder, int(form["number"]), who=page.name, **told)
    page.reading.results.tell(QUERIES)


def keep_parts(page: Page, form: dict) -> None:
    """Keep which parts the record holds in the review."""
    review = _review(page, "a record is made of a review")
    page.reading.take(choose_parts(review, list(form), list(PARTS), who=page.name or "the desk"))
    page.reading.results.tell(QUERIES)


def make_record(page: Page, _: str) -> None:
    page.studies.make_record()


def make_pack(page: Page, kind: str) -> None:
    page.studies.packs.make(kind)


def stop_pack(page: Page, kind: str) -> None:
    page.studies.packs.stop(kind)


def keep_view(page: Page, form: dict) -> None:
    review = _review(page, "stops are kept in a review")
    page.reading.take(keep(review, page.choices, str(form.get("sentence", "")), who="the desk"))
    page.stop = len(page.stops) - 1
    page.reading.results.tell(QUERIES)


WRITING: dict[str, Callable[[Page, Any], None]] = {
    "ask": write_query,
    "raise": raise_finding,
    "answer": answer_query,
    "parts": keep_parts,
    "record": make_record,
    "pack": make_pack,
    "unpack": stop_pack,
    "keep": keep_view,
}
