"""The section looking downstream: water in its tubes, bed, and the speed as bars on the surface; SVG text."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..units import Units, round_step


@dataclass(frozen=True, eq=False)
class Profile:
    """What is read along the line, from the left bank to the right.

    Attributes
    ----------
    distance : (k,) float64
        m from the left end.
    bed : (k,) float64
        m above datum; NaN off the mesh.
    level : (k,) float64
        Water level, m above datum; NaN where dry.
    speed : (k,) float64
        Depth-averaged speed square to the line, m/s, positive downstream; NaN where dry.
    psi : (k,) float64 or None
        m3/s; NaN outside the domain.
    tube_m3_s : float
        Discharge of one tube; 0: the water is not cut into tubes.
    subject : pair of floats or None
        From and to, m, of the subject zone.
    length : float
        Of the whole line, m; 0: as long as its stations reach.
    """

    distance: np.ndarray
    bed: np.ndarray
    level: np.ndarray
    speed: np.ndarray
    psi: np.ndarray | None = None
    tube_m3_s: float = 0.0
    subject: tuple[float, float] | None = None
    length: float = 0.0


@dataclass(frozen=True, slots=True)
class Box:
    """The drawing's lines, px."""

    width: float
    label: float = 13.0
    tall: float = 1.0

    @property
    def right(self) -> float:
        return self.width - 4.4 * self.label

    @property
    def head(self) -> float:
        return 1.6 * self.label

    @property
    def surface(self) -> float:
        return self.head + 8.4 * self.tall * self.label

    @property
    def foot(self) -> float:
        return self.surface + 7.4 * self.tall * self.label

    @property
    def height(self) -> float:
        return self.foot + 1.9 * self.label


def draw(profile: Profile, box: Box, units: Units) -> str:
    """The section as SVG text; colours come from the page's custom properties."""
    if not np.isfinite(profile.level).any():
        return _without_water(profile, box, units)
    scale = _Scale(profile, box)
    parts = [
        f'<text class="strong" x="0" y="{box.label:.1f}">L, left bank</text>',
        f'<text class="strong end" x="{box.right:.1f}" y="{box.label:.1f}">R, right bank</text>',
        _speed_lines(scale, units), _ground(scale), _water(scale), _bed(scale), _bars(scale), _axis(scale, units),
    ]
    return (
        f'<svg class="section" viewBox="0 0 {box.width:.0f} {box.height:.0f}" width="{box.width:.0f}" '
        f'height="{box.height:.0f}" aria-hidden="true" font-size="{box.label:.1f}">{"".join(parts)}</svg>'
    )


class _Scale:
    """From metres and m/s to px: the surface sits on one line, bars stand on it, water hangs below."""

    def __init__(self, profile: Profile, box: Box) -> None:
        self.profile, self.box = profile, box
        d = profile.distance
        self.length = profile.length or float(d[-1])
        self.x = d / self.length * box.right
        wet = np.isfinite(profile.level)
        self.level = float(np.nanmedian(profile.level[wet]))
        deepest = float(np.nanmax(self.level - profile.bed)) if np.isfinite(profile.bed).any() else 1.0
        self.per_m = (box.foot - box.surface - 8) / max(deepest, 1e-3)
        speed = profile.speed[np.isfinite(profile.speed)]
        self.top = max(float(np.abs(speed).max()) if speed.size else 0.0, 1e-3)
        self.per_speed = (box.surface - box.head - 0.9 * box.label) / self.top
        # Hanging bars must end above the bed's foot: they share the upward scale unless that is too long.
        self.bed_y = self.y(np.where(np.isfinite(profile.bed), profile.bed, np.nan))

    def y(self, level: np.ndarray | float) -> np.ndarray:
        high = self.box.surface - 1.6 * self.box.label
        return np.clip(self.box.surface + (self.level - level) * self.per_m, high, self.box.foot)


def _points(x, y) -> str:
    return " ".join(f"{a:.1f},{b:.1f}" for a, b in zip(x, y))


def _ground(s: _Scale) -> str:
    ok = np.isfinite(s.bed_y)
    if not ok.any():
        return ""
    x, y = s.x[ok], s.bed_y[ok]
    return f'<polygon class="ground" points="0,{s.box.foot} 0,{y[0]:.1f} {_points(x, y)} {s.box.right},{y[-1]:.1f} {s.box.right},{s.box.foot}"/>'


def _bed(s: _Scale) -> str:
    ok = np.isfinite(s.bed_y)
    return f'<polyline class="ink" points="{_points(s.x[ok], s.bed_y[ok])}"/>'


