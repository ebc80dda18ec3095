"""Afflux: the rise of the width-mean level by sections along the reach, with the noise of comparison."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from shapely.geometry.base import BaseGeometry

from ..frame import Frame
from ..reach import CentreLine, automatic_sections
from ..section import cut, section_figures
from .setup import outside


@dataclass(frozen=True, eq=False)
class LevelChange:
    """Width-mean levels of two frames at the same chainages, (k,) each, m.

    ``rise`` is b minus a; ``outside`` tells sections that stand clear of the works. ``noise_m`` is the
    95th percentile of |rise| where none is expected (None where nothing was named as such).
    ``headline`` is the index of the greatest rise outside the works (-1: none).
    """

    chainage: np.ndarray
    level_a: np.ndarray
    level_b: np.ndarray
    outside: np.ndarray
    noise_m: float | None
    inflow_difference_m3_s: float
    downstream_level_difference_m: float

    @property
    def rise(self) -> np.ndarray:
        return self.level_b - self.level_a

    @property
    def headline(self) -> int:
        rise = np.where(self.outside & np.isfinite(self.rise), self.rise, -np.inf)
        return int(rise.argmax()) if np.isfinite(rise).any() else -1

    @property
    def told_apart(self) -> bool:
        """Whether the headline is above the noise of comparison."""
        i = self.headline
        return i >= 0 and abs(float(self.rise[i])) > (self.noise_m or 0.0)

    def upstream_reach(self, above_m: float) -> float:
        """How far upstream of the headline the rise stays above a value the user entered, m."""
        i = self.headline
        if i < 0 or not self.rise[i] > above_m:
            return 0.0
        j = i
        while j > 0 and self.rise[j - 1] > above_m:
            j -= 1
        return float(self.chainage[i] - self.chainage[j])


def level_change(
    a: Frame,
    b: Frame,
    centre_line: CentreLine,
    *,
    spacing_m: float,
    works: Sequence[BaseGeometry] = (),
    margin_m: float = 0.0,
    quiet: tuple[float, float] | None = None,
    inflows: tuple[float, float] = (0.0, 0.0),
) -> LevelChange:
    """Rise of the width-mean level from frame a to frame b.

    Parameters
    ----------
    a, b : Frame
        About one origin (move one mesh before if need be).
    spacing_m : float
        Between sections along the centre line.
    works : polygons, local m
        With ``margin_m`` of ground beside them, left out of the headline.
    quiet : (chainage, chainage), optional
        Where no change is expected: sets the noise of comparison. Default: the downstream tenth of
        the reach, clear of the works.
    inflows : through-discharges of a and b, m3/s.

    Raises
    ------
    ValueError
        If fewer than three sections meet water in both frames.
    """
    both = np.vstack([a.mesh.node_xy, b.mesh.node_xy])
    found = []
    for chainage, line in automatic_sections(centre_line, both, spacing_m):
        levels = [_level(f, line) for f in (a, b)]
        if levels[0] is not None and levels[1] is not None:
            found.append((chainage, *levels))
    if len(found) < 3:
        raise ValueError("fewer than three sections meet water in both runs; do they show the same reach?")
    chainage, level_a, level_b = np.array(found).T
    clear = outside(works, centre_line.at(chainage), margin_m)
    part = quiet or (float(chainage[-1] - 0.1 * (chainage[-1] - chainage[0])), float(chainage[-1]))
    still = (chainage >= part[0]) & (chainage <= part[1]) & clear
    noise = float(np.percentile(np.abs(level_b - level_a)[still], 95)) if still.any() else None
    return LevelChange(
        chainage, level_a, level_b, clear, noise, inflows[1] - inflows[0], float(level_b[-1] - level_a[-1])
    )


def _level(frame: Frame, line: np.ndarray) -> float | None:
    try:
        return section_figures(cut(frame, line)).mean_level_m
    except ValueError:  # the section lies between two arms of the mesh
        return None
