"""Drift: where does floating wood go, and what does it meet?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from hydro.cautions import OWED
from hydro.drift import Drifted
from hydro.drift.report import DriftAnswer

from .. import text
from ..choices import LOGS, Choices
from ..raster import View
from ..studies import OWN, TRIED, Wish
from ..views import marks, wood
from ..views import ribbon as strip
from ..views.scene import LineMark, LogsMark, Scene
from . import common
from .base import Desk, Question, footnote

_DRAWN = 250  # paths on the map; more only blacken it
_CELL = 2.0  # m; of the corridor's grid


class Drift(Question):
    """The review's wood in the chosen run."""

    key = "drift"
    word = "Drift"
    asks = "Where does floating wood go, and what does it meet?"
    places = (("subject", "the bridge"),)

    def summary(self, desk: Desk) -> str:
        if not desk.studies.has_wood():
            return "needs wood in the review"
        answer = desk.reading.known(("drift", desk.run_id, wish_of(desk.choices)))
        if answer is None:
            return "not let go yet"
        touch = int(answer.base.touched.any(axis=1).sum())
        return f"{touch} of {len(answer.base.state)} logs touch a pier"

    def sentence(self, desk: Desk) -> str:
        if not desk.studies.has_wood():
            return "Drift needs a [[releases]] entry in review.toml and its release line in the review's lines."
        if not self.lets_go(desk):
            return "Drag <b>L</b> and <b>R</b> to where the wood comes from, then let it go."
        base, ids = self.answer(desk).base, self.cautions(desk)
        early = " Stopped early: these are the logs as far as they came." if base.stopped_early else ""
        whole = f"{len(base.state):,}".replace(",", "\u202f")
        if not base.piers:
            return f"None of the {whole} modelled logs can touch a pier: the review draws none.{early}"
        pier = self.pier(desk, base)
        share, lodge = base.touches(pier), base.lodges(pier).count
        ranges = f"{100 * share.low:.0f} to {100 * share.high:.0f}\u00a0% from their number alone"
        tried = desk.reading.known((TRIED, desk.run_id, wish_of(desk.choices)))
        if tried is not None:
            values = [100 * d.touches(pier).value for d in (tried.base, *tried.tried.values())]
            ranges += f"; {min(values):.0f} to {max(values):.0f}\u00a0% over the settings tried"
        return (
            f"With these settings, <b>{text.percent(share.value)}</b> of the {whole} modelled logs touch "
            f'<em class="subject">{text.safe(base.piers[pier].name)}</em> ({ranges}){footnote(ids, "drift")}; {lodge} lodge there by the '
            f"rule chosen. Not a forecast of jams.{early}"
        )

    def scene(self, desk: Desk) -> Scene:
        scene = common.water_scene(desk)
        if not self.lets_go(desk) or not scene.shore:
            return scene
        base = self.answer(desk).base
        now, shown = self.at(desk, base), self.shown(desk, base)
        here = base.paths[:, now]
        known = np.isfinite(here[:, 0]) & shown
        stays = (base.lodged_at >= 0) & (here[:, 0] == base.paths[:, -1, 0])
        logs = LogsMark(here[known, :2].astype(float), here[known, 2].astype(float), base.wood.length[known], stays[known])
        corridor = desk.choices.gone == "corridor"
        value, top = self.corridor(desk, base) if corridor else (np.zeros(desk.run.mesh.n_nodes), 1.0)
        water = replace(scene.water, value=value, top=top) if scene.water is not None else None
        ways = [] if corridor else [p[np.isfinite(p[:, 0]), :2].astype(float) for p in base.paths[shown][:_DRAWN]]
        lines = tuple(LineMark("path", way) for way in ways if len(way) > 1)
        return replace(scene, water=water, lines=lines, logs=logs)

    def view(self, desk: Desk):
        if not self.lets_go(desk):
            return None
        piers = self.answer(desk).base.piers
        if not piers:
            return None
        bounds = np.array([p.geometry.bounds for p in piers])
        low, high = bounds[:, :2].min(axis=0), bounds[:, 2:].max(axis=0)
        middle = (low + high) / 2
        return float(middle[0]), float(middle[1]), 120.0

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        review = desk.reading.matter().review
        if review is None or not desk.studies.has_wood():
            return "<i>Plate 3.</i>"
        numbers = {str(n): f"{n:,} logs".replace(",", "\u202f") if n else "a fifth of the review's logs" for n in LOGS}
        names = [str(t["name"]) for t in review.releases]
        offered = {"": "all releases", **{n: n for n in names}, OWN: "a line that you draw"}
        words = (
            f"<i>Plate 3.</i> Let go: {common.chooser('logs', str(desk.choices.logs), numbers, 'how many logs')} from "
            f"{common.chooser('release', desk.choices.release, offered, 'where wood is let go')}."
        )
        if desk.choices.release == OWN:
            words += ' <button type="button" class="plain" data-do="letgo" data-value="" data-key="letgo">Let it go from L to R</button>'
        gone = {"paths": "their paths", "corridor": "where most have gone"}
        only = f"; only those that touch {text.safe(desk.choices.subject)}" if desk.choices.subject else ""
        return (
            f"{words} Shown: {common.chooser('gone', desk.choices.gone, gone, 'what is drawn of their ways')}. Logs to true length, at "
            f"least 7 px{only}. Vermilion: lodged."
        )

    def key_html(self, desk: Desk) -> str:
        if desk.choices.gone != "corridor" or not self.lets_go(desk):
            return ""
        return marks.ramp_key("Logs by time in a 2 m square", self.corridor(desk, self.answer(desk).base)[1], "logs", desk.units)

    def alternative(self, desk: Desk) -> str:
        return desk.units.sentence(" ".join(self.answer(desk).sentences())) if self.lets_go(desk) else ""

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(self.course(desk), common.ribbon_box(desk), desk.units) if self.lets_go(desk) else ""

    def moments(self, desk: Desk) -> dict[str, object] | None:
        return common.moments_of(self.course(desk), desk) if self.lets_go(desk) else None

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
        if not self.lets_go(desk):
            return {}
        answer, note = self.answer(desk), footnote(self.cautions(desk), "drift")
        piers = wood.against_piers(answer.base, desk.choices.subject, note, self.tried(desk))
        return {"section": piers, "table": wood.through_openings(answer.base), "body": wood.more(answer, desk.units)}

    def tried(self, desk: Desk) -> str:
        """The range over the settings tried, in words, once they have been."""
        answer = desk.reading.known((TRIED, desk.run_id, wish_of(desk.choices)))
        if answer is None:
            return '<button type="button" class="word" data-do="try" data-value="" data-key="try">Try other settings</button> for the range.'
        return text.safe(desk.units.sentence(" ".join(answer.sentences())))

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return OWED["drift"]

    def progress(self, desk: Desk) -> tuple[str, int, int] | None:
        share = desk.studies.shares.get(desk.run_id)
        return None if share is None else ("Letting the logs go:", round(100 * share), 100)

    def section_ends(self, desk: Desk) -> common.Ends | None:
        """The line that wood is let go from, where the reader draws it."""
        if desk.choices.release != OWN:
            return None
        return common.chosen_ends(desk) if desk.choices.section is not None else common.across(desk, 0.3 * common.length(desk))

    def corridor(self, desk: Desk, base: Drifted) -> tuple[np.ndarray, float]:
        """How many logs have gone by each node (n,), and the number at the end of the ramp."""
        grid, (west, south) = base.corridor(_CELL)
        x, y = desk.run.mesh.node_xy.T
        column, row = np.floor((x - west) / _CELL).astype(int), np.floor((y - south) / _CELL).astype(int)
        inside = (column >= 0) & (row >= 0) & (column < grid.shape[1]) & (row < grid.shape[0])
        value = np.zeros(len(x))
        value[inside] = grid[row[inside], column[inside]]
        busy = grid[grid > 0]
        return value, float(np.percentile(busy, 97)) if busy.size else 1.0

    def shown(self, desk: Desk, base: Drifted) -> np.ndarray:
        """Logs (k,) that are drawn: those that touch the chosen pier, else all."""
        names = [p.name for p in base.piers]
        if desk.choices.subject in names:
            return base.touched[:, names.index(desk.choices.subject)]
        return np.ones(len(base.state), bool)

    def pier(self, desk: Desk, base: Drifted) -> int:
        """Place of the pier that the sentence speaks of: the chosen one, else that which most logs touch."""
        names = [p.name for p in base.piers]
        return names.index(desk.choices.subject) if desk.choices.subject in names else int(base.touched.sum(axis=0).argmax())

    def lets_go(self, desk: Desk) -> bool:
        """Whether there is wood, and a place that it is let go from."""
        return desk.studies.has_wood() and not (desk.choices.release == OWN and desk.choices.let_go is None)

    def at(self, desk: Desk, base: Drifted) -> int:
        """Place of the chosen moment among the kept positions; where none was chosen, when half of those that pass the bridge have."""
        if desk.choices.seconds is None or not base.times[0] <= desk.choices.seconds <= base.times[-1]:
            passed = base.pass_time[np.isfinite(base.pass_time)]
            return int(np.abs(base.times - np.median(passed)).argmin()) if passed.size else len(base.times) // 3
        return int(np.abs(base.times - desk.choices.seconds).argmin())

    def answer(self, desk: Desk) -> DriftAnswer:
        """The logs let go in the chosen run."""
        return desk.studies.drift(desk.run_id, wish_of(desk.choices))


def wish_of(choices: Choices) -> Wish:
    """The wood that the reader has chosen."""
    return Wish(choices.release, choices.let_go if choices.release == OWN else None, choices.logs)
