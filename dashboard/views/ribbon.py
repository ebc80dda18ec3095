"""The time ribbon: discharge, one row a thing that comes and goes, and the cursor; SVG text."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from .. import text
from ..units import Units, step_above

_HOURS = np.array([0.25, 0.5, 1, 2, 3, 6, 12, 24, 48, 24 * 7, 24 * 30]) * 3600.0
_SPANS = np.array([0.1, 0.2, 0.5, 1, 2, 5, 10, 20, 30, 60, 120, 300, 600, 900, 1800, 3600, 7200, 14400, 43200, 86400.0])


@dataclass(frozen=True, eq=False)
class Row:
    """A thing's size at each frame (NaN: not there), drawn as a spindle."""

    name: str
    sizes: np.ndarray
    subject: bool = False


@dataclass(frozen=True, eq=False)
class Course:
    """What the ribbon shows.

    Attributes
    ----------
    seconds : (k,) float64
    instants : (k,) datetime64 or None
    amount : (k,) float64
        What ``title`` and ``unit`` say, by default the discharge; NaN where not known yet.
    rows : sequence of Row
    index : int
        The frame under the cursor.
    more_rows : int
        Things that found no row.
    window : (from, to) or None
        s; the stretch of time whose mean is shown.
    """

    seconds: np.ndarray
    instants: np.ndarray | None
    amount: np.ndarray
    rows: Sequence[Row]
    index: int
    rows_title: str = "Eddies"
    rows_note: str = "size"
    more_rows: int = 0
    window: tuple[float, float] | None = None
    title: str = "Discharge"
    unit: str = "m3/s"
    from_zero: bool = True  # False: the scale begins near the least value, as for levels


@dataclass(frozen=True, slots=True)
class Box:
    """The ribbon's lines, px: its width, the left gutter of names, the right one of the scale, the label size."""

    width: float
    label: float = 13.0

    @property
    def left(self) -> float:
        return 6.4 * self.label

    @property
    def right(self) -> float:
        return self.width - 4.2 * self.label

    @property
    def flag(self) -> float:
        return 1.75 * self.label

    @property
    def base(self) -> float:
        """Foot of the discharge."""
        return self.flag + 4.6 * self.label

    @property
    def row(self) -> float:
        return 1.12 * self.label


def places(course: Course, box: Box) -> np.ndarray:
    """x of each frame, px."""
    s = course.seconds
    span = s[-1] - s[0]
    share = (s - s[0]) / span if span > 0 else np.full(len(s), 0.5)
    return box.left + share * (box.right - box.left)


def draw(course: Course, box: Box, units: Units) -> str:
    """The ribbon as SVG text; colours come from the page's custom properties."""
    if len(course.seconds) == 1:
        return _one_frame(course, box, units)
    x = places(course, box)
    axis = box.base + 0.9 * box.label + len(course.rows) * box.row
    height = axis + 2.1 * box.label
    parts = [_discharge(course, box, units, x), _rows(course, box, x), _axis(course, box, x, axis)]
    parts.append(_window(course, box, axis) if course.window is not None else _cursor(course, box, units, x, axis))
    return (
        f'<svg class="ribbon" viewBox="0 0 {box.width:.0f} {height:.0f}" width="{box.width:.0f}" height="{height:.0f}" '
        f'aria-hidden="true" font-size="{box.label:.1f}">{"".join(parts)}</svg>'
    )


def _one_frame(course: Course, box: Box, units: Units) -> str:
    """A run of one frame has no course of time to show."""
    return (
        f'<svg class="ribbon" viewBox="0 0 {box.width:.0f} {2 * box.label:.0f}" width="{box.width:.0f}" '
        f'height="{2 * box.label:.0f}" aria-hidden="true" font-size="{box.label:.1f}"><text class="second" x="0" '
        f'y="{1.3 * box.label:.1f}">This run holds one frame: {words(course, units)}.</text></svg>'
    )


def words(course: Course, units: Units) -> str:
    """The moment under the cursor, for those who do not see it."""
    q = course.amount[course.index]
    moment = text.moment(_instant(course), course.seconds[course.index])
    return f"{moment}, {_amount(course, units)}" if np.isfinite(q) else moment


def _amount(course: Course, units: Units) -> str:
    """The amount under the cursor; levels with the digits that tell them apart."""
    return units.quantity(course.amount[course.index], course.unit, digits=3 if course.from_zero else 6)


def _instant(course: Course):
    return None if course.instants is None else course.instants[course.index]


