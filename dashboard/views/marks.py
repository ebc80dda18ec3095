"""Glyphs that no font has, as SVG text: turning marks, triangles, the key, north and the scale bar."""

from __future__ import annotations

import numpy as np

from ..units import Units, round_step
from .strokes import turning_mark


def turning(rotation: str) -> str:
    """A turning mark for a line of text."""
    arc, *head = turning_mark(np.zeros(2), 6.0, rotation)
    lines = "".join(
        f'<polyline points="{" ".join(f"{8 + x:.2f},{8 - y:.2f}" for x, y in stroke)}"/>' for stroke in (arc, *head)
    )
    return f'<svg class="turn" viewBox="0 0 16 16" role="img" aria-label="{rotation}">{lines}</svg>'


def triangle(filled: bool) -> str:
    """The triangle of separation (filled) or reattachment (open) for a caption."""
    kind = "full" if filled else "open"
    return f'<svg class="tri {kind}" viewBox="0 0 14 14" aria-hidden="true"><path d="M7 1.5 L12.5 12 L1.5 12 Z"/></svg>'


def north() -> str:
    """A plain arrow with its letter; the map's y axis is north."""
    return (
        '<svg class="north" viewBox="0 0 20 48" role="img" aria-label="North is up"><text x="10" y="12">N</text>'
        '<path class="casing" d="M10 46 L10 17 M5.5 24 L10 17 L14.5 24"/><path d="M10 46 L10 17 M5.5 24 L10 17 L14.5 24"/></svg>'
    )


def scale_bar(step_m: float, units: Units, *, label: float = 13.0) -> str:
    """A bar half ink half paper of a round length; ``step_m`` is m a pixel."""
    f = units.factor("m")
    length = round_step(10 * label * step_m * f)
    px = length / f / step_m
    high = 0.4 * label
    return (
        f'<svg class="scale" width="{px + 4 * label:.0f}" height="{2.1 * label:.0f}" role="img" '
        f'aria-label="Scale bar {length:g} {units.label("m")}" font-size="{label}">'
        f'<rect class="half" x="4" y="{1.35 * label:.1f}" width="{px / 2:.1f}" height="{high:.1f}"/>'
        f'<rect class="rest" x="{4 + px / 2:.1f}" y="{1.35 * label:.1f}" width="{px / 2:.1f}" height="{high:.1f}"/>'
        f'<text x="4" y="{label:.1f}">0</text>'
        f'<text class="end" x="{px + 4:.1f}" y="{label:.1f}">{length:g} {units.label("m")}</text></svg>'
    )


def ramp_key(title: str, top: float, unit: str, units: Units) -> str:
    """The ramp with its numbers, as HTML."""
    stops = ", ".join(f"var(--water-{i}) {25 * i}%" for i in range(5))
    end = top * units.factor(unit)
    numbers = "".join(f"<span>{end * k / 2:.3g}{'+' if k == 2 else ''}</span>" for k in range(3))
    return (
        f'<div class="ramp"><span>{title}, {units.label(unit)}</span><div class="bar" style="background:linear-gradient(to right, '
        f'{stops})"></div><div class="numbers">{numbers}</div></div>'
    )


def hatch_key() -> str:
    """How the two senses of rotation are hatched, as HTML."""
    def swatch(down: bool) -> str:
        lines = "".join(f'<path d="M{x} {0 if down else 13} l13 {13 if down else -13}"/>' for x in range(-12, 28, 5))
        return f'<svg class="swatch" viewBox="0 0 28 13" aria-hidden="true">{lines}<rect x=".5" y=".5" width="27" height="12"/></svg>'

    return (
        f'<div class="hatches"><div>{swatch(False)} clockwise seen from above</div>'
        f"<div>{swatch(True)} anticlockwise</div></div>"
    )


