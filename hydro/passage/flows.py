"""For which flows, and for how much of the time, the way is not excluded: hydrographs and monthly flow durations."""

from __future__ import annotations

import calendar
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from .answer import EXCLUDED, NOT_ASSESSED, NOT_EXCLUDED

UNDECIDED = "undecided"
MONTHS = tuple(calendar.month_abbr)


@dataclass(frozen=True, slots=True)
class FlowDuration:
    """Monthly flow-duration curves as the user entered them.

    Attributes
    ----------
    exceedance : (k,) float64
        Share of time, rising, 0 to 1.
    discharge_m3_s : dict of int to (k,) float64
        For each month 1 to 12 given: the discharge exceeded for that share, falling.
    source : str
    """

    exceedance: np.ndarray
    discharge_m3_s: dict[int, np.ndarray]
    source: str

    def exceeded(self, month: int, discharge: float) -> float:
        """Share of the month in which a discharge is exceeded, linear in the logarithm of discharge.

        Beyond the ends of the table it stays at its ends: what happens there is not known.
        """
        q = self.discharge_m3_s[month]
        if discharge <= 0:
            return float(self.exceedance[-1])
        return float(np.interp(-math.log(discharge), -np.log(q), self.exceedance))


def read_flow_duration(table: Mapping[str, Any]) -> FlowDuration | None:
    """The [flows] table of review.toml; None where the review has none.

    ``exceedance_percent`` lists shares of time; ``monthly_m3_s`` gives, by month number, the discharges exceeded for
    those shares; ``source`` says where they come from.

    Raises
    ------
    ValueError
        A missing source, shares or discharges out of order, a month that does not exist or has another length.
    """
    if not table:
        return None
    percent = np.asarray(table.get("exceedance_percent", ()), float)
    if not table.get("source"):
        raise ValueError("flows in review.toml has no source; say where the flow-duration table comes from.")
    if percent.size < 2 or (np.diff(percent) <= 0).any() or percent[0] < 0 or percent[-1] > 100:
        raise ValueError("flows.exceedance_percent in review.toml needs at least two rising shares from 0 to 100.")
    months: dict[int, np.ndarray] = {}
    for key, values in dict(table.get("monthly_m3_s", {})).items():
        q = np.asarray(values, float)
        if not str(key).isdigit() or not 1 <= int(key) <= 12:
            raise ValueError(f"flows.monthly_m3_s in review.toml has month {key!r}; months are numbers from 1 to 12.")
        if q.shape != percent.shape or (np.diff(q) >= 0).any() or (q <= 0).any():
            raise ValueError(
                f"flows.monthly_m3_s.{key} in review.toml needs {percent.size} falling discharges above 0, one a share."
            )
        months[int(key)] = q
    if not months:
        raise ValueError("flows in review.toml has no monthly_m3_s; give the discharges of at least one month.")
    return FlowDuration(percent / 100, dict(sorted(months.items())), str(table["source"]))


@dataclass(frozen=True, slots=True)
class Band:
    """A range of discharge and the answer for it; between two runs that differ it is "undecided"."""

    low_m3_s: float
    high_m3_s: float
    status: str


@dataclass(frozen=True, slots=True)
class Shares:
    """Shares of time; they add up to 1. ``outside``: flows beyond the runs or beyond the table."""

    label: str
    not_excluded: float
    excluded: float
    undecided: float
    outside: float


def bands(discharge: Sequence[float], status: Sequence[str]) -> tuple[Band, ...]:
    """Ranges of discharge between assessed flows, rising, adjoining ranges of one answer joined.

    A range has an answer when both its ends do and agree. Flows that were not assessed make their neighbourhood
    undecided; runs of one discharge that disagree do so as well.
    """
    order = np.argsort(np.asarray(discharge, float), kind="stable")
    q, s = [float(discharge[i]) for i in order], [status[i] for i in order]
    out: list[Band] = []
    for (q0, s0), (q1, s1) in zip(zip(q, s), zip(q[1:], s[1:])):
        answer = s0 if s0 == s1 and s0 != NOT_ASSESSED else UNDECIDED
        if out and out[-1].status == answer and out[-1].high_m3_s == q0:
            out[-1] = Band(out[-1].low_m3_s, q1, answer)
        else:
            out.append(Band(q0, q1, answer))
    return tuple(b for b in out if b.high_m3_s > b.low_m3_s)