def _discharge(course: Course, box: Box, units: Units, x: np.ndarray) -> str:
    q = course.amount
    out = [
        f'<text class="strong" x="0" y="{box.flag + 1.2 * box.label:.1f}">{course.title}</text>'
        f'<text class="second" x="0" y="{box.flag + 2.5 * box.label:.1f}">{units.label(course.unit)}</text>'
        f'<line class="hair" x1="{box.left}" x2="{box.right}" y1="{box.base}" y2="{box.base}"/>'
    ]
    known = np.isfinite(q)
    if known.sum() < 1:
        return out[0]
    f = units.factor(course.unit)
    low, high = (min(float(np.nanmin(q)) * f, 0.0) if course.from_zero else float(np.nanmin(q)) * f), float(np.nanmax(q)) * f
    step = step_above(max(high - low, 1e-9 if course.from_zero else 1e-3) / 3.4)
    low = np.floor(low / step + 1e-9) * step
    top = max(low + 1.06 * (high - low), low + step)
    tall = (box.base - box.flag - 4) / (top - low)
    y = box.base - (q * f - low) * tall
    for run in _pieces(known):
        line = " ".join(f"{a:.1f},{b:.1f}" for a, b in zip(x[run], y[run]))
        if len(run) > 1:
            out.append(
                f'<polygon class="flow" points="{x[run][0]:.1f},{box.base} {line} {x[run][-1]:.1f},{box.base}"/>'
                f'<polyline class="ink" points="{line}"/>'
            )
        else:
            out.append(f'<circle class="dot" cx="{x[run][0]:.1f}" cy="{y[run][0]:.1f}" r="3"/>')
    labels = [f"{round(low + k * step, 6):g}" for k in range(1, int((top - low) / step + 1e-9) + 1)]
    end = min(box.width - 1, box.right + 13 + 0.56 * box.label * max(map(len, labels), default=0))
    for k, label in enumerate(labels, 1):
        at = box.base - k * step * tall
        out.append(
            f'<line class="hair2" x1="{box.right + 3}" x2="{box.right + 9}" y1="{at:.1f}" y2="{at:.1f}"/>'
            f'<text class="end" x="{end:.1f}" y="{at + 0.35 * box.label:.1f}">{label}</text>'
        )
    return "".join(out)


def _rows(course: Course, box: Box, x: np.ndarray) -> str:
    if not len(course.rows):
        return ""
    largest = max((float(np.nanmax(r.sizes)) for r in course.rows if np.isfinite(r.sizes).any()), default=1.0)
    first = box.base + 0.9 * box.label
    out = [
        f'<text class="strong" x="0" y="{first + 0.8 * box.label:.1f}">{course.rows_title}</text>'
        f'<text class="second" x="0" y="{first + 2.1 * box.label:.1f}">{course.rows_note}</text>'
    ]
    for i, row in enumerate(course.rows):
        y = first + (i + 0.4) * box.row
        kind = "subject" if row.subject else "still"
        out.append(
            f'<text class="{kind} end" x="{box.left - 6}" y="{y + 0.35 * box.label:.1f}">{text.safe(row.name)}</text>'
            f'<line class="rule" x1="{box.left}" x2="{box.right}" y1="{y:.1f}" y2="{y:.1f}"/>'
        )
        half = np.sqrt(np.maximum(row.sizes, 0) / max(largest, 1e-12)) * 0.46 * box.row
        for run in _pieces(np.isfinite(half)):
            h = np.maximum(half[run], 0.9)
            if len(run) == 1:
                out.append(f'<circle class="{kind}" cx="{x[run][0]:.1f}" cy="{y:.1f}" r="{max(h[0], 2):.1f}"/>')
                continue
            up = [f"{a:.1f},{y - b:.1f}" for a, b in zip(x[run], h)]
            down = [f"{a:.1f},{y + b:.1f}" for a, b in zip(x[run][::-1], h[::-1])]
            out.append(f'<polygon class="{kind}" points="{" ".join(up + down)}"/>')
    return "".join(out)


def _axis(course: Course, box: Box, x: np.ndarray, y: float) -> str:
    out = [f'<line class="hair" x1="{box.left}" x2="{box.right}" y1="{y:.1f}" y2="{y:.1f}"/>']
    gap = float(np.median(np.diff(x))) if len(x) > 1 else 10.0
    for at in x[:: max(1, int(np.ceil(3 / max(gap, 1e-6))))]:
        out.append(f'<line class="hair" x1="{at:.1f}" x2="{at:.1f}" y1="{y:.1f}" y2="{y + 5:.1f}"/>')
    last = -np.inf
    for at, label in _labels(course, box):
        width = 0.52 * box.label * len(label)
        begin = min(max(at, box.left), box.width - width)
        if begin < last + 10:
            continue
        last = begin + width
        out.append(
            f'<line class="hair2" x1="{at:.1f}" x2="{at:.1f}" y1="{y:.1f}" y2="{y + 9:.1f}"/>'
            f'<text x="{begin:.1f}" y="{y + 9 + 0.95 * box.label:.1f}">{label}</text>'
        )
    return "".join(out)


