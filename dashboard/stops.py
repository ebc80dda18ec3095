"""Saved views: stops that a presenter walks through, each with a sentence, kept in the review."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import tomlkit

from hydro.review import Review

from .choices import Choices, from_query

_KEPT_BY_THE_VIEWER = ("mode", "hall", "units")  # how one looks, not what one looks at
_LONGEST = 300


@dataclass(frozen=True, slots=True)
class Stop:
    """One saved view."""

    sentence: str
    address: str

    def choices(self, now: Choices) -> Choices:
        """What the stop shows, seen the way the viewer looks now. Raises ``ValueError`` for a broken address."""
        return from_query(self.address).with_(**{name: getattr(now, name) for name in _KEPT_BY_THE_VIEWER})


def stops_of(review: Review | None) -> tuple[Stop, ...]:
    """The review's stops, in order."""
    views = review.contents.views if review is not None else []
    return tuple(Stop(str(v.get("sentence", "")), str(v.get("address", ""))) for v in views)


def keep(review: Review, choices: Choices, sentence: str, *, who: str) -> Review:
    """Add a stop to the review's end, and the review opened anew.

    Raises ``ValueError`` for an empty sentence, or when somebody else saved the review meanwhile.
    """
    if not sentence.strip():
        raise ValueError("a stop needs a sentence; write what you will say there.")
    plain = choices.with_(mode="day", hall=False, units="SI")

    def add(document: Any) -> None:
        entry = tomlkit.table()
        entry.update({"sentence": sentence.strip()[:_LONGEST], "address": plain.query()})
        if "views" not in document:
            document.append("views", tomlkit.aot())
        document["views"].append(entry)

    return review.edit(add, who=who, what=f"kept a view: {sentence.strip()[:_LONGEST]}")