def monthly_shares(found: Sequence[Band], flows: FlowDuration, months: Sequence[int] = ()) -> tuple[Shares, ...]:
    """Shares of time by month and, last, over the window of ``months`` (none: all that the table has).

    Months weigh by their days, February 28.25.
    """
    by_month = {m: _month_shares(found, flows, m) for m in flows.discharge_m3_s}
    window = [m for m in (months or by_month) if m in by_month]
    if not window:
        raise ValueError("the flow-duration table has none of the months of the migration window; add them to flows.")
    days = np.array([28.25 if m == 2 else calendar.monthrange(2001, m)[1] for m in window])
    total = days @ np.array([by_month[m] for m in window]) / days.sum()
    label = "migration window" if months else "all months given"
    return tuple(Shares(MONTHS[m], *v) for m, v in by_month.items()) + (Shares(label, *total),)


def _month_shares(found: Sequence[Band], flows: FlowDuration, month: int) -> tuple[float, float, float, float]:
    share = {NOT_EXCLUDED: 0.0, EXCLUDED: 0.0, UNDECIDED: 0.0}
    for band in found:
        share[band.status] += flows.exceeded(month, band.low_m3_s) - flows.exceeded(month, band.high_m3_s)
    return share[NOT_EXCLUDED], share[EXCLUDED], share[UNDECIDED], 1.0 - sum(share.values())


@dataclass(frozen=True, slots=True)
class Spell:
    """An unbroken time for which the way is excluded; ``at_least``: it touches the run's end."""

    from_s: float
    to_s: float
    at_least: bool

    @property
    def seconds(self) -> float:
        return self.to_s - self.from_s


@dataclass(frozen=True, slots=True)
class Hydrograph:
    """A run of many frames: shares of its time, the longest excluded spell, and the ranges of discharge met."""

    shares: Shares
    longest_excluded: Spell | None
    not_excluded_m3_s: tuple[float, float] | None
    excluded_m3_s: tuple[float, float] | None


def hydrograph(seconds: Sequence[float], discharge: Sequence[float], status: Sequence[str]) -> Hydrograph:
    """What the frames of one run say together; a frame stands for the time nearer to it than to its neighbours.

    Raises ``ValueError`` for fewer than two frames.
    """
    t = np.asarray(seconds, float)
    if len(t) < 2:
        raise ValueError("a hydrograph needs at least two frames.")
    edges = np.concatenate([t[:1], (t[1:] + t[:-1]) / 2, t[-1:]])
    weight, answers = np.diff(edges) / (t[-1] - t[0]), np.asarray(status)
    share = [float(weight[answers == s].sum()) for s in (NOT_EXCLUDED, EXCLUDED, NOT_ASSESSED)]
    shut = np.flatnonzero(answers == EXCLUDED)
    spells = [
        Spell(float(edges[part[0]]), float(edges[part[-1] + 1]), bool(part[0] == 0 or part[-1] == len(t) - 1))
        for part in np.split(shut, np.flatnonzero(np.diff(shut) > 1) + 1) if part.size
    ]

    def span(which: str) -> tuple[float, float] | None:
        q = np.asarray(discharge, float)[answers == which]
        return (float(q.min()), float(q.max())) if q.size else None

    return Hydrograph(
        Shares("hydrograph", share[0], share[1], share[2], 0.0), max(spells, key=lambda s: s.seconds, default=None), span(NOT_EXCLUDED),
        span(EXCLUDED),
    )
