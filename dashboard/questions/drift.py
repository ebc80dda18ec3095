"""Drift: where does floating wood go, and what does it meet?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from hydro.cautions import OWED
from hydro.drift import Drifted
from hydro.drift.report import DriftAnswer

from .. import text
from ..raster import View
from ..studies import TRIED
from ..views import ribbon as strip
from ..views import table
from ..views.scene import LineMark, PointMark, Scene
from . import common
from .base import Desk, Question, footnote

_DRAWN = 250  # paths on the map; more only blacken it


class Drift(Question):
    """The review's wood in the chosen run."""

    key = "drift"
    word = "Drift"
    asks = "Where does floating wood go, and what does it meet?"
    places = (("subject", "the bridge"),)

    def summary(self, desk: Desk) -> str:
        if not desk.studies.has_wood():
            return "needs wood in the review"
        answer = desk.reading.known(("drift", desk.run_id))
        if answer is None:
            return "not let go yet"
        touch = int(answer.base.touched.any(axis=1).sum())
        return f"{touch} of {len(answer.base.state)} logs touch a pier"

    def sentence(self, desk: Desk) -> str:
        if not desk.studies.has_wood():
            return "Drift needs a [[releases]] entry in review.toml and its release line in the review's lines."
        base, ids = self.answer(desk).base, self.cautions(desk)
        touch = int(base.touched.any(axis=1).sum())
        lodge = int((base.lodged_at >= 0).sum())
        passed = base.pass_time[np.isfinite(base.pass_time)]
        half = f" Half of those that pass the bridge have done so within <b>{text.elapsed(float(np.median(passed - base.times[0])))}</b>." if passed.size else ""
        early = " Stopped early: these are the logs as far as they came." if base.stopped_early else ""
        return (
            f'Of {len(base.state)} modelled logs <b>{touch} touch a pier</b> and <em class="subject">{lodge} lodge</em>'
            f"{footnote(ids, 'drift')}, by the rule chosen.{half}{early}"
        )

    def scene(self, desk: Desk) -> Scene:
        scene = common.water_scene(desk)
        if not desk.studies.has_wood() or not scene.shore:
            return scene
        base = self.answer(desk).base
        now = self.at(desk, base)
        lines = [LineMark("path", p[np.isfinite(p[:, 0]), :2].astype(float)) for p in base.paths[:_DRAWN]]
        lines = [line for line in lines if len(line.points) > 1]
        points = []
        for i in range(len(base.state)):
            x, y, angle = (float(v) for v in base.paths[i, now])
            if not np.isfinite(x):
                continue
            lodged = base.lodged_at[i] >= 0 and bool(np.all(base.paths[i, now:, 0] == base.paths[i, now, 0]))
            points.append(PointMark("lodged" if lodged else "log", np.array([x, y]), angle, float(base.wood.length[i]), subject=lodged))
        water = replace(scene.water, value=np.zeros(desk.run.mesh.n_nodes)) if scene.water is not None else None
        return replace(scene, water=water, lines=tuple(lines), points=tuple(points))

    def view(self, desk: Desk):
        if not desk.studies.has_wood():
            return None
        piers = self.answer(desk).base.piers
        if not piers:
            return None
        bounds = np.array([p.geometry.bounds for p in piers])
        low, high = bounds[:, :2].min(axis=0), bounds[:, 2:].max(axis=0)
        middle = (low + high) / 2
        return float(middle[0]), float(middle[1]), 120.0

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        tubes = scene.water.tube_m3_s if scene.water is not None else 0.0
        of = f" in tubes of {desk.units.quantity(tubes, 'm3/s')}" if tubes else ""
        return f"<i>Plate 3.</i> Logs to true length, at least 7 px; thin lines: where they have gone{of}. Vermilion: lodged."

    def alternative(self, desk: Desk) -> str:
        return desk.units.sentence(" ".join(self.answer(desk).sentences())) if desk.studies.has_wood() else ""

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(self.course(desk), common.ribbon_box(desk), desk.units) if desk.studies.has_wood() else ""

    def moments(self, desk: Desk) -> dict[str, object] | None:
        return common.moments_of(self.course(desk), desk) if desk.studies.has_wood() else None

    def times(self, desk: Desk) -> np.ndarray:
        return self.answer(desk).base.times

    def course(self, desk: Desk) -> strip.Course:
        """Logs past the bridge by time, from letting go."""
        base = self.answer(desk).base
        passed = np.sort(base.pass_time[np.isfinite(base.pass_time)])
        count = np.searchsorted(passed, base.times, side="right").astype(float)
        return strip.Course(
            base.times - base.times[0], None, count, (), self.at(desk, base), title="Logs past", unit="logs",
        )

    def side(self, desk: Desk) -> dict[str, str]:
        if not desk.studies.has_wood():
            return {}
        answer, ids = self.answer(desk), self.cautions(desk)
        base = answer.base
        columns = (
            table.Column(f"Of {len(base.state)} logs", figure=False), table.Column("touch"), table.Column("lodge"),
            table.Column("share that touches,", f"95 % interval{footnote(ids, 'drift')}"),
        )
        lines = []
        for i, pier in enumerate(base.piers):
            touch, lodge = base.touches(i), base.lodges(i)
            between = f"{100 * touch.low:.1f} to {100 * touch.high:.1f}\u00a0%"
            lines.append(table.Line(((text.safe(pier.name), ""), (str(touch.count), ""), (str(lodge.count), ""), (text.percent(touch.value), between))))
        ranges = self.tried(desk)
        piers = table.html(table.Table("Wood against the piers", "", "Logs that touch and lodge, by pier", columns, lines, "No pier.", ranges))
        through = (table.Column("Opening", figure=False), table.Column("pass"), table.Column("share"))
        rows = [
            table.Line(((text.safe(o.name), ""), (str(base.passes(i).count), ""), (text.percent(base.passes(i).value), "")))
            for i, o in enumerate(base.openings)
        ]
        openings = table.html(table.Table("Through the openings", "", "Logs through each opening", through, rows, "No opening."))
        return {"section": piers, "table": openings}

    def tried(self, desk: Desk) -> str:
        """The range over the settings tried, in words, once they have been."""
        answer = desk.reading.known((TRIED, desk.run_id))
        if answer is None:
            return '<button type="button" class="word" data-do="try" data-value="" data-key="try">Try other settings</button> for the range.'
        return text.safe(desk.units.sentence(" ".join(answer.sentences())))

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return OWED["drift"]

    def progress(self, desk: Desk) -> tuple[str, int, int] | None:
        share = desk.studies.shares.get(desk.run_id)
        return None if share is None else ("Letting the logs go:", round(100 * share), 100)

    def at(self, desk: Desk, base: Drifted) -> int:
        """Place of the chosen moment among the kept positions; where none was chosen, when half of those that pass the bridge have."""
        if desk.choices.seconds is None or not base.times[0] <= desk.choices.seconds <= base.times[-1]:
            passed = base.pass_time[np.isfinite(base.pass_time)]
            return int(np.abs(base.times - np.median(passed)).argmin()) if passed.size else len(base.times) // 3
        return int(np.abs(base.times - desk.choices.seconds).argmin())

    def answer(self, desk: Desk) -> DriftAnswer:
        """The logs let go in the chosen run."""
        return desk.studies.drift(desk.run_id)
