"""Door for raster sets: GeoTIFF files of depth or level and two velocity components, one set a time, and a bed.

File names say what each holds: ``{quantity}_{time}.tif`` for what changes and ``{quantity}.tif`` for what
does not, with the quantities of :mod:`.mapping` (``depth_60.tif``, ``velocity_x_60.tif``, ``bed.tif``) or the
words that the mapping gives as ``variable``; mapping ``pattern`` sets another form. Times are numbers in
the mapping's unit, numbers with a unit (``60s``), or dates like ``20310302T060000Z``. A cell is a face; cells
without bed are no part of the mesh.
"""

from __future__ import annotations

import re
import threading
import warnings
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
import pyproj
import rasterio
from rasterio.errors import NotGeoreferencedWarning, RasterioError

from ..mesh import build_mesh
from ..run import Note, Run, TimeAxis
from . import faults
from .assemble import Asked, Field, Parts, make_run
from .crs import ground, read_system, system_factor
from .lattice import quads
from .mapping import FIELDS, Said
from .units import DIMENSIONS, factor_to_si

PATTERN = "{quantity}_{time}.tif"
_NUMBER = re.compile(r"^(?P<number>[+-]?\d+(?:\.\d+)?)\s*(?P<unit>[A-Za-z]*)$")


@dataclass(frozen=True, eq=False)
class Raster:
    """One file's place in the set: its quantity and the text of its time (None: constant)."""

    path: Path
    quantity: str
    time: str | None


def open_rasters(files: list[Path], asked: Asked) -> Run:
    """A run from a set of rasters; only one time is held at once.

    Raises ``ValueError`` with one sentence for anything that is wrong.
    """
    said = asked.said
    rasters = [_recognised(f, said) for f in files]
    first = _header(files[0])
    for f in files[1:]:
        _same_grid(first, _header(f))
    axis, times, notes = _times(rasters, said, asked.kind)
    sets = _sets(rasters, times)
    fields = {q: _field(q, paths, said) for q, paths in sets.items()}
    if "bed" not in fields and not {"depth", "level"} <= set(fields):
        raise ValueError(
            f"{files[0].name}: the set has no bed; add bed.tif, or both depth and level of the first time."
        )
    everywhere = np.arange(first.shape[0] * first.shape[1])
    if "bed" in fields:
        bed = fields["bed"].read(0, everywhere)
    else:
        bed = fields["level"].read(0, everywhere) - fields["depth"].read(0, everywhere)
    kept = np.flatnonzero(np.isfinite(bed))
    if not kept.size:
        raise ValueError(f"{files[0].name}: no cell of the set has a bed; check the no-data value of the bed.")
    system = _system(first, said)
    factor = 1.0 if system is None else system_factor(system)
    place = ground(system, factor, said.plain.get("datum", ""), "", files[0].name)
    mesh = build_mesh(_corners(first) * factor, quads(*first.shape)[kept].astype(np.int32), origin=asked.origin, stepped=True)
    faults.check_coordinates(files[0].name, "of the raster", mesh.to_world(mesh.node_xy), mesh.face_nodes)
    size = float(np.sqrt(np.median(mesh.face_area)))
    text = f"cells of a raster, {size:.3g} m wide: banks and piers are stair steps, there are no edges of the model"
    notes.append(Note(text, ""))
    kept_fields = {("face bed" if q == "bed" else q): _kept(f, kept) for q, f in fields.items()}
    parts = Parts(
        asked.name or files[0].parent.name, tuple(files), mesh, kept_fields, axis, place, asked.settings,
        said.get("depth", "is", "mean"), notes,
    )
    return make_run(parts)


@dataclass(frozen=True, eq=False)
class _Header:
    path: Path
    shape: tuple[int, int]
    transform: rasterio.Affine
    crs: str | None


def _header(path: Path) -> _Header:
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error", NotGeoreferencedWarning)
            with rasterio.open(path) as source:
                return _Header(path, source.shape, source.transform, source.crs.to_wkt() if source.crs else None)
    except NotGeoreferencedWarning:
        raise ValueError(
            f"{path.name} has no georeference, so its cells have neither size nor place; export it with its transform."
        ) from None
    except RasterioError as error:
        raise ValueError(f"{path.name} cannot be read as a raster ({_first(error)}); export it again.") from None


