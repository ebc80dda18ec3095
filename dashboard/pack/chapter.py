"""One run told frame by frame, by the desk's own views: sentences, tables, sections, ribbon and the map's marks."""

from __future__ import annotations

import contextlib
import re
import threading
from collections.abc import Callable, Hashable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from hydro.cautions import OWED
from hydro.eddies import Zone

from .. import text, theme
from ..choices import Choices
from ..questions.base import Desk, Question, Sizes
from ..questions.change import Change
from ..questions.common import ramp_key, section_html, structures, zone_mark
from ..questions.drift import Drift
from ..questions.eddies import Eddies
from ..questions.passage import Passage
from ..reading import Reading
from ..results import Results
from ..studies import Studies
from ..views import frame_words, marks, ribbon
from ..views.scene import ZoneMark
from . import fields
from .items import block

CAUTIONS = (*OWED["eddies"], "section-discharge", "tracing", "public-water")
# Three ways to look at the page, each with drawings of its own: a label keeps its size on every screen.
WAYS = {
    "wide": (Sizes(ribbon=860, section=440), theme.look("day")),
    "narrow": (Sizes(window=390, ribbon=358, section=358), theme.look("day")),
    "hall": (Sizes(ribbon=860, section=440), theme.look("day", hall=True)),
}
_CURSOR = "<g data-cursor"


class AtOnce(Results):
    """Results made on the spot, for a script that waits for each."""

    def __init__(self) -> None:
        super().__init__()
        self._thread = threading.current_thread()

    def ahead(self, key: Hashable, make: Callable[[], Any], *, label: str, group: str, heavy: bool = False) -> None:
        """Made now; a failure is kept and raised where the result is asked for."""
        with contextlib.suppress(Exception):
            self.get(key, make, label=label, group=group, heavy=heavy)


class PackQuestion(Eddies):
    """Eddies with the cautions of a page that anybody may open."""

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        return CAUTIONS


@dataclass(frozen=True, eq=False)
class Line:
    """A section offered in the pack; ``ends`` are world x, y of its left and right end."""

    name: str
    ends: tuple[float, float, float, float]


