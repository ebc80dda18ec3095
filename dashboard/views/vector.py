"""A drawn map as SVG: the same sheet and the same picture of the water as on the screen, to keep or to print."""

from __future__ import annotations

import base64
import io

import numpy as np
from PIL import Image

from ..raster import View
from ..text import safe
from ..theme import Look, water_palette
from ..units import Units, round_step
from .sheet import Sheet

_DASHES = {"solid": "", "dashed": "6 4", "dotted": "1 3"}
_FAMILIES = {"literata": "Literata, Georgia, serif"}
_HATCHES = {  # paths in a square of the hatch's scale
    "/": "M0 {s} L{s} 0 M-1 1 L1 -1 M{m} {p} L{p} {m}", "\\": "M0 0 L{s} {s} M-1 {m} L1 {p} M{m} -1 L{p} 1",
    "-": "M0 {h} H{s}", "|": "M{h} 0 V{s}", "x": "M0 0 L{s} {s} M0 {s} L{s} 0",
}


def map_svg(
    sheet: Sheet, picture: np.ndarray | None, picture_view: View | None, view: View, look: Look, units: Units, *,
    section: tuple[tuple[float, float], tuple[float, float]] | None = None, ramp: tuple[str, float, str] | None = None,
) -> str:
    """The map of one view, in px, with its frame, north and scale bar.

    ``picture`` (rows, columns) uint8 holds the water's palette bytes, rows from the south, over ``picture_view``;
    ``ramp`` is what its shade tells, the value at its end and the unit.
    """
    pen = _Pen(view)
    parts = [f'<rect width="{view.columns}" height="{view.rows}" fill="{look.palette.ground}"/>']
    if picture is not None and picture_view is not None:
        parts.append(_water(picture, picture_view, pen, look))
    parts += [pen.line(row) for row in _rows(sheet.under)]
    parts += [pen.area(row) for row in _rows(sheet.areas)]
    parts += [pen.line(row) for row in _rows(sheet.over)]
    if section is not None:
        parts.append(_section(section, pen, look))
    parts += [pen.text(row) for row in _rows(sheet.texts)]
    parts += [_north(view, look), _scale(view, look, units)]
    if ramp is not None and picture is not None:
        parts.append(_ramp(*ramp, look, units))
    frame = f'<rect width="{view.columns}" height="{view.rows}" fill="none" stroke="{look.palette.ink}" stroke-width="3"/>'
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {view.columns} {view.rows}" width="{view.columns}" '
        f'height="{view.rows}"><defs>{"".join(pen.patterns.values())}</defs>{"".join(parts)}{frame}</svg>'
    )


class _Pen:
    """From local m to px of the view, and the hatches that were needed."""

    def __init__(self, view: View) -> None:
        self.view = view
        self.west, _, _, self.north = view.extent
        self.patterns: dict[tuple, str] = {}

    def px(self, xs, ys) -> np.ndarray:
        return np.column_stack([np.asarray(xs, float) - self.west, self.north - np.asarray(ys, float)]) / self.view.step

    def line(self, row: dict) -> str:
        dash = row["dash"] if isinstance(row["dash"], str) else " ".join(str(v) for v in row["dash"])
        dash = _DASHES.get(dash, dash)
        px = self.px(row["xs"], row["ys"])
        gaps = np.flatnonzero(np.isnan(px[:, 0]))  # NaN parts one line from the next
        path = " ".join(f"M{_points(p)}" for p in (p[~np.isnan(p[:, 0])] for p in np.split(px, gaps)) if len(p) > 1)
        return (
            f'<path d="{path}" fill="none" stroke="{row["colour"]}" '
            f'stroke-width="{row["width"]:.2f}" stroke-opacity="{row["alpha"]:g}" stroke-linecap="round" stroke-linejoin="round"'
            f'{f" stroke-dasharray={chr(34)}{dash}{chr(34)}" if dash else ""}/>'
        )

    def area(self, row: dict) -> str:
        path = " ".join(
            f"M{_points(self.px(xs, ys))} Z" for parts_x, parts_y in zip(row["xs"], row["ys"]) for xs, ys in zip(parts_x, parts_y)
        )
        shape = f'<path d="{path}" fill-rule="evenodd"'
        out = f'{shape} fill="{row["fill"]}" fill-opacity="{row["alpha"]:g}"/>'
        if row["hatch"].strip():
            out += f'{shape} fill="{self.hatch(row)}"/>'
        if row["width"] > 0:
            out += f'{shape} fill="none" stroke="{row["line"]}" stroke-width="{row["width"]:.2f}"/>'
        return out

    def hatch(self, row: dict) -> str:
        key = (row["hatch"], row["hatch_colour"], row["hatch_scale"], row["hatch_weight"])
        name = f"hatch-{len(self.patterns)}"
        if key in self.patterns:
            return f"url(#hatch-{list(self.patterns).index(key)})"
        kind, colour, s, weight = key
        if kind == ".":
            mark = f'<circle cx="{s / 2:g}" cy="{s / 2:g}" r="{weight:g}" fill="{colour}"/>'
        else:
            d = _HATCHES[kind].format(s=s, h=s / 2, m=s - 1, p=s + 1)
            mark = f'<path d="{d}" fill="none" stroke="{colour}" stroke-width="{weight:g}"/>'
        self.patterns[key] = f'<pattern id="{name}" width="{s:g}" height="{s:g}" patternUnits="userSpaceOnUse">{mark}</pattern>'
        return f"url(#{name})"

    def text(self, row: dict) -> str:
        (x, y), = self.px([row["x"]], [row["y"]])
        size, pad = row["size"], 3 + row["pad"] / 2
        width = 0.56 * size * len(row["text"]) + 2 * pad
        turn = f' transform="rotate({-np.degrees(row["angle"]):.1f} {x:.1f} {y:.1f})"' if row["angle"] else ""
        out = ""
        if row["fill_alpha"] or not row["border"].endswith("00"):
            dash = _DASHES.get(row["dash"], "")
            out = (
                f'<rect x="{x - width / 2:.1f}" y="{y - 0.62 * size - pad:.1f}" width="{width:.1f}" height="{1.24 * size + 2 * pad:.1f}" '
                f'rx="2" fill="{row["fill"]}" fill-opacity="{row["fill_alpha"]:g}" stroke="{row["border"]}"'
                f'{f" stroke-dasharray={chr(34)}{dash}{chr(34)}" if dash else ""}{turn}/>'
            )
        family = _FAMILIES.get(row["font"])
        kind = (' font-weight="650"' if row["font"] == "bold" else "") + (' font-style="italic"' if row["style"] == "italic" else "")
        return out + (
            f'<text x="{x:.1f}" y="{y + 0.35 * size:.1f}" font-size="{size:.1f}" text-anchor="middle" '
            f'style="fill:{row["colour"]}{";font-family:" + family if family else ""}"{kind}{turn}>{safe(row["text"])}</text>'
        )


