"""A drawn map as plain columns: areas, lines and texts in order, back to front."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import shapely

from .strokes import rings

_AREA = ("xs", "ys", "fill", "alpha", "hatch", "hatch_colour", "hatch_scale", "hatch_weight", "line", "width")
_LINE = ("xs", "ys", "colour", "width", "alpha", "dash")
_TEXT = ("x", "y", "text", "colour", "fill", "fill_alpha", "border", "dash", "angle", "style", "font", "size", "pad")


def _columns(names: tuple[str, ...]) -> dict[str, list]:
    return {name: [] for name in names}


@dataclass
class Sheet:
    """Marks in local m, styled, ready for any renderer; ``hidden`` counts labels that found no room.

    ``key`` is the corner where the key covers nothing of the section: "nw", "sw" or "ne".
    """

    under: dict[str, list] = field(default_factory=lambda: _columns(_LINE))
    areas: dict[str, list] = field(default_factory=lambda: _columns(_AREA))
    over: dict[str, list] = field(default_factory=lambda: _columns(_LINE))
    texts: dict[str, list] = field(default_factory=lambda: _columns(_TEXT))
    hidden: int = 0
    key: str = "nw"

    def area(
        self, shape: shapely.Geometry, *, fill: str = "#ffffff", alpha: float = 0.0, hatch: str = " ",
        hatch_colour: str = "#000000", hatch_scale: float = 11.0, hatch_weight: float = 1.0, line: str = "#000000",
        width: float = 0.0,
    ) -> None:
        """A polygon or multipolygon, filled, hatched and outlined."""
        xs, ys = rings(shape)
        if xs:
            _add(self.areas, xs, ys, fill, alpha, hatch, hatch_colour, hatch_scale, hatch_weight, line, width)

    def line(
        self, points: np.ndarray, colour: str, width: float, *, alpha: float = 1.0, dash: str = "solid", under: bool = False,
    ) -> None:
        """A line; ``under`` puts it below all areas."""
        if len(points):
            _add(self.under if under else self.over, points[:, 0], points[:, 1], colour, width, alpha, dash)

    def text(
        self, x: float, y: float, text: str, colour: str, *, size: float, fill: str = "#ffffff", fill_alpha: float = 0.0,
        border: str | None = None, dash: str = "solid", angle: float = 0.0, style: str = "normal", font: str = "atkinson",
        pad: float = 0.0,
    ) -> None:
        """A label about its middle; ``border`` draws its edge."""
        _add(
            self.texts, x, y, text, colour, fill, fill_alpha, border or "#00000000", dash, angle, style, font, size, pad,
        )


def _add(columns: dict[str, list], *values) -> None:
    for name, value in zip(columns, values, strict=True):
        columns[name].append(value)
