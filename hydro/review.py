"""The review folder: review.toml, lines.gpkg, queries and the log of who changed what.

A review refers to runs by relative path and content hash and never changes them. Files are written
whole or not at all, and a file that somebody else has changed meanwhile is not overwritten.
"""

from __future__ import annotations

import os
import tempfile
import tomllib
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from functools import cached_property
from pathlib import Path
from typing import Any, Literal

import pydantic
import tomlkit

from .provenance import file_hash, files_hash
from .reach import REPRESENTED_AS, Reach, origin_of_lines, read_lines
from .review_log import NAME as LOG
from .review_log import alone, append_line, change_entry, now, read_log
from .run import Run
from .settings import Settings
from .streamfunction.boundaries import said_sets

SCHEMA = "leewater/review/1"
SAMPLE = Path(__file__).resolve().parent.parent / "sample_reach"


class _Table(pydantic.BaseModel):
    model_config = pydantic.ConfigDict(extra="forbid", frozen=True)


class RunEntry(_Table):
    """One run of the matrix: design x event x variant, with the files that hold it.

    ``kind`` overrules the kind of frame found in the file (instant, mean, maximum); ``mesh`` picks
    one of several meshes; ``mapping`` names variables the file's metadata does not tell.
    """

    id: str
    name: str = ""
    design: str = ""
    event: str = ""
    variant: str = ""
    kind: str | None = None
    file: str | list[str]
    sha256: str = ""
    mesh: str | None = None
    mapping: dict[str, Any] = {}

    @property
    def label(self) -> str:
        """What to call the run on screens and in tables."""
        return self.name or " ".join(p for p in (self.design, self.event, self.variant) if p) or self.id

    @property
    def files(self) -> list[str]:
        return [self.file] if isinstance(self.file, str) else list(self.file)


class Person(_Table):
    """Who makes the review; printed on the record's first page."""

    name: str = ""
    role: str = ""
    organisation: str = ""


class Document(_Table):
    """A document that was received, or is still awaited (``received`` empty)."""

    name: str
    version: str = ""
    date: str = ""
    received: str = ""
    file: str = ""
    sha256: str = ""


class Boundaries(_Table):
    """What the review says of open boundaries, over what the file names and what the flow shows.

    ``open``: stretches by name, each two world points (m); boundary edges on the line between them let water
    through. With any, only these are open. ``closed``: names of the file's stretches that are walls.
    """

    open: dict[str, tuple[tuple[float, float], tuple[float, float]]] = {}
    closed: list[str] = []


class BackdropEntry(_Table):
    """A GeoTIFF, a picture with a world file, or a layer of a GeoPackage that maps show in grey under the water."""

    file: str
    layer: str | None = None
    opacity: float = pydantic.Field(0.35, gt=0, le=1)


class PhotographEntry(_Table):
    """A picture of the site; ``x``, ``y`` (world, m) and ``bearing`` (degrees from north) where its own tags lack them."""

    file: str
    caption: str = ""
    x: float | None = None
    y: float | None = None
    bearing: float | None = None


class _Contents(_Table):
    """Everything review.toml may hold. Tables of releases, fish, checks and the record are checked
    by the modules that use them."""

    schema_: str = pydantic.Field(SCHEMA, alias="schema")
    title: str
    created: str = ""
    place: str = ""
    datum: str = ""
    crs: str = ""
    units: str = "SI"
    reviewer: Person = Person()
    lines: str = "lines.gpkg"
    runs: list[RunEntry] = []
    settings: dict[str, float] = {}
    mapping: dict[str, Any] = {}
    boundaries: Boundaries = Boundaries()
    represented_as: dict[str, Literal[REPRESENTED_AS]] = {}  # type: ignore[valid-type]
    releases: list[dict[str, Any]] = []
    fish: list[dict[str, Any]] = []
    checks: list[dict[str, Any]] = []
    observations: list[dict[str, Any]] = []
    documents: list[Document] = []
    flows: dict[str, Any] = {}
    record: dict[str, Any] = {}
    views: list[dict[str, Any]] = []
    backdrop: list[BackdropEntry] = []
    photograph: list[PhotographEntry] = []


