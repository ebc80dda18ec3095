"""Figures against values that a user enters with their source. Answers in four words, never a verdict."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from .figure import Figure, printed
from .frame import Frame
from .reach import Reach
from .section.crossings import bridge_openings
from .section.receptors import reading

WITHIN, BEYOND, TOO_CLOSE, NOT_ASSESSED = (
    "within the value entered", "beyond the value entered", "too close to tell", "not assessed",
)
COMPARISONS = ("at most", "at least")
_KEYS = {"id", "name", "figure", "place", "comparison", "value", "unit", "source", "events", "note"}


@dataclass(frozen=True, slots=True)
class Check:
    """A value to compare a figure with, and where that value comes from.

    ``events`` limits the check to runs of these events; empty: all.
    """

    id: str
    name: str
    figure: str
    place: str
    comparison: str
    value: float
    unit: str
    source: str
    events: tuple[str, ...] = ()
    note: str = ""


@dataclass(frozen=True, slots=True)
class Answer:
    """A check's answer for one run and frame, with the figure it was read from and the reason in words."""

    check: Check
    figure: Figure
    answer: str
    sentence: str


@dataclass(frozen=True, slots=True)
class Quantity:
    """A figure that checks may name: its unit, what it is, the cautions it owes, and how it is read."""

    unit: str
    meaning: str
    cautions: tuple[str, ...]
    read: Callable[[Frame, Reach, str], float | None]


def _at_place(name: str) -> Callable[[Frame, Reach, str], float | None]:
    def read(frame: Frame, reach: Reach, place: str) -> float | None:
        value = getattr(reading(frame, reach.find("receptors", place)), name)
        return value if np.isfinite(value) else None

    return read


def _least_freeboard(frame: Frame, reach: Reach, place: str) -> float | None:
    deck = next((s for s in reach.structures if place in (s.id, s.name)), None)
    if deck is None or "soffit_m" not in deck.levels:
        raise ValueError(f"freeboard is asked at {place!r}, which is no structure with a soffit level in the review's lines.")
    if reach.centre_line is None or not reach.layer("openings"):
        raise ValueError("freeboard needs a centre line and the openings of the bridge in the review's lines.")
    free = bridge_openings(frame, reach.layer("openings"), reach.centre_line, soffit_m=deck.levels["soffit_m"])
    known = [o.freeboard_m for o in free if o.freeboard_m is not None]
    return min(known) if known else None


FIGURES: dict[str, Quantity] = {
    "mean depth": Quantity("m", "mean depth over the wet part of a receptor", ("screening",), _at_place("depth_mean")),
    "greatest depth": Quantity("m", "greatest depth in a receptor", ("screening",), _at_place("depth_max")),
    "mean level": Quantity("m", "mean water level over the wet part of a receptor", ("screening",), _at_place("level_mean")),
    "mean speed": Quantity("m/s", "mean depth-averaged speed over the wet part of a receptor", ("screening", "near-bed"), _at_place("speed_mean")),
    "greatest speed": Quantity("m/s", "greatest depth-averaged speed in a receptor", ("screening", "near-bed"), _at_place("speed_max")),
    "depth times speed": Quantity(
        "m2/s", "greatest product of depth and speed at one spot and one time", ("screening", "hazard-class"),
        _at_place("depth_speed_max"),
    ),
    "least freeboard": Quantity(
        "m", "soffit of a deck minus the highest level in its openings", ("screening", "pressure-flow"), _least_freeboard
    ),
}
AFFLUX = "afflux"  # needs two runs: answered by answer_afflux


def read_checks(tables: list[dict[str, Any]]) -> tuple[Check, ...]:
    """Checks from review.toml's [[checks]].

    Raises
    ------
    ValueError
        A check without a source, with an unknown figure, comparison or key, or a unit that is not the
        figure's.
    """
    return tuple(_check(t) for t in tables)


def judge(figure: Figure, check: Check) -> Answer:
    """Compare a figure with the value entered.

    Where the figure's sensitivity straddles the value the answer is "too close to tell"; where there
    is no figure, "not assessed".
    """
    low = figure.value if figure.low is None else figure.low
    high = figure.value if figure.high is None else figure.high
    if figure.value is None or low is None or high is None or not np.isfinite([low, high]).all():
        reason = figure.note or "the figure does not exist in this run"
        return Answer(check, figure, NOT_ASSESSED, f"{check.name}: not assessed, because {reason}.")
    keeps = [v <= check.value if check.comparison == "at most" else v >= check.value for v in (low, high)]
    answer = WITHIN if all(keeps) else BEYOND if not any(keeps) else TOO_CLOSE
    text = (
        f"{check.name}: {printed(figure.value, figure.low, figure.high)} {check.unit} against {check.comparison} "
        f"{check.value:g} {check.unit} ({check.source}): {answer}."
    )
    return Answer(check, figure, answer, text)


def answer(check: Check, frames: list[Frame], reach: Reach) -> Answer:
    """A check answered from frames of one run: the frame that comes nearest to breaking it counts.

    With several frames the range over the last ones is not a sensitivity; only the worst value is used.
    """
    quantity = FIGURES[check.figure]
    values = [quantity.read(f, reach, check.place) for f in frames]
    known = [v for v in values if v is not None]
    worst = None if not known else (max(known) if check.comparison == "at most" else min(known))
    note = "" if known else "the place is dry or no water reaches it"
    if check.figure == "least freeboard" and worst is not None and worst < 0:
        worst, note = None, "the level is above the soffit"
    return judge(Figure(check.figure, worst, quantity.unit, cautions=quantity.cautions, note=note), check)


def answer_afflux(check: Check, rise_m: float | None, noise_m: float | None) -> Answer:
    """An afflux check from a comparison of two runs; the noise of comparison is its sensitivity."""
    low, high = (None, None) if rise_m is None or noise_m is None else (rise_m - noise_m, rise_m + noise_m)
    note = "" if rise_m is not None else "no section near the place meets water in both runs"
    return judge(Figure(AFFLUX, rise_m, "m", low, high, cautions=("change", "screening"), note=note), check)


def _check(table: Mapping[str, Any]) -> Check:
    name = table.get("name") or table.get("id") or "a check"
    if unknown := set(table) - _KEYS:
        raise ValueError(f"check {name!r}: {sorted(unknown)[0]!r} is not known; a check has {', '.join(sorted(_KEYS))}.")
    if not str(table.get("source", "")).strip():
        raise ValueError(f"check {name!r} has no source; name the standard that its value comes from.")
    figure = table.get("figure")
    if figure != AFFLUX and figure not in FIGURES:
        raise ValueError(f"check {name!r}: figure {figure!r} is not known; the figures are {', '.join([*FIGURES, AFFLUX])}.")
    if table.get("comparison") not in COMPARISONS:
        raise ValueError(f"check {name!r}: comparison is {table.get('comparison')!r}; say at most or at least.")
    unit = "m" if figure == AFFLUX else FIGURES[figure].unit
    if table.get("unit") != unit:
        raise ValueError(f"check {name!r}: {figure} is in {unit}, the value entered in {table.get('unit')!r}; give it in {unit}.")
    return Check(
        str(table.get("id", name)), str(name), str(figure), str(table.get("place", "")), table["comparison"],
        float(table["value"]), unit, str(table["source"]), tuple(table.get("events", ())), str(table.get("note", "")),
    )
