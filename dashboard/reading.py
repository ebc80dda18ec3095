"""One review or results file as the screen reads it: choices in, hydro results out, remembered.

Every method either answers at once or raises ``Working`` and has the answer made.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
from shapely.geometry.base import BaseGeometry

from hydro.contours import psi_lines, tube_levels
from hydro.eddies import Zone
from hydro.eddies.travelling import Traveller
from hydro.frame import Frame
from hydro.ledger import (
    FrameLedger,
    FrameReader,
    FrameSummary,
    Instants,
    Life,
    follow,
    follow_travelling,
    instants_of,
    lumped_area,
    twin_of,
)
from hydro.reach import CentreLine, Reach, proposed_centre_line
from hydro.review import Review, open_any
from hydro.run import Run
from hydro.section import SectionFigures, cut, section_figures

from .raster import Canvas, IndexRaster, View, canvas
from .results import AHEAD, NOW, Results, Working
from .views.shore import shoreline

_PIXELS_KEPT = 12_000_000  # triangles held in remembered frames, over all of them
STORY = "story"
Ends = tuple[tuple[float, float], tuple[float, float]]  # of a section, local m, left bank first
Moment = int | tuple[float, float]  # a frame's index, or the mean between two times, s from the first frame


@dataclass(frozen=True, eq=False)
class Matter:
    """What was opened: a review with its runs, or one results file alone.

    ``proposed`` says that the centre line was made here and wants confirmation.
    """

    review: Review | None
    alone: Run | None
    reach: Reach
    proposed: bool = False

    @property
    def title(self) -> str:
        return self.review.title if self.review else self.alone.name if self.alone else ""

    @property
    def runs(self) -> tuple[tuple[str, str], ...]:
        """(id, label) of every run."""
        if self.review is not None:
            return tuple((e.id, e.label) for e in self.review.runs)
        return (("file", self.alone.name),) if self.alone else ()

    def design(self, run_id: str) -> str | None:
        """Which design's structures stand in a run; None where the review does not say."""
        return (self.review.entry(run_id).design or None) if self.review else None


@dataclass(frozen=True, eq=False)
class Beat:
    """One frame's part in the story that the ribbon tells."""

    seconds: float
    discharge_m3_s: float
    zones: tuple[Zone, ...]
    travelling: tuple[Traveller, ...] = ()


@dataclass(frozen=True, eq=False)
class Followed:
    """The eddies of a run followed through time: their lives, and each frame's zones with lasting ids."""

    lives: tuple[Life, ...]
    zones: dict[int, tuple[Zone, ...]]
    travelling: dict[int, tuple[Traveller, ...]]


@dataclass(frozen=True, eq=False)
class Story:
    """What is known so far of a run's frames, in order; None where a frame is not done or failed."""

    beats: tuple[Beat | None, ...]
    done: int
    followed: Followed | None = None

    @property
    def whole(self) -> bool:
        return self.done == len(self.beats)


@dataclass(frozen=True, eq=False)
class Instances:
    """The single moments of a window: what they say about each eddy of the mean, by id, and its outline in each."""

    found: dict[str, Instants]
    outlines: dict[str, tuple[BaseGeometry, ...]]


