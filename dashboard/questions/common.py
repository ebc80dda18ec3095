"""What several questions show alike: structures, names, the section beside the map, controls in captions."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import shapely

from hydro.eddies import Zone
from hydro.eddies.travelling import Traveller
from hydro.ledger import FrameLedger
from hydro.reach import CentreLine, Structure
from hydro.section import Section, SectionFigures, cut, section_figures
from hydro.section.cut import runs_right_to_left
from hydro.transfer import barycentric

from .. import text
from ..choices import SHADES, TUBES
from ..reading import Ends, Story
from ..results import Working
from ..units import Units
from ..views import marks, ribbon, section
from ..views.scene import LineMark, Name, Scene, StructureMark, Tag, Water, ZoneMark
from .base import Desk, footnote

UNDER_RESOLVED = "under-resolved"
_WIDEST = 240.0  # m: a first map that shows a thing is no wider because of it
_REACH = 150.0  # m to each side of the centre line that a first section may go
_PIER = 12.0  # m of dry ground that a section steps over
_NOTED = 0.02  # difference of two discharges of one section that is spoken of
_BANK = 2.0  # m that it goes up each bank


def structures(desk: Desk) -> tuple[StructureMark, ...]:
    """The structures of the chosen run's design."""
    return tuple(
        StructureMark(_labelled(s), s.kind, s.geometry, s.represented_as in ("hole", "dry"))
        for s in desk.reading.reach(desk.run_id).structures
    )


def water_scene(desk: Desk) -> Scene:
    """Water in its tubes, banks, structures and names; only the water's shade until psi is there."""
    reading, run_id, moment = desk.reading, desk.run_id, desk.moment
    frame, shade = reading.frame(run_id, moment), desk.choices.shade
    value = frame.speed if shade == "speed" else frame.depth
    water = Water(frame, value, reading.top(run_id, shade))
    scene = Scene(water=water, structures=structures(desk), names=names(desk))
    try:
        ledger = reading.ledger(run_id, moment)
        lines, tube = reading.tubes(run_id, moment, desk.choices.tubes)
    except (Working, ValueError):  # the sentence says which; the water is shown meanwhile
        return scene
    water = replace(water, psi=ledger.sf.psi, tube_m3_s=tube, carries=ledger.sf.domain, tube_lines=lines)
    paths, tags = link_marks(ledger, desk.units)
    return replace(scene, water=water, shore=reading.shore(run_id, moment), lines=paths, tags=tags)


