"""Record: what goes on file?"""

from __future__ import annotations

from .. import text
from ..views import pack_list
from .base import Desk, Question


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
        if made is None:
            return {"body": button.format("Make the record") + shelf}
        files = "".join(f"<li>{text.safe(name)}</li>" for name in made.files)
        return {"body": f"<h2>Written to {text.safe(made.folder)}</h2><ul>{files}</ul>{button.format('Make it again')}{shelf}"}

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return ("screening", "sensitivity", "wake-detail", "no-roller")
