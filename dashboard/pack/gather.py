"""What goes into a pack: the chosen runs, saved views, cautions and, for a team, the queries."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Sequence
from dataclasses import asdict, dataclass
from functools import partial
from pathlib import Path
from typing import Any

from hydro.cautions import CAUTIONS
from hydro.queries import IMPORTANCE, Query, queries

from .. import theme
from ..choices import UNITS
from ..reading import Matter, Reading
from ..stops import Stop, stops_of
from ..text import safe
from ..units import Units
from ..views import frame_words, marks, table
from . import chapter as chapters
from .chapter import AtOnce, Chapter
from .items import block

_PINNED = ("number", "text", "importance", "state", "run", "x", "y", "seconds")


@dataclass(frozen=True, eq=False)
class Pack:
    """A pack before it is written: data items by name, and the HTML of the page's places.

    ``team`` packs hold queries and take new ones.
    """

    title: str
    items: dict[str, str]
    places: dict[str, str]
    team: bool

    @property
    def digest(self) -> str:
        """Twelve hexadecimal digits that change when anything in the pack does."""
        whole = hashlib.sha256()
        for name, text in sorted((self.items | self.places).items()):
            whole.update(f"{name}\n{text}\n".encode())
        return whole.hexdigest()[:12]


def gather(
    path: Path | str, runs: Sequence[str] = (), *, team: bool = False,
    progress: Callable[[str, int, int], None] = lambda label, done, whole: None,
) -> Pack:
    """Everything a pack of a review, or of one results file, shows.

    Parameters
    ----------
    path : review folder or results file
    runs : ids of runs
        Default: those that the saved views show, else the first run that changes in time, else the first run.
    team : bool
        With the review's queries, their authors, and a place to write new ones. Without it the pack names no
        person, no query and no path.
    progress : callable
        Called with what is being done, and how many steps of the whole are done; what it raises ends the work.

    Raises
    ------
    ValueError
        A run that the review does not list, or a review that cannot be read.
    """
    reading = Reading(path, AtOnce())
    reading.long = AtOnce()
    matter = reading.matter()
    stops = stops_of(matter.review)
    chosen = [_known(matter, r) for r in runs] or _default_runs(reading, matter, stops)
    units = matter.review.contents.units if matter.review and matter.review.contents.units in UNITS else "SI"
    items: dict[str, str] = {}
    told = [Chapter(reading, run_id, units) for run_id in chosen]
    whole, done = 2 * sum(chapter.run.n_frames for chapter in told), 0
    for number, chapter in enumerate(told):
        _tell(chapter, f"r{number}", items, partial(_onward, progress, done, whole))
        done += 2 * chapter.run.n_frames
    log = tuple(queries(matter.review.folder)) if team and matter.review else ()
    head = _head(matter, told, _kept_stops(stops, chosen), log, team, items)
    places = _places(matter, told, log, team)
    return Pack(matter.title, {"pack": block(head, {}), **items}, places, team)


def _known(matter: Matter, run: str) -> str:
    for run_id, label in matter.runs:
        if run in (run_id, label):
            return run_id
    raise ValueError(f"there is no run {run!r}; there are {', '.join(i for i, _ in matter.runs)}.")


def _default_runs(reading: Reading, matter: Matter, stops: Sequence[Stop]) -> list[str]:
    ids = [run_id for run_id, _ in matter.runs]
    shown = [s.choices(Chapter.plain).run for s in stops]
    if wanted := [i for i in ids if i in shown]:
        return wanted
    return [next((i for i in ids if reading.run(i).n_frames > 1), ids[0])]


def _onward(progress: Callable[[str, int, int], None], before: int, whole: int, label: str, done: int) -> None:
    """Steps of one run, counted on from those of the runs before it."""
    progress(label, before + done, whole)


def _tell(chapter: Chapter, key: str, items: dict[str, str], progress: Callable[[str, int], None]) -> None:
    n, label = chapter.run.n_frames, chapter.reading.label(chapter.run_id)
    chapter.prepare(lambda done, all_: progress(f"{label}: eddies of frame {done} of {all_}", done))
    items[key] = chapter.head()
    for i in range(n):
        items[f"{key}-f{i}"] = chapter.frame(i)
        progress(f"{label}: frame {i + 1} of {n} packed", n + i + 1)


def _kept_stops(stops: Sequence[Stop], runs: Sequence[str]) -> list[dict[str, Any]]:
    """The saved views of runs in the pack, as the page takes them."""
    out = []
    for stop in stops:
        c = stop.choices(Chapter.plain)
        if (c.run or runs[0]) in runs:
            out.append({"sentence": stop.sentence, "run": c.run or runs[0], "seconds": c.seconds, "subject": c.subject,
                        "view": list(c.view) if c.view else None})
    return out


def _head(matter: Matter, told: Sequence[Chapter], stops, log: Sequence[Query], team: bool, items: dict[str, str]) -> dict[str, Any]:
    units = Units(told[0].start.units)
    data = hashlib.sha256("\n".join(f"{k} {v}" for k, v in items.items()).encode()).hexdigest()[:12]
    return {
        "schema": "leewater/pack/1", "title": matter.title, "digest": data, "team": team,
        "runs": [{"key": f"r{k}", "id": c.run_id, "label": c.reading.label(c.run_id)} for k, c in enumerate(told)],
        "length": {"factor": units.factor("m"), "label": units.label("m")}, "stops": stops,
        "flow": {"factor": units.factor("m3/s"), "label": units.label("m3/s")},
        "palettes": {name: list(theme.water_palette(p)) for name, p in (("day", theme.LIGHT), ("hall", theme.HALL), ("night", theme.DARK))},
        "cautions": {way: frame_words.cautions(chapters.CAUTIONS, short=way == "hall") for way in chapters.WAYS},
        "queries": [{k: v for k, v in asdict(q).items() if k in _PINNED} for q in log],
    }


def _places(matter: Matter, told: Sequence[Chapter], log: Sequence[Query], team: bool) -> dict[str, str]:
    """HTML of the page's places as they are before a script has run; every text of the review is made safe here."""
    place = matter.review.contents.place if matter.review else ""
    labels = [c.reading.label(c.run_id) for c in told]
    runs = "".join(f'<option value="{k}">{safe(label)}</option>' for k, label in enumerate(labels))
    return told[0].opening_html() | {
        "title": safe(matter.title), "place": safe(place), "runs": runs, "north": marks.north(),
        "cautions": frame_words.cautions(chapters.CAUTIONS), "public": CAUTIONS["public-water"].text,
        "queries": _query_table(log) if team else "",
        "importance": "".join(f"<option{' selected' if i == 'clarify' else ''}>{i}</option>" for i in IMPORTANCE),
        "digits": safe("; ".join(f"{label}: SHA-256 {c.run.hash}" for label, c in zip(labels, told))),
    }


def _query_table(log: Sequence[Query]) -> str:
    columns = (
        table.Column("Query", figure=False), table.Column("What is asked", figure=False), table.Column("State", figure=False),
        table.Column("Answer", figure=False),
    )
    lines = [
        table.Line(((str(q.number), ""), (safe(q.text), safe(", ".join(p for p in (q.author, q.date) if p))),
                    (safe(q.state), safe(q.importance)), (safe(q.answer), "")))
        for q in log
    ]
    return table.html(table.Table("Queries", f"{len(log)} in the log", "Queries of the review", columns, lines, "No query yet."))
