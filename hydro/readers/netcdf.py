"""A run from one or several NetCDF files that share a mesh: fields read lazily, times joined in order."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ..mesh import Mesh
from ..run import Note, Run, TimeAxis
from . import units
from .assemble import Asked, Field, Parts, check_edge_sense, make_run
from .crs import Ground, convergence_deg
from .mapping import Said
from .names import Choice, Placed, choose
from .store import Store
from .times import FileTimes, depth_is, kind_of, read_times, time_dimension


@dataclass(frozen=True, eq=False)
class Piece:
    """One file's share of a run: the variables chosen and its times."""

    store: Store
    choices: dict[str, Choice]
    times: FileTimes
    kind: str | None


def read_piece(store: Store, placed: list[Placed], said: Said) -> tuple[Piece, list[Note]]:
    """What one file gives.

    Raises ``ValueError`` for variables and times that cannot be used.
    """
    of_mesh = {d for p in placed for d in p.dimensions}
    candidates, _ = choose(placed, said)
    dimension = time_dimension([c.variable for c in candidates.values()], store, of_mesh, said)
    choices, notes = choose(placed, said, [dimension] if dimension else [])
    flow = [c for q, c in choices.items() if q.startswith(("depth", "level", "velocity", "unit", "edge"))]
    kinds = {c.variable.name: kind_of(c.variable, dimension) for c in flow}
    said_kinds = {k for k in kinds.values() if k}
    if len(said_kinds) > 1:
        words = ", ".join(f"{name} {kind}" for name, kind in kinds.items() if kind)
        raise ValueError(
            f"{store.path.name}: cell_methods disagree about time ({words}); depth and velocity must be of one kind: "
            "correct them, or export both as instants or means."
        )
    return Piece(store, choices, read_times(store, dimension, said), next(iter(said_kinds), None)), notes


def join(
    pieces: list[Piece], mesh: Mesh, ground: Ground, asked: Asked, *, notes: list[Note],
    boundary_sets: dict[str, np.ndarray] | None = None, keep: dict[str, np.ndarray] | None = None,
) -> Run:
    """One run of all pieces, in order of time. ``keep``: by location, the places that the mesh was made of.

    Raises ``ValueError`` when pieces do not hold the same quantities, overlap in time, or date their
    frames differently.
    """
    pieces, first_frames, axis, more = _in_order(pieces, asked.kind)
    notes = [*notes, *more, *(n for p in pieces for n in p.times.notes)]
    _same_quantities(pieces)
    dimensions = [p.times.dimension for p in pieces]
    fields = {
        quantity: _field([p.choices[quantity] for p in pieces], first_frames, dimensions, keep or {})
        for quantity in pieces[0].choices
    }
    notes += _of_velocity_and_bed(pieces[0], ground, mesh)
    files = tuple(p.store.path for p in pieces)
    statements = {k: str(v) for k, v in pieces[0].store.attributes.items()}
    parts = Parts(
        asked.name or statements.get("title", "").strip() or files[0].stem, files, mesh, fields, axis, ground,
        asked.settings, _depth_is(pieces[0], asked.said, notes), _once(notes), boundary_sets or {}, statements,
    )
    run = make_run(parts)
    notes_of_edges = check_edge_sense(parts, run)
    return replace(run, notes=(*run.notes, *notes_of_edges), series=_series(pieces, first_frames, len(axis)))


def _series(pieces: list[Piece], first_frames: np.ndarray, count: int) -> dict[str, np.ndarray]:
    """Discharges that depend on time alone, (frames,) m3/s by name: what links, pumps and gauges carry."""
    found: dict[str, np.ndarray] = {}
    ends = [*first_frames[1:], count]
    for piece, begin, end in zip(pieces, first_frames, ends, strict=True):
        for name, variable in piece.store.variables.items():
            unit = variable.text("units")
            if variable.dimensions == (piece.times.dimension,) and units.fits(unit, "edge_discharge"):
                values = found.setdefault(name, np.full(count, np.nan))
                values[begin:end] = variable.values()[: end - begin] * units.factor_to_si(unit, "edge_discharge")
    return found


