"""The invented place: course of the river, bed, roughness, and the works of each design.

Everything is in local metres about :data:`ORIGIN`; ``s`` is chainage down the centre line and ``n``
the offset, positive to the left. Lengths are metres, levels metres above :data:`DATUM`.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np
import shapely
from numpy.typing import ArrayLike
from scipy.ndimage import gaussian_filter1d
from scipy.spatial import cKDTree
from shapely.geometry import LineString, Polygon

ORIGIN = (52000.0, 31000.0)  # world coordinates of local (0, 0) in the invented grid
DATUM = "Sample local datum (invented)"
DESIGNS = ("existing", "proposed")

LENGTH = 900.0
SLOPE = 0.0014
BED_AT_START = 101.80
BANK_WIDTH, BANK_HEIGHT = 4.6, 2.9  # a planar bank on each side of the bottom
WEIR, BRIDGE = 520.0, 655.0  # chainages
TRIBUTARY = 120.0
BASIN = (430.0, 456.0)  # chainages of the old mill basin's two ends
CULVERT = ((503.0, -15.0), (545.0, -15.5))  # (s, n) of inlet and outlet
CULVERT_DIAMETER, CULVERT_LOSS = 0.6, 1.8

_STEP = 0.25
# Turns of the centre line: start, end, radius (positive turns left).
_ARCS = ((60.0, 200.0, -400.0), (235.0, 375.0, 120.0), (560.0, 800.0, -500.0))


@dataclass(frozen=True)
class Pier:
    """A bridge pier: where its middle stands, and its outline in local metres."""

    name: str
    outline: Polygon
    width: float
    length: float
    hole: bool  # False: resistance inside the outline


def _bump(s: np.ndarray | float, middle: float, half: float) -> np.ndarray:
    """1 at the middle, smoothly 0 beyond ``half`` either side."""
    x = np.clip(np.abs(np.asarray(s, float) - middle) / half, 0, 1)
    return (1 - x * x) ** 2


def _ramp(x: np.ndarray) -> np.ndarray:
    """0 below 0, 1 above 1, smooth between."""
    x = np.clip(x, 0, 1)
    return x * x * (3 - 2 * x)


class Course:
    """The centre line, dense enough to read chainage and offset from its nearest point."""

    def __init__(self) -> None:
        s = np.arange(-20.0, LENGTH + 20.0 + _STEP / 2, _STEP)
        curvature = np.zeros_like(s)
        for first, last, radius in _ARCS:
            curvature[(s >= first) & (s <= last)] = 1 / radius
        heading = np.cumsum(gaussian_filter1d(curvature, 12.0 / _STEP)) * _STEP + 0.15
        self.s = s
        self.tangent = np.column_stack([np.cos(heading), np.sin(heading)])
        xy = np.cumsum(self.tangent * _STEP, axis=0)
        self.xy = xy - xy[np.argmin(np.abs(s))]
        self.tree = cKDTree(self.xy)

    def locate(self, xy: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Chainage and offset of local points (k, 2)."""
        k = self.tree.query(xy)[1]
        rel, t = xy - self.xy[k], self.tangent[k]
        return self.s[k] + np.sum(rel * t, axis=1), t[:, 0] * rel[:, 1] - t[:, 1] * rel[:, 0]

    def at(self, s: ArrayLike, n: ArrayLike = 0.0) -> np.ndarray:
        """Local points (k, 2) at chainage and offset."""
        s, n = np.broadcast_arrays(np.atleast_1d(np.asarray(s, float)), np.asarray(n, float))
        x, y = (np.interp(s, self.s, self.xy[:, k]) for k in (0, 1))
        t = self.direction(s)
        return np.column_stack([x - n * t[:, 1], y + n * t[:, 0]])

    def direction(self, s: ArrayLike) -> np.ndarray:
        """Unit vectors (k, 2) downstream."""
        s = np.atleast_1d(np.asarray(s, float))
        t = np.column_stack([np.interp(s, self.s, self.tangent[:, k]) for k in (0, 1)])
        return t / np.hypot(t[:, 0], t[:, 1])[:, None]


@lru_cache(maxsize=1)
def course() -> Course:
    """The one centre line of the reach."""
    return Course()


def half_bottom(s: np.ndarray | float) -> np.ndarray:
    """Half the width of the bottom; the river is wider at the bridge and in the bend."""
    return 16.0 + 2.2 * _bump(s, BRIDGE, 90) + 1.0 * _bump(s, 305, 90)


def mean_bed(s: np.ndarray | float) -> np.ndarray:
    """Level of the toe of the banks."""
    return BED_AT_START - SLOPE * np.asarray(s, float)


def _blunt(length: float, width: float) -> np.ndarray:
    x, y = length / 2, width / 2
    return np.array([(-x, -y), (x, -y), (x, y), (-x, y)])


