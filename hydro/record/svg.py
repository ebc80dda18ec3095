"""Small vector drawings in millimetres: the few marks that a plate needs, as SVG text."""

from __future__ import annotations

import base64
import io
from collections.abc import Iterable
from dataclasses import dataclass, field
from html import escape

import numpy as np


@dataclass
class Drawing:
    """A sheet of ``width`` x ``height`` mm; y grows downwards, as in SVG."""

    width: float
    height: float
    font: str = "Libertinus Serif"
    _marks: list[str] = field(default_factory=list)
    _patterns: list[str] = field(default_factory=list)

    def line(self, points: np.ndarray, *, ink: str, width: float, dash: str = "", close: bool = False, fill: str = "none"):
        """A polyline or polygon through points (k, 2), mm."""
        body = " ".join(f"{x:.3f},{y:.3f}" for x, y in points)
        name = "polygon" if close else "polyline"
        dashes = f' stroke-dasharray="{dash}"' if dash else ""
        self._marks.append(
            f'<{name} points="{body}" fill="{fill}" stroke="{ink}" stroke-width="{width}" stroke-linejoin="round"{dashes}/>'
        )

    def area(self, rings: Iterable[np.ndarray], *, fill: str, opacity: float = 1.0):
        """A filled polygon of several rings, holes left out."""
        path = " ".join("M" + " L".join(f"{x:.3f} {y:.3f}" for x, y in ring) + " Z" for ring in rings)
        self._marks.append(f'<path d="{path}" fill="{fill}" fill-opacity="{opacity}" fill-rule="evenodd" stroke="none"/>')

    def hatch(self, *, rising: bool, ink: str, spacing: float = 1.6, width: float = 0.15) -> str:
        """A fill of lines rising or falling to the right; returns the paint to use as ``fill``."""
        name = f"hatch{len(self._patterns)}"
        angle = -45 if rising else 45
        self._patterns.append(
            f'<pattern id="{name}" width="{spacing}" height="{spacing}" patternUnits="userSpaceOnUse" '
            f'patternTransform="rotate({angle})"><line x1="0" y1="0" x2="{spacing}" y2="0" stroke="{ink}" '
            f'stroke-width="{width}"/></pattern>'
        )
        return f"url(#{name})"

    def text(self, x: float, y: float, text: str, *, size: float = 2.6, ink: str, anchor: str = "start", italic=False, halo=""):
        """Text with its baseline at (x, y); ``halo`` is the colour of a strip of paper behind it."""
        style = ' font-style="italic"' if italic else ""
        if halo:
            width = 0.48 * size * len(text) + 0.6
            left = x - {"start": 0.3, "middle": width / 2, "end": width - 0.3}[anchor]
            self._marks.append(
                f'<rect x="{left:.3f}" y="{y - 0.8 * size:.3f}" width="{width:.3f}" height="{1.05 * size:.3f}" '
                f'fill="{halo}" fill-opacity="0.85"/>'
            )
        self._marks.append(
            f'<text x="{x:.3f}" y="{y:.3f}" font-family="{self.font}" font-size="{size}" text-anchor="{anchor}" '
            f'fill="{ink}"{style}>{escape(text)}</text>'
        )

    def image(self, rgb: np.ndarray, x: float, y: float, width: float, height: float):
        """A picture (rows, columns, 3) uint8, its first row at the top."""
        from PIL import Image

        stream = io.BytesIO()
        Image.fromarray(rgb).save(stream, format="PNG", optimize=True)
        data = base64.b64encode(stream.getvalue()).decode("ascii")
        self._marks.append(
            f'<image x="{x:.3f}" y="{y:.3f}" width="{width:.3f}" height="{height:.3f}" preserveAspectRatio="none" '
            f'href="data:image/png;base64,{data}"/>'
        )

    def svg(self) -> str:
        """The sheet as SVG text."""
        head = (
            f'<svg xmlns="http://www.w3.org/2000/svg" width="{self.width}mm" height="{self.height}mm" '
            f'viewBox="0 0 {self.width} {self.height}">'
        )
        defs = f"<defs>{''.join(self._patterns)}</defs>" if self._patterns else ""
        return head + defs + "".join(self._marks) + "</svg>"
