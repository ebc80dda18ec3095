"""The ledger as a page to print: plain HTML that needs nothing else."""

from __future__ import annotations

import html
from collections.abc import Mapping
from typing import Any

import numpy as np

from ..figure import Figure, printed
from ..settings import Settings
from .report import balance_words

_COLUMNS = (
    ("area_m2", "area", "m2"), ("volume_m3", "volume", "m3"), ("length_m", "length", "m"), ("width_m", "width", "m"),
    ("mean_depth_m", "mean depth", "m"), ("recirculating_discharge_m3_s", "circulates", "m3/s"),
    ("rotation_time_s", "rotation time", "s"), ("max_reverse_speed_m_s", "reverse speed", "m/s"),
)
_STYLE = """
body { font: 10pt/1.4 system-ui, sans-serif; margin: 18mm; color: #17202a; }
h1 { font-size: 15pt; margin: 0 0 2mm; } h2 { font-size: 11pt; margin: 6mm 0 2mm; }
table { border-collapse: collapse; width: 100%; } caption { text-align: left; padding: 0 0 1mm; }
th, td { text-align: left; padding: 1mm 2mm; border-bottom: 0.2mm solid #8795a1; vertical-align: top; }
td.n, th.n { text-align: right; font-variant-numeric: tabular-nums; }
small { color: #44525e; } footer { margin-top: 6mm; font-size: 8pt; overflow-wrap: anywhere; }
@page { size: A4 landscape; margin: 12mm; } @media print { body { margin: 0; } tr { break-inside: avoid; } }
"""


def page_text(whole: Mapping[str, Any], settings: Settings) -> str:
    """A printable page of a ledger (see :func:`hydro.ledger.ledger_json`), figures rounded to their sensitivity."""
    source = whole["source"]
    title = f"Recirculation zones: {source['run']}"
    body = [f"<h1>{html.escape(title)}</h1>"]
    if whole.get("eddies"):
        body.append(_lives(whole["eddies"]))
    body += [_frame(entry) for entry in whole["frames"]]
    body.append("<h2>Cautions</h2><ul>" + "".join(f"<li>{html.escape(c['text'])}</li>" for c in whole["cautions"]) + "</ul>")
    body.append(
        f"<footer>SHA-256 {html.escape(str(source['hash']))}; settings {settings.digest()}; leewater "
        f"{html.escape(source['versions']['leewater'])}; {html.escape(source['made'])}; {html.escape(source['command'])}</footer>"
    )
    return (
        f'<!doctype html>\n<html lang="en-GB"><head><meta charset="utf-8"><title>{html.escape(title)}</title>'
        f"<style>{_STYLE}</style></head><body>\n" + "\n".join(body) + "\n</body></html>\n"
    )


def figure_of(zone: Mapping[str, Any], name: str, unit: str) -> Figure:
    """The figure record of one entry of a zone."""
    low, high = zone["sensitivity"].get(name, (None, None))
    return Figure(name, zone[name], unit, low, high, tuple(zone["flags"]), tuple(zone["cautions"]))


def _frame(entry: Mapping[str, Any]) -> str:
    when = entry["time"] or f"{entry['seconds']:g} s"
    head = "".join(f'<th class="n">{name} <small>{unit}</small></th>' for _, name, unit in _COLUMNS)
    rows = "".join(_row(zone) for zone in entry["zones"]) or f'<tr><td colspan="{len(_COLUMNS) + 4}">No zone above the floor.</td></tr>'
    misfit = entry["misfit"]
    return (
        f"<h2>{html.escape(entry['kind'].capitalize())} at {html.escape(when)}</h2><table><caption>"
        f"{printed(entry['through_discharge_m3_s'])} m3/s through; misfit of psi {100 * misfit['total']:.2g} %, unexplained "
        f"{100 * misfit['unexplained']:.2g} %; read from {html.escape(entry['field'])}; {entry['small_zones']} under the floor"
        f"{''.join(f'. {html.escape(words)}' for words in balance_words(entry))}</caption><tr><th>id</th><th>zone</th><th>turns</th>{head}<th>flags</th></tr>{rows}</table>"
        + _residence(entry["zones"])
        + (_travelling(entry["travelling"]) if entry["travelling"] else "")
    )


