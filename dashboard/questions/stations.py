"""A section through time and beside another: its history on the ribbon, two sections' figures, its stations."""

from __future__ import annotations

from collections.abc import Hashable, Mapping

import numpy as np

from hydro.section import Section, SectionFigures, cut, section_figures
from hydro.section.profile import Profile, profile, thalweg
from hydro.tracks import streamlines

from .. import text
from ..choices import COURSES
from ..reading import Ends
from ..views import profile as profile_view
from ..views import ribbon as strip
from . import common
from .base import Desk

_FIGURES = {  # choice: field of SectionFigures, unit, title
    "discharge": ("discharge_m3_s", "m3/s", "Discharge"), "level": ("mean_level_m", "m", "Level"), "head": ("head_m", "m", "Head"),
    "speed": ("mean_velocity_m_s", "m/s", "Mean speed"), "area": ("area_m2", "m2", "Area"),
}


def course(desk: Desk, ends: Ends) -> strip.Course:
    """The chosen figure of the section in every frame that is known."""
    name, unit, title = _FIGURES[desk.choices.course]
    known = desk.reading.stations(desk.run_id, ends)
    values = [getattr(f, name) if f is not None else None for f in known]
    times = desk.run.times
    amount = np.array([np.nan if v is None else v for v in values])
    return strip.Course(
        times.seconds, times.instants, amount, (), desk.index, window=desk.choices.window, title=title, unit=unit,
        from_zero=name not in ("mean_level_m", "head_m"),
    )


def awaited(desk: Desk, ends: Ends) -> set[Hashable]:
    """Frames in which the section is not measured yet."""
    keys = [("station", desk.run_id, ends, i) for i in range(desk.run.n_frames)]
    return {key for key in keys if not desk.reading.results.have(key)}


def course_words(desk: Desk) -> str:
    """The figure on the ribbon, as a word that changes it; empty for a single frame."""
    if desk.run.n_frames == 1:
        return ""
    offered = {c: _FIGURES[c][2].lower() for c in COURSES}
    return f" Ribbon: {common.chooser('course', desk.choices.course, offered, 'the figure of the section through time')}."


def measured(desk: Desk, ends: Ends) -> tuple[Section, SectionFigures]:
    """A section cut through the chosen moment, and its figures."""
    ledger = desk.reading.ledger(desk.run_id, desk.moment)
    line = cut(ledger.frame, np.array(ends), centre_line=desk.reading.reach(desk.run_id).centre_line)
    return line, section_figures(line, sf=ledger.sf, settings=desk.run.settings)


def rows(desk: Desk, line: Section) -> list[dict[str, object]]:
    """The section's stations from the left bank to the right, SI; a row a piece's end, places in world coordinates."""
    xy = desk.run.mesh.to_world(line.xy.reshape(-1, 2))
    wet = np.repeat(line.wet, 2)
    depth = np.where(wet, line.depth.ravel(), 0.0)
    flow = np.where(wet, line.flow.ravel(), 0.0)
    speed = np.divide(flow, depth, out=np.full(len(depth), np.nan), where=depth > line.frame.wet_depth_m)
    columns = {
        "distance_m": line.distance.ravel(), "x": xy[:, 0], "y": xy[:, 1], "bed_m": line.bed.ravel(), "depth_m": depth,
        "level_m": line.level.ravel(), "unit_discharge_m2_s": flow, "speed_m_s": speed,
    }
    table = zip(*columns.values(), strict=True)
    return [{name: None if np.isnan(v) else float(v) for name, v in zip(columns, row, strict=True)} for row in table]


def along_html(desk: Desk, ends: Ends) -> str:
    """The profile along the thalweg, or along the streamline through the middle of the line's water, HTML."""
    offered = {"thalweg": "the thalweg", "streamline": "the streamline through the middle of the line"}
    chooser = common.chooser("along", desk.choices.along, offered, "the line of the profile")
    title = f'<h2>Profile along {chooser} <span class="beside">downstream to the right; dashed: head; dotted: critical depth</span></h2>'
    try:
        found = _along(desk, ends)
    except ValueError as error:
        return f'{title}<p class="figures">{text.safe(error)}</p>'
    u, loss = desk.units, found.loss()
    words = f"{u.quantity(float(found.distance[-1]), 'm')} long"
    words += f"; head falls by {u.quantity(loss, 'm')} over it" if loss is not None else ""
    if found.jumps:
        words += f"; the flow passes from Froude above 1 to below at {text.listed(u.quantity(j, 'm') for j in found.jumps)}"
    if desk.choices.along == "streamline":
        words += ". Along one streamline head may rise in eddies and shear layers"
    drawn = profile_view.draw(found, max(desk.sizes.ribbon, 280), desk.look.label_px, u)
    return f'{title}{drawn}<p class="figures">{words}.</p>'


