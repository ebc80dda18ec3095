"""What the questions other than Eddies ask of hydro: the audit, queries, a comparison, a way upstream, the record."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial
from pathlib import Path

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from hydro.arrival import Finding, audit
from hydro.change import Change, Pair, compare, pair_frames
from hydro.change.answers import Beside, passage, side_by_side, wood
from hydro.checks import read_checks
from hydro.drift.report import DriftAnswer, study
from hydro.observations import Observed, compare_observations
from hydro.passage import Answer, Fish, assess, read_fish
from hydro.queries import Query, queries
from hydro.record.build import Material, build_record
from hydro.record.write import write_record
from hydro.review import open_review

from .packs import Packs
from .parcels import Parcels
from .reading import Reading
from .results import SOON
from .site import Site

QUERIES, SHARES = "queries", "shares"  # told to all viewers when they change
TRIED = "drift tried"
OWN = "own"  # the release that is the reader's own line
_QUICK = 0.2  # share of the review's logs that are let go on screen


@dataclass(frozen=True, slots=True)
class Recorded:
    """A record that was written: when, where and what it holds."""

    at: str
    folder: str
    files: tuple[str, ...]
    figures: int
    parts: int
    cautions: int


@dataclass(frozen=True, slots=True)
class Wish:
    """What wood is let go: from which release (empty: all; ``OWN``: from ``line``, world x and y of its ends), how many logs.

    ``logs`` 0: a fifth of the review's own number.
    """

    release: str = ""
    line: tuple[float, float, float, float] | None = None
    logs: int = 0


class Studies:
    """Results of the longer kind for one reading; each answers at once or raises ``Working``."""

    def __init__(self, reading: Reading) -> None:
        self.reading = reading
        self._record_wanted = False
        self.shares: dict[str, float] = {}  # how far the drift of a run is, 0 to 1
        self._stopped: set[str] = set()
        self.packs = Packs(reading)
        self.site = Site(reading)
        self.parcels = Parcels(reading)

    def audit(self, run_id: str) -> list[Finding]:
        """What there is to ask about a run, gravest first."""
        run, reach = self.reading.run(run_id), self.reading.reach(run_id)
        return self.reading.results.get(("audit", run_id), lambda: audit(run, reach), label="Looking at what has arrived.", rank=SOON)

    def observed(self, run_id: str) -> list[Observed]:
        """What was observed in the field, beside a run; empty where the review declares nothing for it."""
        review, run = self.reading.matter().review, self.reading.run(run_id)
        if review is None or not any(str(o.get("run")) == run_id for o in review.contents.observations):
            return []
        return self.reading.results.get(
            ("observed", run_id), lambda: compare_observations(review, run, run_id), label="Comparing with what was observed.", rank=SOON,
        )

    def queries(self) -> list[Query] | None:
        """The review's queries as they stand; None where there is no review to keep them."""
        review = self.reading.matter().review
        return None if review is None else queries(review.folder)

    def change(self, run_id: str, index: int, other: str) -> Change:
        """A frame of a run compared with its partner in another run."""
        a, b = self.reading.run(run_id), self.reading.run(other)
        ra, rb = self.reading.reach(run_id), self.reading.reach(other)

        def make() -> Change:
            return compare(a, b, self.pair(run_id, index, other), reach_a=ra, reach_b=rb)

        return self.reading.results.get(("change", run_id, index, other), make, label="Comparing the two runs.", heavy=True)

    def pair(self, run_id: str, index: int, other: str) -> Pair:
        """A frame of a run and the one of another run that stands beside it.

        Raises ``ValueError`` where none is near its time.
        """
        a, b = self.reading.run(run_id), self.reading.run(other)
        pair = next((p for p in pair_frames(a, b) if p.a == index), None)
        if pair is None:
            raise ValueError(f"no frame of {b.name} is near the chosen time of {a.name}; choose another time.")
        return pair

    def change_areas(self, run_id: str, index: int, other: str, step: float) -> tuple[BaseGeometry, BaseGeometry]:
        """Where the water is faster and slower by more than ``step``, m/s."""
        change = self.change(run_id, index, other)

        def make() -> tuple[BaseGeometry, BaseGeometry]:
            mesh = change.ledger_a.frame.mesh
            rise = change.maps.speed[mesh.triangles].mean(axis=1)
            faster, slower = (
                shapely.union_all(shapely.polygons(mesh.node_xy[mesh.triangles[chosen]]))
                for chosen in (rise > step, rise < -step)
            )
            return faster, slower

        return self.reading.results.get(("areas", run_id, index, other), make, label="Mapping the change.", heavy=True)

    def answers(self, run_id: str, index: int, other: str) -> list[Beside]:
        """Receptors and checks of two runs side by side, and of wood and fish what their own screens have found in both."""
        change = self.change(run_id, index, other)
        matter, known = self.reading.matter(), self.reading.known
        if matter.review is None:
            return []
        review = matter.review
        reaches = self.reading.reach(run_id), self.reading.reach(other)

        def make() -> list[Beside]:
            return side_by_side(change, reaches, read_checks(review.checks), review.entry(run_id).event)

        out = self.reading.results.get(("answers", run_id, index, other), make, label="Setting the answers side by side.", heavy=True)
        logs = [known(("drift", i)) for i in (run_id, other)]
        found = [wood(*logs)] if None not in logs else []
        for which in range(len(review.fish)):
            ways = [known(("passage", i, frame, which)) for i, frame in ((run_id, change.pair.a), (other, change.pair.b))]
            found += [passage([ways[0]], [ways[1]])] if None not in ways else []
        return [*out, *(row for rows in found for row in rows)]

    def fish(self) -> list[Fish]:
        """The review's fish; none for a results file alone."""
        review = self.reading.matter().review
        return [read_fish(entry) for entry in review.fish] if review is not None else []

    def passage(self, run_id: str, index: int, which: int) -> Answer:
        """The answer for one of the review's fish in one frame."""
        matter, run, frame = self.reading.matter(), self.reading.run(run_id), self.reading.frame(run_id, index)

        def make() -> Answer:
            return assess(
                frame, self.fish()[which], matter.reach, run.settings, design=matter.design(run_id),
                boundary_sets=run.boundary_sets,
            )

        return self.reading.results.get(("passage", run_id, index, which), make, label="Looking for a way upstream.", heavy=True)

    def passage_areas(self, run_id: str, index: int, which: int) -> tuple[BaseGeometry, ...]:
        """Outlines of the start, the goal and every resting water of an answer, in its order."""
        answer = self.passage(run_id, index, which)

        def make() -> tuple[BaseGeometry, ...]:
            mesh, items = answer.mesh, answer.search.areas.items if answer.search else ()
            return tuple(shapely.union_all(shapely.polygons(mesh.node_xy[mesh.triangles[a.triangles]])) for a in items)

        return self.reading.results.get(("rests", run_id, index, which), make, label="Mapping the resting water.", heavy=True)

    def has_wood(self) -> bool:
        """Whether the review says what wood is let go."""
        review = self.reading.matter().review
        return review is not None and bool(review.releases)

    def drift(self, run_id: str, wish: Wish) -> DriftAnswer:
        """The wished logs let go in a run, with the settings chosen."""
        return self.reading.long.get(
            ("drift", run_id, wish), partial(self._let_go, run_id, wish, False), label="Letting the logs go.", rank=SOON,
        )

    def try_settings(self, run_id: str, wish: Wish) -> None:
        """Let the logs go again with other settings, for the range."""
        self.reading.long.ahead(
            (TRIED, run_id, wish), partial(self._let_go, run_id, wish, True), label="Trying other settings.", group="drift",
        )

    def stop(self, run_id: str) -> None:
        """Stop letting logs go in a run; what was done is kept."""
        self._stopped.add(run_id)

    def _let_go(self, run_id: str, wish: Wish, tried: bool) -> DriftAnswer:
        review = self.reading.matter().review
        assert review is not None  # has_wood says so
        told = [-1]

        def progress(_: str, share: float) -> None:
            self.shares[run_id] = share
            if int(50 * share) != told[0]:
                told[0] = int(50 * share)
                self.reading.long.tell(SHARES)

        try:
            tables = [t for t in review.releases if wish.release in ("", OWN, str(t["name"]))]
            if wish.release == OWN:
                tables = tables[:1]  # the review's first wood, let go from the reader's own line
            whole = sum(int(t.get("number", 0)) for t in tables)
            line = None if wish.line is None else self.reading.run(run_id).mesh.to_local(np.array(wish.line).reshape(2, 2))
            return study(
                review, review.entry(run_id), numbers=wish.logs / max(whole, 1) if wish.logs else _QUICK, try_settings=tried,
                stop=lambda: run_id in self._stopped, progress=progress, releases=tables, line=line,
            )
        finally:
            self._stopped.discard(run_id)  # only now: a stop may be asked for before the first step
            self.shares.pop(run_id, None)
            self.reading.long.tell(SHARES)

    def made_record(self) -> Recorded | None:
        """The record as it was made here; None before :meth:`make_record`. Raises ``Working`` while it is made."""
        if not self._record_wanted:
            return None
        review = self.reading.matter().review
        assert review is not None  # make_record refuses a results file alone
        return self.reading.long.get(("record",), partial(_recorded, review.folder), label="Making the record.")

    def make_record(self) -> None:
        """Have the record made, or made again.

        Raises ``ValueError`` where there is no review to make it of.
        """
        if self.reading.matter().review is None:
            raise ValueError("a record is made of a review; this is a results file alone.")
        self._record_wanted = True
        self.reading.long.forget(("record",))


def _recorded(folder: Path) -> Recorded:
    """Write a review's record beside it; opened anew, so that nobody who looks at the review waits."""
    review = open_review(folder)
    material = Material(review)
    record = build_record(material)
    out = review.folder / "record"
    files = write_record(record, out, review=review, readings=material.readings)
    names = tuple(str(f.relative_to(out)) for f in files)
    return Recorded(record.made, str(out), names, len(record.figures()), len(record.parts), len(record.cautions()))
