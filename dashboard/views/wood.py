"""Tables of drift: wood against piers and openings, what fed them, eddies that hold it, design logs, deck contact; HTML."""

from __future__ import annotations

from hydro.drift import Drifted
from hydro.drift.places import LOG_SOURCE
from hydro.drift.report import DriftAnswer

from ..text import percent, safe
from ..units import Units
from .table import Column, Line, Table, html


def against_piers(base: Drifted, chosen: str, note: str, ranges: str) -> str:
    """Logs that touch and lodge, by pier; a row shows only the logs that touch its pier."""
    columns = (
        Column(f"Of {len(base.state)} logs", figure=False), Column("touch"), Column("lodge"),
        Column("share that touches,", f"95 % interval{note}"),
    )
    lines = []
    for i, pier in enumerate(base.piers):
        touch, lodge = base.touches(i), base.lodges(i)
        between = f"{100 * touch.low:.1f} to {100 * touch.high:.1f}\u00a0%"
        lines.append(Line(
            ((safe(pier.name), ""), (str(touch.count), ""), (str(lodge.count), ""), (percent(touch.value), between)),
            pier.name == chosen, ("subject", "" if pier.name == chosen else pier.name), f"Show only the logs that touch {pier.name}",
        ))
    return html(Table("Wood against the piers", "", "Logs that touch and lodge, by pier", columns, lines, "No pier.", ranges))


def through_openings(base: Drifted) -> str:
    """Logs through each opening."""
    rows = [
        Line(((safe(o.name), ""), (str(base.passes(i).count), ""), (percent(base.passes(i).value), ""))) for i, o in enumerate(base.openings)
    ]
    through = (Column("Opening", figure=False), Column("pass"), Column("share"))
    return html(Table("Through the openings", "", "Logs through each opening", through, rows, "No opening."))


def more(answer: DriftAnswer, units: Units) -> str:
    """What fed each pier, openings against a design log, eddies that hold wood, and contact with a deck."""
    base = answer.base
    fed = html(Table(
        "What fed the piers", "logs that touch, by release", "Logs that touch each pier, by release",
        (Column("Pier", figure=False), *(Column(safe(name)) for name in base.release_names)),
        [Line(((safe(p.name), ""), *((str(n), "") for n in base.fed(i).values()))) for i, p in enumerate(base.piers)], "No pier.",
    ))
    decks = [s for s in answer.reach.structures if s.kind == "deck" and "soffit_m" in s.levels]
    contact = "".join(
        f"<p>{base.deck_contacts(s.levels['soffit_m']).count} of the logs that pass stand above the soffit of {safe(s.name)}.</p>" for s in decks
    )
    return fed + _gaps(answer, units) + _held(answer, units) + contact


def _gaps(answer: DriftAnswer, units: Units) -> str:
    columns = (
        Column("Opening", figure=False), Column("Square to the flow,", units.label("m")), Column("Design log,", units.label("m")),
        Column("A design log is", figure=False),
    )
    lines = [
        Line((
            (safe(g.opening), ""), (units.number(g.effective_width_m, "m"), ""), (units.number(g.design_log_m, "m"), ""),
            (f"{'longer' if g.narrower else 'no longer'} than the opening is wide", ""),
        )) for g in answer.gaps
    ]
    caption = "Width of each opening square to the flow, and the length of a design log"
    return html(Table("Openings and a design log", safe(LOG_SOURCE), caption, columns, lines, "No opening."))


def _held(answer: DriftAnswer, units: Units) -> str:
    columns = (Column("Eddy", figure=False), Column("Logs"), Column("Half stay for,", "s or more"))
    lines = [
        Line(((safe(h.eddy), ""), (str(h.logs), ""), (units.number(h.median_s, "s", digits=2), ""))) for h in answer.held if h.logs
    ]
    return html(Table("Wood in eddies", "", "Logs that come into each eddy and how long half of them stay", columns, lines, "No log comes into one."))