def _along(desk: Desk, ends: Ends) -> Profile:
    ledger = desk.reading.ledger(desk.run_id, desk.moment)
    frame, centre = ledger.frame, desk.reading.reach(desk.run_id).centre_line
    assert centre is not None  # one is proposed where the review has none
    if desk.choices.along == "thalweg":
        return profile(frame, thalweg(frame, centre, max(centre.length / 200, 1.0)), settings=desk.run.settings)
    line, _ = measured(desk, ends)
    wet = np.flatnonzero(line.wet)
    if not wet.size:
        raise ValueError("the line crosses no water, so no streamline starts on it; move its ends.")
    track = streamlines(ledger.sf, line.xy[wet[len(wet) // 2]].mean(axis=0)[None]).tracks[0]
    return profile(frame, track.xy, settings=desk.run.settings)


def ends_form(desk: Desk, ends: Ends) -> str:
    """The section's ends as numbers that can be typed, world coordinates, HTML."""
    (x1, y1), (x2, y2) = desk.run.mesh.to_world(np.array(ends)).round(2)
    fields = "".join(
        f'<label>{label} <input type="text" name="{name}" id="ends-{name}" value="{value:.2f}" size="10" data-once></label>'
        for name, label, value in (("x1", "Left end, east", x1), ("y1", "north", y1), ("x2", "Right end, east", x2), ("y2", "north", y2))
    )
    return (
        f'<details><summary class="word">Type the ends of the line</summary><form data-send="ends" class="ask">{fields}'
        '<button type="submit" class="plain">Draw the line</button></form></details>'
    )


def typed_ends(form: Mapping[str, object]) -> tuple[float, float, float, float]:
    """World coordinates typed into the form.

    Raises ``ValueError`` for what is no number and for two ends at one place.
    """
    try:
        x1, y1, x2, y2 = (float(str(form.get(name, ""))) for name in ("x1", "y1", "x2", "y2"))
    except ValueError as error:
        raise ValueError("the ends of the line are not numbers; give east and north in metres, such as 52378.16.") from error
    if not np.isfinite([x1, y1, x2, y2]).all() or np.hypot(x2 - x1, y2 - y1) < 0.1:
        raise ValueError("the line is shorter than 0.1 m; give two ends that lie apart.")
    return x1, y1, x2, y2


def typed_place(form: Mapping[str, object]) -> tuple[float, float]:
    """World x and y typed into the form; ``ValueError`` for what is no number."""
    try:
        x, y = (float(str(form.get(name, ""))) for name in ("x", "y"))
        if np.isfinite([x, y]).all():
            return x, y
    except ValueError:
        pass
    raise ValueError("the place is not two numbers; give east and north in metres, such as 52378.16 and 31120.5.")


def beside_words(desk: Desk, named: Mapping[str, Ends]) -> str:
    """The second section, as a word that changes it; empty without sections in the review."""
    if not named:
        return ""
    offered = {"": "no other", **{name: name for name in named}}
    return f" Beside it: {common.chooser('beside', desk.choices.beside if desk.choices.beside in named else '', offered, 'a second section')}."


def loss_words(desk: Desk, here: SectionFigures, there: SectionFigures, name: str) -> str:
    """What lies between the two sections: fall of level, loss of head, difference of discharge; HTML."""
    u, parts = desk.units, []
    for what, a, b, unit in (
        ("level", here.mean_level_m, there.mean_level_m, "m"), ("head", here.head_m, there.head_m, "m"),
        ("discharge", here.discharge_m3_s, there.discharge_m3_s, "m3/s"),
    ):
        if a is not None and b is not None:
            parts.append(f"{what} {u.quantity(b - a, unit, digits=3)}")
    return f"From this line to {text.safe(name)}: {text.listed(parts)}." if parts else ""