def _tapered(length: float, width: float) -> np.ndarray:
    """Round nose upstream, straight flanks, tail tapering to a rounded tip."""
    r = width / 2
    nose = np.linspace(np.pi / 2, 3 * np.pi / 2, 19)
    head = np.column_stack([-length / 2 + r + r * np.cos(nose), r * np.sin(nose)])
    tail_length = 2.2 * width
    x = np.linspace(0, 1, 15)
    flank = r * (1 - x**2) + 0.20 * x**2  # a blunt tip, so that it does not set the time step
    lower = np.column_stack([length / 2 - tail_length + tail_length * x, -flank])
    return np.vstack([head, lower, lower[::-1] * [1, -1]])


def _place(shape: np.ndarray, s: float, n: float, skew_deg: float) -> Polygon:
    """Set an outline drawn along the flow at (s, n), turned anticlockwise by the skew."""
    c = course()
    along = c.direction(s)[0]
    a = np.deg2rad(skew_deg)
    along = np.array([along[0] * np.cos(a) - along[1] * np.sin(a), along[0] * np.sin(a) + along[1] * np.cos(a)])
    across = np.array([-along[1], along[0]])
    return Polygon(c.at(s, n)[0] + shape[:, :1] * along + shape[:, 1:] * across)


@dataclass(frozen=True)
class Place:
    """One design of the reach."""

    design: str

    @cached_property
    def piers(self) -> tuple[Pier, ...]:
        if self.design == "existing":
            shape, size, skew, offsets = _blunt(8.0, 3.6), (8.0, 3.6), 14.0, (-6.5, 6.5)
        else:
            shape, size, skew, offsets = _tapered(9.0, 2.0), (9.0, 2.0), 0.0, (-7.5, 7.5)
        return tuple(
            Pier(f"Pier {i + 1}", _place(shape, BRIDGE, n, skew), size[1], size[0], self.design == "proposed" or i == 0)
            for i, n in enumerate(offsets)
        )

    @cached_property
    def abutments(self) -> tuple[Polygon, Polygon]:
        """Right and left abutment with wing walls; set back in the proposed design."""
        face = 18.6 if self.design == "existing" else 21.4
        back = float(half_bottom(BRIDGE)) + BANK_WIDTH + 2.0
        shape = [(-5 - (back - face), back), (-5, face), (5, face), (5 + (back - face), back)]
        return tuple(Polygon(np.vstack([course().at(BRIDGE + s, side * n) for s, n in shape])) for side in (-1, 1))

    @cached_property
    def domain(self) -> Polygon:
        """The modelled water: banks to their tops, less abutments and the piers that are holes."""
        water = shapely.union_all([channel_outline(), tributary_outline(), basin_outline()])
        solid = [*self.abutments, *(p.outline for p in self.piers if p.hole)]
        return shapely.difference(water, shapely.union_all(solid))

    def crest(self, n: np.ndarray) -> np.ndarray:
        """Level of the weir crest: rising to the right, higher still at its right end, notched by the ramp."""
        level = float(mean_bed(WEIR)) + 0.85 + 0.10 * np.clip((8.0 - n) / 24.0, 0, 1) + 0.12 * _ramp((-5.0 - n) / 2.0)
        first, last, drop = self.ramp_span
        inside = _ramp((n - first) / 1.0) * _ramp((last - n) / 1.0)
        return level - drop * inside

    @property
    def ramp_span(self) -> tuple[float, float, float]:
        """Offsets of the ramp's two sides and how far its crest lies below the weir's."""
        return (7.5, 14.5, 0.28) if self.design == "existing" else (4.5, 14.5, 0.24)

    @property
    def ramp_grade(self) -> float:
        """Metres along for one metre down."""
        return 10.0 if self.design == "existing" else 22.0

    def bed(self, xy: np.ndarray) -> np.ndarray:
        """Bed level at local points (k, 2)."""
        s, n = course().locate(xy)
        z = _river_bed(s, n)
        z = np.minimum(z, _tributary_bed(xy))
        basin = float(mean_bed(BASIN[0])) - 0.15
        z = np.minimum(z, basin + shapely.distance(basin_outline(), shapely.points(xy)) / 1.0)
        # Upstream face 1:1, crest 2 m wide, back 1:3; the ramp is gentler within its span.
        first, last, _ = self.ramp_span
        inside = _ramp((n - first) / 1.0) * _ramp((last - n) / 1.0)
        grade = 3.0 + (self.ramp_grade - 3.0) * inside
        d = s - WEIR
        weir = self.crest(n) - np.maximum(-1 - d, 0) - np.maximum(d - 1, 0) / grade
        return np.maximum(z, np.where(np.abs(n) < 24, weir, -np.inf))

    def roughness(self, xy: np.ndarray) -> np.ndarray:
        """Manning's n, s/m^(1/3): gravel, grassed banks, weir, rock ramp, and the resistance pier."""
        s, n = course().locate(xy)
        value = np.where(np.abs(n) > half_bottom(s) + 0.5, 0.045, 0.032)
        value = np.where(shapely.contains_xy(basin_outline(), xy[:, 0], xy[:, 1]), 0.028, value)
        value = np.where((np.abs(s - WEIR - 0.5) < 4.0) & (np.abs(n) < 22), 0.025, value)
        value = np.where(shapely.contains_xy(self.ramp_outline, xy[:, 0], xy[:, 1]), 0.050, value)
        for pier in self.piers:
            if not pier.hole:
                value = np.where(shapely.contains_xy(pier.outline, xy[:, 0], xy[:, 1]), PIER_ROUGHNESS, value)
        return value

    @cached_property
    def ramp_outline(self) -> Polygon:
        first, last, drop = self.ramp_span
        run = (0.85 - drop) * self.ramp_grade
        corners = [(-2, first), (1 + run, first), (1 + run, last), (-2, last)]
        return Polygon(np.vstack([course().at(WEIR + s, n) for s, n in corners]))

    @cached_property
    def weir_outline(self) -> Polygon:
        return Polygon(np.vstack([course().at(WEIR + s, n) for s, n in ((-1.9, -18), (3.6, -18), (3.6, 18), (-1.9, 18))]))


