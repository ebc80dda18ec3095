"""Drawings that leave the page: one sheet as SVG, with its title, its words and every caution that it owes.

A sheet stands alone: the page's colours and type are written into it. Lengths are millimetres, so that a map
keeps its scale in print.
"""

from __future__ import annotations

import base64
import re
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache

from hydro.cautions import CAUTIONS

from . import colour, theme
from .text import safe
from .wire import WEB

_MM_PER_PX = 25.4 / 96
_MARGIN, _TITLE, _WORDS = 8.0, 5.2, 3.2  # mm: margin, size of the title, of the words
_FONT = "Atkinson Hyperlegible Next"


@dataclass(frozen=True, slots=True)
class File:
    """A file for the reader to keep: SVG and CSV as text; ``picture`` asks the browser for a PNG of the SVG."""

    name: str
    text: str
    picture: bool = False


@dataclass(frozen=True, slots=True)
class Drawn:
    """An SVG element with its size on the sheet, mm."""

    svg: str
    width: float
    height: float


def of_page(svg: str) -> Drawn:
    """A drawing of the page, at the size that it has there."""
    found = re.search(r'width="([\d.]+)" height="([\d.]+)"', svg)
    if found is None:
        raise ValueError("the drawing has no size; it cannot be put on a sheet.")
    return Drawn(svg, *(float(v) * _MM_PER_PX for v in found.groups()))


def sheet(title: str, words: Sequence[str], drawings: Sequence[Drawn], cautions: Sequence[str]) -> str:
    """One sheet: the title, drawings under each other, lines of words, and the cautions by their ids.

    ``title`` and ``words`` are plain text.
    """
    width = max(120.0, *(d.width for d in drawings)) + 2 * _MARGIN
    y = _MARGIN + _TITLE
    parts = [_text(title, y, _TITLE, bold=True)]
    y += 0.6 * _TITLE
    for drawn in drawings:
        parts.append(_placed(drawn, y))
        y += drawn.height + 3.0
    lines = [line for text in words for line in _wrapped(text, width)]
    told = [line for i, id_ in enumerate(cautions) for line in _wrapped(f"{chr(ord('a') + i)}  {CAUTIONS[id_].text}", width)]
    for line in [*lines, "", "Cautions", *told] if told else lines:
        y += 1.35 * _WORDS
        parts.append(_text(line, y, _WORDS, bold=line == "Cautions"))
    height = y + _MARGIN
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{width:.1f}mm" height="{height:.1f}mm" '
        f'viewBox="0 0 {width:.1f} {height:.1f}"><style>{_styles()}</style>'
        f'<rect width="100%" height="100%" fill="{theme.LIGHT.paper}"/>{"".join(parts)}</svg>'
    )


def _placed(drawn: Drawn, y: float) -> str:
    """The drawing as an element of the sheet."""
    head, rest = drawn.svg.split(">", 1)
    view = re.search(r'viewBox="[^"]*"', head)
    kind = re.search(r'class="[^"]*"', head)
    size = re.search(r'font-size="[^"]*"', head)
    kept = " ".join(m.group(0) for m in (view, kind, size) if m)
    return f'<svg x="{_MARGIN}" y="{y:.2f}" width="{drawn.width:.2f}" height="{drawn.height:.2f}" {kept}>{rest}'


def _text(line: str, y: float, size: float, *, bold: bool = False) -> str:
    weight = ' font-weight="650"' if bold else ""
    return f'<text class="words" x="{_MARGIN}" y="{y:.2f}" font-size="{size}"{weight}>{safe(line)}</text>'


def _wrapped(text: str, width: float) -> list[str]:
    return textwrap.wrap(text, int((width - 2 * _MARGIN) / (0.56 * _WORDS)), break_on_hyphens=False) or [""]


@cache
def _styles() -> str:
    """The page's rules for drawings, with every custom property resolved, and the font itself."""
    font = base64.b64encode((WEB / "fonts" / "atkinson-hyperlegible-next-latin-wght-normal.woff2").read_bytes()).decode()
    css = (WEB / "desk.css").read_text(encoding="utf-8")
    css = re.sub(r"/\*.*?\*/", "", css, flags=re.S)
    rules = [
        f"{selectors.strip()}{{{body}}}" for selectors, body in re.findall(r"([^{}]+)\{([^{}]*)\}", css)
        if all(re.match(r"(svg|text|\.end)", s.strip()) for s in selectors.split(","))
    ]
    face = f"@font-face{{font-family:'{_FONT}';font-weight:200 900;src:url(data:font/woff2;base64,{font})}}"
    ours = f"text{{font-family:{theme.ATKINSON};fill:{theme.LIGHT.ink}}}"
    return face + ours + resolved("".join(rules), theme.LIGHT)


def resolved(css: str, palette: theme.Palette) -> str:
    """CSS with its custom properties, products and mixed colours worked out, for programs that know none of them."""
    known = dict(re.findall(r"--([\w-]+):([^;]+);", theme.css(palette))) | {"stroke": "1", "atkinson": theme.ATKINSON}

    def value(found: re.Match[str]) -> str:
        if found.group(1) not in known:
            raise ValueError(f"the style sheet uses --{found.group(1)}, which has no value on a sheet; give it one.")
        return known[found.group(1)]

    css = re.sub(r"var\(--([\w-]+)\)", value, css)
    css = re.sub(r"calc\(([\d.]+)px \* ([\d.]+)\)", lambda m: f"{float(m[1]) * float(m[2]):g}px", css)
    return re.sub(
        r"color-mix\(in srgb, (#\w{6}) ([\d.]+)%, (#\w{6})\)", lambda m: colour.mixed(m[1], m[3], float(m[2]) / 100), css
    )