def _rows(columns: dict[str, list]) -> list[dict]:
    return [dict(zip(columns, values)) for values in zip(*columns.values())]


def _points(px: np.ndarray) -> str:
    return " ".join(f"{x:.1f},{y:.1f}" for x, y in px)


def _water(picture: np.ndarray, wide: View, pen: _Pen, look: Look) -> str:
    colours = np.array([[int(c[i : i + 2], 16) for i in (1, 3, 5)] + [0 if len(c) > 7 else 255] for c in water_palette(look.palette)], np.uint8)
    out = io.BytesIO()
    Image.fromarray(colours[picture][::-1], "RGBA").save(out, "PNG")
    west, south, east, north = wide.extent
    (x0, y0), (x1, y1) = pen.px([west, east], [north, south])
    return (
        f'<image x="{x0:.1f}" y="{y0:.1f}" width="{x1 - x0:.1f}" height="{y1 - y0:.1f}" preserveAspectRatio="none" '
        f'href="data:image/png;base64,{base64.b64encode(out.getvalue()).decode()}"/>'
    )


def _section(ends, pen: _Pen, look: Look) -> str:
    p = look.palette
    left, right = pen.px(*np.array(ends).T)
    line = f'x1="{left[0]:.1f}" y1="{left[1]:.1f}" x2="{right[0]:.1f}" y2="{right[1]:.1f}"'
    rings = "".join(
        f'<circle cx="{x:.1f}" cy="{y:.1f}" r="11" fill="{p.paper}" stroke="{p.ink}" stroke-width="1.5"/>'
        f'<text x="{x:.1f}" y="{y + 4.5:.1f}" font-size="13" font-weight="650" text-anchor="middle">{word}</text>'
        for (x, y), word in ((left, "L"), (right, "R"))
    )
    return (
        f'<line {line} stroke="{p.paper}" stroke-width="4.6"/>'
        f'<line {line} stroke="{p.ink}" stroke-width="1.8" stroke-dasharray="12 4 2 4"/>{rings}'
    )


def _north(view: View, look: Look) -> str:
    p, x = look.palette, view.columns - 24
    arrow = f"M{x} 60 V30 M{x - 5} 37 L{x} 30 L{x + 5} 37"
    return (
        f'<path d="{arrow}" fill="none" stroke="{p.paper}" stroke-width="4"/><path d="{arrow}" fill="none" stroke="{p.ink}" '
        f'stroke-width="1.5"/><text x="{x}" y="25" font-size="13" font-weight="650" text-anchor="middle">N</text>'
    )


def _ramp(title: str, top: float, unit: str, look: Look, units: Units) -> str:
    p, shades = look.palette, water_palette(look.palette)
    stops = "".join(f'<stop offset="{k / 4}" stop-color="{shades[1 + round(k * 126 / 4)]}"/>' for k in range(5))
    end = top * units.factor(unit)
    numbers = "".join(
        f'<text x="{22 + 75 * k}" y="72" font-size="13" text-anchor="{("start", "middle", "end")[k]}">{end * k / 2:.3g}{"+" if k == 2 else ""}</text>'
        for k in range(3)
    )
    return (
        f'<defs><linearGradient id="ramp">{stops}</linearGradient></defs><rect x="14" y="14" width="168" height="66" fill="{p.paper}" '
        f'fill-opacity="0.82"/><text x="22" y="33" font-size="13">{title}, {units.label(unit)}</text>'
        f'<rect x="22" y="42" width="150" height="11" fill="url(#ramp)" stroke="{p.ink}"/>{numbers}'
    )


def _scale(view: View, look: Look, units: Units) -> str:
    p, f = look.palette, units.factor("m")
    length = round_step(130 * view.step * f)
    px = length / f / view.step
    x, y = view.columns - px - 40, view.rows - 18
    return (
        f'<rect x="{x - 8:.1f}" y="{y - 24}" width="{px + 42:.1f}" height="36" fill="{p.paper}" fill-opacity="0.82"/>'
        f'<rect x="{x:.1f}" y="{y}" width="{px / 2:.1f}" height="5" fill="{p.ink}" stroke="{p.ink}"/>'
        f'<rect x="{x + px / 2:.1f}" y="{y}" width="{px / 2:.1f}" height="5" fill="{p.paper}" stroke="{p.ink}"/>'
        f'<text x="{x:.1f}" y="{y - 7}" font-size="13">0</text>'
        f'<text x="{x + px:.1f}" y="{y - 7}" font-size="13" text-anchor="middle">{length:g} {units.label("m")}</text>'
    )
