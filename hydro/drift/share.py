"""Shares of logs with their intervals: Wilson's, widened where logs let go together fare alike."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri


@dataclass(frozen=True, slots=True)
class Share:
    """A count of ``whole`` with its share and 95 % interval from their number alone."""

    count: int
    whole: int
    low: float
    high: float

    @property
    def value(self) -> float:
        return self.count / self.whole if self.whole else float("nan")


def wilson(count: float, whole: float, level: float = 0.95) -> tuple[float, float]:
    """Interval of a share (Wilson 1927, J. Am. Stat. Assoc. 22, 209-212).

    >>> [round(v, 4) for v in wilson(31, 100)]
    [0.2278, 0.4063]
    """
    if whole <= 0:
        return float("nan"), float("nan")
    z = float(ndtri(0.5 + level / 2))
    p = count / whole
    middle = (p + z * z / (2 * whole)) / (1 + z * z / whole)
    half = z / (1 + z * z / whole) * np.sqrt(p * (1 - p) / whole + z * z / (4 * whole * whole))
    return float(max(0.0, middle - half)), float(min(1.0, middle + half))


def share_of(hit: np.ndarray, groups: np.ndarray) -> Share:
    """Share of logs (k,) bool; ``groups`` (k,) int names logs let go together.

    Where the groups differ more than chance would have it, the number that counts is cut by the design
    effect, variance between groups over that of single logs (Kish 1965).
    """
    whole, count = len(hit), int(hit.sum())
    if whole == 0:
        return Share(0, 0, float("nan"), float("nan"))
    effective = whole / _design_effect(hit.astype(float), groups)
    low, high = wilson(count / whole * effective, effective)
    return Share(count, whole, low, high)


def _design_effect(hit: np.ndarray, groups: np.ndarray) -> float:
    names, index = np.unique(groups, return_inverse=True)
    p = hit.mean()
    if len(names) < 5 or p in (0.0, 1.0) or len(names) == len(hit):
        return 1.0
    size = np.bincount(index)
    total = np.bincount(index, weights=hit)
    between = float(((total - p * size) ** 2).sum()) * len(names) / (len(names) - 1)
    return max(1.0, between / (len(hit) * p * (1 - p)))
