"""One viewer's page: takes what the reader does, keeps the one state, and has the screen drawn from it."""

from __future__ import annotations

import logging
from collections.abc import Callable
from dataclasses import fields, replace
from typing import Any

import numpy as np

from . import theme
from .choices import Choices, History, from_query
from .packs import PACKS
from .questions import QUESTIONS, saving
from .questions.base import Desk, Question, Sizes
from .questions.drift import wish_of
from .questions.moments import window_for, window_of
from .questions.stations import typed_ends, typed_place
from .raster import View
from .reading import STORY
from .results import Working
from .screen import Screen
from .sheets import File
from .stops import Stop, stops_of
from .studies import QUERIES, SHARES, TRIED, Studies
from .views.figure import MapFigure
from .wire import Wire
from .writing import WRITING

log = logging.getLogger(__name__)
# Choices that a message sets just as it comes, and how its text is read.
_PLAIN: dict[str, Callable[[str], Any]] = {
    "against": str, "along": str, "beside": str, "compared": str, "course": str, "gone": str, "mode": str, "shade": str, "tubes": int,
    "units": str,
}
_ZOOM = 1.6
_PAN = 0.2  # share of the map's size a key press moves it


class Page:
    """The page of one viewer.

    Parameters
    ----------
    studies : Studies
        Shared with the other viewers of the same review.
    query : str
        The address's query string.
    later : callable
        ``later(function)`` runs a function soon on the page's own thread; may be called from any.
    """

    def __init__(self, studies: Studies, query: str, later: Callable[[Callable[[], None]], None]) -> None:
        self.studies, self.reading, self.later = studies, studies.reading, later
        self.trouble = ""
        self.name = ""  # of the reader, once given
        try:
            start = from_query(query)
        except ValueError as error:
            start, self.trouble = Choices(), str(error)
        self.history = History(start)
        self.sizes = Sizes()
        self.own_section = start.section is not None
        self.push, self.sent = False, 0
        self.stop: int | None = None  # the saved view that is shown
        self.photograph: int | None = None  # the one that is open
        self.file: File | None = None  # to be handed to the reader with the next drawing
        self.files_sent = 0
        self.map = MapFigure((0.0, 0.0, 100.0, 54.0), moved=self._moved, pressed=self._pressed)
        self.twin = MapFigure((0.0, 0.0, 100.0, 54.0), moved=self._moved, beside=self.map)
        self.wire = Wire(self.hear)
        self.screen = Screen()
        self._scheduled = False
        self._finished: set[Any] = set()
        self._unlisten = self.reading.listen(self._told)
        self.refresh()

    @property
    def choices(self) -> Choices:
        return self.history.now

    @property
    def question(self) -> Question:
        return QUESTIONS[self.choices.question]

    @property
    def stops(self) -> tuple[Stop, ...]:
        return stops_of(self.reading.matter().review)

    def close(self) -> None:
        """The viewer has left."""
        self._unlisten()

    # ---- what the reader does ----------------------------------------------------------------------

    def hear(self, name: str, value: Any) -> None:
        """Take one message of the page; a wrong one is told on the sentence line and changes nothing."""
        try:
            if name in _PLAIN:
                self.choose(**{name: _PLAIN[name](value)})
            elif name in WRITING:
                WRITING[name](self, value)
            elif hasattr(self, f"on_{name}"):
                getattr(self, f"on_{name}")(value)
            else:
                raise ValueError(f"the page sent {name!r}, which the desk does not know; reload the page.")
            if name != "size":  # what the browser measures answers nothing
                self.trouble = ""
        except Working:
            return  # a button pressed before its figures were there
        except (ValueError, KeyError, TypeError) as error:
            self.trouble = str(error)
        self.refresh()

    def choose(self, **changed: object) -> None:
        """Take new choices into the history."""
        self.stop = None
        self.push = self.history.go(self.choices.with_(**changed)) and not set(changed) <= {"seconds", "window", "view", "section", "divider"} or bool(changed.get("window"))

    def on_question(self, key: str) -> None:
        self.choose(question=key)

    def on_subject(self, name: str) -> None:
        self.choose(subject=name, view=None, **({} if self.own_section else {"section": None}))

    def on_run(self, run_id: str) -> None:
        if run_id not in [id_ for id_, _ in self.reading.matter().runs]:
            raise ValueError(f"there is no run {run_id!r} in this review.")
        self.choose(run=run_id, seconds=None, window=None, parcel=None)

    def on_frame(self, value: dict) -> None:
        self.sent = int(value.get("sent", 0))
        times = self.question.times(self.desk())
        self.choose(seconds=float(times[int(np.clip(int(value["index"]), 0, len(times) - 1))]), window=None)

    def on_seconds(self, value: str) -> None:
        self.choose(seconds=float(value), window=None)

    def on_moment(self, word: str) -> None:
        desk, eddies = self.desk(), QUESTIONS["eddies"]
        self.choose(window=window_for(desk, word, eddies.subject(desk)))  # type: ignore[attr-defined]

    def on_window(self, form: dict) -> None:
        window = window_of(form)
        self.desk().run.window(*window)  # raises where it holds no frame
        self.choose(window=window)

    def on_section(self, value: dict) -> None:
        self.sent = int(value.get("sent", 0))
        local = np.array(value["ends"], float).reshape(2, 2)
        if not np.isfinite(local).all():
            raise ValueError("the section's ends are not numbers; drag them again.")
        world = self.desk().run.mesh.to_world(local).round(2)
        self.own_section = True
        self.choose(section=tuple(float(v) for v in world.ravel()))

    def on_ends(self, form: dict) -> None:
        self.own_section = True
        self.choose(section=tuple(round(v, 2) for v in typed_ends(form)), view=None)

    def on_line(self, name: str) -> None:
        found = QUESTIONS["sections"].named(self.desk())  # type: ignore[attr-defined]
        if name in found:
            world = self.desk().run.mesh.to_world(np.array(found[name])).round(2)
            self.own_section = True
            self.choose(section=tuple(float(v) for v in world.ravel()), view=None)

    def on_divider(self, value: dict) -> None:
        """The swipe's divider was moved to a share of the map's width."""
        self.sent = int(value.get("sent", 0))
        self.choose(divider=round(float(np.clip(float(value["share"]), 0.0, 1.0)), 3))

    def on_visit(self, number: str) -> None:
        """Take the map to the place of a sentence of the comparison."""
        self._look_at(*QUESTIONS["change"].place_of(self.desk(), int(number)))  # type: ignore[attr-defined]

    def on_photograph(self, value: str) -> None:
        """Open one of the site's photographs, or close it."""
        self.photograph = int(value) if value and self.photograph != int(value) else None

    def on_parcel(self, form: dict | str) -> None:
        """Let a parcel go where the form says, or in the middle of the map; or take it away."""
        if form == "":
            self.choose(parcel=None)
        elif form == "middle":
            view = self.view()
            self._let_go(np.array([view.x, view.y]))
        else:
            x, y = typed_place(form)  # type: ignore[arg-type]
            self._let_go(self.desk().run.mesh.to_local(np.array([x, y])))

    def on_alongside(self, run_id: str) -> None:
        """Another run on a map beside; empty takes it away."""
        if run_id and run_id not in [id_ for id_, _ in self.reading.matter().runs]:
            raise ValueError(f"there is no run {run_id!r} in this review.")
        self.choose(alongside=run_id)

    def on_try(self, _: str) -> None:
        self.studies.try_settings(self.desk().run_id, wish_of(self.choices))

    def on_release(self, name: str) -> None:
        self.choose(release=name, subject="", seconds=None)

    def on_letgo(self, _: str) -> None:
        self.choose(let_go=self.choices.section, seconds=None)

    def on_logs(self, value: str) -> None:
        self.choose(logs=int(value), seconds=None)

    def on_step(self, step: str) -> None:
        if not self.stops:
            raise ValueError("there are no stops yet; keep a view first.")
        at = int(step) - (1 if self.stop is None and int(step) > 0 else 0) + (self.stop or 0)
        at = min(max(at, 0), len(self.stops) - 1)
        self.push = self.history.go(self.stops[at].choices(self.choices))
        self.own_section = self.choices.section is not None
        self.stop = at

    def on_follow(self, query: str) -> None:
        self.choose(**{f.name: getattr(from_query(query), f.name) for f in fields(Choices)})

    def on_save(self, what: str) -> None:
        view = self.view()
        self.file = saving.file_of(self.question, self.desk(view), view, what)

    def file_to_send(self) -> dict[str, object] | None:
        """The file asked for, once."""
        file, self.file = self.file, None
        if file is None:
            return None
        self.files_sent += 1
        return {"number": self.files_sent, "name": file.name, "text": file.text, "picture": file.picture}

    def on_hall(self, value: str) -> None:
        self.choose(hall=value == "yes")

    def on_undo(self, _: str) -> None:
        self.push = self.history.undo()

    def on_redo(self, _: str) -> None:
        self.push = self.history.redo()

    def on_address(self, query: str) -> None:
        self.history.go(from_query(query))
        self.own_section = self.choices.section is not None
        self.push = False

    def on_zoom(self, value: str) -> None:
        if value == "whole":
            mesh = self.desk().run.mesh
            west, south, east, north = mesh.bounds
            cols, rows = self.sizes.map
            width = 1.04 * max(east - west, (north - south) * cols / max(rows, 1))
            self._look_at((west + east) / 2, (south + north) / 2, width)
        elif value == "subject":
            self.choose(view=None)
        else:
            view = self.view()
            self._look_at(view.x, view.y, view.width_m * (1 / _ZOOM if value == "nearer" else _ZOOM))

    def on_pan(self, step: list) -> None:
        view = self.view()
        self._look_at(
            view.x + _PAN * float(step[0]) * view.width_m, view.y + _PAN * float(step[1]) * view.height_m, view.width_m
        )

    def on_size(self, value: dict) -> None:
        columns, rows = (int(v) for v in value["map"])
        old = self.sizes
        self.sizes = Sizes(
            int(value["window"]), float(value["ratio"]), int(value["ribbon"]) or old.ribbon,
            int(value["section"]) or old.section, (columns, rows) if columns and rows else old.map,
        )
        if self.sizes == old:
            return
        self.screen.forget()

    def on_stop(self, _: str) -> None:
        if self.question.progress(self.desk()) is not None:
            self.studies.stop(self.desk().run_id)
        else:
            self.reading.results.stop(STORY)

    def on_resume(self, _: str) -> None:
        self.reading.results.resume(STORY)

    # ---- the view ----------------------------------------------------------------------------------

    def view(self) -> View:
        """The map's window: the reader's, else the question's, else the whole reach."""
        desk = self.desk()
        mesh = desk.run.mesh
        columns, rows = self.sizes.map
        if self.choices.view is not None:
            x, y, width = self.choices.view
            centre = mesh.to_local(np.array([x, y]))
            return View(float(centre[0]), float(centre[1]), width, columns, rows)
        wanted = self.question.view(desk)
        if wanted is None:
            west, south, east, north = mesh.bounds
            wanted = (west + east) / 2, (south + north) / 2, 1.04 * max(east - west, (north - south) * columns / rows)
        return View(*wanted, columns, rows)

    def desk(self, view: View | None = None) -> Desk:
        """What the question is given."""
        look = theme.look(self.choices.mode, hall=self.choices.hall, width_px=self.sizes.window)
        return Desk(self.choices, self.reading, self.studies, look, self.sizes, view)

    def _look_at(self, x: float, y: float, width: float) -> None:
        world = self.desk().run.mesh.to_world(np.array([x, y]))
        self.choose(view=(round(float(world[0]), 2), round(float(world[1]), 2), round(width, 2)))

    def _moved(self, extent: tuple[float, float, float, float]) -> None:
        """The reader panned or zoomed on the map itself."""
        west, south, east, north = extent
        try:
            self._look_at((west + east) / 2, (south + north) / 2, east - west)
        except Working:
            return
        self.soon()

    def _pressed(self, x: float, y: float) -> None:
        """The reader pressed on the map: a parcel is let go there."""
        if not self.question.has_map:
            return
        try:
            self._let_go(np.array([x, y]))
        except Working:
            return
        self.soon()

    def _let_go(self, local: np.ndarray) -> None:
        desk = self.desk()
        x, y = (round(float(v), 2) for v in desk.run.mesh.to_world(local))
        self.choose(parcel=(x, y, float(desk.run.times.seconds[desk.index])))

    def _settle(self) -> None:
        """Hold the view and the section still once they are known, so that time moves only the water."""
        desk = self.desk()
        if self.choices.view is None and self.question.has_map:
            view = self.view()
            world = desk.run.mesh.to_world(np.array([view.x, view.y]))
            held = (round(float(world[0]), 2), round(float(world[1]), 2), round(view.width_m, 2))
            self.history.now = replace(self.choices, view=held)
        if self.choices.section is None:
            ends = self.question.section_ends(self.desk())
            if ends is not None:
                world = desk.run.mesh.to_world(np.array(ends)).round(2)
                self.history.now = self.choices.with_(section=tuple(float(v) for v in world.ravel()))

    # ---- drawing -----------------------------------------------------------------------------------

    def soon(self) -> None:
        """Draw once the messages that are waiting have been heard."""
        if not self._scheduled:
            self._scheduled = True
            self.later(self._now)

    def _now(self) -> None:
        self._scheduled = False
        self.refresh()

    def _told(self, key: Any) -> None:
        """A result is ready (called from the worker)."""
        self._finished.add(key)
        if key in (QUERIES, SHARES, PACKS) or (isinstance(key, tuple) and key[0] == TRIED):
            self.later(self.refresh)
        elif self.screen.awaits(key):
            self.later(self._ready)

    def _ready(self) -> None:
        finished, self._finished = self._finished, set()
        if any(self.screen.awaits(key) for key in finished):
            self.screen.only = self.screen.waiting_for(finished)
            self.refresh()

    def refresh(self) -> None:
        """Draw what can be drawn; what is still being made follows when it is ready."""
        try:
            self._settle()
        except (Working, ValueError, OSError):
            pass  # the screen meets the same and tells it
        try:
            self.screen.draw(self)
        except Exception:
            log.exception("the screen could not be drawn")
            raise
        self.push = False
        # A result may have come between asking for it and waiting for it; its message was then missed.
        missed = self.screen.awaited(self.reading.have)
        if missed:
            self.screen.only = self.screen.waiting_for(missed)
            self.soon()
