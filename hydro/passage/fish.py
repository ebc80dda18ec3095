"""A fish and how long it lasts: endurance lines, resting water, and the limits it meets in a channel."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pydantic

from .._kernels import swim
from ..settings import Settings


@dataclass(frozen=True, slots=True)
class EnduranceLine:
    """Time to fatigue T = exp(a + b U), T in s and U in m/s, for ``lowest`` <= U <= ``highest``.

    References
    ----------
    .. [1] Brett 1964, J. Fish. Res. Board Can. 21, 1183-1226, for the log-linear form (from memory).
    """

    a: float
    b: float
    lowest: float
    highest: float
    source: str = ""

    def seconds(self, speed: float) -> float:
        """Time to fatigue at a swimming speed in m/s; NaN outside the range, which is never extended."""
        if not self.lowest <= speed <= self.highest:
            return math.nan
        return math.exp(self.a + self.b * speed)

    @property
    def best_ground_speed(self) -> float:
        """Ground speed -1/b, m/s, that carries farthest against any uniform flow (Castro-Santos 2005)."""
        return -1.0 / self.b

    def farthest(self, flow: float) -> float:
        """Greatest distance against a uniform flow (m/s), m: exp(a + b U_f - 1)/|b|; the range is not looked at."""
        return math.exp(self.a + self.b * flow - 1.0) / abs(self.b)


def switch_of_mode(prolonged: EnduranceLine, sprint: EnduranceLine) -> float:
    """Flow, m/s, above which sprinting carries farther than prolonged swimming.

    Both lines give one greatest distance there: [(a_s - a_p) + ln(b_p/b_s)] / (b_p - b_s), derived from
    Castro-Santos 2005, J. Exp. Biol. 208, 421-432.
    """
    return ((sprint.a - prolonged.a) + math.log(prolonged.b / sprint.b)) / (prolonged.b - sprint.b)


@dataclass(frozen=True, slots=True)
class Fish:
    """A fish as the review describes it, all in SI.

    Attributes
    ----------
    length_m : float
    sustained_m_s : float
        Swimming speed at or under which no fatigue is added.
    prolonged, sprint : EnduranceLine or None
    least_depth_m, greatest_drop_m : float
        Shallower water and a rise of the level over three body lengths above the drop bar the way.
    position_factor : float
        The speed that it meets over the mean speed.
    rest_speed_m_s, rest_depth_m : float
        Water at most this fast (factor applied) and at least this deep is resting water.
    length_sd_m, endurance_sd : float
        Scatter between swimmers: of the length, and of ln T.
    migration : tuple of int
        Months, 1 to 12, of the migration window; empty: the whole year.
    source : str
        Where the figures come from, as the user states it.
    """

    name: str
    length_m: float
    sustained_m_s: float
    prolonged: EnduranceLine | None
    sprint: EnduranceLine | None
    least_depth_m: float
    greatest_drop_m: float
    rest_speed_m_s: float
    rest_depth_m: float
    position_factor: float = 1.0
    length_sd_m: float = 0.0
    endurance_sd: float = 0.0
    migration: tuple[int, ...] = ()
    source: str = ""
    in_body_lengths: bool = False

    @property
    def top_speed_m_s(self) -> float:
        """Highest swimming speed that the data cover."""
        return max([self.sustained_m_s] + [line.highest for line in (self.prolonged, self.sprint) if line])

    def resized(self, length_m: float, log_endurance: float = 0.0) -> Fish:
        """The same kind of fish at another length, with ln T of both lines moved by ``log_endurance``.

        Speeds given in body lengths grow with the length; those given in m/s stay.
        """
        scale = length_m / self.length_m if self.in_body_lengths else 1.0

        def line(old: EnduranceLine | None) -> EnduranceLine | None:
            if old is None:
                return None
            return EnduranceLine(
                old.a + log_endurance, old.b / scale, old.lowest * scale, old.highest * scale, old.source
            )

        return replace(
            self, length_m=length_m, sustained_m_s=self.sustained_m_s * scale,
            prolonged=line(self.prolonged), sprint=line(self.sprint),
        )

    def swimmer(self, settings: Settings) -> np.ndarray:
        """The plain array that the kernels take; see :mod:`hydro._kernels.swim`."""
        out = np.zeros(swim.SWIMMER_SIZE)
        out[swim.SUSTAINED] = self.sustained_m_s
        rates = []
        for at, line in ((swim.PROLONGED, self.prolonged), (swim.SPRINT, self.sprint)):
            if line is None:
                out[at : at + 4] = 0.0, -1.0, 0.0, -1.0
            else:
                out[at : at + 4] = line.a, line.b, line.lowest, line.highest
                rates.append(math.exp(-line.a - line.b * line.lowest))
        out[swim.TIME_WEIGHT] = settings["passage_time_weight"]
        out[swim.TOP] = self.top_speed_m_s
        out[swim.LEAST_RATE] = min(rates, default=math.inf)
        out[swim.POSITION] = self.position_factor
        out[swim.LEAST_DEPTH] = self.least_depth_m
        out[swim.WET_DEPTH] = settings["wet_depth_m"]
        out[swim.BODY] = self.length_m
        return out


class _Line(pydantic.BaseModel):
    model_config = pydantic.ConfigDict(extra="forbid")
    a: float
    b: float = pydantic.Field(lt=0)
    lowest: float = pydantic.Field(ge=0)
    highest: float = pydantic.Field(gt=0)
    source: str = pydantic.Field(min_length=1)


class _Rest(pydantic.BaseModel):
    model_config = pydantic.ConfigDict(extra="forbid")
    speed_m_s: float = pydantic.Field(ge=0)
    depth_m: float = pydantic.Field(gt=0)


class _Entry(pydantic.BaseModel):
    """A [[fish]] table of review.toml."""

    model_config = pydantic.ConfigDict(extra="forbid")
    name: str
    length_m: float = pydantic.Field(gt=0)
    speeds: str = pydantic.Field(pattern="^(BL/s|m/s)$")
    sustained: float | None = None
    prolonged: _Line | None = None
    sprint: _Line | None = None
    least_depth_m: float = pydantic.Field(gt=0)
    greatest_drop_m: float = pydantic.Field(gt=0)
    position_factor: float = pydantic.Field(1.0, gt=0)
    rest: _Rest
    length_sd_m: float = pydantic.Field(0.0, ge=0)
    endurance_sd: float = pydantic.Field(0.0, ge=0)
    migration_months: list[int] = []
    source: str = pydantic.Field(min_length=1)


def read_fish(table: Mapping[str, Any]) -> Fish:
    """A fish from a [[fish]] table of review.toml.

    ``speeds`` says whether endurance lines are in "BL/s" (body lengths a second) or "m/s"; each line has ``a``,
    ``b``, ``lowest``, ``highest`` and its ``source``. ``sustained`` is the speed without fatigue, in the same unit;
    left out, it is where the prolonged line begins.

    Raises
    ------
    ValueError
        A missing, unknown or impossible entry, no endurance line, or resting water faster than the sustained speed.
    """
    who = table.get("name", "without a name")
    try:
        entry = _Entry.model_validate(dict(table))
    except pydantic.ValidationError as error:
        first = error.errors()[0]
        where = ".".join(str(p) for p in first["loc"])
        raise ValueError(f"fish {who}: {where}: {first['msg'].lower()}; mend that entry in review.toml.") from error
    if entry.prolonged is None and entry.sprint is None:
        raise ValueError(f"fish {who}: no endurance line; give prolonged, sprint or both, with their sources.")
    start = entry.sustained
    if start is None:
        if entry.prolonged is None:
            raise ValueError(f"fish {who}: no sustained speed; give it, or a prolonged line that begins there.")
        start = entry.prolonged.lowest
    unit = entry.length_m if entry.speeds == "BL/s" else 1.0
    fish = Fish(
        entry.name, entry.length_m, start * unit, _line(entry.prolonged, unit, who), _line(entry.sprint, unit, who),
        entry.least_depth_m, entry.greatest_drop_m, entry.rest.speed_m_s, entry.rest.depth_m, entry.position_factor,
        entry.length_sd_m, entry.endurance_sd, _months(entry.migration_months, who), entry.source,
        in_body_lengths=entry.speeds == "BL/s",
    )
    if fish.rest_speed_m_s > fish.sustained_m_s:
        raise ValueError(
            f"fish {who}: resting water of {fish.rest_speed_m_s:g} m/s is faster than its sustained speed of "
            f"{fish.sustained_m_s:g} m/s, so it would tire while resting; lower rest.speed_m_s."
        )
    return fish


def _line(entry: _Line | None, unit: float, who: str) -> EnduranceLine | None:
    if entry is None:
        return None
    if not entry.lowest < entry.highest:
        raise ValueError(f"fish {who}: an endurance line goes from {entry.lowest:g} to {entry.highest:g}; swap them.")
    return EnduranceLine(entry.a, entry.b / unit, entry.lowest * unit, entry.highest * unit, entry.source)


def _months(months: list[int], who: str) -> tuple[int, ...]:
    wrong = [m for m in months if not 1 <= m <= 12]
    if wrong:
        raise ValueError(f"fish {who}: month {wrong[0]} does not exist; migration_months holds numbers from 1 to 12.")
    return tuple(months)
