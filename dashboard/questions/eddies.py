"""Eddies: where does the water turn back on itself, and how much of it?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from shapely import get_coordinates, get_parts

from hydro.cautions import OWED
from hydro.eddies import Zone
from hydro.eddies.sensitivity import range_outlines
from hydro.eddies.travelling import Traveller
from hydro.ledger import FrameLedger, ledger_json
from hydro.ledger.export import rows_of

from .. import text
from ..raster import View
from ..reading import Story
from ..results import Working
from ..units import Units
from ..views import marks, table
from ..views import ribbon as strip
from ..views.scene import LineMark, Scene
from . import common
from .base import Desk, Question, footnote
from .moments import instants_words, life_words, moment_words, window_words

_ROWS_DESK, _ROWS_HALL = 6, 1


class Eddies(Question):
    """The question that Leewater is named for."""

    key = "eddies"
    word = "Eddies"
    asks = "Where does the water turn back on itself, and how much of it?"

    places = (("subject", "the eddy"),)
    has_section = True
    numbered = ("figures",)

    def summary(self, desk: Desk) -> str:
        ledger = desk.reading.known(("ledger", desk.run_id, desk.moment))
        if ledger is None:
            return "being found"
        zones = ledger.zones.zones
        if not zones:
            return "none in this mean" if isinstance(desk.moment, tuple) else "none in this frame"
        largest = max(zones, key=lambda z: z.area_m2)
        area = desk.units.quantity(largest.area_m2, "m2", *_span(largest, "area_m2"))
        return f"{len(zones)} {'eddy' if len(zones) == 1 else 'eddies'}, largest {area}"

    def sentence(self, desk: Desk) -> str:
        ledger = self.ledger(desk)
        zones, zone = ledger.zones.zones, self.subject(desk)
        here = _here(desk, ledger)
        if not ledger.sf.drawn:
            return "Storage explains more than half of the flow in this frame, so it has no eddies to tell of."
        if zone is None:
            rest = len(ledger.zones.small)
            more = f" {text.count(rest, 'region')} under the floor {'is' if rest == 1 else 'are'} left out." if rest else ""
            return f"No eddy turns {here}.{more}"
        largest = zone.area_m2 == max(z.area_m2 for z in zones)
        u, ids = desk.units, self.cautions(desk)
        # Until the eddies are followed through the run they have numbers, not names.
        called = "eddy " if zone.id.isdigit() else ""
        who = f'{called}<em class="subject">{text.safe(zone.id)}</em> {_where(zone, desk.units)}'
        first = f"{text.count(len(zones), 'eddy', 'eddies')} turn {here}. {'The largest' if largest else 'Of these'}, {who},"
        if len(zones) == 1:
            first = f"One eddy turns {here}: {who}. It"
        area = u.quantity(zone.area_m2, "m2", *_span(zone, "area_m2"))
        flow = u.quantity(
            zone.recirculating_discharge_m3_s, "m3/s", *_span(zone, "recirculating_discharge_m3_s")
        )
        share = zone.share_of_through_discharge
        river = f", {text.percent(share)} of the river" if share is not None else ""
        if desk.look.hall and share is not None:
            flow, river = text.percent(share), " of the river"
        answer = (
            f"{first} covers <b>{area}</b>{footnote(ids, 'sensitivity')} and "
            f"takes <b>{flow}</b>{river + ' round with it' if desk.look.hall else ' round with it' + river}."
        )
        return f"{answer} {self.in_moments(desk, zone)}" if isinstance(desk.moment, tuple) else answer

    def scene(self, desk: Desk) -> Scene:
        scene = common.water_scene(desk)
        if not scene.shore:
            return scene
        chosen = self.subject_id(desk)
        found = self.ledger(desk).zones
        zones = tuple(common.zone_mark(z, z.id == chosen) for z in found.zones)
        zones += tuple(common.traveller_mark(t, desk.units) for t in found.travelling)
        return replace(scene, zones=zones, lines=(*scene.lines, *self.lines(desk), *self.paths(desk)), section=self.section_ends(desk))

    def lines(self, desk: Desk) -> tuple[LineMark, ...]:
        """The subject's outline at both ends of its range, and in each moment of a mean."""
        zone = self.subject(desk)
        if zone is None:
            return ()
        inner, outer = range_outlines(self.ledger(desk).sf, zone)
        marks_ = [LineMark("dotted", points, subject=True) for points in (*inner, *outer)]
        instances = desk.reading.instants(desk.run_id, desk.moment) if isinstance(desk.moment, tuple) else None
        for outline in instances.outlines.get(zone.id, ()) if instances else ():
            marks_ += [LineMark("path", get_coordinates(part.exterior)) for part in get_parts(outline)]
        return tuple(marks_)

    def paths(self, desk: Desk) -> list[LineMark]:
        """Where the travelling eddies of this frame have come from."""
        followed = desk.reading.known(("followed", desk.run_id))
        if followed is None or isinstance(desk.moment, tuple):
            return []
        out = []
        for eddy in self.ledger(desk).zones.travelling:
            way = [t.core.centre for i in sorted(followed.travelling) if i <= desk.index for t in followed.travelling[i] if t.id == eddy.id]
            if len(way) > 1:
                out.append(LineMark("dotted", np.array(way)))
        return out

    def view(self, desk: Desk):
        zone = self.subject(desk)
        if zone is None:
            return None
        return common.view_of(desk, zone.contour.bounds, self.section_ends(desk))

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        words = f"<i>Plate 2.</i> {common.water_words(desk, scene)}"
        if not desk.sizes.narrow:
            words += f" {marks.triangle(True)} leaves the wall {marks.triangle(False)} returns; dotted: least and greatest reading."
        if isinstance(desk.moment, tuple):
            words += " Thin: its outline at single moments."
        return words + moment_words(desk, _known_subject(self, desk))

    def key_html(self, desk: Desk) -> str:
        ramp = common.ramp_key(desk)
        return ramp + ("" if desk.sizes.narrow or desk.look.hall else marks.hatch_key())

    def alternative(self, desk: Desk) -> str:
        ledger = self.ledger(desk)
        u = desk.units
        through = u.quantity(ledger.sf.through_discharge_m3_s, "m3/s")
        moving = "; ".join(
            f"{t.id} travelling at {u.quantity(float(np.hypot(*t.speed)), 'm/s', digits=2)}, {t.core.rotation}" for t in ledger.zones.travelling
        )
        eddies = "; ".join(
            f"{text.safe(z.id)} {_where(z, u)}, {z.rotation}, {u.quantity(z.area_m2, 'm2')}" for z in ledger.zones.zones
        )
        return f"Map of the reach with {through} flowing through, in tubes of equal discharge. Eddies: {eddies or 'none'}." + (
            f" Seen by one who moves with them: {moving}." if moving else ""
        )

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(self.course(desk), common.ribbon_box(desk), desk.units)

    def moments(self, desk: Desk) -> dict[str, object]:
        return common.moments(desk)

    def course(self, desk: Desk) -> strip.Course:
        """What the ribbon shows: discharge and the largest eddies, with the subject among them."""
        run, story = desk.run, desk.reading.story(desk.run_id)
        areas: dict[str, np.ndarray] = {}
        for i, zones in (story.followed.zones if story.followed else {}).items():
            for zone in zones:
                areas.setdefault(zone.id, np.full(run.n_frames, np.nan))[i] = zone.area_m2
        chosen = self.subject_id(desk)
        order = sorted(areas, key=lambda k: (k != chosen, -float(np.nanmax(areas[k]))))
        keep = order[: _ROWS_HALL if desk.look.hall or desk.sizes.narrow else _ROWS_DESK]
        rows = [strip.Row(k, areas[k], k == chosen) for k in sorted(keep, key=common.natural)]
        return strip.Course(
            run.times.seconds, run.times.instants, self.discharge(desk, story), rows, desk.index,
            more_rows=len(order) - len(keep), window=desk.choices.window,
        )

    def discharge(self, desk: Desk, story: Story) -> np.ndarray:
        """Through-discharge by frame, the chosen frame's as soon as it is known."""
        found = common.discharge(story)
        if not isinstance(desk.moment, tuple):
            found[desk.index] = self.ledger(desk).sf.through_discharge_m3_s
        return found

    def side(self, desk: Desk) -> dict[str, str]:
        subject = self.subject(desk)
        outline = subject.contour if subject is not None else None
        section = common.section_html(desk, self.section_ends(desk), self.ledger(desk), outline, self.cautions(desk))
        return {"section": section, "table": self.table(desk)}

    def table(self, desk: Desk) -> str:
        ledger, u, ids = self.ledger(desk), desk.units, self.cautions(desk)
        chosen = self.subject_id(desk)
        zones = list(ledger.zones.zones)
        if desk.look.hall or desk.sizes.narrow:
            zones.sort(key=lambda z: (z.id != chosen, -z.area_m2))
            zones = zones[: 3 if desk.look.hall else 6]
        lines = [_line(z, z.id == chosen, desk, ids) for z in zones]
        few = desk.look.hall or desk.sizes.narrow
        lines += [] if few else [_moving_line(t, desk) for t in ledger.zones.travelling]
        columns = (
            table.Column("Eddy", figure=False), table.Column("Where", figure=False),
            table.Column("Area,", f"{u.label('m2')}{footnote(ids, 'sensitivity')}"),
            *(() if few else (
                table.Column("Takes round,", u.label("m3/s")), table.Column("Once in,", f"s{footnote(ids, 'rotation-time')}"),
            )),
        )
        moment = text.moment(ledger.frame.time, ledger.frame.seconds)
        if isinstance(desk.moment, tuple):
            moment = f"mean {window_words(desk)}"
        aside = " ".join(p for p in (_flagged(self.subject(desk)), self.life(desk), _left_out(ledger, len(ledger.zones.zones) - len(zones))) if p)
        return table.html(table.Table(
            "Ledger of eddies", moment, f"Recirculation zones, {moment}", columns, lines,
            "No recirculation zone is kept in this frame.", aside,
        ))

    def life(self, desk: Desk) -> str:
        """What following says of the subject, with buttons that go to its first, largest and last moment; HTML."""
        followed = desk.reading.known(("followed", desk.run_id))
        life = next((x for x in followed.lives if x.id == self.subject_id(desk)), None) if followed else None
        if life is None or desk.look.hall or desk.run.n_frames == 1:
            return ""
        return life_words(life, followed.zones, desk)

    def in_moments(self, desk: Desk, zone: Zone) -> str:
        """What the single moments of the mean say of an eddy; HTML."""
        assert isinstance(desk.moment, tuple)
        instances = desk.reading.instants(desk.run_id, desk.moment)
        return instants_words(instances.found[zone.id] if instances else None, desk)

    def numbers(self, desk: Desk, which: str) -> tuple[list[dict[str, object]], str]:
        run, moment = desk.run, desk.moment
        when = f"--mean {moment[0]:g} {moment[1]:g}" if isinstance(moment, tuple) else f"--frame {moment}"
        return rows_of(ledger_json(run, [self.ledger(desk)])), f"leewater eddies {run.files[0].name} {when} --out DIR"

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return (*OWED["eddies"], "section-discharge")

    def section_ends(self, desk: Desk):
        if desk.choices.section is not None:
            return common.chosen_ends(desk)
        return common.first_ends(desk, self.subject(desk))

    def ledger(self, desk: Desk) -> FrameLedger:
        """Stream function and eddies of the chosen moment or mean."""
        return desk.reading.ledger(desk.run_id, desk.moment)

    def subject_id(self, desk: Desk) -> str:
        """The subject's id; empty where there is no eddy."""
        zone = self.subject(desk)
        return zone.id if zone is not None else ""

    def subject(self, desk: Desk) -> Zone | None:
        """The chosen eddy if it is in this frame, else the largest; None where there is none."""
        zones = self.ledger(desk).zones.zones
        chosen = next((z for z in zones if z.id == desk.choices.subject), None)
        return chosen or max(zones, key=lambda z: z.area_m2, default=None)


