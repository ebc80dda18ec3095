"""Sections: how much passes here, and how is it spread?"""

from __future__ import annotations

import numpy as np

from hydro.section import Section, SectionFigures, cut, section_figures, shares

from .. import text
from ..raster import View
from ..views import ribbon as strip
from ..views import table
from ..views.scene import Scene
from . import common
from .base import Desk, Question, footnote

_OWN = "your own line"


class Sections(Question):
    """One line across the river, drawn by the reader or taken from the review."""

    key = "sections"
    word = "Sections"
    asks = "How much passes here, and how is it spread?"
    places = (("subject", "the line"),)

    def summary(self, desk: Desk) -> str:
        named = len(self.named(desk))
        return f"{named} in the review" if named else "draw one on the map"

    def sentence(self, desk: Desk) -> str:
        line, figures = self.read(desk)
        u, ids = desk.units, self.cautions(desk)
        if not figures.area_m2 > 0:
            return "The line crosses no water in this frame."
        name = self.chosen(desk)
        where = f'<em class="subject">{text.safe(name)}</em>' if name != _OWN else "this line"
        left, middle, right = self.thirds(line)
        q = u.quantity(abs(figures.discharge_m3_s), "m3/s")
        back = ", upstream" if figures.discharge_m3_s < 0 else ""
        return (
            f"<b>{q}</b>{footnote(ids, 'section-discharge')} passes {where}{back}: {text.percent(left)} of it in the left third of "
            f"the water, {text.percent(middle)} in the middle and {text.percent(right)} in the right."
        )

    def scene(self, desk: Desk) -> Scene:
        return common.water_scene(desk)

    def view(self, desk: Desk):
        (x1, y1), (x2, y2) = self.section_ends(desk)
        bounds = min(x1, x2), min(y1, y2), max(x1, x2), max(y1, y2)
        return common.view_of(desk, bounds, None)

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        offered = {name: name for name in self.named(desk)}
        chosen = self.chosen(desk)
        lines = common.chooser("line", chosen, {_OWN: _OWN, **offered}, "the section")
        return f"<i>Plate 5.</i> Section: {lines}. {common.water_words(desk, scene)} Drag L and R to draw your own."

    def key_html(self, desk: Desk) -> str:
        return common.ramp_key(desk)

    def alternative(self, desk: Desk) -> str:
        _, figures = self.read(desk)
        return f"Map of the reach with a section that passes {desk.units.quantity(figures.discharge_m3_s, 'm3/s')}."

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(common.plain_course(desk), common.ribbon_box(desk), desk.units)

    def moments(self, desk: Desk) -> dict[str, object]:
        return common.moments(desk)

    def side(self, desk: Desk) -> dict[str, str]:
        ledger = desk.reading.ledger(desk.run_id, desk.index)
        return {
            "section": common.section_html(desk, self.section_ends(desk), ledger, None, self.cautions(desk)),
            "table": self.table(desk),
        }

    def table(self, desk: Desk) -> str:
        _, f = self.read(desk)
        u, ids = desk.units, self.cautions(desk)
        note = footnote(ids, "section-discharge")
        rows: tuple[tuple[str, float | None, str], ...] = (
            (f"Discharge by the field{note}", f.discharge_m3_s, "m3/s"),
            ("Error of reading it", f.discharge_error_m3_s, "m3/s"), ("Discharge by psi", f.discharge_psi_m3_s, "m3/s"),
            ("Discharge, mid-section", f.discharge_mid_section_m3_s, "m3/s"),
            ("Discharge, mean-section", f.discharge_mean_section_m3_s, "m3/s"),
            ("Width of water", f.width_m, "m"), ("Area", f.area_m2, "m2"), ("Hydraulic radius A/P", f.hydraulic_radius_m, "m"),
            ("Mean depth A/T", f.mean_depth_m, "m"), ("Greatest depth", f.max_depth_m, "m"),
            ("Mean velocity", f.mean_velocity_m_s, "m/s"), ("Greatest velocity", f.max_velocity_m_s, "m/s"),
            (f"Froude number{footnote(ids, 'uniform-flow')}", f.froude, ""), ("Energy coefficient alpha", f.alpha, ""),
            ("Momentum coefficient beta", f.beta, ""),
        )
        lines = [
            table.Line(((name, ""), (u.number(value, unit), ""), (u.label(unit), ""))) for name, value, unit in rows
        ]
        levels = (("Section head", f.head_m), ("Mean level over the width", f.mean_level_m))
        lines += [
            table.Line(((name, ""), (u.number(value, "m", digits=6), ""), (u.label("m"), ""))) for name, value in levels
        ]
        columns = (table.Column("Figure", figure=False), table.Column("Value"), table.Column("Unit", figure=False))
        datum = desk.run.datum
        frame = desk.reading.frame(desk.run_id, desk.index)
        moment = text.moment(frame.time, frame.seconds)
        aside = f"Levels above {text.safe(datum)}." if datum else "The file names no vertical datum."
        return table.html(table.Table("Figures", moment, f"Figures of the section at {moment}", columns, lines, aside=aside))

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return ("section-discharge", "uniform-flow", "no-secondary-currents", "no-roller")

    def section_ends(self, desk: Desk) -> common.Ends:
        if desk.choices.section is not None:
            return common.chosen_ends(desk)
        return next(iter(self.named(desk).values()), None) or common.first_ends(desk, None)

    def read(self, desk: Desk) -> tuple[Section, SectionFigures]:
        """The section cut through the chosen frame, and its figures."""
        ledger = desk.reading.ledger(desk.run_id, desk.index)
        centre = desk.reading.reach(desk.run_id).centre_line
        line = cut(ledger.frame, np.array(self.section_ends(desk)), centre_line=centre)
        return line, section_figures(line, sf=ledger.sf, settings=desk.run.settings)

    def named(self, desk: Desk) -> dict[str, common.Ends]:
        """Sections of the review, by name, as their ends."""
        found = {}
        for item in desk.reading.reach(desk.run_id).layer("sections"):
            at = np.asarray(item.geometry.coords)[[0, -1], :2]
            found[item.name] = (float(at[0, 0]), float(at[0, 1])), (float(at[1, 0]), float(at[1, 1]))
        return found

    def chosen(self, desk: Desk) -> str:
        """The name of the review's section that the line lies on, to the centimetre."""
        ends = np.array(self.section_ends(desk))
        for name, other in self.named(desk).items():
            if np.abs(ends - np.array(other)).max() < 0.02 or np.abs(ends[::-1] - np.array(other)).max() < 0.02:
                return name
        return _OWN

    def thirds(self, line: Section) -> tuple[float, float, float]:
        """Shares of the discharge in the left, middle and right third of the water's width."""
        wet = line.distance[line.wet]
        low, high = float(wet.min()), float(wet.max())
        parts = shares(line, np.linspace(low, high, 4))
        return float(parts[0]), float(parts[1]), float(parts[2])