class Chapter:
    """A run of the review as the pack tells it; every method takes a frame's index.

    Parameters
    ----------
    reading : Reading
        With its results made at once.
    run_id : str
    units : str
        One of the desk's systems of units.
    """

    plain = Choices()

    def __init__(self, reading: Reading, run_id: str, units: str = "SI") -> None:
        self.reading, self.run_id, self.question = reading, run_id, PackQuestion()
        self.studies = Studies(reading)
        self.run = reading.run(run_id)
        self.start = Choices(run=run_id, units=units)
        self.opening = 0 if self.run.n_frames == 1 else self._fullest()
        self.lines = self._lines()

    def desk(self, index: int, way: str = "wide", **chosen: Any) -> Desk:
        """The desk at one frame, looked at in one of ``WAYS``."""
        sizes, look = WAYS[way]
        choices = self.start.with_(seconds=float(self.run.times.seconds[index]), **chosen)
        return Desk(choices, self.reading, self.studies, look, sizes)

    def head(self) -> str:
        """The run's own item: its mesh, moments, structures, ribbon and sections."""
        mesh, reach, desk = self.run.mesh, self.reading.reach(self.run_id), self.desk(self.opening)
        boundaries = self._boundaries()
        top = self.reading.top(self.run_id, "speed")
        content = {
            "label": self.reading.label(self.run_id), "id": self.run_id, "hash": self.run.hash,
            "corner": (np.array(mesh.origin) + fields.corner(mesh)).tolist(),
            "size": [mesh.bounds[2] - mesh.bounds[0], mesh.bounds[3] - mesh.bounds[1]],
            "seconds": self.run.times.seconds.tolist(), "moments": self._moments(), "opening": self.opening,
            "wet": self._wet(), "top": top, "key": ramp_key(desk) + marks.hatch_key(),
            "ribbon": {way: self._ribbon(way) for way in WAYS},
            "structures": [
                {"name": s.name, "kind": s.kind, "solid": s.solid, "closed": s.shape.geom_type.endswith("Polygon"),
                 "rings": fields.ring_lists(s.shape, mesh)} for s in structures(desk)
            ],
            "centre": fields.point_list(reach.centre_line.points, mesh) if reach.centre_line is not None else [],
            "sections": [{"name": line.name, "ends": self._page_ends(line)} for line in self.lines],
            "also": self.also(),
        }
        return block(content, fields.mesh_arrays(mesh, boundaries))

    def frame(self, index: int) -> str:
        """A frame's item: its field, waterline, zones and everything that is said of it."""
        desk, mesh = self.desk(index), self.run.mesh
        frame = self.reading.frame(self.run_id, index)
        try:
            entry = self.reading.ledger(self.run_id, index)
        except ValueError as error:  # a frame of maxima, or one without water: the sentence says so
            shore: Sequence[np.ndarray] = ()
            scale, arrays = fields.frame_arrays(frame, None)
            content = {"tube": 0.0, "zones": [], "subject": "", "alternative": text.safe(str(error))}
            content["said"] = {way: self._unsaid(index, way, error) for way in WAYS}
        else:
            sf = entry.sf if entry.sf.drawn else None
            shore = self.reading.shore(self.run_id, index)
            scale, arrays = fields.frame_arrays(frame, sf)
            _, tube = self.reading.tubes(self.run_id, index, desk.choices.tubes)
            content = {
                "tube": tube if sf else 0.0, "zones": [self._zone(z) for z in entry.zones.zones], "subject": self.question.subject_id(desk),
                "alternative": self.question.alternative(desk), "said": {way: self._said(index, way) for way in WAYS},
            }
        step, lines = fields.line_arrays(shore, mesh, "shore")
        return block(content | {"scale": scale | {"shore": step}}, arrays | lines)

    def _said(self, index: int, way: str) -> dict[str, Any]:
        """All that is said of a frame in one way: a sentence for each eddy that may be its subject, table, sections, cursor."""
        zones = self.question.ledger(self.desk(index)).zones.zones
        subjects = [z.id for z in zones] or [""]
        return {
            "sentences": {z: self.question.sentence(self.desk(index, way, subject=z)) for z in subjects},
            "table": self.question.table(self.desk(index, way)), "cursor": self._cursor(index, way),
            "sections": [self._section(index, line, way) for line in self.lines],
        }

    def _unsaid(self, index: int, way: str, error: ValueError) -> dict[str, Any]:
        return {"sentences": {"": frame_words.trouble(str(error))}, "table": "", "cursor": self._cursor(index, way), "sections": []}

    def opening_html(self) -> dict[str, str]:
        """What the page holds before any script has run."""
        desk = self.desk(self.opening)
        try:
            return {
                "answer": self.question.sentence(desk), "table": self.question.table(desk), "alternative": self.question.alternative(desk),
                "section": self._section(self.opening, self.lines[0], "wide") if self.lines else "", "also": self.also(),
            }
        except ValueError as error:
            return {"answer": frame_words.trouble(str(error)), "table": "", "alternative": text.safe(str(error)), "section": "", "also": self.also()}

    def also(self) -> str:
        """What the review's other questions answer in the opening frame, each with its table and its own cautions.

        A question that the review holds nothing for (no wood, no fish, no second design) is left out.
        """
        change = Change()
        asked = (
            (Drift(), self.studies.has_wood()), (Passage(), bool(self.studies.fish())),
            (change, bool(change.other(self.desk(self.opening, question=change.key)))),
        )
        return "".join(self._answer(question) for question, held in asked if held)

    def _answer(self, question: Question) -> str:
        desk = self.desk(self.opening, question=question.key)
        try:
            sentence, table = question.sentence(desk), question.side(desk).get("table", "")
        except ValueError as error:
            sentence, table = frame_words.trouble(str(error)), ""
        cautions = frame_words.cautions(question.cautions(desk))
        when = text.moment(self.reading.frame(self.run_id, self.opening).time, float(self.run.times.seconds[self.opening]))
        html = (
            f'<section aria-label="{question.word}"><p class="asks">{question.asks} <span>{when}</span></p>'
            f'<h2 class="answer">{sentence}</h2><div class="evidence">{_without_controls(table)}</div><div class="own">{cautions}</div></section>'
        )
        return html.replace("caution-", f"{question.key}-caution-")  # footnotes point to the list beside them

    def prepare(self, progress: Callable[[int, int], None]) -> None:
        """Find every frame's eddies and follow them through the run, so that they have lasting names."""
        n = self.run.n_frames
        for i in range(n):
            with contextlib.suppress(ValueError):  # told where the frame is shown
                self.reading.entry(self.run_id, i)
            progress(i + 1, n)
        self.reading.story(self.run_id)

    def _fullest(self) -> int:
        """The frame with the greatest water area: where the story of a flood is best begun."""
        wet = [float(self.run.mesh.face_area[f.wet_faces].sum()) for f in self.run.frames()]
        return int(np.argmax(wet))

    def _wet(self) -> float:
        return float(self.reading.frame(self.run_id, 0).wet_depth_m)

    def _boundaries(self):
        for i in range(self.run.n_frames):
            with contextlib.suppress(ValueError):
                return self.reading.entry(self.run_id, i).sf.open_boundaries
        return ()

    def _moments(self) -> list[str]:
        """Each frame's moment in words with its discharge: what the slider says aloud."""
        course = self._course("wide")
        return [ribbon.words(replace(course, index=i), self.desk(i).units) for i in range(self.run.n_frames)]

    def _course(self, way: str) -> ribbon.Course:
        desk = self.desk(self.opening, way)
        try:
            return self.question.course(desk)
        except ValueError:
            times = self.run.times
            return ribbon.Course(times.seconds, times.instants, np.full(self.run.n_frames, np.nan), (), self.opening)

    def _ribbon(self, way: str) -> dict[str, Any]:
        course, box = self._course(way), self._box(way)
        svg = ribbon.draw(course, box, self.desk(self.opening).units)
        return {"svg": svg, "width": box.width, "places": np.round(ribbon.places(course, box), 1).tolist()}

    def _cursor(self, index: int, way: str) -> str:
        """The cursor's part of the ribbon at one frame; empty where the run has one frame only."""
        drawn = ribbon.draw(replace(self._course(way), index=index), self._box(way), self.desk(index).units)
        begin = drawn.find(_CURSOR)
        return drawn[begin : drawn.rindex("</svg>")] if begin >= 0 else ""

    def _box(self, way: str) -> ribbon.Box:
        sizes, look = WAYS[way]
        return ribbon.Box(sizes.ribbon, look.label_px)

    def _lines(self) -> tuple[Line, ...]:
        """The section through the largest eddy of the opening frame, then the review's own."""
        out = []
        with contextlib.suppress(ValueError):
            ends = self.run.mesh.to_world(np.array(self.question.section_ends(self.desk(self.opening)))).ravel()
            out.append(Line("Through the largest eddy", tuple(ends.tolist())))
        for s in self.reading.matter().reach.layer("sections"):
            points = self.run.mesh.to_world(np.asarray(s.geometry.coords)[[0, -1], :2]).ravel()
            out.append(Line(s.name, tuple(points.tolist())))
        return tuple(out)

    def _page_ends(self, line: Line) -> list[list[float]]:
        desk = self.desk(self.opening, section=line.ends)
        return fields.point_list(np.array(self.question.section_ends(desk)), self.run.mesh)

    def _section(self, index: int, line: Line, way: str) -> str:
        desk = self.desk(index, way, section=line.ends)
        subject = self.question.subject(desk)
        ends = self.question.section_ends(desk)
        outline = subject.contour if subject is not None else None
        return section_html(desk, ends, self.question.ledger(desk), outline, CAUTIONS)

    def _zone(self, zone: Zone) -> dict[str, Any]:
        mark: ZoneMark = zone_mark(zone, False)
        mesh = self.run.mesh

        def place(point: np.ndarray | None) -> list[float] | None:
            return None if point is None else fields.point_list(np.asarray(point), mesh)[0]

        return {
            "id": mark.tag, "rings": fields.ring_lists(mark.outline, mesh), "inner": [fields.point_list(line, mesh) for line in mark.inner],
            "rotation": mark.rotation, "centre": place(mark.centre), "coarse": mark.coarse, "travelling": mark.travelling,
            "leaves": place(mark.separation), "returns": place(mark.reattachment),
        }


def _without_controls(html: str) -> str:
    """A table whose rows take the reader nowhere: the desk's buttons in it become plain words, its forms go."""
    html = re.sub(r'<button type="button" class="row"[^>]*>(.*?)</button>', r"\1", html, flags=re.DOTALL)
    html = re.sub(r"<(button|select|form)\b.*?</\1>", "", html, flags=re.DOTALL)
    return re.sub(r' data-(?:do|value|key)="[^"]*"', "", html)