def _first(error: Exception) -> str:
    """What a library says of a fault, its first line."""
    return (str(error).splitlines() or [type(error).__name__])[0].rstrip(".")


def _same_grid(first: _Header, other: _Header) -> None:
    in_place = other.shape == first.shape and other.transform.almost_equals(first.transform, 1e-6)
    if not in_place or other.crs != first.crs:
        raise ValueError(
            f"{other.path.name} lies on other cells than {first.path.name}; give all rasters of a run the same extent, "
            "cell "
            "size and coordinate system."
        )


def _recognised(path: Path, said: Said) -> Raster:
    words = {said.variable(q) or q: q for q in FIELDS if q != "edge_discharge"}
    either = "|".join(re.escape(w) for w in sorted(words, key=len, reverse=True))
    pattern = said.plain.get("pattern", PATTERN)
    if "{quantity}" not in pattern or "{time}" not in pattern:
        raise ValueError(f"mapping: pattern is {pattern!r}; it needs {{quantity}} and {{time}}.")
    stem = re.sub(r"\.tiff?$", "", pattern, flags=re.IGNORECASE)
    timed = re.escape(stem).replace(r"\{quantity\}", f"(?P<quantity>{either})").replace(r"\{time\}", "(?P<time>.+)")
    name = re.sub(r"\.tiff?$", "", path.name, flags=re.IGNORECASE)
    found = re.fullmatch(f"(?P<quantity>{either})", name) or re.fullmatch(timed, name)
    if not found:
        raise ValueError(
            f"{path.name} does not say what it holds; name it like depth_60s.tif or bed.tif, or give mapping.pattern "
            "and the "
            "words of each quantity."
        )
    return Raster(path, words[found["quantity"]], found.groupdict().get("time"))


def _times(rasters: list[Raster], said: Said, kind: str | None) -> tuple[TimeAxis, dict[str, int], list[Note]]:
    """The time axis, and the frame of each time's text."""
    texts = sorted({r.time for r in rasters if r.time is not None})
    unsaid = Note("rasters do not say whether they are instants, means or maxima; taken as instants: ask", "")
    notes = [] if kind else [unsaid]
    if not texts:
        return TimeAxis(np.zeros(1), None, (kind or "instant",), np.full(1, np.nan)), {}, notes
    numbers = [_NUMBER.match(t) for t in texts]
    instants = None
    if all(numbers):
        seconds = np.array([_seconds(n, said, rasters) for n in numbers if n])
        notes.append(Note("times are undated: seconds from the start of the run", ""))
    else:
        instants = np.array([_date(t, rasters) for t in texts])
        seconds = instants.astype("int64") / 1e6
    order = np.argsort(seconds)
    twice = np.flatnonzero(np.diff(seconds[order]) == 0)
    if twice.size:
        same = [texts[order[twice[0] + k]] for k in (0, 1)]
        raise ValueError(
            f"{rasters[0].path.name}: the set names one time twice, as {same[0]!r} and {same[1]!r}; keep one."
        )
    frames = {texts[o]: i for i, o in enumerate(order)}
    seconds = seconds[order]
    axis = TimeAxis(
        seconds - seconds[0], None if instants is None else instants[order], (kind or "instant",) * len(texts),
        np.full(len(texts), np.nan),
    )
    return axis, frames, notes


def _seconds(number: re.Match[str], said: Said, rasters: list[Raster]) -> float:
    unit = number["unit"] or said.unit("time")
    if not unit:
        raise ValueError(
            f"{rasters[0].path.name}: times in the file names have no unit; write 60s, or say mapping.time.unit = "
            "\"s\"."
        )
    try:
        return float(number["number"]) * factor_to_si(unit, "time")
    except ValueError as error:
        raise ValueError(f"{rasters[0].path.name}: {error}; write times like 60s, 5min or 2h.") from None