def _field(
    choices: list[Choice], first_frames: np.ndarray, dimensions: list[str | None], keep: dict[str, np.ndarray]
) -> Field:
    """A field over all pieces: frame i is found in the piece that holds it."""

    first = choices[0]
    kept = keep.get(first.location)

    def read(index: int, places: np.ndarray) -> np.ndarray:
        piece = int(np.searchsorted(first_frames, index, side="right")) - 1
        listed = places if kept is None else kept[places]
        return read_places(choices[piece], dimensions[piece], index - int(first_frames[piece]), listed)

    return Field(first.variable.name, first.location, read, first.per_length)


def read_places(choice: Choice, dimension: str | None, index: int, listed: np.ndarray | None = None) -> np.ndarray:
    """Values (k,) float64 of a variable at one step of its time dimension, SI, at the places listed (None: all)."""
    variable, placed = choice.variable, choice.placed
    kept = list(variable.dimensions)
    if dimension in kept:
        raw = variable.along(dimension, index)
        kept.remove(dimension)
    else:
        raw = variable.raw()
    places_held = placed.size if placed.subset is None else len(placed.subset)
    if len(kept) != raw.ndim or raw.size != places_held:
        raise ValueError(
            f"{variable} holds {' by '.join(map(str, raw.shape)) or 'one'} values for {places_held} {placed.location}s; the file "
            "contradicts itself: export it again."
        )
    sizes = dict(zip(kept, raw.shape, strict=True))
    places = [d for d in kept if d in placed.dimensions]
    raw = raw.reshape([sizes[d] for d in places])
    raw = raw.transpose([places.index(d) for d in placed.dimensions]).ravel()
    if placed.subset is None and listed is not None:
        raw = raw[listed]  # before unpacking: stored numbers are half as long or less
    values = variable.unpacked(raw)
    if choice.factor != 1.0:
        values *= choice.factor
    if placed.subset is None:
        return values
    whole = np.full(placed.size, np.nan)
    whole[placed.subset] = values
    return whole if listed is None else whole[listed]


def _in_order(pieces: list[Piece], kind: str | None) -> tuple[list[Piece], np.ndarray, TimeAxis, list[Note]]:
    """Pieces sorted by time, the first frame of each, and the joined axis."""
    dated = [p.times.instants is not None for p in pieces]
    if any(dated) and not all(dated):
        lacking = pieces[dated.index(False)].store.path.name
        raise ValueError(
            f"{lacking} has undated times and another file of the run dated ones; export all of them alike."
        )
    if len(pieces) > 1 and not all(dated) and len({p.times.zero for p in pieces}) > 1:
        raise ValueError("the files of the run count time from different starts; export all of them alike.")
    all_instants = [p.times.instants for p in pieces if p.times.instants is not None]

    def starts(p: Piece) -> float:
        if p.times.instants is None:
            return float(p.times.seconds[0])
        return float((p.times.instants[0] - all_instants[0][0]) / np.timedelta64(1, "us")) / 1e6

    pieces = sorted(pieces, key=starts)
    notes: list[Note] = []
    seconds = _trimmed(pieces, [starts(p) + (p.times.seconds - p.times.seconds[0]) for p in pieces], notes)
    kinds = [kind or p.kind or "instant" for p, s in zip(pieces, seconds, strict=True) for _ in s]
    if kind is None and any(p.kind is None for p in pieces):
        text = "the file does not say whether frames are instants, means or maxima; taken as instants: ask"
        notes.append(Note(text, ""))
    elif kind is not None and any(p.kind not in (None, kind) for p in pieces):
        notes.append(Note(f"frames are taken as {kind} as asked, against cell_methods in the file", ""))
    counts = [len(s) for s in seconds]
    first = np.concatenate([[0], np.cumsum(counts)[:-1]]).astype(int)
    joined = np.concatenate(seconds)
    held = [(p.times.instants, len(s)) for p, s in zip(pieces, seconds, strict=True)]
    dates = [instants[:n] for instants, n in held if instants is not None]
    instants = np.concatenate(dates) if dates else None
    intervals = np.concatenate([p.times.intervals_s[: len(s)] for p, s in zip(pieces, seconds, strict=True)])
    intervals[np.array(kinds) == "instant"] = np.nan
    _note_gaps(pieces, joined, first, notes)
    return pieces, first, TimeAxis(joined - joined[0], instants, tuple(kinds), intervals), notes