@dataclass(frozen=True, eq=False)
class Review:
    """An opened review folder.

    ``stamp`` is the hash of review.toml as it was read: a later save that finds another one on disk
    is refused, so two people never overwrite each other unknowingly.
    """

    folder: Path
    contents: _Contents
    stamp: str
    _opened: dict[str, Run] = field(default_factory=dict, repr=False)

    @property
    def title(self) -> str:
        return self.contents.title

    @property
    def runs(self) -> list[RunEntry]:
        return list(self.contents.runs)

    @property
    def fish(self) -> list[dict[str, Any]]:
        return self.contents.fish

    @property
    def releases(self) -> list[dict[str, Any]]:
        return self.contents.releases

    @property
    def checks(self) -> list[dict[str, Any]]:
        return self.contents.checks

    @cached_property
    def settings(self) -> Settings:
        return Settings(self.contents.settings)

    def entry(self, run_id: str) -> RunEntry:
        """The run with this id or label; an unknown one lists the known ones."""
        for entry in self.runs:
            if run_id in (entry.id, entry.label):
                return entry
        raise ValueError(f"the review has no run {run_id!r}; it has {', '.join(e.id for e in self.runs) or 'none'}.")

    def paths(self, entry: RunEntry) -> list[Path]:
        """Files of a run: where review.toml says, else found again by hash beside or below the review.

        Raises ``ValueError`` when a file is not there or its content has changed.
        """
        found = [(self.folder / f).resolve() for f in entry.files]
        if all(p.is_file() for p in found):
            return found
        again = _find_by_hash(self.folder, entry)
        if again is None:
            lost = next(p for p in found if not p.is_file())
            raise ValueError(
                f"run {entry.id}: {lost.name} is neither at {lost.parent} nor found by its hash beside the review; "
                "put the file there or correct the path in review.toml."
            )
        return again

    def changed_inputs(self) -> list[str]:
        """Runs whose files no longer have the hash in review.toml, as sentences."""
        out = []
        for entry in self.runs:
            if entry.sha256 and (actual := files_hash(self.paths(entry))) != entry.sha256:
                out.append(
                    f"run {entry.id}: its content has hash {actual[:12]}..., the review holds {entry.sha256[:12]}...; "
                    "it was changed after it was reviewed."
                )
        return out

    def open(self, run_id: str) -> Run:
        """The run, with the review's mapping, settings and origin; opened once."""
        entry = self.entry(run_id)
        if entry.id not in self._opened:
            from .readers import open_run

            run = open_run(
                self.paths(entry), mesh=entry.mesh, mapping={**self.contents.mapping, **entry.mapping} or None,
                settings=self.settings, kind=entry.kind, name=entry.label, origin=self.origin,
            )
            said = self.contents.boundaries
            self._opened[entry.id] = replace(run, boundary_sets=said_sets(run.mesh, run.boundary_sets, said.open, said.closed))
        return self._opened[entry.id]

    @cached_property
    def origin(self) -> tuple[float, float] | None:
        """Local origin shared by all runs and lines of the review: set by its centre line; None without one,
        when each run sets its own by the same rule."""
        path = self.folder / self.contents.lines
        return origin_of_lines(path) if path.is_file() else None

    @cached_property
    def reach(self) -> Reach:
        """Centre line, structures and lines; empty where the review has no lines yet."""
        path = self.folder / self.contents.lines
        if path.is_file() and self.origin is not None:
            return _as_said(read_lines(path, self.origin), self.contents.represented_as)
        return Reach(self.origin or self.open(self.contents.runs[0].id).mesh.origin)

    def entry_of(self, run: Run) -> RunEntry | None:
        """The entry whose files a run was read from; None for a run from elsewhere."""
        opened = next((i for i, r in self._opened.items() if r is run), None)
        if opened is not None:
            return self.entry(opened)
        files = [p.resolve() for p in run.files]
        return next((e for e in self.runs if [(self.folder / f).resolve() for f in e.files] == files), None)

    def reach_for(self, run: Run) -> Reach:
        """The review's lines with only what belongs to the run's design."""
        entry = self.entry_of(run)
        return self.reach.of_design(entry.design if entry else None)

    def edit(
        self, change: Callable[[Any], None], *, who: str, what: str, check: Callable[[Review], object] = lambda trial: None, **more: Any
    ) -> Review:
        """Change review.toml through its document, keeping comments, and log it.

        Parameters
        ----------
        change : callable
            Gets the tomlkit document and alters it.
        who, what : str
            For the log: the person, and one sentence on what changed and why.
        check : callable
            Gets the review as it would be and raises ``ValueError`` where it may not be so.
        more
            Further entries for the log.

        Returns
        -------
        Review
            Opened anew.

        Raises
        ------
        ValueError
            If somebody else saved review.toml meanwhile, or the change makes it invalid; nothing
            is written then.
        """
        path = self.folder / "review.toml"
        with alone(self.folder):
            before = path.read_bytes().decode("utf-8")
            if file_hash(path) != self.stamp:
                raise ValueError(
                    f"{path} was saved by somebody else since you opened it; open it again and repeat the change."
                )
            document = tomlkit.parse(before)
            change(document)
            text = tomlkit.dumps(document)
            check(Review(self.folder, _checked(text, path), ""))
            entry = change_entry(self.logged(), before, text)
            write_whole(path, text)
            self.log(who=who, what=what, **more, **entry)
        return open_review(self.folder)

    def log(self, *, who: str, what: str, **more: Any) -> None:
        """Add a line to the append-only settings log (settings-log.jsonl)."""
        append_line(self.folder / LOG, {"at": now(), "who": who, "what": what, **more})

    def logged(self) -> list[dict[str, Any]]:
        """The settings log, oldest first."""
        return read_log(self.folder / LOG)


