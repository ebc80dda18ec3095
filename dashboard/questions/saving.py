"""What the reader keeps of a screen: the map and the section as drawings or pictures, the figures as numbers."""

from __future__ import annotations

import re
from html import unescape

from hydro.ledger.export import csv_text
from hydro.ledger.report import source_of

from .. import text, theme
from ..raster import View
from ..sheets import Drawn, File, of_page, sheet
from ..views import map as drawing
from ..views import swipe
from ..views.vector import map_svg
from .base import Desk, Question

_MAP = {"map.svg": "map, drawing (SVG)", "map.png": "map, picture (PNG)"}
_SECTION = {"section.svg": "section, drawing (SVG)", "section.png": "section, picture (PNG)"}


def words(question: Question) -> str:
    """The word that opens what can be kept, as HTML."""
    buttons = " ".join(
        f'<button type="button" class="word" data-do="save" data-value="{key}" data-key="save-{key}">{label}</button>'
        for key, label in _offered(question).items()
    )
    return f'<details class="inline"><summary class="word">save</summary> {buttons}</details>'


def file_of(question: Question, desk: Desk, view: View, what: str) -> File:
    """The file that a word of the menu asks for.

    Raises ``ValueError`` for an unknown word, and where the screen has no such thing.
    """
    offered = _offered(question)
    if what not in offered:
        raise ValueError(f"{question.word} cannot save {what!r}; it offers {', '.join(offered)}.")
    part, kind = what.split(".")
    name = f"leewater-{desk.run_id}-{question.key}-{part}.{kind}"
    if kind == "csv":
        rows, command = question.numbers(desk, part)
        source = source_of(desk.run) | {"command": command}
        return File(name, csv_text(rows, source, desk.run.settings, question.cautions(desk)))
    drawn = _map(question, desk, view) if part == "map" else _section(question, desk)
    told = [plain(question.sentence(desk)), _source(desk)]
    title = f"{question.word}: {desk.reading.label(desk.run_id)}"
    return File(name, sheet(title, told, [drawn], question.cautions(desk)), picture=kind == "png")


def _offered(question: Question) -> dict[str, str]:
    tables = {f"{name}.csv": f"{name} (CSV)" for name in question.numbered}
    return _MAP | (_SECTION if question.has_section else {}) | tables


def _map(question: Question, desk: Desk, view: View) -> Drawn:
    from ..screen import picture_of

    look = theme.look("day")
    scene = swipe.labelled(question.scene(desk), view)
    marks = drawing.draw(scene, view, look)
    shade = desk.choices.shade
    ramp = shade.capitalize(), scene.water.top if scene.water else 1.0, "m/s" if shade == "speed" else "m"
    return of_page(map_svg(
        marks, *picture_of(scene, desk, view), view, look, desk.units, section=question.section_ends(desk), ramp=ramp,
    ))


def _section(question: Question, desk: Desk) -> Drawn:
    found = re.search(r"<svg class=.section.*?</svg>", question.side(desk).get("section", ""), re.S)
    if found is None:
        raise ValueError("this screen has no section to save; choose Eddies or Sections.")
    return of_page(found.group(0))


def _source(desk: Desk) -> str:
    """Run, time, units, file and its hash: enough to derive the drawing again."""
    run = desk.run
    moment = desk.moment
    if isinstance(moment, tuple):
        when = f"mean from {moment[0]:g} s to {moment[1]:g} s"
    else:
        instant = None if run.times.instants is None else run.times.instants[moment]
        when = text.moment(instant, float(run.times.seconds[moment]))
    names = ", ".join(p.name for p in run.files)
    return f"{when}. From {names}, SHA-256 {run.hash}. View: ?{desk.choices.query()}"


def plain(html: str) -> str:
    """HTML as plain text; raised letters in brackets."""
    html = re.sub(r"<sup>.*?>(\w)</a></sup>", r" (\1)", html)
    return re.sub(r"[ \n]+", " ", unescape(re.sub(r"<[^>]+>", "", html))).strip()