def _water(s: _Scale) -> str:
    """Strips of water, even and odd by the tube they belong to."""
    p = s.profile
    wet = np.isfinite(p.level) & np.isfinite(p.bed)
    tube = np.zeros(len(wet), int)
    if p.psi is not None and p.tube_m3_s > 0:
        with np.errstate(invalid="ignore"):
            tube = np.where(np.isfinite(p.psi), np.floor(np.nan_to_num(p.psi) / p.tube_m3_s), 0).astype(int) % 2
    out, surface = [], s.y(np.where(wet, p.level, s.level))
    changes = np.flatnonzero((np.diff(tube) != 0) | (np.diff(wet.astype(int)) != 0)) + 1
    for piece in np.split(np.arange(len(wet)), changes):
        if not wet[piece[0]]:
            continue
        piece = np.append(piece, piece[-1] + 1) if piece[-1] + 1 < len(wet) and wet[piece[-1] + 1] else piece
        if len(piece) < 2:
            continue
        x, top, low = s.x[piece], surface[piece], s.bed_y[piece]
        kind = "odd" if tube[piece[0]] else "even"
        out.append(f'<polygon class="tube {kind}" points="{_points(x, top)} {_points(x[::-1], low[::-1])}"/>')
    for piece in _runs(wet):
        out.append(f'<polyline class="ink thin" points="{_points(s.x[piece], surface[piece])}"/>')
    return "".join(out)


def _bars(s: _Scale) -> str:
    p, box = s.profile, s.box
    spacing = max(7.0, 0.55 * box.label)
    at = np.arange(spacing / 2, box.right, spacing)
    speed = np.interp(at, s.x, np.nan_to_num(p.speed))
    base = np.interp(at, s.x, s.y(np.where(np.isfinite(p.level), p.level, s.level)))
    after = np.clip(np.searchsorted(s.x, at), 1, len(s.x) - 1)
    wet = np.isfinite(p.speed[after]) & np.isfinite(p.speed[after - 1]) & (at >= s.x[0]) & (at <= s.x[-1])
    out = []
    for x, v, low, ok in zip(at, speed, base, wet):
        if not ok or abs(v) * s.per_speed < 0.6:
            continue
        metres = x / box.right * s.length
        inside = p.subject is not None and p.subject[0] <= metres <= p.subject[1]
        kind = "bar subject" if inside else "bar"
        if v >= 0:
            out.append(f'<line class="{kind}" x1="{x:.1f}" x2="{x:.1f}" y1="{low:.1f}" y2="{low - v * s.per_speed:.1f}"/>')
        else:
            end = min(low - v * s.per_speed, box.foot)
            line = f'x1="{x:.1f}" x2="{x:.1f}" y1="{low:.1f}" y2="{end:.1f}"'
            out.append(f'<line class="case" {line}/><line class="{kind} back" {line}/>')
    return "".join(out)


def _speed_lines(s: _Scale, units: Units) -> str:
    box, f = s.box, units.factor("m/s")
    step = round_step(s.top * f / 1.6)
    out = []
    for k in range(1, int(s.top * f / step + 1e-9) + 1):
        y = box.surface - k * step / f * s.per_speed
        out.append(
            f'<line class="guide" x1="0" x2="{box.right:.1f}" y1="{y:.1f}" y2="{y:.1f}"/>'
            f'<text x="{box.right + 6:.1f}" y="{y + 0.35 * box.label:.1f}">{k * step:g} {units.label("m/s")}</text>'
        )
    out.append(f'<text x="{box.right + 6:.1f}" y="{box.surface + 0.35 * box.label:.1f}">surface</text>')
    depth = float(np.nanmax(s.level - s.profile.bed))
    deepest = float(s.y(s.level - depth))
    out.append(
        f'<text class="second" x="{box.right + 6:.1f}" y="{deepest:.1f}">{units.quantity(depth, "m", digits=2)}</text>'
        f'<text class="second" x="{box.right + 6:.1f}" y="{deepest - 1.1 * box.label:.1f}">deepest</text>'
    )
    return "".join(out)


def _axis(s: _Scale, units: Units) -> str:
    box, f = s.box, units.factor("m")
    step = round_step(2.5 * s.length * f / (box.right / (3.2 * box.label)))
    out = [f'<line class="hair" x1="0" x2="{box.right:.1f}" y1="{box.foot}" y2="{box.foot}"/>']
    for k in range(int(s.length * f / step + 1e-9) + 1):
        x = k * step / f / s.length * box.right
        label = f"{k * step:g}" if x < box.right - 1.2 * box.label else ""
        anchor = ' class="mid"' if k else ""
        out.append(
            f'<line class="hair2" x1="{x:.1f}" x2="{x:.1f}" y1="{box.foot}" y2="{box.foot + 5:.1f}"/>'
            f'<text{anchor} x="{x:.1f}" y="{box.foot + 5 + box.label:.1f}">{label}</text>'
        )
    out.append(f'<text x="{box.right + 6:.1f}" y="{box.foot + 5 + box.label:.1f}">{units.label("m")}</text>')
    return "".join(out)


def _without_water(profile: Profile, box: Box, units: Units) -> str:
    return (
        f'<svg class="section" viewBox="0 0 {box.width:.0f} {3 * box.label:.0f}" width="{box.width:.0f}" '
        f'height="{3 * box.label:.0f}" aria-hidden="true" font-size="{box.label:.1f}">'
        f'<text x="0" y="{box.label:.1f}">The line crosses no water in this frame.</text></svg>'
    )


def _runs(known: np.ndarray) -> list[np.ndarray]:
    at = np.flatnonzero(known)
    return np.split(at, np.flatnonzero(np.diff(at) > 1) + 1) if at.size else []
