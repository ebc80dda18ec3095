"""Sections: how much passes here, and how is it spread?"""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import asdict

import numpy as np

from hydro.cautions import OWED
from hydro.section import Section, SectionFigures, shares
from hydro.section.figures import FORMULAS

from .. import text
from ..raster import View
from ..views import ribbon as strip
from ..views import table
from ..views.scene import Scene
from . import common, stations
from .base import Desk, Question, footnote
from .moments import moment_words, window_words

_OWN = "your own line"


class Sections(Question):
    """One line across the river, drawn by the reader or taken from the review."""

    key = "sections"
    word = "Sections"
    asks = "How much passes here, and how is it spread?"
    places = (("subject", "the line"),)
    has_section = True
    numbered = ("figures", "stations")

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
        words = f"<i>Plate 5.</i> Section: {lines}.{stations.beside_words(desk, self.named(desk))} {common.water_words(desk, scene)}"
        return f"{words} Drag L and R to draw your own.{moment_words(desk, None)}{stations.course_words(desk)}"

    def key_html(self, desk: Desk) -> str:
        return common.ramp_key(desk)

    def alternative(self, desk: Desk) -> str:
        _, figures = self.read(desk)
        return f"Map of the reach with a section that passes {desk.units.quantity(figures.discharge_m3_s, 'm3/s')}."

    def ribbon(self, desk: Desk) -> str:
        return strip.draw(stations.course(desk, self.section_ends(desk)), common.ribbon_box(desk), desk.units)

    def awaited(self, desk: Desk) -> set[Hashable]:
        return stations.awaited(desk, self.section_ends(desk))

    def moments(self, desk: Desk) -> dict[str, object]:
        return common.moments_of(stations.course(desk, self.section_ends(desk)), desk)

    def side(self, desk: Desk) -> dict[str, str]:
        ledger, ends = desk.reading.ledger(desk.run_id, desk.moment), self.section_ends(desk)
        drawn = common.section_html(desk, ends, ledger, None, self.cautions(desk))
        other = self.beside(desk)
        if other is not None:
            second = common.section_html(desk, other[1], ledger, None, self.cautions(desk))
            drawn += second.replace("<h2>Section", f"<h2>{text.safe(other[0])}", 1)
        return {"section": drawn, "table": self.table(desk), "body": "" if desk.look.hall else stations.along_html(desk, ends) + stations.ends_form(desk, ends)}

    def beside(self, desk: Desk) -> tuple[str, common.Ends] | None:
        """The second section with its name, if one is chosen."""
        name = desk.choices.beside
        ends = self.named(desk).get(name)
        return None if ends is None else (name, ends)

    def numbers(self, desk: Desk, which: str) -> tuple[list[dict[str, object]], str]:
        run, ends = desk.run, self.section_ends(desk)
        (x1, y1), (x2, y2) = run.mesh.to_world(np.array(ends))
        line, figures = self.read(desk)
        command = f'leewater section {run.files[0].name} --line "{x1:.2f},{y1:.2f} {x2:.2f},{y2:.2f}" --frame {desk.index}'
        if which == "stations":
            return stations.rows(desk, line), command
        return [{"section": self.chosen(desk), "frame": desk.index, **asdict(figures), "flags": ", ".join(figures.flags)}], command

    def table(self, desk: Desk) -> str:
        _, f = self.read(desk)
        other = self.beside(desk)
        g = stations.measured(desk, other[1])[1] if other is not None else None
        u, ids = desk.units, self.cautions(desk)
        note = footnote(ids, "section-discharge")
        rows = (
            (f"Discharge by the field{note}", "discharge_m3_s", "m3/s", 3),
            (f"Error of reading it{footnote(ids, 'sensitivity')}", "discharge_error_m3_s", "m3/s", 2),
            ("Discharge by psi", "discharge_psi_m3_s", "m3/s", 3),
            ("Discharge, mid-section", "discharge_mid_section_m3_s", "m3/s", 3),
            ("Discharge, mean-section", "discharge_mean_section_m3_s", "m3/s", 3),
            ("Width of water", "width_m", "m", 3), ("Area", "area_m2", "m2", 3), ("Hydraulic radius A/P", "hydraulic_radius_m", "m", 3),
            ("Mean depth A/T", "mean_depth_m", "m", 3), ("Greatest depth", "max_depth_m", "m", 3),
            ("Mean velocity", "mean_velocity_m_s", "m/s", 3), ("Greatest velocity", "max_velocity_m_s", "m/s", 3),
            (f"Froude number{footnote(ids, 'uniform-flow')}", "froude", "", 3), ("Energy coefficient alpha", "alpha", "", 3),
            ("Momentum coefficient beta", "beta", "", 3), ("Section head", "head_m", "m", 6),
            ("Mean level over the width", "mean_level_m", "m", 6),
        )
        lines = []
        for name, key, unit, digits in rows:
            values = [u.number(getattr(figures, key), unit, digits=digits) for figures in (f, g) if figures is not None]
            title = f'<span title="{text.safe(FORMULAS[key])}">{name}</span>' if key in FORMULAS else name
            lines.append(table.Line(((title, ""), *((v, "") for v in values), (u.label(unit), ""))))
        second = (table.Column(text.safe(other[0])),) if other is not None else ()
        columns = (table.Column("Figure", figure=False), table.Column("Value"), *second, table.Column("Unit", figure=False))
        datum = desk.run.datum
        frame = desk.reading.frame(desk.run_id, desk.moment)
        moment = f"mean {window_words(desk)}" if isinstance(desk.moment, tuple) else text.moment(frame.time, frame.seconds)
        aside = f"Levels above {text.safe(datum)}." if datum else "The file names no vertical datum."
        if g is not None and other is not None:
            aside = f"{stations.loss_words(desk, f, g, other[0])} {aside}"
        return table.html(table.Table("Figures", moment, f"Figures of the section at {moment}", columns, lines, aside=aside))

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return OWED["sections"]

    def section_ends(self, desk: Desk) -> common.Ends:
        if desk.choices.section is not None:
            return common.chosen_ends(desk)
        return next(iter(self.named(desk).values()), None) or common.first_ends(desk, None)

    def read(self, desk: Desk) -> tuple[Section, SectionFigures]:
        """The section cut through the chosen frame, and its figures."""
        return stations.measured(desk, self.section_ends(desk))

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
