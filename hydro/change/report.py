"""Everything that changes from one run to another, as plain sentences with their figures."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..cautions import OWED
from ..figure import signed
from ..ledger import FrameLedger, frame_ledger
from ..reach import CentreLine, Reach
from ..run import Run
from ..section.crossings import Opening, bridge_openings
from .eddies import ZoneChange, match_zones
from .levels import LevelChange, level_change
from .maps import MapChange, map_change
from .pairing import Pair
from .setup import Difference, setup_differences


@dataclass(frozen=True, slots=True)
class Finding:
    """A sentence, how many times over the noise it is (None: no noise known), and where, local m."""

    sentence: str
    over_noise: float | None
    at: tuple[float, float] | None = None
    cautions: tuple[str, ...] = ("change",)


@dataclass(frozen=True, eq=False)
class Change:
    """One pair of frames of two runs compared: b minus a throughout."""

    a: Run
    b: Run
    pair: Pair
    ledger_a: FrameLedger
    ledger_b: FrameLedger
    setup: tuple[Difference, ...]
    levels: LevelChange | None
    maps: MapChange
    zones: tuple[ZoneChange, ...]
    openings: tuple[tuple[Opening, ...], tuple[Opening, ...]]
    findings: tuple[Finding, ...]

    @property
    def cautions(self) -> tuple[str, ...]:
        """Ids of the cautions that the comparison owes: those of every change, of its findings and of its openings."""
        own = [f.cautions for f in self.findings] + [o.cautions for side in self.openings for o in side]
        return tuple(dict.fromkeys([*OWED["change"], *(c for ids in own for c in ids)]))


def compare(
    a: Run, b: Run, pair: Pair, *, reach_a: Reach, reach_b: Reach, spacing_m: float = 20.0, above_m: float = 0.01,
    quiet: tuple[float, float] | None = None,
) -> Change:
    """Compare a pair of frames.

    Parameters
    ----------
    reach_a, reach_b : Reach
        With the structures of each design; the works are the outlines that are not in both.
    spacing_m : float
        Between level sections.
    above_m : float
        Rise whose extent upstream is reported, m: a value the user enters.
    quiet : chainages between which no change is expected.
    """
    la, lb = frame_ledger(a, pair.a, reach=reach_a), frame_ledger(b, pair.b, reach=reach_b)
    works = works_of(reach_a, reach_b)
    margin = max((_width(g) for g in works), default=0.0)
    setup = setup_differences(a, b, la.frame, lb.frame, works, margin)
    levels = None
    if reach_a.centre_line is not None:
        levels = level_change(
            la.frame, lb.frame, reach_a.centre_line, spacing_m=spacing_m, works=works, margin_m=margin, quiet=quiet,
            inflows=(la.sf.inflow_m3_s, lb.sf.inflow_m3_s),
        )
    maps = map_change(la.frame, lb.frame)
    zones = tuple(match_zones(la.zones.zones, lb.zones.zones, (b.mesh.origin[0] - a.mesh.origin[0], b.mesh.origin[1] - a.mesh.origin[1])))
    openings = (_openings(la.frame, reach_a), _openings(lb.frame, reach_b))
    findings = _findings(levels, maps, zones, openings, above_m, reach_a)
    return Change(a, b, pair, la, lb, setup, levels, maps, zones, openings, tuple(findings))


def works_of(a: Reach, b: Reach) -> list:
    """Outlines that stand in one design only, local m."""
    ids_a, ids_b = {s.id for s in a.structures}, {s.id for s in b.structures}
    return [s.geometry for s in (*a.structures, *b.structures) if (s.id in ids_a) != (s.id in ids_b)]


def _width(shape) -> float:
    """Shorter side of the smallest rectangle round an outline, m."""
    corners = np.asarray(shape.minimum_rotated_rectangle.boundary.coords) if shape.geom_type == "Polygon" else None
    return float(np.hypot(*np.diff(corners, axis=0).T).min()) if corners is not None else 0.0


def _openings(frame, reach: Reach) -> tuple[Opening, ...]:
    lines = reach.layer("openings")
    if not lines or reach.centre_line is None:
        return ()
    soffits = [s.levels["soffit_m"] for s in reach.structures if "soffit_m" in s.levels]
    chosen = [o for o in lines if _meets(frame, o)]
    return bridge_openings(frame, chosen, reach.centre_line, soffit_m=min(soffits) if soffits else None) if chosen else ()


def _meets(frame, line) -> bool:
    points = [line.geometry.interpolate(f, normalized=True).coords[0] for f in (0.25, 0.5, 0.75)]
    return bool((frame.mesh.find(np.array(points)[:, :2]) >= 0).any())


def _findings(levels, maps, zones, openings, above_m, reach) -> list[Finding]:
    out = []
    if levels is not None and levels.headline >= 0 and reach.centre_line is not None:
        out.append(_afflux(levels, above_m, reach.centre_line))
    for change in zones:
        out.append(_zone(change))
    for words, area in (("becomes wet", maps.newly_wet_m2), ("is no longer wet", maps.no_longer_wet_m2)):
        if area > 0:
            out.append(Finding(f"{area:.0f} m2 of ground {words}.", None))
    out += _split(*openings)
    return sorted(out, key=lambda f: -(f.over_noise if f.over_noise is not None else 1.0))


def _afflux(levels: LevelChange, above_m: float, centre_line: CentreLine) -> Finding:
    i = levels.headline
    rise, noise = float(levels.rise[i]), levels.noise_m
    x, y = centre_line.at(levels.chainage[i : i + 1])[0]
    at = f"chainage {levels.chainage[i]:.0f} m"
    if not levels.told_apart:
        text = f"The greatest rise of level outside the works, {signed(rise, 3)} m at {at}, is not distinguishable from the noise of {noise:.3f} m."
    else:
        text = f"Outside the works the level rises by at most {rise:.3f} m, at {at}"
        if rise > above_m:
            text += f"; it stays above {above_m:g} m for {levels.upstream_reach(above_m):.0f} m upstream"
        text += f" (noise of comparison {'not known' if noise is None else f'{noise:.3f} m'})."
    text += (
        f" Inflow differs by {signed(levels.inflow_difference_m3_s, 2)} m3/s and the downstream level by "
        f"{signed(levels.downstream_level_difference_m, 3)} m."
    )
    return Finding(text, abs(rise) / noise if noise else None, (float(x), float(y)))


def _zone(change: ZoneChange) -> Finding:
    zone = change.zone
    at = (float(zone.centre[0]), float(zone.centre[1]))
    size = f"{zone.area_m2:.0f} m2"
    if change.state in ("new", "gone"):
        words = "is new" if change.state == "new" else "is gone"
        return Finding(f"The eddy {zone.name} ({size}) {words}.", None, at, ("change", "wake-detail"))
    if change.state == "not distinguishable":
        text = f"The eddy {zone.name} ({size}) changes by {signed(change.area_change_m2 or 0.0, 0)} m2, which is not distinguishable from none."
        return Finding(text, 0.5, at, ("change", "wake-detail"))
    text = f"The eddy {zone.name} has {change.state}"
    text += f" by {abs(change.area_change_m2 or 0.0):.0f} m2 to {size}." if change.state != "moved" else f" by {change.moved_m:.1f} m."
    return Finding(text, None, at, ("change", "wake-detail"))


def _split(a: Sequence[Opening], b: Sequence[Opening]) -> list[Finding]:
    """Shares of flow through openings of the same name."""
    before = {o.name: o for o in a}
    out = []
    for o in b:
        if o.name in before and abs(o.share - before[o.name].share) >= 0.005:
            text = f"{o.name} carries {100 * o.share:.1f} % of the flow, was {100 * before[o.name].share:.1f} %."
            out.append(Finding(text, None, None, ("change", "section-discharge")))
    return out
