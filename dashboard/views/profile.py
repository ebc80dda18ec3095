"""A profile along the flow: bed, water, critical depth and head over the distance; SVG text."""

from __future__ import annotations

import numpy as np

from hydro.section.profile import Profile

from ..units import Units, round_step, step_above

_TALL = 12.0  # height of the drawing, in label sizes


def draw(profile: Profile, width: float, label: float, units: Units) -> str:
    """The profile as SVG text, from its start at the left; colours come from the page's custom properties."""
    f = units.factor("m")
    right, foot, head_room = width - 5.2 * label, _TALL * label, 1.6 * label
    known = [v for v in (profile.bed, profile.level, profile.head, profile.critical_level) for v in v[np.isfinite(v)]]
    if not np.isfinite(profile.level).any():
        return ""
    low, high = float(min(known)), float(max(known))
    span = max(high - low, 1e-3)
    length = float(profile.distance[-1])

    def px(distance, level) -> np.ndarray:
        x = np.asarray(distance) / length * right
        return np.column_stack([x, foot - (np.asarray(level) - low) / span * (foot - head_room) * 0.94])

    bed = px(profile.distance, profile.bed)
    parts = [
        *(_band(px, profile, piece) for piece in _runs(np.isfinite(profile.level))),
        f'<polygon class="ground" points="0,{foot + 4} {_points(bed)} {right:.1f},{foot + 4}"/>',
        f'<polyline class="ink" points="{_points(bed)}"/>',
    ]
    for values, kind, dash in ((profile.level, "ink", ""), (profile.head, "ink thin", "7 4"), (profile.critical_level, "ink thin", "1 4")):
        for piece in _runs(np.isfinite(values)):
            line = _points(px(profile.distance[piece], values[piece]))
            parts.append(f'<polyline class="{kind}"{f" stroke-dasharray={chr(34)}{dash}{chr(34)}" if dash else ""} points="{line}"/>')
    for jump in profile.jumps:
        x = jump / length * right
        parts.append(f'<path class="subject" d="M{x - 5:.1f} {head_room - 2:.1f} h10 l-5 8 Z"/>')
    parts += _levels(low, span, right, foot, head_room, f, units, label) + _distances(length, right, foot, f, units, label)
    return (
        f'<svg class="section" viewBox="0 0 {width:.0f} {foot + 2.6 * label:.0f}" width="{width:.0f}" height="{foot + 2.6 * label:.0f}" '
        f'aria-hidden="true" font-size="{label:.1f}">{"".join(parts)}</svg>'
    )


def _band(px, profile: Profile, piece: np.ndarray) -> str:
    surface, bed = px(profile.distance[piece], profile.level[piece]), px(profile.distance[piece], profile.bed[piece])
    return f'<polygon class="flow" points="{_points(surface)} {_points(bed[::-1])}"/>'


def _levels(low, span, right, foot, head_room, f, units: Units, label: float) -> list[str]:
    step = step_above(span * f / 4)
    first = np.ceil(low * f / step - 1e-9) * step
    out = []
    for level in np.arange(first, (low + span) * f + 1e-9, step):
        y = foot - (level / f - low) / span * (foot - head_room) * 0.94
        out.append(
            f'<line class="guide" x1="0" x2="{right:.1f}" y1="{y:.1f}" y2="{y:.1f}"/>'
            f'<text x="{right + 6:.1f}" y="{y + 0.35 * label:.1f}">{round(float(level), 6):g} {units.label("m")}</text>'
        )
    return out


def _distances(length, right, foot, f, units: Units, label: float) -> list[str]:
    step = round_step(2.5 * length * f / (right / (4 * label)))
    out = [f'<line class="hair" x1="0" x2="{right:.1f}" y1="{foot + 4:.1f}" y2="{foot + 4:.1f}"/>']
    for k in range(int(length * f / step + 1e-9) + 1):
        x = k * step / f / length * right
        anchor = ' class="mid"' if k else ""
        label_here = f"{k * step:g}" if x < right - 1.2 * label else ""
        out.append(
            f'<line class="hair2" x1="{x:.1f}" x2="{x:.1f}" y1="{foot + 4:.1f}" y2="{foot + 9:.1f}"/>'
            f'<text{anchor} x="{x:.1f}" y="{foot + 9 + label:.1f}">{label_here}</text>'
        )
    return [*out, f'<text x="{right + 6:.1f}" y="{foot + 9 + label:.1f}">{units.label("m")}</text>']


def _runs(known: np.ndarray) -> list[np.ndarray]:
    at = np.flatnonzero(known)
    pieces = np.split(at, np.flatnonzero(np.diff(at) > 1) + 1) if at.size else []
    return [p for p in pieces if len(p) > 1]


def _points(px: np.ndarray) -> str:
    return " ".join(f"{x:.1f},{y:.1f}" for x, y in px if np.isfinite(y))
