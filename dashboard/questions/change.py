"""Change: what does the proposal change, and is that more than can be told apart?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import shapely

from hydro.cautions import OWED
from hydro.change import Change as Compared
from hydro.change import Difference
from hydro.change.answers import Beside
from hydro.change.eddies import ZoneChange
from hydro.checks import AFFLUX
from hydro.eddies import Zone
from hydro.figure import Figure, shown, signed

from .. import text
from ..raster import View
from ..results import Working
from ..units import Units
from ..views import marks, swipe, table
from ..views import ribbon as strip
from ..views.scene import AreaMark, LineMark, Scene, Tag, Water, ZoneMark
from . import common
from .base import Desk, Question, footnote

_ROUND_A_PLACE = 120.0  # m: width of the map that a sentence takes its reader to
_CONVERTED = ("m", "m/s", "m2/s")  # units that the reader may have chosen otherwise
SPEED_STEP = 0.1  # m/s: smaller changes of speed stay blank on the map (Leewater's own, stated in the caption)


class Change(Question):
    """One run against another of the same event."""

    key = "change"
    word = "Change"
    asks = "What does the proposal change, and is that more than can be told apart?"
    places = (("subject", "the works"),)

    def summary(self, desk: Desk) -> str:
        other = self.other(desk)
        if not other:
            return "needs two runs of one event"
        change = desk.reading.known(("change", desk.run_id, desk.index, other))
        if change is None:
            return f"against {desk.reading.label(other)}"
        now = len(change.ledger_b.zones.zones)
        return f"{now} {'eddy' if now == 1 else 'eddies'}, were {len(change.ledger_a.zones.zones)}"

    def sentence(self, desk: Desk) -> str:
        if not self.other(desk):
            return "Change needs a second run of the same event, of another design; this review has none beside this run."
        change, u, ids = self.change(desk), desk.units, self.cautions(desk)
        parts = []
        gone = [z for z in change.zones if z.state == "gone"]
        if gone:
            names = text.listed(text.safe(u.sentence(z.name)) for z in gone[:2])
            more = f" and {len(gone) - 2} more" if len(gone) > 2 else ""
            parts.append(f'{names}{more} <em class="subject">{"is" if len(gone) == 1 else "are"} gone</em>')
        kept = [z for z in change.zones if z.area_change_m2 is not None and z.told_apart]
        if kept:
            z = max(kept, key=lambda k: abs(k.area_change_m2 or 0.0))
            grows = "grows" if (z.area_change_m2 or 0) > 0 else "shrinks"
            parts.append(f"{text.safe(u.sentence(z.name))} {grows} by <b>{u.quantity(abs(z.area_change_m2 or 0.0), 'm2')}</b>")
        levels = change.levels
        if levels is not None and levels.headline >= 0:
            i = levels.headline
            rise = f"<b>{u.quantity(float(levels.rise[i]), 'm', digits=2)}</b>"
            if levels.told_apart:
                parts.append(f"outside the works the level rises by at most {rise}{footnote(ids, 'change')}")
            else:
                parts.append(f"the greatest rise of level, {rise}, cannot be told apart{footnote(ids, 'change')}")
        if not parts:
            return "Nothing changes by more than can be told apart."
        sentence = "; ".join(parts)
        return f"With {text.safe(desk.reading.label(self.other(desk)))}: {sentence}."

    def scene(self, desk: Desk) -> Scene:
        scene = common.water_scene(desk)
        if not self.other(desk) or not scene.shore:
            return scene
        if desk.choices.compared == "swipe":
            return self._side_by_side(desk, scene)
        change = self.change(desk)
        faster, slower = desk.studies.change_areas(desk.run_id, desk.index, self.other(desk), SPEED_STEP)
        areas = [AreaMark("dots", faster, "more"), AreaMark("levels", slower, "less")]
        for chosen, pattern in ((change.maps.newly_wet, "wet"), (change.maps.no_longer_wet, "dry")):
            if chosen.any():
                areas.append(AreaMark(pattern, _faces(change, chosen)))
        lines, tags = [], []
        frame = change.ledger_a.frame
        still = Water(frame, np.zeros_like(frame.speed), 1.0)  # the water's shade tells nothing here
        for z in change.zones:
            for side, dotted in ((z.a, True), (z.b, False)):
                if side is not None:
                    lines += [_outline(side, "dotted" if dotted else "streamline", z.state == "gone")]
            zone = z.b or z.a
            if zone is not None:
                tags.append(Tag(_tag(z, desk.units), tuple(zone.centre), z.state == "gone"))
        return replace(
            scene, water=still, areas=tuple(a for a in areas if not a.area.is_empty), lines=tuple(lines), tags=tuple(tags),
            section=None,
        )

    def _side_by_side(self, desk: Desk, scene: Scene) -> Scene:
        """This run left of the divider, the other right of it, at one time and with one ramp."""
        other, reading = self.other(desk), desk.reading
        change, frame = self.change(desk), desk.studies.pair(desk.run_id, desk.index, other).b
        reading.tubes(other, frame, desk.choices.tubes)  # until psi is there, nothing is drawn of it
        second = replace(desk, choices=desk.choices.with_(run=other, seconds=float(reading.run(other).times.seconds[frame])))
        there = common.water_scene(second)
        assert scene.water is not None and there.water is not None and desk.view is not None  # a map is drawn in a view
        top = max(scene.water.top, there.water.top)
        zones = [tuple(_mark(z, side) for z in change.zones if (side := getattr(z, name)) is not None) for name in ("a", "b")]
        west, _, east, _ = desk.view.extent
        return swipe.joined(
            replace(scene, water=replace(scene.water, top=top), zones=zones[0], section=None),
            replace(there, water=replace(there.water, top=top), zones=zones[1]),
            other, west + desk.choices.divider * (east - west), np.subtract(change.b.mesh.origin, change.a.mesh.origin),
            (reading.label(desk.run_id), reading.label(other)),
        )

    def swipe(self, desk: Desk) -> dict[str, object] | None:
        other = self.other(desk)
        if desk.choices.compared != "swipe" or not other:
            return None
        return {"share": desk.choices.divider, "left": desk.reading.label(desk.run_id), "right": desk.reading.label(other)}

    def place_of(self, desk: Desk, number: int) -> tuple[float, float, float]:
        """Local centre and width, m, of a map that shows what a sentence speaks of.

        Raises ``ValueError`` for a sentence without a place.
        """
        findings = self.change(desk).findings
        at = findings[number].at if 0 <= number < len(findings) else None
        if at is None:
            raise ValueError(f"sentence {number + 1} of the comparison names no place; choose another.")
        x, y = at
        return x, y, _ROUND_A_PLACE

    def view(self, desk: Desk):
        if not self.other(desk):
            return None
        change = self.change(desk)
        bounds = [z.contour.bounds for c in change.zones for z in (c.a, c.b) if z is not None and c.state != "not distinguishable"]
        if not bounds:
            return None
        b = np.array(bounds)
        x, y, width = common.view_of(desk, (*b[:, :2].min(axis=0), *b[:, 2:].max(axis=0)), None)
        return x, y, max(width, 90.0)  # the works' surroundings belong to the answer

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        runs = dict(desk.reading.matter().runs)
        offered = {i: label for i, label in runs.items() if i != desk.run_id}
        if not offered:
            return "<i>Plate 6.</i> There is one run only."
        other = common.chooser("against", self.other(desk), {"": "choose a run", **offered}, "the run that is compared")
        ways = {"difference": "Difference", "swipe": "Swipe"}
        way = common.chooser("compared", desk.choices.compared, ways, "how the two runs stand on the map")
        mine = text.safe(runs[desk.run_id])
        if desk.choices.compared == "swipe":
            here, there = (desk.units.quantity(w.water.tube_m3_s if w and w.water else 0.0, "m3/s") for w in (scene, scene.beside))
            right = f" Right of the divider a tube carries {there}." if scene.beside is not None and there != here else ""
            return f"<i>Plate 6.</i> {way}: left of the divider {mine}, right of it {other}. {common.water_words(desk, scene)}{right}"
        step = desk.units.quantity(SPEED_STEP, "m/s", digits=1)
        return (
            f"<i>Plate 6.</i> {way}: {other} less {mine}; speed changed by less than {step} is blank. Eddies: dotted "
            "before, drawn out after."
        )

    def key_html(self, desk: Desk) -> str:
        if desk.choices.compared == "swipe" and self.other(desk):
            shade = desk.choices.shade
            top = max(desk.reading.top(i, shade) for i in (desk.run_id, self.other(desk)))
            return marks.ramp_key(shade.capitalize(), top, "m/s" if shade == "speed" else "m", desk.units)
        return (
            '<div class="hatches"><div><svg class="swatch more" viewBox="0 0 28 13" aria-hidden="true">'
            '<g><circle cx="5" cy="4" r="1.3"/><circle cx="11" cy="9" r="1.3"/><circle cx="17" cy="4" r="1.3"/>'
            '<circle cx="23" cy="9" r="1.3"/></g><rect x=".5" y=".5" width="27" height="12"/></svg> faster</div>'
            '<div><svg class="swatch less" viewBox="0 0 28 13" aria-hidden="true"><path d="M0 4h28M0 9h28"/>'
            '<rect x=".5" y=".5" width="27" height="12"/></svg> slower</div></div>'
        )

    def alternative(self, desk: Desk) -> str:
        if not self.other(desk):
            return ""
        told = desk.units.sentence(" ".join(f.sentence for f in self.change(desk).findings))
        stands = self.swipe(desk)
        return f"Left of the divider {stands['left']}, right of it {stands['right']}. {told}" if stands else told

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(common.plain_course(desk), common.ribbon_box(desk), desk.units)

    def moments(self, desk: Desk) -> dict[str, object]:
        return common.moments(desk)

    def side(self, desk: Desk) -> dict[str, str]:
        if not self.other(desk):
            return {}
        change, u, ids = self.change(desk), desk.units, self.cautions(desk)
        columns = (
            table.Column("Eddy", figure=False), table.Column("before,", u.label("m2")), table.Column("after,", u.label("m2")),
            table.Column("change,", u.label("m2")), table.Column(f"told apart{footnote(ids, 'change')}", figure=False),
        )
        lines = [_zone_line(z, u) for z in change.zones]
        zones = table.html(table.Table("Eddies, matched", "", "Eddies of both runs", columns, lines, "No eddy in either run."))
        first = "".join(f"<li>{_told(f.sentence, i, f.at is not None, u)}</li>" for i, f in enumerate(change.findings))
        before = "".join(f"<li>{text.safe(_differs(d, desk.units))}</li>" for d in change.setup)
        said = f"<h2>In words</h2><ul>{first}</ul>" if first else ""
        beside = _beside(desk.studies.answers(desk.run_id, desk.index, self.other(desk)), u)
        differs = before or "<li>Nothing that Leewater can see.</li>"
        return {"table": zones, "body": f"{said}{beside}<h2>What differs outside the works</h2><ul>{differs}</ul>"}

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        try:
            rows = desk.studies.answers(desk.run_id, desk.index, self.other(desk)) if self.other(desk) else []
        except (Working, ValueError, OSError):  # the screen's other parts wait for it, or say why it cannot be
            rows = []
        return tuple(dict.fromkeys([*OWED["change"], *(c for r in rows for f in (r.a, r.b) for c in f.cautions)]))

    def other(self, desk: Desk) -> str:
        """The run compared with the chosen one: the reader's, else another design's of the same event."""
        review = desk.reading.matter().review
        if review is None:
            return ""
        if desk.choices.against and desk.choices.against != desk.run_id:
            return desk.choices.against
        mine = review.entry(desk.run_id)
        for entry in review.runs:
            if entry.event == mine.event and entry.design != mine.design and entry.variant == mine.variant:
                return entry.id
        return ""

    def change(self, desk: Desk) -> Compared:
        """The comparison of the chosen frame with the other run's."""
        return desk.studies.change(desk.run_id, desk.index, self.other(desk))