class Reading:
    """Results for one path, shared by all who look at it.

    ``results`` makes what a screen waits for, ``long`` what takes so long that nobody else should wait
    behind it; loops over several cores run in ``long`` only.
    """

    def __init__(self, path: Path | str, results: Results | None = None) -> None:
        self.path = Path(path)
        self.results = results or Results()
        self.long = Results()
        self._readers: dict[str, FrameReader] = {}

    def matter(self) -> Matter:
        """The review or the file; raises what opening it raised."""
        return self.results.get("matter", lambda: _opened(self.path), label=f"Opening {self.path.name}.")

    def take(self, review: Review) -> None:
        """Go on with a review that was saved and opened anew; its runs stay as they are."""
        self.results.put("matter", replace(self.matter(), review=review))

    def run(self, run_id: str) -> Run:
        matter = self.matter()
        run_id = run_id or matter.runs[0][0]
        return self.results.get(("run", run_id), lambda: self._opened_run(matter, run_id), label="Reading the run's mesh.")

    def reach(self, run_id: str) -> Reach:
        """The reach as it is in the run's design; its centre line is proposed where there is none."""
        matter, run = self.matter(), self.run(run_id)

        def make() -> Reach:
            reach = matter.reach.of_design(matter.design(run_id))
            return reach if reach.centre_line else replace(reach, origin=run.mesh.origin, centre_line=self._proposed(run))

        return self.results.get(("reach", run_id), make, label="Placing the review's lines.")

    def frame(self, run_id: str, moment: Moment) -> Frame:
        run = self.run(run_id)
        if isinstance(moment, tuple):
            return self.entry(run_id, moment).frame
        return self.results.get(("frame", run_id, moment), lambda: run.frame(moment), label="Reading the frame.", heavy=True)

    def ledger(self, run_id: str, moment: Moment) -> FrameLedger:
        """Stream function and eddies of one frame or of a mean flow.

        Eddies of a frame have lasting ids (E1, E2 ...) once they were followed through the run; until then they
        are numbered within the frame (1, 2 ...). Those of a mean flow are M1, M2 ...
        """
        entry = self.entry(run_id, moment)
        if isinstance(moment, tuple):
            zones = tuple(replace(z, id=f"M{k + 1}") for k, z in enumerate(entry.zones.zones))
            return replace(entry, zones=replace(entry.zones, zones=zones))
        index = moment
        if self.run(run_id).n_frames == 1:
            return entry
        followed = self.results.peek(("followed", run_id))
        if followed is not None and index in followed.zones:
            zones = followed.zones[index]
            entry = replace(entry, zones=replace(entry.zones, travelling=followed.travelling[index]))
        else:
            zones = tuple(replace(z, id=str(k + 1)) for k, z in enumerate(entry.zones.zones))
        return replace(entry, zones=replace(entry.zones, zones=zones))

    def entry(self, run_id: str, moment: Moment, *, rank: int = NOW) -> FrameLedger:
        """Stream function and eddies of one frame or of a mean flow, numbered within it."""
        run = self.run(run_id)

        def make() -> FrameLedger:
            if run_id not in self._readers:
                self._readers[run_id] = FrameReader(run, reach=self.reach(run_id))
            reader = self._readers[run_id]
            return reader.mean(*moment) if isinstance(moment, tuple) else reader.frame(moment)

        return self.results.get(
            ("ledger", run_id, moment), make, label="Finding the stream function and its eddies.", rank=rank, heavy=True,
        )

    def instants(self, run_id: str, window: tuple[float, float]) -> Instances | None:
        """What the moments of a window say about each eddy of its mean flow; None until all were read."""
        if self.results.peek(("followed", run_id)) is None:
            return None
        run, ledger = self.run(run_id), self.ledger(run_id, window)

        def make() -> Instances:
            chosen, _ = run.window(*window)
            beats = [(int(i), self.results.peek(("beat", run_id, int(i)))) for i in chosen]
            known = [FrameSummary(i, beat.seconds, {}, beat.zones) for i, beat in beats if beat is not None]
            area = lumped_area(run.mesh)
            twins = {z.id: [twin_of(z, s.zones, area) for s in known] for z in ledger.zones.zones}
            outlines = {id_: tuple(t.contour for t in own if t is not None) for id_, own in twins.items()}
            return Instances(instants_of(self._readers[run_id], ledger, known), outlines)

        return self.results.get(("instants", run_id, window), make, label="Reading the moments of the mean.")

    def shore(self, run_id: str, moment: Moment) -> tuple[np.ndarray, ...]:
        """The waterline, with the water on the left of its lines."""

        def make() -> tuple[np.ndarray, ...]:
            boundaries = self.entry(run_id, moment).sf.open_boundaries if self._has_psi(run_id, moment) else ()
            edges = [b.edges for b in boundaries]
            return tuple(shoreline(self.frame(run_id, moment), np.concatenate(edges) if edges else None))

        return self.results.get(("shore", run_id, moment), make, label="Drawing the waterline.", heavy=True)

    def tubes(self, run_id: str, moment: Moment, count: int) -> tuple[tuple[np.ndarray, ...], float]:
        """Lines between the stream tubes of one moment, and the discharge of one tube, m3/s."""
        ledger = self.entry(run_id, moment)

        def make() -> tuple[tuple[np.ndarray, ...], float]:
            sf = ledger.sf
            levels = tube_levels(sf, count)
            lines = [line for level in levels for line in psi_lines(sf, level)]
            return tuple(lines), float(np.median(np.diff(levels))) if len(levels) > 1 else 0.0

        return self.results.get(("tubes", run_id, moment, count), make, label="Drawing the stream tubes.", heavy=True)

    def top(self, run_id: str, shade: str) -> float:
        """The end of the ramp for a run, one for all its frames: a round value above most of the water's."""
        run = self.run(run_id)

        def make() -> float:
            highest = [0.0]
            for i in sorted({0, run.n_frames // 4, run.n_frames // 2, 3 * run.n_frames // 4, run.n_frames - 1}):
                frame = self.frame(run_id, i)
                value = (frame.speed if shade == "speed" else frame.depth)[frame.wet_nodes]
                highest.append(float(np.percentile(value, 97)) if value.size else 0.0)
            return _round_up(max(highest))

        return self.results.get(("top", run_id, shade), make, label="Reading the range of speeds.")

    def canvas(self, run_id: str) -> Canvas:
        run = self.run(run_id)

        def make() -> Canvas:
            ready, frame = canvas(run.mesh), self.frame(run_id, 0)
            # A first stroke here, so that nothing is compiled while somebody waits for a page.
            ready.index(View(0.0, 0.0, 1.0, 1, 1)).paint(frame, frame.speed, 1.0)
            return ready

        return self.results.get(("canvas", run_id), make, label="Preparing the map; the first time compiles it.")

    def raster(self, run_id: str, view: View) -> IndexRaster:
        """Which triangle lies under each pixel of a view."""
        ready = self.canvas(run_id)
        return self.results.get(("raster", run_id, view), lambda: ready.index(view), label="Drawing the water.", heavy=True)

    def story(self, run_id: str) -> Story:
        """What is known of all frames; asks for the rest to be made when nobody waits for anything."""
        run = self.run(run_id)
        beats = []
        for i in range(run.n_frames):
            key = ("beat", run_id, i)
            if not self.results.have(key):
                self.results.ahead(key, partial(self._beat, run_id, i), label="Following the eddies.", group=STORY)
            beats.append(self.results.peek(key))
        done = sum(self.results.have(("beat", run_id, i)) for i in range(run.n_frames))
        followed = None
        if done == run.n_frames:
            self.results.ahead(("followed", run_id), partial(self._follow, run_id), label="Following the eddies.", group=STORY)
            followed = self.results.peek(("followed", run_id))
        return Story(tuple(beats), done, followed)

    def stations(self, run_id: str, ends: Ends) -> list[SectionFigures | None]:
        """Figures of a section (local m) in every frame, None where not known yet; asks for those to be made."""
        run, centre = self.run(run_id), self.reach(run_id).centre_line

        def make(index: int) -> SectionFigures:
            return section_figures(cut(self.frame(run_id, index), np.array(ends), centre_line=centre), settings=run.settings)

        known = []
        for i in range(run.n_frames):
            key = ("station", run_id, ends, i)
            self.results.ahead(key, partial(make, i), label="Following the section.", group=STORY)
            known.append(self.results.peek(key))
        return known

    def label(self, run_id: str) -> str:
        """What a run is called."""
        return dict(self.matter().runs)[run_id]

    def known(self, key: Any) -> Any:
        """A result that is ready, else None; starts nothing."""
        return self.results.peek(key) or self.long.peek(key)

    def have(self, key: Any) -> bool:
        """Whether a result is ready or has failed."""
        return self.results.have(key) or self.long.have(key)

    def listen(self, told: Callable[[Any], None]) -> Callable[[], None]:
        """Call ``told(key)`` after each result; returns how to end it."""
        ends = [self.results.listen(told), self.long.listen(told)]
        return lambda: [end() for end in ends][0]

    def _beat(self, run_id: str, index: int) -> Beat:
        entry = self.entry(run_id, index, rank=AHEAD)
        return Beat(entry.frame.seconds, entry.sf.through_discharge_m3_s, entry.zones.zones, entry.zones.travelling)

    def _follow(self, run_id: str) -> Followed:
        run = self.run(run_id)
        beats = {i: self.results.peek(("beat", run_id, i)) for i in range(run.n_frames)}
        known = [i for i, beat in beats.items() if beat is not None]
        lives, zones = follow(
            [beats[i].zones for i in known], run.times.seconds[known], lumped_area(run.mesh), run.settings, known,
        )
        moved = follow_travelling([beats[i].travelling for i in known], run.times.seconds[known])
        return Followed(tuple(lives), dict(zip(known, zones)), dict(zip(known, moved)))

    def _has_psi(self, run_id: str, moment: Moment) -> bool:
        return isinstance(moment, tuple) or self.run(run_id).times.kinds[moment] != "maximum"

    def _opened_run(self, matter: Matter, run_id: str) -> Run:
        run = matter.review.open(run_id) if matter.review is not None else matter.alone
        assert run is not None  # a matter has a review or a run
        self.results.heavy = int(np.clip(_PIXELS_KEPT / max(run.mesh.n_triangles, 1), 24, 400))
        return run

    def _proposed(self, run: Run) -> CentreLine:
        frame = run.frame(0)
        return proposed_centre_line(run.mesh.node_xy, frame.unit_discharge.mean(axis=0) + [1e-12, 0])


def _opened(path: Path) -> Matter:
    review, run = open_any(path)
    if review is not None:
        if not review.runs:
            raise ValueError(f"{review.folder / 'review.toml'} lists no runs; add one under [[runs]].")
        return Matter(review, run, review.reach, review.reach.centre_line is None)
    assert run is not None  # open_any gives a review or a run
    return Matter(None, run, Reach(run.mesh.origin), True)


def _round_up(value: float) -> float:
    """The next of 1, 1.5, 2, 3, 4, 5, 8 times a power of ten."""
    if not value > 0:
        return 1.0
    power = 10.0 ** np.floor(np.log10(value))
    return float(next(s * power for s in (1, 1.5, 2, 3, 4, 5, 8, 10) if s * power >= value * 0.999))


__all__ = ["Beat", "Matter", "Moment", "Reading", "Story", "Working"]