def _residence(zones: list[Mapping[str, Any]]) -> str:
    """How long water stays in each zone, where it was asked for."""
    return "".join(f"<p>{z['id']}: {html.escape(z['residence']['words'])}.</p>" for z in zones if "residence" in z)


def _travelling(eddies: list[Mapping[str, Any]]) -> str:
    """Travelling eddies: listed apart, since none of them closes in the fixed frame."""
    rows = []
    for e in eddies:
        speed = float(np.hypot(*e["speed_m_s"]))
        size = "core only" if e["core_only"] else printed(e["area_m2"])
        flow = "" if e["core_only"] else printed(e["recirculating_discharge_m3_s"])
        rows.append(
            f"<tr><td>{e['id']}</td><td>{e['rotation']}</td><td class=\"n\">{e['centre'][0]:.1f}</td><td class=\"n\">{e['centre'][1]:.1f}</td>"
            f'<td class="n">{printed(speed)}</td><td>{e["speed_from"]}</td><td class="n">{printed(e["circulation_m2_s"])}</td>'
            f'<td class="n">{size}</td><td class="n">{flow}</td><td class="n">{100 * e["misfit_of_its_view"]:.0f} %</td></tr>'
        )
    return (
        "<table><caption>Travelling eddies, each seen by an observer who moves with it</caption><tr><th>id</th><th>turns</th>"
        '<th class="n">east <small>m</small></th><th class="n">north <small>m</small></th><th class="n">moves <small>m/s</small></th>'
        '<th>speed from</th><th class="n">circulation <small>m2/s</small></th><th class="n">area <small>m2</small></th>'
        f'<th class="n">circulates <small>m3/s</small></th><th class="n">misfit</th></tr>{"".join(rows)}</table>'
    )


def _row(zone: Mapping[str, Any]) -> str:
    cells = []
    for name, _, unit in _COLUMNS:
        f = figure_of(zone, name, unit)
        span = "" if f.low is None else f"<br><small>{printed(f.low)} to {printed(f.high)}</small>"
        cells.append(f'<td class="n">{printed(f.value, f.low, f.high)}{span}</td>')
    words = (zone["id"], zone["name"], zone["rotation"])
    return (
        "<tr>" + "".join(f"<td>{html.escape(w)}</td>" for w in words) + "".join(cells)
        + f"<td>{html.escape(', '.join(zone['flags']))}</td></tr>"
    )


def _lives(eddies: list[Mapping[str, Any]]) -> str:
    rows = []
    for life in eddies:
        area = " to ".join(printed(v) for v in life["ranges"]["area_m2"])
        flow = " to ".join(printed(v) for v in life["ranges"]["recirculating_discharge_m3_s"])
        remarks = [f"not followed: {life['why']}"] if not life["followed"] else []
        remarks += ["unsteady"] if life["unsteady"] else []
        remarks += [f"split from {life['parent']}"] if life["parent"] else []
        remarks += [f"merged into {life['merged_into']}"] if life["merged_into"] else []
        rows.append(
            f"<tr><td>{life['id']}</td><td>{html.escape(life['name'])}</td><td class=\"n\">{life['first_s']:g}</td>"
            f"<td class=\"n\">{life['last_s']:g}</td><td class=\"n\">{100 * life['share_of_time']:.0f} %</td>"
            f'<td class="n">{area}</td><td class="n">{flow}</td><td>{html.escape(", ".join(remarks))}</td></tr>'
        )
    return (
        '<h2>Eddies in time</h2><table><tr><th>id</th><th>eddy</th><th class="n">from <small>s</small></th>'
        '<th class="n">to <small>s</small></th><th class="n">of the time</th><th class="n">area <small>m2</small></th>'
        f'<th class="n">circulates <small>m3/s</small></th><th>remarks</th></tr>{"".join(rows)}</table>'
    )