def link_marks(ledger: FrameLedger, units: Units) -> tuple[tuple[LineMark, ...], tuple[Tag, ...]]:
    """The paths along which psi jumps, dotted, each named with what its link carries."""
    xy, links = ledger.frame.mesh.node_xy, ledger.sf.links
    lines = tuple(LineMark("dotted", xy[link.path.nodes]) for link in links)
    tags = tuple(
        Tag(f"{link.path.name}, {units.quantity(link.discharge_m3_s, 'm3/s', digits=2)}", (float(at[0]), float(at[1])))
        for link in links for at in [xy[link.path.nodes[len(link.path.nodes) // 2]]]
    )
    return lines, tags


def zone_mark(zone: Zone, subject: bool) -> ZoneMark:
    """How an eddy stands on the map, with two of its streamlines."""
    return ZoneMark(
        zone.id, zone.contour, tuple(zone.streamlines[1::2][:2]), zone.rotation, np.asarray(zone.centre), subject,
        UNDER_RESOLVED in zone.flags, zone.kind == "travelling", zone.separation, zone.reattachment,
    )


def traveller_mark(eddy: Traveller, units: Units) -> ZoneMark:
    """How a travelling eddy stands on the map: its outline in the view that moves with it, else its core."""
    speed = units.quantity(float(np.hypot(*eddy.speed)), "m/s", digits=2)
    outline = eddy.contour if eddy.contour is not None else shapely.Point(eddy.core.centre).buffer(eddy.core.radius_m)
    return ZoneMark(f"{eddy.id}, {speed}", outline, (), eddy.core.rotation, eddy.core.centre, travelling=True)


def water_words(desk: Desk, scene: Scene) -> str:
    """"Speed in 22 tubes of 3.3 m3/s: narrow is fast." with its words as controls."""
    choices = desk.choices
    tube = scene.water.tube_m3_s if scene.water is not None else 0.0
    shade = chooser("shade", choices.shade, {s: s.capitalize() for s in SHADES}, "what the shade of the water tells")
    count = chooser("tubes", str(choices.tubes), {str(t): f"{t} tubes" for t in TUBES}, "number of stream tubes")
    of = f" of {desk.units.quantity(tube, 'm3/s')}" if tube else ""
    return f"{shade} in {count}{of}: narrow is fast."


def ramp_key(desk: Desk) -> str:
    """The ramp with its numbers."""
    shade = desk.choices.shade
    top = desk.reading.top(desk.run_id, shade)
    return marks.ramp_key(shade.capitalize(), top, "m/s" if shade == "speed" else "m", desk.units)


def _labelled(structure: Structure) -> str:
    """Its name; a deck stands above the water, and a pier that water passes through says how it is modelled."""
    if structure.kind == "deck":
        return f"{structure.name}, above" if "above" not in structure.name else structure.name
    if structure.kind == "pier" and structure.represented_as not in ("hole", "dry"):
        return f"{structure.name}, as {structure.represented_as}"
    return structure.name


def names(desk: Desk) -> tuple[Name, ...]:
    """Banks and the direction of flow, placed in the part of the reach that is in view."""
    reach = desk.reading.reach(desk.run_id)
    centre = reach.centre_line
    if centre is None or desk.view is None:
        return ()
    west, south, east, north = desk.view.extent
    chainage = np.linspace(0, centre.length, 400)
    at = centre.at(chainage)
    inside = (at[:, 0] > west) & (at[:, 0] < east) & (at[:, 1] > south) & (at[:, 1] < north)
    if not inside.any():
        return ()
    s = chainage[inside]
    start = float(s[0] + 0.06 * (s[-1] - s[0]))
    direction = centre.direction(np.array([start]))[0]
    x, y = centre.at(np.array([start]))[0]
    return (Name("flow", float(x), float(y), _readable(direction), arrow=True),)


def _readable(direction: np.ndarray) -> float:
    return float(np.arctan2(direction[1], direction[0]))


def view_of(desk: Desk, bounds, ends) -> tuple[float, float, float]:
    """Centre and width, m, of a map that holds a thing and the section through it, with room round them."""
    thing = max(bounds[2] - bounds[0], bounds[3] - bounds[1])
    across = [*np.min(ends, axis=0), *np.max(ends, axis=0)] if ends else bounds
    # An eddy along a whole bank is looked at where its section is: the rest of it would show nothing.
    boxes = np.array([across, bounds] if thing < _WIDEST / 2 else [across])
    west, south = boxes[:, :2].min(axis=0)
    east, north = boxes[:, 2:].max(axis=0)
    columns, rows = desk.sizes.map
    width = max(1.5 * (east - west), 1.5 * (north - south) * columns / rows, min(4.0 * thing, _WIDEST), 40.0)
    return float((west + east) / 2), float((south + north) / 2), float(width)


def chooser(name: str, chosen: str, offered: Mapping[str, str], label: str) -> str:
    """A word of the caption that changes it: a native list in the caption's own type."""
    options = "".join(
        f'<option value="{text.safe(v)}"{" selected" if v == chosen else ""}>{text.safe(words)}</option>'
        for v, words in offered.items()
    )
    return f'<select class="word" data-choose="{name}" id="choose-{name}" aria-label="{text.safe(label)}">{options}</select>'


def discharge(story: Story) -> np.ndarray:
    """Through-discharge by frame, NaN where not known."""
    return np.array([b.discharge_m3_s if b else np.nan for b in story.beats])


def plain_course(desk: Desk) -> ribbon.Course:
    """The ribbon without rows: discharge and the cursor."""
    times = desk.run.times
    found = discharge(desk.reading.story(desk.run_id))
    return ribbon.Course(times.seconds, times.instants, found, (), desk.index)


def ribbon_box(desk: Desk) -> ribbon.Box:
    """The ribbon's lines for this look and window."""
    return ribbon.Box(max(desk.sizes.ribbon, 280), desk.look.label_px)


def moments(desk: Desk) -> dict[str, object]:
    """What the slider under the ribbon needs to know; never waits for a frame's figures."""
    return moments_of(plain_course(desk), desk)


def moments_of(course: ribbon.Course, desk: Desk) -> dict[str, object]:
    """The same of any course of time."""
    return {
        "index": course.index, "last": len(course.seconds) - 1, "words": ribbon.words(course, desk.units),
        "places": [round(float(x), 1) for x in ribbon.places(course, ribbon_box(desk))],
    }


def natural(name: str) -> tuple:
    """Sort key that puts E2 before E10."""
    return tuple(int(p) if p.isdigit() else p for p in re.split(r"(\d+)", name))


def chosen_ends(desk: Desk) -> Ends:
    """The reader's section, local m, turned so that the left bank comes first."""
    assert desk.choices.section is not None
    x1, y1, x2, y2 = desk.choices.section
    line = desk.run.mesh.to_local(np.array([[x1, y1], [x2, y2]]))
    if runs_right_to_left(line, _centre_line(desk)):
        line = line[::-1]
    return (float(line[0, 0]), float(line[0, 1])), (float(line[1, 0]), float(line[1, 1]))


def first_ends(desk: Desk, zone: Zone | None) -> Ends:
    """A section where the reader has drawn none: across the river at the subject, else in the middle."""
    centre = _centre_line(desk)
    at = np.asarray(zone.centre) if zone is not None else centre.at(np.array([centre.length / 2]))[0]
    chainage, offset = (float(v[0]) for v in centre.locate(at))
    return across(desk, chainage, offset)


def _centre_line(desk: Desk) -> CentreLine:
    centre = desk.reading.reach(desk.run_id).centre_line
    assert centre is not None  # one is proposed where the review has none
    return centre


def length(desk: Desk) -> float:
    """Length of the centre line, m."""
    return _centre_line(desk).length


def across(desk: Desk, chainage: float, offset: float = 0.0) -> Ends:
    """A line square to the centre line through the water round an offset, from bank to bank."""
    centre, mesh = _centre_line(desk), desk.run.mesh
    frame = desk.reading.frame(desk.run_id, desk.moment)
    offsets = np.arange(_REACH, -_REACH - 0.5, -0.5)
    points = np.vstack([centre.at(np.array([chainage]), float(o)) for o in offsets])
    found = mesh.find(points)
    wet = (found >= 0) & frame.wet_triangles[np.maximum(found, 0)]
    at = offsets[wet]
    if not at.size:
        ends = points[[0, -1]]
    else:
        groups = np.split(at, np.flatnonzero(-np.diff(at) > _PIER) + 1)
        chosen = min(groups, key=lambda g: max(g[-1] - offset, offset - g[0], 0.0))
        ends = np.vstack([centre.at(np.array([chainage]), float(o)) for o in (chosen[0] + _BANK, chosen[-1] - _BANK)])
    return (float(ends[0, 0]), float(ends[0, 1])), (float(ends[1, 0]), float(ends[1, 1]))


def section_html(desk: Desk, ends, ledger: FrameLedger, subject: shapely.Geometry | None, ids: tuple[str, ...]) -> str:
    """The section beside the map, with its discharge by the field and by psi."""
    if ends is None:
        return ""
    u, title = desk.units, '<h2>Section <span class="beside">looking downstream; hanging bars: back upstream</span></h2>'
    if desk.look.hall:
        title = '<h2>Section <span class="beside">looking downstream</span></h2>'
    try:
        line = cut(ledger.frame, np.array(ends), centre_line=desk.reading.reach(desk.run_id).centre_line)
    except ValueError as error:
        return f'{title}<p class="figures">{text.safe(error)}</p>'
    figures = section_figures(line, sf=ledger.sf, settings=desk.run.settings)
    tube = desk.reading.known(("tubes", desk.run_id, desk.moment, desk.choices.tubes))
    profile = profile_of(line, ledger, tube[1] if tube else 0.0, subject)
    box = section.Box(max(desk.sizes.section, 260), desk.look.label_px, 0.72 if desk.look.hall else 1.0)
    passes = f"Passes <b>{u.quantity(figures.discharge_m3_s, 'm3/s')}</b> by the field"
    if figures.discharge_psi_m3_s is not None:
        passes += f", <b>{u.quantity(figures.discharge_psi_m3_s, 'm3/s')}</b> by psi"
    mean = f" at a mean of {u.quantity(figures.mean_velocity_m_s, 'm/s')}" if figures.mean_velocity_m_s is not None else ""
    flags = f" {text.safe('; '.join(figures.flags)).capitalize()}." if figures.flags else ""
    flags += _why_they_differ(figures, ledger.sf.storage_m3_s, desk)
    return (
        f'{title}{section.draw(profile, box, u)}<p class="figures">{passes}{footnote(ids, "section-discharge")}; '
        f"{u.quantity(figures.area_m2, 'm2')} of water{mean}.{flags}</p>"
    )


def _why_they_differ(figures: SectionFigures, storage: float | None, desk: Desk) -> str:
    """Why the discharge by the field and by psi differ by more than a little; empty where they do not."""
    if figures.discharge_psi_m3_s is None:
        return ""
    gap, u = figures.discharge_m3_s - figures.discharge_psi_m3_s, desk.units
    if abs(gap) <= _NOTED * max(abs(figures.discharge_m3_s), abs(figures.discharge_psi_m3_s)):
        return ""
    if storage is None or abs(storage) < abs(gap) / 2:
        return f" They differ by {u.quantity(abs(gap), 'm3/s')}: the field does not carry one discharge along the reach; see Arrival."
    stored = u.quantity(abs(storage), "m3/s")
    how = f"{stored} goes into storage along the reach as the water rises" if storage > 0 else f"{stored} comes out of storage as the water falls"
    return f" They differ because {how}; psi leaves that out."


def profile_of(line: Section, ledger: FrameLedger, tube: float, subject: shapely.Geometry | None) -> section.Profile:
    """A cut as the drawing wants it: one station after the other, with gaps where the line leaves the mesh."""
    corners = line.frame.mesh.triangles[line.triangle]
    weight = barycentric(line.frame.mesh.node_xy, np.repeat(corners, 2, axis=0), line.xy.reshape(-1, 2))
    psi = (weight * ledger.sf.corners(np.repeat(line.triangle, 2))).sum(axis=1).reshape(-1, 2)
    wet = line.wet[:, None] & (line.depth > line.frame.wet_depth_m)
    speed = np.where(wet, line.flow / np.where(wet, line.depth, 1.0), np.nan)
    after = np.flatnonzero(line.distance[1:, 0] - line.distance[:-1, 1] > 1e-6) + 1

    def stations(values: np.ndarray, gap: float | np.ndarray = np.nan) -> np.ndarray:
        return np.insert(values.ravel(), 2 * after, gap)

    return section.Profile(
        stations(line.distance, line.distance[after, 0]), stations(line.bed), stations(np.where(wet, line.level, np.nan)), stations(speed),
        stations(psi), tube, crossing(line.points, subject) if subject is not None else None, line.length,
    )


def crossing(ends, outline: shapely.Geometry) -> tuple[float, float] | None:
    """From and to, m along the section, where it runs inside an outline."""
    line = shapely.LineString(ends)
    cut = line.intersection(outline)
    if cut.is_empty:
        return None
    at = [line.project(shapely.Point(c)) for c in shapely.get_coordinates(cut)]
    return min(at), max(at)
