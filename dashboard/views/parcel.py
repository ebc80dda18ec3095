"""A parcel on the page: its path with ticks, where it is now, and what is said of it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from hydro.cautions import CAUTIONS

from .. import text
from ..parcels import A_TICK, Parcel, Place
from ..units import Units
from .scene import LineMark, PointMark, Scene, Tag

_ENDED = {
    "left": "then leaves the model", "at a wall": "then stops at a wall", "closed": "and comes back to where it began",
    "limit reached": "and is followed no further", "still water": "then lies in still water", "aground": "then runs aground",
    "afloat": "and is still afloat when the run ends", "outside the water": "",
}
_FORM = (
    '<details class="inline"><summary class="word">let a parcel go</summary><form data-send="parcel">'
    '<label for="parcel-x">East</label><input type="text" name="x" id="parcel-x" size="9" inputmode="decimal" required>'
    '<label for="parcel-y">North</label><input type="text" name="y" id="parcel-y" size="9" inputmode="decimal" required>'
    '<button type="submit" class="plain">Let go</button></form></details>'
)


def form() -> str:
    """The word of the caption that takes a place by its coordinates."""
    return _FORM


def onto(scene: Scene, parcel: Parcel | None, line: np.ndarray | None, seconds: float) -> Scene:
    """A scene with the parcel's path, the parcel at a moment, and the streamline through its start."""
    lines, points = list(scene.lines), list(scene.points)
    if line is not None and len(line) > 1:
        lines.append(LineMark("streamline", line))
    if parcel is None:
        return replace(scene, lines=tuple(lines))
    if len(parcel.xy) > 1:
        lines.append(LineMark("pathline", parcel.xy, tick=A_TICK))
    points.append(PointMark("parcel", parcel.xy[0] if parcel.steady else parcel.at(seconds)))
    end = parcel.xy[-1]
    return replace(scene, lines=tuple(lines), points=tuple(points), tags=(*scene.tags, Tag("parcel", (float(end[0]), float(end[1])))))


def words(parcel: Parcel, place: Place, units: Units, line: bool) -> str:
    """Where it went and why it ended, what it must not be used for, and how to take it away."""
    where = f"Parcel let go at {place[0]:.1f}, {place[1]:.1f}"
    if parcel.ended == "outside the water":
        told = f"{where}: there is no water there."
    elif len(parcel.xy) < 2:
        told = f"{where}: it does not move."
    else:
        went = f"{units.quantity(parcel.length_m, 'm')} in {text.elapsed(parcel.seconds[-1] - parcel.seconds[0])}"
        along = " along the streamline of this frame" if parcel.steady else ""
        told = f"{where} goes {went}{along}, {_ENDED[parcel.ended]}; a tick every {text.elapsed(parcel.tick_s)}."
        if line and not parcel.steady:
            told += " Thin: the streamline through the place in this frame."
    return (
        f"{told} <b>{CAUTIONS['public-water'].text}</b> {CAUTIONS['tracing'].text} "
        '<button type="button" class="word" data-do="parcel" data-value="" data-key="parcel-away">take it away</button>'
    )
