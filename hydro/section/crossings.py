"""Weir lines and bridge lines read from a frame: section heads, the relation asked for, flow by opening, freeboard."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..frame import Frame
from ..reach import CentreLine, NamedLine, Structure, section_at
from .cut import Section, cut
from .figures import SectionFigures, section_figures
from .weir import WeirReading, weir_discharge

WHY_THEY_DIFFER = (
    "A model cell row is no rated structure: cells smear the crest, the model may use its own weir equation on the "
    "cell edges, the approach is not straight, and side slopes and the ramp carry part of the flow."
)


@dataclass(frozen=True, slots=True)
class WeirLine:
    """A weir in one frame. Heads are section heads above the crest, m."""

    name: str
    crest_m: float
    upstream_head_m: float
    downstream_head_m: float
    fall_m: float
    discharge_m3_s: float
    reading: WeirReading
    stations: tuple[float, float]  # chainages of the two sections, m
    cautions: tuple[str, ...] = ("weir-formula", "no-roller")


@dataclass(frozen=True, slots=True)
class Opening:
    """Flow through one opening of a bridge."""

    name: str
    discharge_m3_s: float
    share: float
    width_m: float
    mean_velocity_m_s: float | None
    max_velocity_m_s: float
    approach_deg: float | None  # between the approach flow and the opening's own normal
    highest_level_m: float | None
    freeboard_m: float | None  # soffit minus highest level; negative: above the soffit
    flags: tuple[str, ...]
    cautions: tuple[str, ...]


def weir_line(
    frame: Frame, weir: Structure, centre_line: CentreLine, *, relation: str, heads_away: float = 4.0,
    crest_length_m: float = 0.0,
) -> WeirLine:
    """Section heads above and below a weir, with the discharge of the relation the user picked.

    Parameters
    ----------
    heads_away : float
        Distance of both sections from the crest in upstream heads; found by two passes.

    Raises
    ------
    ValueError
        A weir without a crest level, or one that stands too near the model's edge for the sections.
    """
    crest = weir.levels.get("crest_m")
    if crest is None:
        raise ValueError(f"{weir.name} has no crest level; give crest_m in the review's lines.")
    line = crest_points(weir)
    chainage = float(centre_line.locate(line)[0].mean())
    head = 1.0
    for _ in range(2):
        above = _at(frame, centre_line, chainage - heads_away * head, weir.name)
        head = max(_head(above, weir.name) - crest, 0.05)
    below = _at(frame, centre_line, chainage + heads_away * head, weir.name)
    up, down = _head(above, weir.name) - crest, _head(below, weir.name) - crest
    over = cut(frame, line, centre_line=centre_line)
    bed = float((above.bed.mean(axis=1) * above.widths)[above.wet].sum() / above.widths[above.wet].sum())
    reading = weir_discharge(
        relation, upstream_head_m=up, downstream_head_m=down, width_m=over.length, crest_height_m=crest - bed,
        crest_length_m=crest_length_m,
    )
    return WeirLine(
        weir.name, crest, up, down, up - down, section_figures(over).discharge_m3_s, reading,
        (chainage - heads_away * head, chainage + heads_away * head),
    )


def crest_points(weir: Structure) -> np.ndarray:
    """Local points of a weir's crest: its line, or the long axis of its outline."""
    shape = weir.geometry
    if shape.geom_type == "Polygon":
        corners = np.asarray(shape.minimum_rotated_rectangle.exterior.coords)[:4]
        sides = np.hypot(*np.diff(np.vstack([corners, corners[:1]]), axis=0).T)
        k = int(sides.argmin())
        return np.array([corners[k] + corners[(k + 1) % 4], corners[(k + 2) % 4] + corners[(k + 3) % 4]]) / 2
    return np.asarray(shape.coords)[:, :2]


def bridge_openings(
    frame: Frame, openings: Sequence[NamedLine], centre_line: CentreLine, *, soffit_m: float | None = None
) -> tuple[Opening, ...]:
    """Flow, approach and freeboard at each opening of a bridge.

    Parameters
    ----------
    openings : lines between piers and abutments, local m.
    soffit_m : float, optional
        Underside of the deck, m above datum; without it freeboard is None.
    """
    cuts = [cut(frame, np.asarray(o.geometry.coords)[:, :2], centre_line=centre_line) for o in openings]
    figures = [section_figures(c) for c in cuts]
    total = sum(f.discharge_m3_s for f in figures)
    return tuple(
        _opening(o.name, c, f, total, soffit_m) for o, c, f in zip(openings, cuts, figures, strict=True)
    )


def _opening(name: str, section: Section, f: SectionFigures, total: float, soffit: float | None) -> Opening:
    level = section.level
    highest = float(np.nanmax(level)) if np.isfinite(level).any() else None
    free = None if soffit is None or highest is None else soffit - highest
    above = free is not None and free < 0
    return Opening(
        name, f.discharge_m3_s, f.discharge_m3_s / total if total else float("nan"), f.width_m, f.mean_velocity_m_s,
        f.max_velocity_m_s, _approach(section), highest, free,
        (*f.flags, *(("level above the soffit: not assessed",) if above else ())),
        ("section-discharge", *(("pressure-flow",) if above else ())),
    )


def _approach(section: Section) -> float | None:
    """Angle between the mean flow through a line and the line's normal, degrees; positive to the left."""
    q = section.frame.triangle_unit_discharge[section.triangle] * section.widths[:, None]
    along = np.column_stack([section.normal[:, 1], -section.normal[:, 0]])
    across_sum, along_sum = float((q * section.normal).sum()), float((q * along).sum())
    if across_sum == 0 and along_sum == 0:
        return None
    return float(np.degrees(np.arctan2(-along_sum, across_sum)))


def _at(frame: Frame, centre_line: CentreLine, chainage: float, name: str) -> Section:
    line = section_at(centre_line, frame.mesh.node_xy, chainage, 5.0)
    if line is None:
        raise ValueError(f"{name}: the model has no water at chainage {chainage:.0f} m, where its head would be read.")
    return cut(frame, line, centre_line=centre_line)


def _head(section: Section, name: str) -> float:
    head = section_figures(section).head_m
    if head is None:
        raise ValueError(f"no water flows near {name} in this frame; its heads cannot be read.")
    return head