PIER_ROUGHNESS = 0.40  # inside the outline of the pier that is modelled as resistance


def _river_bed(s: np.ndarray, n: np.ndarray) -> np.ndarray:
    """Gravel bed with thalweg, bars and pools, between two planar banks."""
    b = half_bottom(s)
    r = np.clip(n / b, -1, 1)
    inside = 1 - r * r  # 0 at both toes
    bed = -0.30 * inside - 0.10 * inside * np.sin(2 * np.pi * s / 95.0)
    bend = _ramp((s - 235) / 60) * _ramp((420 - s) / 60)
    bed = bed - bend * inside * (0.55 - 1.25 * r)  # the pool lies along the outer, right bank
    bed = bed - 0.55 * inside * _bump(s, WEIR + 22, 18) * _ramp((s - WEIR - 4) / 8)  # scour below the weir
    bank = np.maximum(np.abs(n) - b, 0) * (BANK_HEIGHT / BANK_WIDTH)
    return mean_bed(s) + bed + bank


def channel_outline() -> Polygon:
    s = np.arange(0.0, LENGTH + 0.5, 1.0)
    n = half_bottom(s) + BANK_WIDTH
    return Polygon(np.vstack([course().at(s, -n), course().at(s, n)[::-1]]))


def _tributary_axis() -> tuple[np.ndarray, np.ndarray]:
    """Mouth and upstream end of the tributary's axis; it joins from the left, pointing downstream."""
    start = course().at(TRIBUTARY, 14.0)[0]
    t = course().direction(TRIBUTARY)[0]
    a = np.deg2rad(118.0)
    away = np.array([t[0] * np.cos(a) - t[1] * np.sin(a), t[0] * np.sin(a) + t[1] * np.cos(a)])
    return start, start + 44.0 * away


_TRIBUTARY_HALF = 3.0


def tributary_outline() -> Polygon:
    a, b = _tributary_axis()
    return LineString([a, b]).buffer(_TRIBUTARY_HALF + 3.9, cap_style="flat")


def _tributary_bed(xy: np.ndarray) -> np.ndarray:
    a, b = _tributary_axis()
    d = (b - a) / np.hypot(*(b - a))
    along = (xy - a) @ d
    across = np.abs(d[0] * (xy - a)[:, 1] - d[1] * (xy - a)[:, 0])
    floor = float(mean_bed(TRIBUTARY)) + 0.006 * along - 0.10
    bank = np.maximum(across - _TRIBUTARY_HALF, 0) * (2.7 / 3.9)
    return np.where(along > -4, floor + bank, np.inf)


def tributary_mouth() -> LineString:
    """Upstream end of the tributary, where its inflow enters."""
    a, b = _tributary_axis()
    d = (b - a) / np.hypot(*(b - a))
    side = np.array([-d[1], d[0]]) * (_TRIBUTARY_HALF + 3.9)
    return LineString([b - side, b + side])


@lru_cache(maxsize=1)
def basin_outline() -> Polygon:
    """The old mill basin: a walled bay on the right bank."""
    first, last = BASIN
    c = course()
    s = np.linspace(first, last, 9)
    # Its corners on the river's side lie in the channel, so only the far ones are rounded.
    box = Polygon(np.vstack([c.at(s, -10.0), c.at(s[::-1], -41.0)]))
    return box.buffer(-2.0).buffer(2.0, quad_segs=6)