def _here(desk: Desk, ledger: FrameLedger) -> str:
    if isinstance(desk.moment, tuple):
        return f"in the mean flow {window_words(desk)}"
    return "here" if desk.look.hall else "in this mean flow" if ledger.frame.kind == "mean" else "in this frame"


def _known_subject(question: Eddies, desk: Desk) -> Zone | None:
    """The subject, None while it is being found: a caption does not wait."""
    try:
        return question.subject(desk)
    except (Working, ValueError):
        return None


def _where(zone: Zone, units: Units) -> str:
    """Where an eddy is, in words that follow its tag in a sentence."""
    name, chainage = _place(zone, units)
    if zone.kind == "behind structure":
        name = f"at {name}"
    elif zone.kind in ("at bank", "side bay"):
        name = f"{'in' if zone.kind == 'side bay' else 'on'} the {name}"
    else:
        name = f"a {name}"
    return f"{name} at {chainage}" if chainage else name


def _place(zone: Zone, units: Units) -> tuple[str, str]:
    """The eddy's place and, where its name holds one, its chainage in display units, as HTML."""
    name, found, _ = (zone.name or zone.kind).partition(", chainage")
    if not found or zone.chainage_m is None:
        return text.safe(name), ""
    return text.safe(name), f"chainage {round(zone.chainage_m * units.factor('m'))}\u00a0{units.label('m')}"