def _beside(rows: list[Beside], u: Units) -> str:
    """Receptors, checks, wood and fish of both runs in one table."""
    if not rows:
        return ""

    def cell(f: Figure, unit: str) -> str:
        if f.value is None or not np.isfinite(f.value):
            return text.safe(f.note or "none")
        if unit not in _CONVERTED:
            return shown(f)
        factor = u.factor(unit)
        said = shown(replace(f, value=f.value * factor, low=f.low and f.low * factor, high=f.high and f.high * factor))
        return f"\u2212{said[1:]}" if said.startswith("-") else said

    lines = []
    for r in rows:
        told = {True: "yes", False: "no", None: "not known"}[r.told_apart]
        change = "" if r.difference is None else u.number(r.difference, r.unit, digits=2) if r.unit in _CONVERTED else signed(r.difference, 2)
        decision = "" if r.answers is None else {
            True: f"changes: {r.answers[0]}, then {r.answers[1]}", False: f"stays: {r.answers[0]}", None: r.answers[1] if r.figure == AFFLUX else f"before {r.answers[0]}, after {r.answers[1]}",
        }[r.decision_changes]
        unit = u.label(r.unit) if r.unit in _CONVERTED else r.unit
        name = f'{text.safe(r.place)}<span class="under">{text.safe(r.figure)}{f", {unit}" if unit else ""}</span>'
        lines.append(table.Line(
            ((name, ""), (cell(r.a, r.unit), ""), (cell(r.b, r.unit), ""), (change, ""), (told, ""), (text.safe(decision), "")),
            bool(r.decision_changes),
        ))
    columns = (
        table.Column("Receptor, check, pier or fish", figure=False), table.Column("before"), table.Column("after"), table.Column("change"),
        table.Column("told apart", figure=False), table.Column("decision", figure=False),
    )
    return table.html(table.Table("Answers side by side", "", "Answers of both runs", columns, lines, ""))


