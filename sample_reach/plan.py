"""plan.png: an invented site plan with its world file, as a backdrop for the sample review."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from PIL import Image, ImageDraw

from . import geometry as geo

STEP = 0.5  # m a pixel
_MARGIN = 70.0  # m of land drawn round the course
_WHITE, _FIELD, _HEDGE, _ROAD, _BUILDING = 255, 225, 120, 70, 40
_BUILDINGS = ((425.0, -52.0, 26.0, 12.0), (452.0, -60.0, 14.0, 10.0), (628.0, 52.0, 12.0, 9.0), (700.0, -48.0, 10.0, 8.0))  # s, n, length, width


def write_plan(path: Path) -> None:
    """Draw the plan and write it with its world file."""
    course = geo.course()
    line = course.at(np.arange(0.0, geo.LENGTH + 1, 5.0))
    west, south = np.floor(line.min(axis=0) - _MARGIN)
    east, north = np.ceil(line.max(axis=0) + _MARGIN)
    sheet = Image.new("L", (int((east - west) / STEP), int((north - south) / STEP)), _WHITE)
    pen = ImageDraw.Draw(sheet)

    def pixels(points: np.ndarray) -> list[tuple[float, float]]:
        return [((x - west) / STEP, (north - y) / STEP) for x, y in points]

    s = np.arange(0.0, geo.LENGTH + 1, 5.0)
    for side in (1, -1):
        for near, far, first, last in ((28.0, 62.0, 30.0, 250.0), (30.0, 66.0, 270.0, 400.0), (34.0, 60.0, 690.0, 880.0)):
            part = s[(s >= first) & (s <= last)]
            field = np.vstack([course.at(part, side * near), course.at(part[::-1], side * far)])
            pen.polygon(pixels(field), fill=_FIELD)
            pen.line(pixels(np.vstack([field, field[:1]])), fill=_HEDGE, width=2)
    pen.line(pixels(course.at([geo.BRIDGE] * 2, [200.0, -200.0])), fill=_ROAD, width=int(7 / STEP))
    pen.line(pixels(course.at([geo.BRIDGE] * 2, [200.0, -200.0])), fill=_WHITE, width=int(5.5 / STEP))
    pen.line(pixels(course.at([geo.BRIDGE - 4, 560.0, 470.0, 436.0], [-75.0, -72.0, -70.0, -64.0])), fill=_ROAD, width=4)
    for at, offset, length, width in _BUILDINGS:
        corners = course.at(at + length / 2 * np.array([-1, 1, 1, -1]), offset + width / 2 * np.array([-1, -1, 1, 1]))
        pen.polygon(pixels(corners), fill=_BUILDING)
    draw = np.random.default_rng(5)
    for _ in range(160):
        x, y = course.at(draw.uniform(0, geo.LENGTH), draw.choice([-1, 1]) * draw.uniform(24.0, 30.0))[0]
        (column, row), r = pixels(np.array([[x, y]]))[0], draw.uniform(3.0, 7.0)
        pen.ellipse((column - r, row - r, column + r, row + r), outline=_HEDGE, width=1)
    # The bare paper is left out, so that land keeps its colour.
    drawn = Image.merge("LA", (sheet, sheet.point(lambda grey: 0 if grey == _WHITE else 255)))
    drawn.save(path, optimize=True)
    x0, y0 = geo.ORIGIN
    lines = (STEP, 0.0, 0.0, -STEP, x0 + west + STEP / 2, y0 + north - STEP / 2)
    path.with_suffix(".pgw").write_text("".join(f"{v:.3f}\n" for v in lines), encoding="ascii")