def _labels(course: Course, box: Box) -> list[tuple[float, str]]:
    """Round moments with their x, the first of a day with its date."""
    s, wide = course.seconds, box.right - box.left
    span = float(s[-1] - s[0])
    if not span > 0:
        return [(box.left, text.moment(_instant(course), s[0]))]
    wanted = span / max(2.0, wide / (11 * box.label))
    if course.instants is None:
        step = _at_least(_SPANS, wanted)
        moments = np.arange(np.ceil(s[0] / step) * step, s[-1] + 1e-9, step)
        return [(box.left + (m - s[0]) / span * wide, text.elapsed(m)) for m in moments]
    step = _at_least(_HOURS, wanted)
    if wanted < _HOURS[0]:
        step = _at_least(_SPANS, wanted)
    start = course.instants[0]
    offset = (start - start.astype("datetime64[D]")) / np.timedelta64(1, "s")
    moments = np.arange(np.ceil(offset / step) * step, offset + span + 1e-9, step)
    out, shown = [], ""
    for m in moments:
        instant = start.astype("datetime64[D]") + np.timedelta64(round(m * 1000), "ms")
        day, hour = text.day(instant), text.clock(instant, 0.0)
        out.append((box.left + (m - offset) / span * wide, hour if day == shown else f"{day} {hour}"))
        shown = day
    return out


def _at_least(steps: np.ndarray, wanted: float) -> float:
    return float(steps[min(int(np.searchsorted(steps, wanted)), len(steps) - 1)])


def _cursor(course: Course, box: Box, units: Units, x: np.ndarray, axis: float) -> str:
    q = course.amount[course.index]
    words = text.clock(_instant(course), course.seconds[course.index])
    if np.isfinite(q):
        words += f" \u00b7 {_amount(course, units)}"
    width = 0.53 * box.label * len(words) + 14
    left = x[course.index] + width > box.width
    start = -width if left else 0.0
    top, b = 0.0, box.label
    return (
        f'<g data-cursor="" transform="translate({x[course.index]:.1f} 0)">'
        f'<line class="case" x1="0" x2="0" y1="{top}" y2="{axis + 2:.1f}"/>'
        f'<line class="cursor" x1="0" x2="0" y1="{top}" y2="{axis + 2:.1f}"/>'
        f'<path class="subject" d="M-6 {axis + 9:.1f} L6 {axis + 9:.1f} L0 {axis:.1f} Z"/>'
        f'<rect class="subject" x="{start - (1 if not left else -1):.1f}" y="0" width="{width:.1f}" height="{1.55 * b:.1f}"/>'
        f'<text class="flag" x="{start + 6:.1f}" y="{1.12 * b:.1f}">{words}</text></g>'
    )


def _window(course: Course, box: Box, axis: float) -> str:
    """The stretch whose mean is shown: a bracket with its length, in place of the cursor."""
    assert course.window is not None
    s = course.seconds
    low, high = (
        box.left + (min(max(v, s[0]), s[-1]) - s[0]) / max(s[-1] - s[0], 1e-9) * (box.right - box.left) for v in course.window
    )
    words = f"mean over {text.elapsed(course.window[1] - course.window[0])}"
    b, width = box.label, 0.53 * box.label * len(words) + 14
    start = min(low, box.width - width)
    return (
        f'<path class="cursor" fill="none" d="M{low:.1f} {axis + 2:.1f} V1 M{high:.1f} {axis + 2:.1f} V1 M{low:.1f} 1 H{high:.1f}"/>'
        f'<rect class="subject" x="{start:.1f}" y="0" width="{width:.1f}" height="{1.55 * b:.1f}"/>'
        f'<text class="flag" x="{start + 6:.1f}" y="{1.12 * b:.1f}">{words}</text>'
    )


def _pieces(known: np.ndarray) -> list[np.ndarray]:
    """Runs of neighbouring True places."""
    at = np.flatnonzero(known)
    return np.split(at, np.flatnonzero(np.diff(at) > 1) + 1) if at.size else []
