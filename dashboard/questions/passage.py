"""Passage: is the way upstream excluded for these fish, and where?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from hydro.cautions import OWED
from hydro.passage import EXCLUDED, NOT_ASSESSED, Answer
from hydro.passage.answer import barrier_words

from .. import text
from ..raster import View
from ..views import ribbon as strip
from ..views import table
from ..views.scene import AreaMark, LineMark, PointMark, Scene, Tag
from . import common
from .base import Desk, Question, footnote


class Passage(Question):
    """One fish of the review in the chosen frame."""

    key = "passage"
    word = "Passage"
    asks = "Is the way upstream excluded for these fish, and where?"
    places = (("subject", "the place"),)

    def summary(self, desk: Desk) -> str:
        fish = desk.studies.fish()
        if not fish:
            return "needs a fish in the review"
        answer = desk.reading.known(("passage", desk.run_id, desk.index, 0))
        return f"{len(fish)} fish in the review" if answer is None else answer.status

    def sentence(self, desk: Desk) -> str:
        if not desk.studies.fish():
            return "Passage needs a fish in review.toml, with its endurance and the source of it, and its places in the lines."
        a, ids = self.answer(desk), self.cautions(desk)
        q = desk.units.quantity(a.discharge_m3_s, "m3/s")
        who = f"{text.safe(a.fish.name)} at <b>{q}</b>"
        if a.status == NOT_ASSESSED:
            return f"For {who} the way is not assessed: {text.safe(desk.units.sentence(a.reason))}"
        note = footnote(ids, "passage")
        if a.status == EXCLUDED:
            first = a.barriers[0] if a.barriers else None
            why = f": {text.safe(desk.units.sentence(barrier_words(first)))}" if first is not None else ""
            return f'For {who} the way upstream is <em class="subject">excluded</em>{note}{why}.'
        worst = a.worst_leg
        share = f" Its worst leg uses <b>{text.percent(worst.fatigue)}</b> of its endurance." if worst is not None else ""
        return f"For {who} the way upstream is not excluded by depth and mean speed{note}.{share}"

    def scene(self, desk: Desk) -> Scene:
        scene = common.water_scene(desk)
        if not desk.studies.fish() or not scene.shore:
            return scene
        a = self.answer(desk)
        areas, points, tags = [], [], []
        for area, shape in zip(a.search.areas.items if a.search else (), desk.studies.passage_areas(desk.run_id, desk.index, 0)):
            areas.append(AreaMark("rest", shape, ""))
            points.append(PointMark("rest", np.array(area.centre)))
            if area.kind in ("start", "goal", "declared"):
                tags.append(Tag(f"{'from ' if area.kind == 'start' else 'to ' if area.kind == 'goal' else ''}{area.name}", area.centre))
        lines = (LineMark("route", a.route.xy),) if a.route is not None else ()
        for i, barrier in enumerate(a.barriers):
            at = np.array(barrier.xy)
            points.append(PointMark("lodged", at, _across(a, at), 14.0 * desk.view.step if desk.view else 4.0, subject=i == 0))
            tags.append(Tag(barrier.kind, barrier.xy, i == 0))
        tags.sort(key=lambda t: not t.subject)
        return replace(scene, areas=tuple(areas), lines=lines, points=tuple(points), tags=tuple(tags))

    def view(self, desk: Desk):
        if not desk.studies.fish():
            return None
        a = self.answer(desk)
        if a.barriers:
            return float(a.barriers[0].xy[0]), float(a.barriers[0].xy[1]), 110.0
        if a.route is None:
            return None
        low, high = a.route.xy.min(axis=0), a.route.xy.max(axis=0)
        return common.view_of(desk, (*low, *high), None)

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        return (
            f"<i>Plate 4.</i> Two thin lines: the way; rings: water to rest in; the bar: where it first fails. "
            f"{common.water_words(desk, scene)}"
        )

    def key_html(self, desk: Desk) -> str:
        return common.ramp_key(desk)

    def alternative(self, desk: Desk) -> str:
        return text.safe(desk.units.sentence(self.answer(desk).sentence)) if desk.studies.fish() else ""

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(common.plain_course(desk), common.ribbon_box(desk), desk.units)

    def moments(self, desk: Desk) -> dict[str, object]:
        return common.moments(desk)

    def side(self, desk: Desk) -> dict[str, str]:
        if not desk.studies.fish():
            return {}
        a, u, ids = self.answer(desk), desk.units, self.cautions(desk)
        columns = (
            table.Column("Leg", figure=False), table.Column("Length,", u.label("m")), table.Column("Fastest,", u.label("m/s")),
            table.Column("Least depth,", u.label("m")), table.Column("Endurance used", footnote(ids, "endurance")),
        )
        lines = [
            table.Line(
                (
                    (f"{leg.number}", f"{text.safe(leg.from_area)} to {text.safe(leg.to_area)}"), (u.number(leg.length_m, "m"), ""),
                    (u.number(leg.greatest_speed_m_s, "m/s"), ""), (u.number(leg.least_depth_m, "m"), ""),
                    (text.percent(leg.fatigue), ""),
                ),
                leg is a.worst_leg,
            )
            for leg in a.legs
        ]
        legs = table.html(table.Table("Legs of the way", text.safe(a.fish.name), "Legs of the way upstream", columns, lines, "No way."))
        where = (table.Column("What stops it", figure=False), table.Column("Beyond by"), table.Column("Unit", figure=False))
        stops = [
            table.Line(((text.safe(b.kind), f"leg {b.leg}"), (u.number(b.beyond, b.unit), ""), (u.label(b.unit), "")), i == 0)
            for i, b in enumerate(a.barriers)
        ]
        alone = f"Without recovery at rest: {text.safe(a.alone_status)}."
        found = table.html(table.Table("Barriers", "", "Barriers on the least barred way", where, stops, "None found.", alone))
        return {"section": legs, "table": found}

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return OWED["passage"]

    def answer(self, desk: Desk) -> Answer:
        """The answer for the review's first fish in the chosen frame."""
        return desk.studies.passage(desk.run_id, desk.index, 0)


def _across(a: Answer, at: np.ndarray) -> float:
    """Direction square to the way near a place, rad."""
    if a.route is None or len(a.route.xy) < 2:
        return 0.0
    i = int(np.clip(np.hypot(*(a.route.xy - at).T).argmin(), 1, len(a.route.xy) - 1))
    t = a.route.xy[i] - a.route.xy[i - 1]
    return float(np.arctan2(t[0], -t[1]))