def open_review(folder: Path | str) -> Review:
    """A review from its folder or its review.toml.

    Raises ``ValueError`` when review.toml is missing, not TOML, or holds an unknown or wrong entry.
    """
    folder = Path(folder)
    path = folder if folder.name == "review.toml" else folder / "review.toml"
    if not path.is_file():
        raise ValueError(f"{path} is not there; give a folder that holds a review.toml, or a results file.")
    text = path.read_text(encoding="utf-8")
    return Review(path.parent.resolve(), _checked(text, path), file_hash(path))


def open_any(path: Path | str, *, settings: Settings | None = None) -> tuple[Review | None, Run | None]:
    """What a command was given: a review folder (review, None) or results (None or its review, run).

    A results file that a review beside it lists is opened through that review, with its lines.
    """
    given = Path(path)
    if not given.exists() and given.name == SAMPLE.name and SAMPLE.is_dir():
        given = SAMPLE
    if given.is_dir() and (given / "review.toml").is_file() or given.name == "review.toml":
        return open_review(given), None
    if not given.exists():
        raise ValueError(f"{given} is not there; give a results file or a review folder.")
    review = _review_of(given)
    if review is not None:
        entry = next(e for e in review.runs if given.resolve() in [(review.folder / f).resolve() for f in e.files])
        return review, review.open(entry.id)
    from .readers import open_run

    return None, open_run([given], settings=settings)


def open_results(path: Path | str, *, settings: Settings | None = None) -> tuple[Review | None, Run]:
    """Results that a command was given, with the review that lists them; a review folder itself is refused."""
    review, run = open_any(path, settings=settings)
    if run is None:
        files = ", ".join(f for e in review.runs for f in e.files) if review else ""
        raise ValueError(f"{path} is a review; give one of its results files: {files}.")
    return review, run


def new_review(folder: Path | str, title: str) -> Review:
    """Make an empty review folder; an existing one is refused."""
    folder = Path(folder)
    path = folder / "review.toml"
    if path.exists():
        raise ValueError(f"{path} exists already; open it, or give another folder.")
    folder.mkdir(parents=True, exist_ok=True)
    document = tomlkit.document()
    document.update({"schema": SCHEMA, "title": title, "created": now()[:10]})
    write_whole(path, tomlkit.dumps(document))
    return open_review(folder)


def write_whole(path: Path, content: str | bytes) -> None:
    """Write a file whole or not at all: a new file beside it, synced, then renamed over it."""
    data = content.encode("utf-8") if isinstance(content, str) else content
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.replace(name, path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def _checked(text: str, path: Path) -> _Contents:
    try:
        table = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise ValueError(f"{path} is not TOML: {error}; mend that line.") from error
    try:
        contents = _Contents.model_validate(table)
        Settings(contents.settings)
    except pydantic.ValidationError as error:
        first = error.errors()[0]
        where = ".".join(str(p) for p in first["loc"])
        raise ValueError(f"{path}: {where}: {first['msg'].lower()}; mend that entry.") from error
    if contents.schema_ != SCHEMA:
        raise ValueError(f"{path} has schema {contents.schema_!r}; this version reads {SCHEMA!r}.")
    ids = [r.id for r in contents.runs]
    twice = next((i for i in ids if ids.count(i) > 1), None)
    if twice:
        raise ValueError(f"{path}: two runs have the id {twice!r}; give each its own.")
    return contents


def _as_said(reach: Reach, represented_as: dict[str, str]) -> Reach:
    """Structures as the review says they stand, over what lines.gpkg says; an unknown id is refused."""
    known = {s.id for s in reach.structures}
    unknown = next((i for i in represented_as if i not in known), None)
    if unknown is not None:
        raise ValueError(
            f"review.toml, represented_as: there is no structure {unknown!r}; the lines have {', '.join(sorted(known)) or 'none'}."
        )
    return replace(reach, structures=tuple(replace(s, represented_as=represented_as.get(s.id, s.represented_as)) for s in reach.structures))


def _find_by_hash(folder: Path, entry: RunEntry) -> list[Path] | None:
    """Files below the review's folder or beside it whose hash is the run's (one-file runs)."""
    if not entry.sha256 or len(entry.files) != 1:
        return None
    suffix = Path(entry.files[0]).suffix
    for base in (folder, folder.parent):
        for path in sorted(base.rglob(f"*{suffix}")):
            if path.is_file() and file_hash(path) == entry.sha256:
                return [path]
    return None


def _review_of(results: Path) -> Review | None:
    """The review in the file's folder or the one above that lists this file."""
    for folder in list(results.resolve().parents)[:2]:
        if (folder / "review.toml").is_file():
            review = open_review(folder)
            if any(results.resolve() == (folder / f).resolve() for e in review.runs for f in e.files):
                return review
    return None
