"""The screen: every part of the page drawn from the state, each by itself, as soon as its figures are there."""

from __future__ import annotations

from collections.abc import Callable, Hashable
from dataclasses import replace
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np

from . import pair, text
from .choices import UNITS
from .questions import QUESTIONS, saving
from .questions.base import Desk
from .raster import View
from .reading import STORY
from .results import Working
from .theme import Look
from .views import backdrop, frame_words, marks, parcel, photographs, swipe
from .views import map as drawing
from .views.scene import Scene

if TYPE_CHECKING:
    from .page import Page

_PICTURE_SHARE = 0.2  # water drawn beyond the map's edge, so that a pan has something to show


class Screen:
    """What the page shows now, and which results each part waits for."""

    def __init__(self) -> None:
        self.slots: dict[str, str] = {}
        self.waits: dict[str, set[Hashable]] = {}
        self.only: set[str] | None = None
        self.said = ""  # what is being made
        self.failed = ""
        self._question = ""
        self._dressed: Look | None = None
        self._hidden, self._key = 0, "nw"
        self._laid: tuple[str, View, Look] | None = None  # of the backdrop that is shown
        self.at_stop = False
        self._scene: Scene | None = None

    def awaits(self, key: Hashable) -> bool:
        """Whether a part of the screen waits for this result."""
        return any(key in keys for keys in list(self.waits.values()))

    def waiting_for(self, keys: set[Any]) -> set[str]:
        """Parts that wait for any of these results."""
        return {part for part, waited in self.waits.items() if waited & keys}

    def awaited(self, there: Callable[[Hashable], bool]) -> set[Hashable]:
        """Results that a part waits for although they are there."""
        return {key for keys in self.waits.values() for key in keys if there(key)}

    def forget(self) -> None:
        """Everything is drawn anew the next time."""
        self._dressed = None

    def draw(self, page: Page) -> None:
        """Draw the parts that are due and send them."""
        if page.choices.question != self._question:
            self._question, self.slots, self._scene = page.choices.question, {}, None
        due, self.only = self.only, None
        self.said, self.failed = "", page.trouble
        question, desk = page.question, page.desk()
        if self._dressed != desk.look:
            page.map.dress(desk.look)
            page.twin.dress(desk.look)
            self._dressed = desk.look
        self._part("map", due, lambda: self._map(page))
        self._part("twin", due, lambda: self._twin(page))
        desk = page.desk(self._view(page))
        self._part("answer", due, lambda: self._put("answer", question.sentence(desk)))
        for name, make in (
            ("key", lambda: question.key_html(desk)),
            ("alternative", lambda: question.alternative(desk)),
            ("ribbon", lambda: question.ribbon(desk) if question.has_time else ""),
        ):
            self._part(name, due, partial(self._made, name, make))
        self._part("side", due, lambda: self.slots.update({"section": "", "table": "", "body": "", **question.side(desk)}))
        awaited = _ready(question.awaited, desk)
        if awaited:
            self.waits.setdefault("ribbon", set()).update(awaited)
        self._standing(page, desk)
        self._story(page, desk)
        page.wire.param.update(slots=dict(self.slots), state=self._state(page, desk))

    def _part(self, name: str, due: set[str] | None, make: Callable[[], None]) -> None:
        """Run one part; one that is not due keeps what it waits for."""
        if due is not None and name not in due:
            return
        self.waits.pop(name, None)
        try:
            make()
        except Working as working:
            self.waits[name] = {working.key}
            if name in ("map", "answer") or not self.said:
                self.said = working.label
        except (ValueError, OSError) as error:
            self.failed = str(error)

    def _made(self, name: str, make: Callable[[], str]) -> None:
        self._put(name, make())

    def _put(self, name: str, html: str) -> None:
        self.slots[name] = html

    # ---- the map -----------------------------------------------------------------------------------

    def _view(self, page: Page) -> View | None:
        try:
            return page.view()
        except (Working, ValueError, OSError):
            return None

    def _map(self, page: Page) -> None:
        question = page.question
        if not question.has_map:
            return
        run = page.desk().run
        try:
            view = page.view()
        except Working as working:  # the question's own view needs figures: the whole reach meanwhile
            self._draw_map(page, _whole(run.mesh.bounds, page.sizes.map))
            raise working from None
        self._draw_map(page, view)

    def _draw_map(self, page: Page, view: View) -> None:
        desk = page.desk(view)
        question, look = page.question, desk.look
        page.map.turn_to(view)
        scene = replace(question.scene(desk), buttons=tuple((float(x), float(y)) for x, y in _taken_at(desk)))
        self._scene = scene
        scene, waited = self._parcel(desk, scene)
        sheet = drawing.draw(scene, view, look)
        self._hidden, self._key = sheet.hidden, sheet.key
        page.map.show(sheet, *picture_of(scene, desk, view))
        self._put("caption", self._caption(page, desk, view))
        self._put("scale", marks.scale_bar(view.step, desk.units, label=look.label_px) + marks.north())
        missing = self._missing(desk) or waited or self._ground(page, desk, view)
        if missing is not None:
            raise missing

    def _twin(self, page: Page) -> None:
        """The map of the run that stands beside: the same view, section and moment."""
        desk = page.desk(self._view(page))
        beside = pair.other(desk) if page.question.has_map else None
        self._put("twin", "")
        self._put("which", "")
        if beside is None or desk.view is None:
            return
        tube = self._scene.water.tube_m3_s if self._scene is not None and self._scene.water is not None else 0.0
        self._put("which", pair.words(desk, tube))
        self._put("twin", pair.words(beside, 0.0))
        top = desk.reading.top(desk.run_id, desk.choices.shade)
        scene = pair.alike(page.question.scene(beside), top)
        page.twin.turn_to(desk.view)
        page.twin.show(drawing.draw(scene, desk.view, desk.look), *picture_of(scene, beside, desk.view))
        self._put("twin", pair.words(beside, scene.water.tube_m3_s if scene.water is not None else 0.0))
        missing = self._missing(beside)
        if missing is not None:
            raise missing

    def _parcel(self, desk: Desk, scene: Scene) -> tuple[Scene, Working | None]:
        """The scene with the parcel that was let go, and what it waits for; what is wrong with it is said in its place."""
        place, parcels = desk.choices.parcel, desk.studies.parcels
        self._put("parcel", "")
        if place is None:
            return scene, None
        line = None
        try:
            if desk.choices.question == "eddies":
                line = parcels.streamline(desk.run_id, desk.moment, place)
            found = parcels.parcel(desk.run_id, desk.moment, place)
        except Working as working:
            return parcel.onto(scene, None, line, 0.0), working
        except ValueError as error:
            self._put("parcel", text.safe(error))
            return parcel.onto(scene, None, line, 0.0), None
        self._put("parcel", parcel.words(found, place, desk.units, line is not None))
        return parcel.onto(scene, found, line, float(desk.run.times.seconds[desk.index])), None

    def _ground(self, page: Page, desk: Desk, view: View) -> Working | None:
        """The review's backdrops under the water; while they are read the map keeps what it has."""
        wide = view.widened(_PICTURE_SHARE)
        wanted = (desk.run_id, wide, desk.look)
        if self._laid == wanted:
            return None
        try:
            layers = desk.studies.site.layers(desk.run_id, wide)
        except Working as working:
            return working
        colours = backdrop.colours(layers, desk.look.palette)
        for figure in (page.map, page.twin):
            figure.lay(colours, wide)
        self._laid = wanted
        return None

    def _missing(self, desk: Desk) -> Working | None:
        """The map shows only water until psi is there: then it is drawn again."""
        try:
            desk.reading.tubes(desk.run_id, desk.moment, desk.choices.tubes)
        except Working as working:
            return working
        except ValueError:
            return None
        return None

    def _caption(self, page: Page, desk: Desk, view: View) -> str:
        words = page.question.caption(desk, self._scene or Scene(), view)
        if self._hidden:
            words += f" {text.count(self._hidden, 'more eddy is', 'more eddies are')} too small to name here."
        words += backdrop.words(desk.studies.site.backdrop_names())
        zoom = "".join(
            f'<button type="button" class="word" data-do="zoom" data-value="{value}" data-key="zoom-{value}">{label}</button> '
            for value, label in (*page.question.places, ("nearer", "nearer"), ("farther", "farther"), ("whole", "whole reach"))
        )
        return f"<span>{words}</span><span class=zoom>{zoom}{parcel.form()} {saving.words(page.question)}</span>"

    # ---- what stands on every screen ----------------------------------------------------------------

    def _standing(self, page: Page, desk: Desk) -> None:
        question, choices = page.question, page.choices
        rows = []
        for key, q in QUESTIONS.items():
            try:
                rows.append((key, q.word, q.summary(desk)))
            except (Working, ValueError, OSError):
                rows.append((key, q.word, "waiting for the results"))
        self._put("rail", frame_words.rail(rows, choices.question))
        self._put("asks", question.asks)
        self.at_stop = False
        if self.failed:
            self._put("status", f'<span class="trouble">{frame_words.trouble(self.failed)}</span>')
        else:
            self._put("status", frame_words.working(self.said) if self.said else "")
        if "answer" not in self.slots or self.waits.get("answer"):
            self.slots.setdefault("answer", text.safe(self.said or "These results cannot be shown."))
        self._photographs(page, desk)
        self._put("cautions", frame_words.cautions(question.cautions(desk), short=desk.look.hall))
        try:
            matter = page.reading.matter()
        except (Working, ValueError, OSError):
            self._put("title", f"<b>Leewater</b><span>{text.safe(page.reading.path.name)}</span>")
            self._put("foot", "")
            return
        if page.stop is not None and page.stop < len(page.stops):
            self.at_stop = True
            self._put("asks", text.safe(page.stops[page.stop].sentence))
        place = matter.review.contents.place if matter.review else ""
        self._put("title", f"<b>Leewater</b><span>{text.safe(matter.title)}{'. ' + text.safe(place) if place else ''}</span>")
        self._put("foot", _foot(page, desk, matter.runs))

    def _photographs(self, page: Page, desk: Desk) -> None:
        """Their marks on the map, and the one that is open."""
        found = _ready(lambda d: d.studies.site.photographs(d.run_id), desk) if page.question.has_map else None
        self._put("places", photographs.marks(found or (), _taken_at(desk), page.photograph))
        chosen = found[page.photograph] if found and page.photograph is not None else None
        self._put("photograph", photographs.shown(chosen, page.photograph or 0) if chosen else "")

    def _story(self, page: Page, desk: Desk) -> None:
        """Progress of long work, with its Stop: the question's own, else following the eddies through the run."""
        own = page.question.progress(desk) if page.reading.have("matter") else None
        if own is not None:
            self._put("progress", frame_words.working(own[0], own[1], own[2], "%", stoppable=True))
            return
        try:
            story = page.reading.story(desk.run_id) if page.question.has_time else None
        except (Working, ValueError, OSError):
            story = None
        if story is not None and len(story.beats) > 1 and story.followed is None:
            for part in ("map", "answer", "side", "ribbon"):  # tags take their lasting names then
                self.waits.setdefault(part, set()).add(("followed", desk.run_id))
        if story is None or story.whole:
            self._put("progress", "")
            return
        results = page.reading.results
        beats = [("beat", desk.run_id, i) for i in range(len(story.beats))]
        missing = {key for key in beats if not page.reading.results.have(key)}
        self.waits.setdefault("ribbon", set()).update(missing)
        if results.stopped(STORY):
            self._put(
                "progress", f"<span>Followed {story.done} of {len(story.beats)} frames; stopped.</span>"
                '<button type="button" class="plain" data-do="resume" data-key="resume">Go on</button>',
            )
        else:
            self._put("progress", frame_words.working("Following the eddies:", story.done, len(story.beats), stoppable=True))

    def _state(self, page: Page, desk: Desk) -> dict[str, Any]:
        choices = page.choices
        state: dict[str, Any] = {
            "mode": choices.mode, "view": "hall" if choices.hall else "desk", "question": choices.question,
            "query": choices.query(), "push": page.push, "title": f"{page.question.word} \u00b7 Leewater",
            "stop": "yes" if self.at_stop else "", "working": "yes" if self.said else "no", "ends": None, "time": None,
            "key": self._key, "pair": "yes" if self.slots.get("twin") else "", "arrangement": "map" if page.question.has_map else "words", "file": page.file_to_send(),
        }
        if all(isinstance(key, tuple) and key[0] == "followed" for key in self.waits.get("map", ())):
            state["seen"] = page.sent
        ends = _ready(page.question.section_ends, desk) if page.question.has_map else None
        state["swipe"] = _ready(page.question.swipe, desk)
        state["ends"] = [list(end) for end in ends] if ends else None
        state["time"] = _ready(page.question.moments, desk) if page.question.has_time else None
        return state


