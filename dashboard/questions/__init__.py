"""The seven questions of the rail, in order; each is a module with one class."""

from .arrival import Arrival
from .base import Desk, Question, Sizes
from .change import Change
from .drift import Drift
from .eddies import Eddies
from .passage import Passage
from .record import Record
from .sections import Sections

_ALL: tuple[Question, ...] = (
    Arrival(),
    Eddies(),
    Drift(),
    Passage(),
    Sections(),
    Change(),
    Record(),
)
QUESTIONS: dict[str, Question] = {q.key: q for q in _ALL}

__all__ = ["QUESTIONS", "Desk", "Question", "Sizes"]