def _date(text: str, rasters: list[Raster]) -> np.datetime64:
    try:
        stamp = pd.Timestamp(text.replace("_", "T", 1) if "T" not in text else text)
    except ValueError:
        path = next(r.path for r in rasters if r.time == text)
        raise ValueError(f"{path.name}: {text!r} is no time; write 60s or a date like 20310302T060000Z.") from None
    stamp = stamp.tz_convert("UTC").tz_localize(None) if stamp.tzinfo else stamp
    return np.datetime64(stamp.to_datetime64(), "us")


def _sets(rasters: list[Raster], frames: dict[str, int]) -> dict[str, list[Path]]:
    """Files of each quantity in order of time; one file where it is constant."""
    out: dict[str, list[Path]] = {}
    for quantity in {r.quantity for r in rasters}:
        own = [r for r in rasters if r.quantity == quantity]
        by_frame = {frames[r.time] if r.time is not None else -1: r.path for r in own}
        constant = set(by_frame) == {-1}
        lacking = sorted(set(frames.values()) - set(by_frame))
        if len(by_frame) < len(own) or (-1 in by_frame and not constant):
            raise ValueError(
                f"{own[0].path.name}: the set holds {quantity.replace('_', ' ')} twice for one time; keep one."
            )
        if lacking and not constant and quantity not in ("bed", "roughness"):
            time = next(t for t, i in frames.items() if i == lacking[0])
            raise ValueError(
                f"{own[0].path.name}: the set lacks {quantity.replace('_', ' ')} at time {time}; add that raster."
            )
        out[quantity] = [by_frame[i] for i in sorted(by_frame)]
    return out


def _field(quantity: str, paths: list[Path], said: Said) -> Field:
    factor = _factor(quantity, paths[0], said)
    turned = -1.0 if quantity == "bed" and said.get("bed", "positive") == "down" else 1.0
    held: dict[Path, np.ndarray] = {}
    lock = threading.Lock()

    def read(index: int, places: np.ndarray) -> np.ndarray:
        path = paths[min(index, len(paths) - 1)]
        with lock:
            if path not in held:
                held.clear()
                held[path] = _values(path)
            return held[path][places] * (factor * turned)

    return Field(paths[0].name, "face", read)


def _kept(f: Field, kept: np.ndarray) -> Field:
    return Field(f.name, f.location, lambda index, places: f.read(index, kept[places]))


def _values(path: Path) -> np.ndarray:
    """Values (cells,) of a raster row by row, NaN where it has none."""
    try:
        with rasterio.open(path) as source:
            if source.count != 1:
                raise ValueError(f"{path.name} has {source.count} bands; give one band a file.")
            band = source.read(1, masked=True).astype(np.float64)
            scale, offset = source.scales[0], source.offsets[0]
    except RasterioError as error:
        raise ValueError(f"{path.name} cannot be read ({_first(error)}); copy or export it again.") from None
    return (band.filled(np.nan) * scale + offset).ravel()


def _factor(quantity: str, path: Path, said: Said) -> float:
    with rasterio.open(path) as source:
        unit = said.unit(quantity) or (source.units[0] or "")
    if not unit:
        raise ValueError(
            f"{path.name} has no unit; set its band's unit, or say mapping.{quantity}.unit = "
            f"\"{DIMENSIONS[quantity][2]}\"."
        )
    try:
        return factor_to_si(unit, quantity)
    except ValueError as error:
        raise ValueError(f"{path.name}: {error}; correct it or say mapping.{quantity}.unit.") from None


def _system(header: _Header, said: Said) -> pyproj.CRS | None:
    if "crs" in said.plain:
        return read_system(said.plain["crs"], "mapping.crs")
    return None if header.crs is None else read_system(header.crs, header.path.name)


def _corners(header: _Header) -> np.ndarray:
    """Corners of all cells, (n, 2), row by row from the top."""
    rows, columns = header.shape
    i, j = np.meshgrid(np.arange(columns + 1), np.arange(rows + 1))
    t = header.transform
    return np.column_stack([(t.a * i + t.b * j + t.c).ravel(), (t.d * i + t.e * j + t.f).ravel()])