def _taken_at(desk: Desk) -> list[np.ndarray]:
    """Local places of the site's photographs, once they are known."""
    found = _ready(lambda d: d.studies.site.photographs(d.run_id), desk) or ()
    return [desk.run.mesh.to_local(np.array([p.x, p.y])) for p in found]


def picture_of(scene: Scene, desk: Desk, view: View) -> tuple[np.ndarray | None, View | None]:
    """The water's palette bytes, and the somewhat wider view that they fill; None where there is no water."""
    w = scene.water
    if w is None:
        return None, None
    ratio = min(max(desk.sizes.ratio, 1.0), 2.0)
    wide = view.widened(_PICTURE_SHARE)
    wide = replace(wide, columns=round(wide.columns * ratio), rows=round(wide.rows * ratio))
    raster = desk.reading.raster(desk.run_id, wide)
    picture = raster.paint(w.frame, w.value, w.top, psi=w.psi, tube=w.tube_m3_s, carries=w.carries)
    if scene.beside is not None:
        b, (east, north) = scene.beside.water, scene.beside.shift
        other = desk.reading.raster(scene.beside.run_id, replace(wide, x=wide.x - east, y=wide.y - north))
        painted = other.paint(b.frame, b.value, b.top, psi=b.psi, tube=b.tube_m3_s, carries=b.carries)
        picture = swipe.composed(picture, painted, wide, scene.beside)
    return picture, wide


