"""The seven questions of the rail, in order; each is a module with one class."""

from .arrival import Arrival
from .base import Desk, Question, Sizes
from .change import Change
from .eddies import Eddies
from .passage import Passage
from .record import Record
from .sections import Sections
from .waiting import Waiting

_ALL: tuple[Question, ...] = (
    Arrival(),
    Eddies(),
    Waiting(
        "drift", "Drift", "Where does floating wood go, and what does it meet?",
        "Drift needs a release line in the review; its screen is not part of this version.",
    ),
    Passage(),
    Sections(),
    Change(),
    Record(),
)
QUESTIONS: dict[str, Question] = {q.key: q for q in _ALL}

__all__ = ["QUESTIONS", "Desk", "Question", "Sizes"]
