"""Arrival: what has arrived, and what must be asked before relying on it?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from hydro.arrival import Finding
from hydro.cautions import OWED

from .. import text
from ..raster import View
from ..views import observed, query_log, table
from ..views import ribbon as strip
from ..views.scene import PointMark, Scene
from . import common
from .base import Desk, Question


class Arrival(Question):
    """The audit's findings, and the queries that people wrote."""

    key = "arrival"
    word = "Arrival"
    asks = "What has arrived, and what must be asked?"
    places = (("subject", "the finding"),)
    numbered = ("findings",)

    def summary(self, desk: Desk) -> str:
        found = desk.reading.known(("audit", desk.run_id))
        if found is None:
            return "not looked at yet"
        ask = sum(f.grade != "note" for f in found)
        return f"{ask} to ask, {len(found) - ask} to note"

    def sentence(self, desk: Desk) -> str:
        found = self.findings(desk)
        grave = [f for f in found if f.grade == "resolve before use"]
        ask = [f for f in found if f.grade == "ask"]
        run = text.safe(desk.run.name)
        if not grave and not ask:
            return f"The audit of {run} found nothing to ask; {text.count(len(found), 'thing').lower()} to note."
        first = desk.units.sentence((grave or ask)[0].sentence.rstrip("."))
        parts = []
        if grave:
            parts.append(f"<b>{text.count(len(grave), 'finding').lower()}</b> to resolve before use")
        if ask:
            parts.append(f"<b>{text.count(len(ask), 'thing').lower()}</b> to ask")
        there = "There is" if len(grave) + len(ask) == 1 else "There are"
        return f"{there} {text.listed(parts)} about {run}. First: <em class=\"subject\">{text.safe(first)}</em>."

    def scene(self, desk: Desk) -> Scene:
        scene = common.water_scene(desk)
        if not scene.shore:
            return scene
        chosen = desk.choices.subject
        marks = [
            PointMark("query", np.array(f.at), label=str(i), subject=str(i) == chosen)
            for i, f in enumerate(self.findings(desk), 1) if f.at is not None
        ]
        points, lines, tags = observed.marks(desk.studies.observed(desk.run_id), desk.units)
        return replace(scene, points=(*marks, *points), lines=(*scene.lines, *lines), tags=(*scene.tags, *tags))

    def view(self, desk: Desk):
        number = desk.choices.subject
        found = self.findings(desk)
        if number.isdigit() and 0 < int(number) <= len(found) and (at := found[int(number) - 1].at) is not None:
            return float(at[0]), float(at[1]), 90.0
        return None

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        rings = " Rings: model minus observed." if any(p.kind == "rest" for p in scene.points) else ""
        tracks = " Dotted: a drogue; solid: its parcel in the model." if any(p.kind == "drogue" for p in scene.points) else ""
        return f"<i>Plate 1.</i> Numbers stand where a finding has a place.{rings}{tracks} {common.water_words(desk, scene)}"

    def key_html(self, desk: Desk) -> str:
        return common.ramp_key(desk)

    def alternative(self, desk: Desk) -> str:
        placed = sum(f.at is not None for f in self.findings(desk))
        return f"Map of the reach with {placed} numbered places of findings."

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(common.plain_course(desk), common.ribbon_box(desk), desk.units)

    def moments(self, desk: Desk) -> dict[str, object]:
        return common.moments(desk)

    def side(self, desk: Desk) -> dict[str, str]:
        asks = desk.reading.matter().review is not None

        def told(sentence: str) -> str:
            return text.safe(desk.units.sentence(sentence))

        lines = [
            table.Line(
                ((str(i), ""), (f.grade, ""), (told(f.sentence), f"{told(f.meaning)} <b>{told(f.question)}</b>{_ask(i) if asks else ''}")),
                str(i) == desk.choices.subject, ("subject", str(i)), f"Show finding {i}",
            )
            for i, f in enumerate(self.findings(desk), 1)
        ]
        columns = (table.Column("No.", figure=False), table.Column("Do", figure=False), table.Column("Finding", figure=False))
        findings = table.Table("Findings", "gravest first", "Findings of the audit, gravest first", columns, lines, "Nothing found.")
        return {"table": table.html(findings), "body": observed.html(desk.studies.observed(desk.run_id), desk.units) + self.queries(desk)}

    def queries(self, desk: Desk) -> str:
        """The log of queries, and a form to write one; empty without a review to keep them in."""
        items = desk.studies.queries()
        if items is None:
            return '<h2>Queries</h2><p>Queries are kept in a review; this is a results file alone.</p>'
        return query_log.html(items)

    def numbers(self, desk: Desk, which: str) -> tuple[list[dict[str, object]], str]:
        rows: list[dict[str, object]] = []
        for number, f in enumerate(self.findings(desk), 1):
            x, y = desk.run.mesh.to_world(np.array(f.at)) if f.at is not None else (None, None)
            rows.append({
                "number": number, "id": f.id, "grade": f.grade, "finding": f.sentence, "meaning": f.meaning, "ask": f.question,
                "x": x, "y": y, "frame": f.frame,
            })
        return rows, f"leewater arrival {desk.run.files[0].name} --json FILE"

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return OWED["arrival"]

    def findings(self, desk: Desk) -> list[Finding]:
        """The audit of the chosen run, gravest first."""
        return desk.studies.audit(desk.run_id)


def _ask(number: int) -> str:
    return (
        f' <button type="button" class="word" data-do="raise" data-value="{number}" data-key="raise-{number}" '
        f'aria-label="make it a query: finding {number}">make it a query</button>'
    )