def _faces(change: Compared, chosen: np.ndarray) -> shapely.Geometry:
    mesh = change.ledger_a.frame.mesh
    return shapely.union_all(shapely.polygons(mesh.node_xy[mesh.triangles[chosen[mesh.triangle_face]]]))


def _outline(zone: Zone, kind: str, subject: bool) -> LineMark:
    part = max(shapely.get_parts(zone.contour), key=lambda p: p.area)
    return LineMark(kind, shapely.get_coordinates(part.exterior), subject=subject)


def _mark(change: ZoneChange, zone: Zone) -> ZoneMark:
    """An eddy of either run under the one name that both have in the comparison."""
    return replace(common.zone_mark(zone, change.state == "gone"), tag=change.zone.id)


def _told(sentence: str, number: int, placed: bool, u: Units) -> str:
    """A sentence; one with a place is a button that takes the map there."""
    words = text.safe(u.sentence(sentence))
    if not placed:
        return words
    return f'<button type="button" class="tale" data-do="visit" data-value="{number}" data-key="visit-{number}">{words}</button>'


def _tag(z: ZoneChange, units: Units) -> str:
    zone = z.b or z.a
    name = zone.id if zone is not None else ""
    if z.area_change_m2 is None:
        return f"{name} {z.state}"
    sign = "+" if z.area_change_m2 > 0 else "\u2212"
    return f"{name} {sign}{units.quantity(abs(z.area_change_m2), 'm2', digits=2)}"


def _differs(d: Difference, u: Units) -> str:
    """A difference of the set-up in display units; what the files say of themselves stays as they say it."""
    return d.sentence if d.what == "statement" else u.sentence(d.sentence)


def _zone_line(z: ZoneChange, u: Units) -> table.Line:
    def area(zone: Zone | None) -> str:
        return "none" if zone is None else u.number(zone.area_m2, "m2", *zone.sensitivity.get("area_m2", (None, None)))

    change = z.state if z.area_change_m2 is None else u.number(z.area_change_m2, "m2", digits=2)
    told = "yes" if z.told_apart else "no"
    return table.Line(
        ((text.safe(u.sentence(z.name)), ""), (area(z.a), ""), (area(z.b), ""), (change, ""), (told, "")), z.state == "gone",
    )
