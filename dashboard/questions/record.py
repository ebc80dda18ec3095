"""Record: what goes on file?"""

from __future__ import annotations

from hydro.record.build import PARTS
from hydro.record.missing import missing

from .. import text
from ..views import pack_list
from .base import Desk, Question

_TITLES = {
    "documents": "Documents", "runs": "Runs", "method": "Method", "arrival": "What has arrived", "queries": "Queries and answers",
    "eddies": "Recirculation zones", "persistence": "Eddies in time", "sections": "Sections", "change": "What changes", "checks": "Checks",
    "drift": "Floating wood", "passage": "Fish passage", "settings": "Settings and choices",
}


class Record(Question):
    """The review record, made from the review's own figures."""

    key = "record"
    word = "Record"
    asks = "What goes on file?"
    has_map = False
    has_time = False

    def summary(self, desk: Desk) -> str:
        made = desk.reading.known(("record",))
        if made is not None:
            return f"{made.figures} figures, made {made.at[11:16]} UTC"
        return "not yet made" if desk.reading.matter().review is not None else "needs a review"

    def sentence(self, desk: Desk) -> str:
        review = desk.reading.matter().review
        if review is None:
            return "A record is made of a review; this is a results file alone. Put it into a review folder with its lines."
        made = desk.studies.made_record()
        if made is None:
            return (
                f"The record of {text.safe(review.title)} has not been made here yet. It holds every run, its eddies, the settings "
                "and the cautions, with the hash of each input."
            )
        return (
            f"The record holds <b>{made.figures} figures</b> in {made.parts} parts, with {made.cautions} cautions; it was made "
            f"on {text.safe(made.at[:10])} at {text.safe(made.at[11:16])} UTC."
        )

    def side(self, desk: Desk) -> dict[str, str]:
        if desk.reading.matter().review is None:
            return {}
        button = '<button type="button" class="plain first" data-do="record" data-value="" data-key="record">{}</button>'
        packs = desk.studies.packs
        shelf = pack_list.html(packs.finished(), packs.making, packs.trouble)
        made = desk.studies.made_record()
        chosen = _parts(desk) + button.format("Make the record" if made is None else "Make it again")
        if made is None:
            return {"body": chosen + shelf}
        files = "".join(f"<li>{text.safe(name)}</li>" for name in made.files)
        return {"body": f"<h2>Written to {text.safe(made.folder)}</h2><ul>{files}</ul>{chosen}{shelf}"}

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return ("screening", "sensitivity", "wake-detail", "no-roller")


def _parts(desk: Desk) -> str:
    """The record's parts to choose from, each with what it still lacks."""
    review = desk.reading.matter().review
    assert review is not None  # a results file alone has no record
    chosen = review.contents.record.get("parts", list(PARTS))
    lacks = missing(review)
    rows = []
    for name in PARTS:
        own = "".join(f"<li>{text.safe(lack.sentence)}</li>" for lack in lacks if lack.part == name)
        checked = " checked" if name in chosen else ""
        rows.append(
            f'<div><label><input type="checkbox" name="{name}" value="yes" id="part-{name}"{checked}> {_TITLES[name]}</label>'
            f"{f'<ul>{own}</ul>' if own else ''}</div>"
        )
    return (
        f'<h2>Parts <span class="beside">with what is still missing</span></h2><form class="parts" data-send="parts">{"".join(rows)}'
        '<button type="submit" class="plain">Keep this choice</button></form>'
    )