def _ready(make: Callable[[Desk], Any], desk: Desk) -> Any:
    """What a question gives, or None while it is being made or where it cannot be."""
    try:
        return make(desk)
    except (Working, ValueError, OSError):
        return None


def _whole(bounds: tuple[float, float, float, float], size: tuple[int, int]) -> View:
    west, south, east, north = bounds
    return View((west + east) / 2, (south + north) / 2, 1.04 * max(east - west, (north - south) * size[0] / size[1]), *size)


def _foot(page: Page, desk: Desk, runs: tuple[tuple[str, str], ...]) -> str:
    choices = page.choices

    def word(do: str, value: str, label: str, off: bool = False) -> str:
        disabled = " disabled" if off else ""
        return (
            f'<button type="button" class="word" data-do="{do}" data-value="{value}" data-key="{do}-{value}"{disabled}>'
            f"{label}</button>"
        )

    options = "".join(
        f'<option value="{text.safe(i)}"{" selected" if i == desk.run_id else ""}>{text.safe(label)}</option>' for i, label in runs
    )
    others = '<option value="">no other run</option>' + "".join(
        f'<option value="{text.safe(i)}"{" selected" if i == choices.alongside else ""}>{text.safe(label)}</option>'
        for i, label in runs if i != desk.run_id
    )
    units = "".join(f'<option{" selected" if u == choices.units else ""}>{u}</option>' for u in UNITS)
    night = choices.mode == "night"
    stops = len(page.stops)
    where = f"Stop {page.stop + 1} of {stops}" if page.stop is not None else f"{stops} {'stop' if stops == 1 else 'stops'}"
    walk = (
        f"<div><span>{where}</span> {word('step', '-1', 'before', page.stop in (None, 0))} "
        f"{word('step', '1', 'next', page.stop == stops - 1)}</div>" if stops else ""
    )
    beside = (
        f'<div><label for="alongside">Beside it</label> <select class="word" id="alongside" data-choose="alongside">{others}</select></div>'
        if len(runs) > 1 and choices.question in pair.PAIRED else ""
    )
    kept = (
        '<details><summary class="word">Keep this view</summary><form data-send="keep"><label for="keep-sentence">What you will '
        'say here</label><input type="text" name="sentence" id="keep-sentence" data-once required>'
        '<button type="submit" class="plain">Keep</button></form></details>'
    )
    return (
        f"{walk}<div>{word('undo', '', 'Undo', not page.history.can_undo)} {word('redo', '', 'Redo', not page.history.can_redo)}</div>"
        f"<div>{word('hall', 'no' if choices.hall else 'yes', 'Desk view' if choices.hall else 'Hall view')} "
        f"{word('mode', 'day' if night else 'night', 'Day' if night else 'Night')}</div>"
        f'<div><label for="units">Units</label> <select class="word" id="units" data-choose="units">{units}</select></div>'
        f'<div><label for="run">Run</label> <select class="word" id="run" data-choose="run">{options}</select></div>{beside}'
        f"{kept if page.reading.matter().review is not None else ''}"
    )