def _trimmed(pieces: list[Piece], seconds: list[np.ndarray], notes: list[Note]) -> list[np.ndarray]:
    """Seconds of each piece without the frame that the next file repeats; overlaps are refused."""
    for i in range(len(pieces) - 1):
        ours, theirs = pieces[i].store.path.name, pieces[i + 1].store.path.name
        end, start = seconds[i][-1], seconds[i + 1][0]
        if abs(end - start) < 1e-6 and len(seconds[i]) > 1:
            seconds[i] = seconds[i][:-1]
            notes.append(Note(f"the last frame of {ours} is repeated by {theirs}; it is used once", ""))
        elif end >= start:
            raise ValueError(
                f"{ours} and {theirs} overlap in time: the first ends at {end:g} s, the second begins at {start:g} s; "
                "give "
                "files that follow one another."
            )
    return seconds


def _note_gaps(pieces: list[Piece], joined: np.ndarray, first: np.ndarray, notes: list[Note]) -> None:
    steps = np.diff(joined)
    if not steps.size:
        return
    usual = float(np.median(steps))
    for i in range(1, len(pieces)):
        gap = float(joined[first[i]] - joined[first[i] - 1])
        if gap > 1.5 * usual:
            before, after = pieces[i - 1].store.path.name, pieces[i].store.path.name
            text = f"a gap of {gap:g} s between {before} and {after}; frames are usually {usual:g} s apart"
            notes.append(Note(text, ""))


def _same_quantities(pieces: list[Piece]) -> None:
    first = pieces[0]
    for p in pieces[1:]:
        for q, choice in first.choices.items():
            other = p.choices.get(q)
            if other is None or other.location != choice.location or other.placed.size != choice.placed.size:
                raise ValueError(
                    f"{p.store.path.name} lacks {q.replace('_', ' ')} on {choice.location}s, which "
                    f"{first.store.path.name} has; "
                    "export all files of the run alike."
                )


def _of_velocity_and_bed(piece: Piece, ground: Ground, mesh: Mesh) -> list[Note]:
    notes = []
    velocity = piece.choices.get("velocity_x")
    if velocity is not None and "eastward" in velocity.variable.text("standard_name"):
        turn = 0.0 if ground.crs is None else convergence_deg(ground.crs, *mesh.to_world(mesh.node_xy.mean(axis=0)))
        text = (
            f"eastward velocity is taken along grid east; true north lies {turn:.2f} degrees clockwise of grid north: "
            "ask"
        )
        notes.append(Note(text, velocity.variable.name))
    for location in ("node", "face"):
        bed = piece.choices.get(f"{location} bed")
        if bed is not None and piece.times.dimension in bed.variable.dimensions and len(piece.times) > 1:
            ends = [read_places(bed, piece.times.dimension, i) for i in (0, len(piece.times) - 1)]
            change = float(np.nanmax(np.abs(ends[1] - ends[0]), initial=0.0))
            text = f"the bed changes in time by up to {change:.3g} m; the first frame's is used throughout"
            notes.append(Note(text, bed.variable.name))
    return notes


def _depth_is(piece: Piece, said: Said, notes: list[Note]) -> str:
    source = piece.choices.get("depth") or piece.choices.get("level")
    if said.get("depth", "is") or source is None:
        return said.get("depth", "is", "mean")
    stated = depth_is(source.variable, source.placed.dimensions)
    if stated:
        return stated
    assumed = "point" if source.location == "node" else "mean"
    words = {"point": "point values at nodes", "mean": "means over faces"}[assumed]
    notes.append(Note(f"the file does not say what depth is within a face; taken as {words}", source.variable.name))
    return assumed


def _once(notes: list[Note]) -> list[Note]:
    return list(dict.fromkeys(notes))

