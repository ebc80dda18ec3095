"""Logs: their sizes from seeded distributions, and how deep they float."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.special import ndtri

from .._kernels.wood import uniform

_KEYS = {"name", "line", "number", "seed", "length_m", "diameter_m", "density_ratio", "source", "begin_s", "duration_s"}
_LENGTH, _DIAMETER, _DENSITY, _ANGLE, _PLACE, _TIME = range(10, 16)


@dataclass(frozen=True, eq=False)
class Wood:
    """Logs to release, (k,) each: length and diameter m, density over that of water, angle rad,
    place along the release line (0 to 1) and release time s."""

    length: np.ndarray
    diameter: np.ndarray
    density_ratio: np.ndarray
    angle: np.ndarray
    place: np.ndarray
    released: np.ndarray

    @property
    def draft(self) -> np.ndarray:
        """(k,) m."""
        return draft(self.diameter, self.density_ratio)


def draft(diameter: np.ndarray, density_ratio: np.ndarray) -> np.ndarray:
    """Depth to which a horizontal cylinder floats, m, by the exact circular segment (Archimedes).

    (2c - sin 2c) / (2 pi) = ratio with cos c = 1 - 2 d / D, solved by Newton steps from bounds.

    Raises ``ValueError`` for a ratio that is not between 0 and 1.

    >>> round(float(draft(1.0, 0.3)), 6)
    0.340154
    """
    ratio = np.asarray(density_ratio, float)
    if not ((ratio > 0) & (ratio < 1)).all():
        bad = ratio[~((ratio > 0) & (ratio < 1))].ravel()[0]
        raise ValueError(f"a density ratio is {bad:g}; wood that floats has one between 0 and 1.")
    low, high = np.zeros_like(ratio), np.full_like(ratio, np.pi)
    for _ in range(60):
        c = (low + high) / 2
        under = (2 * c - np.sin(2 * c)) / (2 * np.pi) < ratio
        low, high = np.where(under, c, low), np.where(under, high, c)
    return np.asarray(diameter, float) * (1 - np.cos((low + high) / 2)) / 2


def logs(table: Mapping[str, Any]) -> Wood:
    """Logs of a release in review.toml: every number depends on the seed and the log's number alone.

    Raises
    ------
    ValueError
        No number, an unknown key or distribution, or sizes that are not above 0.
    """
    name = table.get("name", "a release")
    if unknown := set(table) - _KEYS:
        raise ValueError(f"release {name!r}: {sorted(unknown)[0]!r} is not known; a release has {', '.join(sorted(_KEYS))}.")
    k, seed = int(table.get("number", 0)), int(table.get("seed", 1))
    if k < 1:
        raise ValueError(f"release {name!r} has number {k}; release at least one log.")

    def numbers(which: int) -> np.ndarray:
        return np.array([uniform(seed, i, 0, which) for i in range(k)])

    length = _drawn(table, "length_m", numbers(_LENGTH), name)
    diameter = _drawn(table, "diameter_m", numbers(_DIAMETER), name)
    ratio = _drawn(table, "density_ratio", numbers(_DENSITY), name)
    if (ratio >= 1).any():
        raise ValueError(f"release {name!r}: density_ratio reaches {ratio.max():g}; wood that floats stays below 1.")
    if (diameter > length).any():
        raise ValueError(f"release {name!r}: some logs are thicker than long; check length_m and diameter_m.")
    begin, duration = float(table.get("begin_s", 0.0)), float(table.get("duration_s", 0.0))
    return Wood(length, diameter, ratio, np.pi * numbers(_ANGLE), numbers(_PLACE), begin + duration * np.sort(numbers(_TIME)))


def design_log_length(channel_width_m: float, sturdy_m: float = 24.0) -> float:
    """Least of the channel's width, the longest sturdy log, and 9 m + W/4 (Diehl 1997, FHWA-RD-97-028, from memory).

    >>> [design_log_length(w) for w in (8, 12, 20, 40, 80)]
    [8.0, 12.0, 14.0, 19.0, 24.0]
    """
    return float(min(channel_width_m, sturdy_m, 9.0 + channel_width_m / 4))


def _drawn(table: Mapping[str, Any], what: str, u: np.ndarray, name: str) -> np.ndarray:
    rule = table.get(what)
    if isinstance(rule, (int, float)):
        values = np.full(len(u), float(rule))
    elif not isinstance(rule, Mapping):
        raise ValueError(f"release {name!r} has no {what}; give a number or a distribution.")
    elif rule.get("distribution") == "uniform":
        values = float(rule["least"]) + u * (float(rule["greatest"]) - float(rule["least"]))
    elif rule.get("distribution") == "lognormal":
        values = float(rule["median"]) * np.exp(float(rule["sigma"]) * ndtri(u))
        values = np.clip(values, float(rule.get("least", 0.0)), float(rule.get("greatest", np.inf)))
    else:
        raise ValueError(f"release {name!r}: {what} has distribution {rule.get('distribution')!r}; say uniform or lognormal.")
    if not (values > 0).all():
        raise ValueError(f"release {name!r}: {what} reaches {values.min():g}; sizes are above 0.")
    return values
