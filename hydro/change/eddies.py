"""Recirculation zones of two runs matched: kept, grown, shrunk, moved, new, gone."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.optimize import linear_sum_assignment

STATES = ("new", "gone", "grown", "shrunk", "moved", "not distinguishable")


@dataclass(frozen=True, slots=True)
class ZoneChange:
    """One zone in both runs, or in one of them.

    ``overlap`` is the shared area over the smaller of the two; ``area_change_m2`` and
    ``discharge_change_m3_s`` are b minus a (None when new or gone); ``told_apart`` says whether the
    area changed by more than the two sensitivities allow.
    """

    state: str
    a: Any | None
    b: Any | None
    overlap: float
    area_change_m2: float | None
    discharge_change_m3_s: float | None
    moved_m: float | None
    told_apart: bool

    @property
    def name(self) -> str:
        return str(self.zone.name)

    @property
    def zone(self) -> Any:
        """The zone as it is after the change, or was before it went."""
        return self.a if self.b is None else self.b


def match_zones(a: Sequence[Any], b: Sequence[Any], shift: tuple[float, float] = (0.0, 0.0)) -> list[ZoneChange]:
    """Zones of ``a`` matched with those of ``b`` by the area they share and their sense of rotation.

    Parameters
    ----------
    a, b : sequences of Zone
        With ``contour`` (local polygons), ``centre``, ``rotation``, ``area_m2``,
        ``recirculating_discharge_m3_s`` and ``sensitivity``.
    shift : (2,) m
        Added to b's coordinates to bring them about a's origin.

    Returns
    -------
    list of ZoneChange
        Largest of either run first; nothing is left out.
    """
    import shapely

    moved = [shapely.transform(z.contour, lambda c: c + np.asarray(shift)) for z in b]
    shared = np.array([[p.contour.intersection(g).area for g in moved] for p in a]).reshape(len(a), len(b))
    same_turn = np.array([[p.rotation == q.rotation for q in b] for p in a], bool).reshape(len(a), len(b))
    small = np.array([[min(p.area_m2, q.area_m2) for q in b] for p in a]).reshape(len(a), len(b))
    overlap = np.where(same_turn & (small > 0), shared / np.where(small > 0, small, 1.0), 0.0)
    rows, columns = linear_sum_assignment(-overlap)
    pairs = {int(i): int(j) for i, j in zip(rows, columns, strict=True) if overlap[i, j] > 0.05}
    out = [_both(a[i], b[j], float(overlap[i, j]), np.asarray(shift)) for i, j in pairs.items()]
    out += [_one("gone", z) for i, z in enumerate(a) if i not in pairs]
    out += [_one("new", z) for j, z in enumerate(b) if j not in pairs.values()]
    return sorted(out, key=lambda c: -max(z.area_m2 for z in (c.a, c.b) if z is not None))


def _both(p: Any, q: Any, overlap: float, shift: np.ndarray) -> ZoneChange:
    change = float(q.area_m2 - p.area_m2)
    apart = abs(change) > _half_range(p, "area_m2") + _half_range(q, "area_m2")
    distance = float(np.hypot(*(np.asarray(q.centre) + shift - np.asarray(p.centre))))
    if apart:
        state = "grown" if change > 0 else "shrunk"
    else:
        state = "moved" if overlap < 0.5 else "not distinguishable"
    flow = float(q.recirculating_discharge_m3_s - p.recirculating_discharge_m3_s)
    return ZoneChange(state, p, q, overlap, change, flow, distance, apart)


def _one(state: str, zone: Any) -> ZoneChange:
    a, b = (zone, None) if state == "gone" else (None, zone)
    return ZoneChange(state, a, b, 0.0, None, None, None, True)


def _half_range(zone: Any, figure: str) -> float:
    """Half of the sensitivity of a zone's figure; 0 where none was worked out."""
    low_high = (zone.sensitivity or {}).get(figure)
    return 0.0 if not low_high else abs(float(low_high[1]) - float(low_high[0])) / 2