def _flagged(zone: Zone | None) -> str:
    """What the subject's figures are subject to, HTML."""
    if zone is None or not zone.flags:
        return ""
    return f"<b>{text.safe(zone.id)}</b>: {text.safe('; '.join(zone.flags))}."


def _left_out(ledger: FrameLedger, unlisted: int) -> str:
    """What the table does not list, counted."""
    parts = []
    if unlisted > 0:
        parts.append(f"{unlisted} smaller {'eddy is' if unlisted == 1 else 'eddies are'} not listed at this width")
    parts += [text.safe(note) for note in ledger.zones.notes]
    small, cut = len(ledger.zones.small), len(ledger.zones.open_to_boundary)
    if small:
        parts.append(f"{text.count(small, 'region')} under the noise or the floor {'is' if small == 1 else 'are'} left out")
    if cut:
        parts.append(f"{text.count(cut, 'region')} cut by the model's edge {'is' if cut == 1 else 'are'} not counted")
    return ("; ".join(parts)[:1].upper() + "; ".join(parts)[1:] + ".") if parts else ""


def _span(zone: Zone, figure: str) -> tuple[float | None, float | None]:
    return zone.sensitivity.get(figure, (None, None))


def _line(zone: Zone, subject: bool, desk: Desk, ids: tuple[str, ...]) -> table.Line:
    u = desk.units

    def cell(figure: str, unit: str) -> tuple[str, str]:
        span = _span(zone, figure)
        return u.number(getattr(zone, figure), unit, *span), u.span(*span, unit)

    place, chainage = _place(zone, u)
    coarse = footnote(ids, "wake-detail") if common.UNDER_RESOLVED in zone.flags else ""
    few = desk.look.hall or desk.sizes.narrow
    return table.Line(
        (
            (f"{marks.turning(zone.rotation)} {text.safe(zone.id)}", ""), (place + coarse, chainage),
            cell("area_m2", "m2"),
            *(() if few else (cell("recirculating_discharge_m3_s", "m3/s"), cell("rotation_time_s", "s"))),
        ),
        subject, ("subject", zone.id), f"Show {zone.id}, {u.sentence(zone.name)}",
    )


def _moving_line(eddy: Traveller, desk: Desk) -> table.Line:
    """A travelling eddy, apart from those that stand: its area and flow are those that an observer who moves with it sees."""
    u = desk.units
    speed = u.quantity(float(np.hypot(*eddy.speed)), "m/s", digits=2)
    how = "seen moving with it" + ("" if eddy.speed_from == "matched cores" else "; speed assumed")
    area = "core only" if eddy.area_m2 is None else u.number(eddy.area_m2, "m2", digits=2)
    flow = "" if eddy.recirculating_discharge_m3_s is None else u.number(eddy.recirculating_discharge_m3_s, "m3/s", digits=2)
    return table.Line((
        (f"{marks.turning(eddy.core.rotation)} {text.safe(eddy.id)}", ""), (f"travels at {speed}", how), (area, ""), (flow, ""), ("", ""),
    ))
