"""The seven questions of the rail, in order; each is a module with one class."""

from .base import Desk, Question, Sizes
from .eddies import Eddies
from .waiting import Waiting

_ALL: tuple[Question, ...] = (
    Waiting(
        "arrival", "Arrival", "What has arrived, and what must be asked?",
        "The audit of what has arrived is made by the command leewater arrival; its screen is not part of this version.",
    ),
    Eddies(),
    Waiting(
        "drift", "Drift", "Where does floating wood go, and what does it meet?",
        "Drift needs a release line in the review; its screen is not part of this version.",
    ),
    Waiting(
        "passage", "Passage", "Is the way upstream excluded for these fish, and where?",
        "Passage needs a fish and its places in the review; its screen is not part of this version.",
    ),
    Waiting(
        "sections", "Sections", "How much passes here, and how is it spread?",
        "Sections are drawn beside the eddies; their own screen is not part of this version.",
    ),
    Waiting(
        "change", "Change", "What does the proposal change, and is that more than can be told apart?",
        "Change needs two runs of one event; its screen is not part of this version.",
    ),
    Waiting("record", "Record", "What goes on file?", "The record is made by the command leewater record."),
)
QUESTIONS: dict[str, Question] = {q.key: q for q in _ALL}

__all__ = ["QUESTIONS", "Desk", "Question", "Sizes"]
