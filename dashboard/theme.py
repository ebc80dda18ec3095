"""The one theme: colours, type sizes and line weights of desk, night and hall view.

Warm means dry, blue means water, ink means built or measured, signal means what the sentence speaks
of; nothing else has a colour. Pages, figures and the pack take every colour from here.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from functools import cache

from . import colour

LITERATA = "Literata, Georgia, serif"
ATKINSON = "'Atkinson Hyperlegible Next', system-ui, sans-serif"
EVEN, ODD, NONE = 1, 128, 0  # palette places: first of even tubes, first of odd tubes, no water
SHADES = 127
_ODD_TUBE_LIGHTNESS = 7.0


@dataclass(frozen=True, slots=True)
class Palette:
    """Named colours of one way of looking."""

    paper: str
    ground: str
    ink: str
    ink2: str
    edge: str
    rule: str
    signal: str
    on_signal: str
    slow: str
    middle: str
    fast: str
    more: str
    less: str
    blank: str
    dark: bool = False


LIGHT = Palette(
    "#F3F5F3", "#E9DFC9", "#14232B", "#45545B", "#6F7B80", "#C6CCC9", "#A8321A", "#FFFFFF",
    "#E1EDEF", "#9CC3D3", "#508CAB", "#1F5F83", "#4B5357", "#E6EDF0",
)
DARK = Palette(
    "#0E181D", "#2C2619", "#ECEAE0", "#A9B5B8", "#7C8A90", "#2A373D", "#FF8A66", "#1A0D08",
    "#0F2A36", "#205670", "#3C7896", "#6FB6D9", "#B4BAB8", "#13232B", dark=True,
)
HALL = Palette(
    "#FFFFFF", "#EFE3C6", "#0B171D", "#2E3D44", "#5A666B", "#B9C1C0", "#9E2A12", "#FFFFFF",
    "#E6F2F6", "#9CC3D8", "#4F8DB0", "#164F70", "#33393C", "#F1F7FC",
)


@dataclass(frozen=True, slots=True)
class Look:
    """A palette with the sizes that go with it: labels in px, lines as a factor of the desk's."""

    name: str
    palette: Palette
    label_px: float = 13.0
    line: float = 1.0

    @property
    def hall(self) -> bool:
        return self.line > 1.0


def look(mode: str, *, hall: bool = False, width_px: int = 1440) -> Look:
    """The look for mode "day" or "night"; in the hall view sizes are shares of the picture's width."""
    night = mode == "night"
    if hall:
        return Look("hall night" if night else "hall", DARK if night else HALL, max(20.0 * width_px / 1440, 13.0), 1.6)
    return Look("night" if night else "day", DARK if night else LIGHT)


@cache
def water_palette(palette: Palette) -> tuple[str, ...]:
    """256 colours for the map: 0 none, 1-127 even tubes from slow to fast, 128-254 odd tubes."""
    even = colour.ramp([palette.slow, palette.middle, palette.fast], SHADES)
    odd = even.copy()
    odd[:, 0] += _ODD_TUBE_LIGHTNESS if palette.dark else -_ODD_TUBE_LIGHTNESS
    shades = [colour.hexed(c) for band in (even, odd) for c in colour.from_lab(band)]
    return ("#00000000", *shades, "#00000000")


def css(palette: Palette) -> str:
    """The palette as CSS custom properties, with the water's knots of both tubes."""
    named = {f.name.replace("_", "-"): getattr(palette, f.name) for f in fields(palette) if f.name != "dark"}
    shades = water_palette(palette)
    named |= {f"water-{i}": shades[EVEN + round(i * (SHADES - 1) / 4)] for i in range(5)}
    named |= {"tube-even": shades[EVEN + SHADES // 3], "tube-odd": shades[ODD + SHADES // 2]}
    return "".join(f"--{name}:{value};" for name, value in named.items())


def stylesheet() -> str:
    """CSS rules that give the page its colours by the attributes of its root element."""
    rules = ((":root", LIGHT), (":root[data-view=hall]", HALL), (":root[data-mode=night]", DARK))
    return "".join(
        f"{where}{{color-scheme:{'dark' if p.dark else 'light'};{css(p)}}}\n" for where, p in rules
    )
