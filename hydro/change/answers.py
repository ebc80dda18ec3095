"""Both runs' answers side by side: receptors, checks, floating wood and fish passage, each against what can be told apart."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd

from ..cautions import OWED
from ..checks import AFFLUX, NOT_ASSESSED, Answer, Check, answer, answer_afflux
from ..drift.report import DriftAnswer
from ..drift.share import Share
from ..figure import Figure, shown, signed
from ..passage import Answer as PassageAnswer
from ..reach import CentreLine, NamedLine, Reach
from ..section.receptors import Reading, reading
from .levels import LevelChange
from .report import Change

_RECEPTOR = (("depth_mean", "mean depth", "m"), ("level_mean", "mean level", "m"), ("speed_mean", "mean speed", "m/s"))


@dataclass(frozen=True, slots=True)
class Beside:
    """One figure in both runs, b after a.

    ``noise`` is the difference below which the two cannot be told apart, in the figure's unit; None: not known,
    or told by the figures' own ranges. ``answers`` are the words of a check or of a way upstream.
    """

    kind: str
    place: str
    figure: str
    unit: str
    a: Figure
    b: Figure
    noise: float | None = None
    answers: tuple[str, str] | None = None

    @property
    def difference(self) -> float | None:
        """b minus a; None where either is missing."""
        values = [f.value for f in (self.a, self.b)]
        if any(v is None or not np.isfinite(v) for v in values):
            return None
        return float(values[1]) - float(values[0])  # type: ignore[arg-type]

    @property
    def told_apart(self) -> bool | None:
        """Whether they differ by more than the noise, or their ranges do not meet; None where neither is known."""
        if self.difference is None:
            return None
        if self.noise is not None:
            return abs(self.difference) > self.noise
        ranges = [(f.low, f.high) for f in (self.a, self.b)]
        if any(low is None or high is None for low, high in ranges):
            return None
        (al, ah), (bl, bh) = ranges
        return bool(al > bh or bl > ah)  # type: ignore[operator]

    @property
    def decision_changes(self) -> bool | None:
        """Whether the words differ; None where there are none, or one run was not assessed."""
        if self.answers is None or NOT_ASSESSED in self.answers:
            return None
        return self.answers[0] != self.answers[1]

    @property
    def sentence(self) -> str:
        """The row in words."""
        if self.figure == AFFLUX and self.answers is not None:
            return f"{self.place}: {shown(self.b)} {self.unit}, {self.answers[1]}."
        a, b = (shown(f) if f.value is not None and np.isfinite(f.value) else f.note or "n/a" for f in (self.a, self.b))
        text = f"{self.place}, {self.figure}: {a} and {b}" + (f" {self.unit}" if self.unit and self.difference is not None else "")
        if self.difference is not None:
            known = {True: "told apart", False: "not distinguishable", None: "no sensitivity known"}[self.told_apart]
            text += f", {signed(self.difference, 3)} ({known})"
        if self.answers is not None:
            changes = {True: "the decision changes", False: "the decision stays", None: "whether the decision changes is not assessed"}
            text += f"; {self.answers[0]}, then {self.answers[1]}: {changes[self.decision_changes]}"
        return text + "."


def side_by_side(change: Change, reaches: tuple[Reach, Reach], checks: Iterable[Check] = (), event: str = "") -> list[Beside]:
    """Every receptor and every check of one comparison.

    Parameters
    ----------
    reaches : of a and b
        With the lines of their designs.
    checks : those of the review
        Checks of other events than ``event`` are left out.
    """
    noise = change.levels.noise_m if change.levels is not None else None
    out = []
    for place in reaches[0].layer("receptors"):
        out += _receptor(change, reaches, place, noise)
    for check in checks:
        if not check.events or event in check.events:
            out.append(_afflux(change, reaches[0], check) if check.figure == AFFLUX else _check(change, reaches, check))
    return out


def wood(a: DriftAnswer, b: DriftAnswer) -> list[Beside]:
    """Shares of the logs that touch each pier and pass each opening that both runs have by name, in %."""
    out = []
    for what, named, share in (("logs that touch it", "piers", "touches"), ("logs that pass it", "openings", "passes")):
        at_b = {p.name: i for i, p in enumerate(getattr(b.base, named))}
        for i, place in enumerate(getattr(a.base, named)):
            if place.name in at_b:
                both = [_percent(getattr(base, share)(k)) for base, k in ((a.base, i), (b.base, at_b[place.name]))]
                out.append(Beside("drift", place.name, what, "%", both[0], both[1]))
    return out


def passage(a: Sequence[PassageAnswer], b: Sequence[PassageAnswer]) -> list[Beside]:
    """The way upstream for each fish that was looked at in both runs, with the fatigue of its worst leg."""
    after = {one.fish.name: one for one in b}
    out = []
    for one in a:
        if one.fish.name in after:
            two = after[one.fish.name]
            out.append(Beside("passage", one.fish.name, "fatigue of the worst leg", "", _fatigue(one), _fatigue(two), None, (one.status, two.status)))
    return out


def answers_table(rows: Sequence[Beside]) -> pd.DataFrame:
    """A row a figure: both values in full digits, their difference, and what can be said of it."""
    return pd.DataFrame([answer_values(r) for r in rows])


def answer_values(row: Beside) -> dict[str, object]:
    """One row as plain values; what is missing is None."""
    a, b = row.a.as_dict(), row.b.as_dict()
    before, after = row.answers or (None, None)
    return {
        "kind": row.kind, "place": row.place, "figure": row.figure, "unit": row.unit, "a": a["value"], "a_low": a["low"],
        "a_high": a["high"], "b": b["value"], "b_low": b["low"], "b_high": b["high"], "difference": row.difference,
        "noise": row.noise, "told_apart": row.told_apart, "answer_a": before, "answer_b": after,
        "decision_changes": row.decision_changes, "sentence": row.sentence,
    }


def rise_at(levels: LevelChange, centre_line: CentreLine, place: NamedLine) -> float:
    """Rise of the level at a place, m, linear between the sections beside it."""
    at = np.asarray(place.geometry.centroid.coords[0])[None]
    return float(np.interp(float(centre_line.locate(at)[0][0]), levels.chainage, levels.rise))


def _receptor(change: Change, reaches: tuple[Reach, Reach], place: NamedLine, noise: float | None) -> list[Beside]:
    found: list[Reading | str] = []
    for ledger, reach in zip((change.ledger_a, change.ledger_b), reaches, strict=True):
        try:
            found.append(reading(ledger.frame, reach.find("receptors", place.id)))
        except ValueError as error:
            found.append(str(error))
    out = []
    for name, words, unit in _RECEPTOR:
        both = [
            Figure(words, None, unit, note=one) if isinstance(one, str) else Figure(words, getattr(one, name), unit, note="dry",
                   cautions=("screening", "near-bed") if name == "speed_mean" else ("screening",),
                   decimals=3 if name == "level_mean" else None)
            for one in found
        ]
        out.append(Beside("receptor", place.name, words, unit, both[0], both[1], noise if unit == "m" else None))
    return out


def _check(change: Change, reaches: tuple[Reach, Reach], check: Check) -> Beside:
    a, b = (answer(check, [ledger.frame], reach) for ledger, reach in zip((change.ledger_a, change.ledger_b), reaches, strict=True))
    noise = change.levels.noise_m if check.unit == "m" and change.levels is not None else None
    return Beside("check", check.name, check.figure, check.unit, a.figure, b.figure, noise, (a.answer, b.answer))


def _afflux(change: Change, reach: Reach, check: Check) -> Beside:
    """A rise is of the pair: the first run has none."""
    place = next((p for p in reach.layer("receptors") if check.place in (p.id, p.name)), None)
    known = place is not None and change.levels is not None and reach.centre_line is not None
    rise = rise_at(change.levels, reach.centre_line, place) if known else None  # type: ignore[arg-type]
    found: Answer = answer_afflux(check, rise, change.levels.noise_m if change.levels is not None else None)
    none = Figure(AFFLUX, None, "m", note="of both runs")
    return Beside("check", check.name, AFFLUX, "m", none, found.figure, None, (NOT_ASSESSED, found.answer))


def _percent(share: Share) -> Figure:
    return Figure("share", 100 * share.value, "%", 100 * share.low, 100 * share.high, cautions=OWED["drift"])


def _fatigue(one: PassageAnswer) -> Figure:
    leg = one.worst_leg
    return Figure("fatigue of the worst leg", leg.fatigue if leg else None, "", cautions=OWED["passage"], note=one.reason)
