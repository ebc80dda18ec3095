"""What the engineer has picked: one frozen state, its address, and the way back through its history."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields, replace
from typing import Any
from urllib.parse import parse_qsl, urlencode

QUESTIONS = ("arrival", "eddies", "drift", "passage", "sections", "change", "record")
SHADES = ("speed", "depth")
TUBES = (11, 22, 44)
LOGS = (0, 200, 2000, 20000)  # let go on the screen; 0: a fifth of the review's own number
DRAWN = ("paths", "corridor")  # where logs have gone, drawn as
ALONG = ("thalweg", "streamline")
COURSES = ("discharge", "level", "head", "speed", "area")  # of a section, through time
COMPARED = ("difference", "swipe")
UNITS = ("SI", "US survey feet", "international feet")
MODES = ("day", "night")


@dataclass(frozen=True, slots=True)
class Choices:
    """Everything a view depends on; two people with the same choices see the same.

    ``seconds`` counts from the run's first frame (None: the question's own choice); ``window`` is the time
    from and to, counted alike, whose mean flow is looked at in place of one moment. ``section`` is the
    world (x, y) of its left and right end, ``beside`` the name of a second one to compare it with, ``course``
    the figure of it that the ribbon shows, ``along`` the line of the profile, and ``view`` the world centre and
    width of the map in m, None where the question chooses; ``parcel`` is the world (x, y) where one is let go,
    and when, s. ``release`` names where wood is let go (empty: all releases of the review; "own": from the line
    ``let_go``, world coordinates), ``logs`` how many, ``gone`` how their ways are drawn. ``run``, ``against``
    (compared with) and ``alongside`` (on a map beside) are ids of the review, ``subject`` names what the map and
    the sentence speak of. ``compared`` says how two runs stand on one map, ``divider`` where the swipe's divider
    stands, as a share of its width.
    """

    question: str = "eddies"
    run: str = ""
    against: str = ""
    alongside: str = ""
    seconds: float | None = None
    window: tuple[float, float] | None = None
    subject: str = ""
    section: tuple[float, float, float, float] | None = None
    beside: str = ""
    course: str = "discharge"
    along: str = "thalweg"
    view: tuple[float, float, float] | None = None
    parcel: tuple[float, float, float] | None = None
    release: str = ""
    let_go: tuple[float, float, float, float] | None = None
    logs: int = 0
    gone: str = "paths"
    compared: str = "difference"
    divider: float = 0.5
    shade: str = "speed"
    tubes: int = 22
    units: str = "SI"
    mode: str = "day"
    hall: bool = False

    def with_(self, **changed: Any) -> Choices:
        """The same choices with some changed.

        Raises ``ValueError`` for a value that is not on offer.
        """
        new = replace(self, **changed)
        for name, offered in _OFFERED.items():
            if getattr(new, name) not in offered:
                raise ValueError(
                    f"{name} is {getattr(new, name)!r}; choose one of {', '.join(str(o) for o in offered)}."
                )
        return new

    def query(self) -> str:
        """The query string that opens this view; only what differs from the defaults."""
        pairs = []
        for f in fields(self):
            value = getattr(self, f.name)
            if value != f.default:
                pairs.append((f.name, _written(value)))
        return urlencode(pairs, safe=",:")


_OFFERED = {
    "question": QUESTIONS, "shade": SHADES, "units": UNITS, "mode": MODES, "tubes": TUBES, "course": COURSES, "along": ALONG,
    "compared": COMPARED, "logs": LOGS, "gone": DRAWN,
}


def from_query(query: str, start: Choices | None = None) -> Choices:
    """Choices from an address's query string, on top of ``start``.

    Raises ``ValueError`` naming the part that cannot be read.
    """
    known = {f.name for f in fields(Choices)}
    changed = {}
    for name, text in parse_qsl(query.lstrip("?")):
        if name in known:
            changed[name] = _read(name, text)
    return (start or Choices()).with_(**changed)


class History:
    """The way back: choices in order, with undo and redo.

    A change of the same fields as the one before (a drag, a pan, a sweep through time) replaces it, so
    one step back undoes the whole movement.
    """

    LONGEST = 200

    def __init__(self, start: Choices) -> None:
        self._past: list[Choices] = []
        self._future: list[Choices] = []
        self._moved: frozenset[str] = frozenset()
        self.now = start

    def go(self, new: Choices) -> bool:
        """Take new choices; False where nothing changed."""
        moved = frozenset(f.name for f in fields(new) if getattr(new, f.name) != getattr(self.now, f.name))
        if not moved:
            return False
        if moved != self._moved or not moved <= _SWEPT:
            self._past = [*self._past[-self.LONGEST :], self.now]
        self._moved, self._future, self.now = moved, [], new
        return True

    def undo(self) -> bool:
        """One step back; False at the start."""
        return self._step(self._past, self._future)

    def redo(self) -> bool:
        """One step forward again; False at the end."""
        return self._step(self._future, self._past)

    @property
    def can_undo(self) -> bool:
        return bool(self._past)

    @property
    def can_redo(self) -> bool:
        return bool(self._future)

    def _step(self, take: list[Choices], put: list[Choices]) -> bool:
        if not take:
            return False
        put.append(self.now)
        self.now, self._moved = take.pop(), frozenset()
        return True


_SWEPT = frozenset({"seconds", "view", "section", "divider"})
_NUMBERS = {"section": 4, "let_go": 4, "view": 3, "window": 2, "parcel": 3}


def _written(value: object) -> str:
    if isinstance(value, tuple):
        return ",".join(f"{v:.2f}" for v in value)
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.10g}"
    return str(value)


def _read(name: str, text: str) -> object:
    try:
        if name in _NUMBERS:
            values = tuple(_finite(v) for v in text.split(","))
            if len(values) != _NUMBERS[name] or (name == "view" and values[2] <= 0) or (name == "window" and values[0] >= values[1]):
                raise ValueError
            return values
        if name == "seconds":
            return _finite(text)
        if name == "divider":
            share = _finite(text)
            if not 0 <= share <= 1:
                raise ValueError
            return share
        if name in ("tubes", "logs"):
            return int(text)
        if name == "hall":
            return {"yes": True, "no": False}[text]
    except (ValueError, KeyError):
        raise ValueError(f"the address says {name}={text!r}, which cannot be read; the rest of it was used.") from None
    return text


def _finite(text: str) -> float:
    value = float(text)
    if not math.isfinite(value):
        raise ValueError
    return value
