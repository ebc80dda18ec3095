"""Observed data that a review declares: read from its files, placed in a run's time and coordinates, and compared.

A review names them under ``[[observations]]``: ``kind`` (levels, marks, gauge, transect, drogue or dye), ``name``,
``file`` relative to the review, ``run``, ``source``, and what the kind needs (see :data:`NEEDS`).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import pandas as pd
import pyogrio
import pyproj

from .ledger.frames import plan_for
from .observed import Comparison, drogue, dye_front, gauge, levels, transect
from .review import Review
from .run import Run

NEEDS = {  # kind: keys beside name, file, run and source
    "levels": ("time",), "marks": (), "gauge": ("x", "y"), "transect": ("time", "line"), "drogue": (), "dye": ("begin", "time", "line"),
}
UNITS = {"levels": "m", "marks": "m", "gauge": "m", "transect": "m/s", "drogue": "m", "dye": "m"}
_MAY = {"accuracy", "layer", *(key for keys in NEEDS.values() for key in keys)}


@dataclass(frozen=True, eq=False)
class Observed:
    """One observation beside the model.

    Attributes
    ----------
    kind, name, source, unit : str
    figures : mapping of name to value or None
        bias, rmse, worst, within, count and left_out; for a drogue skill and travel_time_error_s as well.
    xy : (k, 2) local m or None
        Where the observations stand, for a map.
    difference : (k,)
        Model minus observed; for drogues and dye the separation, m.
    model_xy : (k, 2) or None
        The modelled parcel's places at a drogue's times.
    """

    kind: str
    name: str
    source: str
    unit: str
    figures: Mapping[str, float | None]
    xy: np.ndarray | None
    difference: np.ndarray
    model_xy: np.ndarray | None = field(default=None)


def compare_observations(review: Review, run: Run, run_id: str) -> list[Observed]:
    """Every observation of the review that belongs to a run, beside it.

    Raises
    ------
    ValueError
        An entry that lacks what its kind needs, or a file that cannot be read: which, and what to do.
    """
    entries = [_checked(entry) for entry in review.contents.observations]
    return [_compared(review, run, entry) for entry in entries if str(entry["run"]) == run_id]


def _checked(entry: Mapping[str, Any]) -> Mapping[str, Any]:
    name, kind = entry.get("name", "an observation"), entry.get("kind")
    if kind not in NEEDS:
        raise ValueError(f"observation {name!r}: kind {kind!r} is not known; say one of {', '.join(NEEDS)}.")
    for key in ("name", "file", "run", "source", *NEEDS[kind]):
        if key not in entry:
            raise ValueError(f"observation {name!r} ({kind}) lacks {key!r}; add it to review.toml.")
    if unknown := set(entry) - _MAY - {"kind", "name", "file", "run", "source"}:
        raise ValueError(f"observation {name!r}: {sorted(unknown)[0]!r} is not known; remove it or mend its name.")
    return entry


def _compared(review: Review, run: Run, entry: Mapping[str, Any]) -> Observed:
    kind, table = str(entry["kind"]), _read(review.folder / str(entry["file"]), entry, run)
    accuracy = float(entry.get("accuracy", np.nan))
    if kind in ("levels", "marks"):
        return _of_levels(run, entry, table, accuracy)
    if kind == "gauge":
        at = run.mesh.to_local(np.array([float(entry["x"]), float(entry["y"])]))
        found = gauge(run, at, _seconds(run, table["time"], entry), _column(table, "level_m", entry), accuracy)
        return _observed(entry, found, None)
    if kind == "transect":
        line = np.asarray(review.reach_for(run).find("sections", str(entry["line"])).geometry.coords)[:, :2]
        frame = run.frame(_index(run, entry["time"], entry))
        found = transect(frame, line, _column(table, "distance_m", entry), _column(table, "velocity_m_s", entry), accuracy)
        return _observed(entry, found, None)
    if kind == "drogue":
        return _of_drogue(review, run, entry, table)
    return _of_dye(review, run, entry, table)


def _of_levels(run: Run, entry: Mapping[str, Any], table: pd.DataFrame, accuracy: float) -> Observed:
    """Levels at one time; marks against the highest level that each place has in any frame."""
    xy, observed = _xy(run, table, entry), _column(table, "level_m", entry)
    own = table["accuracy_m"].to_numpy(float) if "accuracy_m" in table else np.full(len(xy), accuracy)
    if entry["kind"] == "levels":
        frame = run.frame(_index(run, entry["time"], entry))
        found = levels(frame, xy, observed, own)
        keep = np.array([levels(frame, xy[i], observed[i : i + 1]).observed.size > 0 for i in range(len(xy))])
        return _observed(entry, found, xy[keep])
    each = [levels(run.frame(i), xy[k : k + 1], observed[k : k + 1]).model for k in range(len(xy)) for i in range(run.n_frames)]
    highest = np.array([max((v[0] for v in each[k * run.n_frames : (k + 1) * run.n_frames] if v.size), default=np.nan) for k in range(len(xy))])
    known = np.isfinite(highest)
    return _observed(entry, Comparison(highest[known], observed[known], int((~known).sum()), own[known]), xy[known])


def _of_drogue(review: Review, run: Run, entry: Mapping[str, Any], table: pd.DataFrame) -> Observed:
    xy, seconds = _xy(run, table, entry), _seconds(run, table["time"], entry)
    last = float(run.times.seconds[-1])
    if run.n_frames == 1:  # steady: the track's time counts from its first fix
        seconds = seconds - seconds[0]
    elif seconds[0] < 0 or seconds[0] >= last:
        raise ValueError(f"observation {entry['name']!r} begins at {seconds[0]:g} s; {run.name} lasts from 0 to {last:g} s: check dates and zone.")
    plan = plan_for(run, run.frame(0), review.reach_for(run))
    found = drogue(run, xy, seconds, boundaries=plan.boundaries)
    known = np.isfinite(found.separation)
    figures = _numbers(Comparison(found.separation[known], np.zeros(known.sum()), int((~known).sum()), np.full(known.sum(), np.nan)))
    figures |= {"skill": found.skill, "travel_time_error_s": _known(found.travel_time_error)}
    return Observed("drogue", str(entry["name"]), str(entry["source"]), "m", figures, xy, found.separation, found.model)


def _of_dye(review: Review, run: Run, entry: Mapping[str, Any], table: pd.DataFrame) -> Observed:
    reach = review.reach_for(run)
    line = np.asarray(reach.find("releases", str(entry["line"])).geometry.coords)[:, :2]
    along = np.linspace(0, 1, 21)[:, None]
    source = line[0] + along * (line[-1] - line[0])
    begin, at = (float(_seconds(run, pd.Series([entry[k]]), entry)[0]) for k in ("begin", "time"))
    away = dye_front(run, source, begin, _xy(run, table, entry), at, boundaries=plan_for(run, run.frame(0), reach).boundaries)
    found = Comparison(away, np.zeros(len(away)), 0, np.full(len(away), np.nan))
    return _observed(entry, found, None)


def _observed(entry: Mapping[str, Any], found: Comparison, xy: np.ndarray | None) -> Observed:
    kind = str(entry["kind"])
    return Observed(kind, str(entry["name"]), str(entry["source"]), UNITS[kind], _numbers(found), xy, found.difference)


def _numbers(found: Comparison) -> dict[str, float | None]:
    return {
        "count": float(found.observed.size), "left_out": float(found.left_out), "bias": _known(found.bias), "rmse": _known(found.rmse),
        "worst": _known(found.worst[1]), "within_accuracy": _known(found.within),
    }


def _known(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


# ---- files ------------------------------------------------------------------------------------------


def _read(path: Path, entry: Mapping[str, Any], run: Run) -> pd.DataFrame:
    """CSV as it is; points of a GeoPackage or track points of a GPX with their world coordinates as x and y."""
    name = entry["name"]
    if not path.is_file():
        raise ValueError(f"observation {name!r}: {path.name} is not in the review's folder; put it there or mend its path.")
    try:
        if path.suffix.lower() == ".csv":
            return pd.read_csv(path, comment="#")
        points = geopandas.read_file(path, layer=_layer(path, entry))
    except (OSError, ValueError, pd.errors.ParserError, pyogrio.errors.DataSourceError, pyogrio.errors.DataLayerError) as error:
        raise ValueError(f"observation {name!r}: {path.name} cannot be read ({error}); give CSV, GPX or GeoPackage.") from error
    if points.crs is not None and run.crs:
        points = points.to_crs(pyproj.CRS.from_user_input(run.crs))
    vertices = points.geometry.get_coordinates(ignore_index=False)
    return points.drop(columns="geometry").loc[vertices.index].reset_index(drop=True).assign(x=vertices["x"].to_numpy(), y=vertices["y"].to_numpy())


def _layer(path: Path, entry: Mapping[str, Any]) -> str:
    known = [str(name) for name, _ in pyogrio.list_layers(path)]
    wanted = entry.get("layer", "track_points" if path.suffix.lower() == ".gpx" else known[0] if len(known) == 1 else "")
    if wanted not in known:
        raise ValueError(f"it has the layers {', '.join(known)}; name one with layer")
    return str(wanted)


def _column(table: pd.DataFrame, column: str, entry: Mapping[str, Any]) -> np.ndarray:
    if column not in table:
        raise ValueError(
            f"observation {entry['name']!r}: {entry['file']} has no column {column}; its columns are {', '.join(map(str, table.columns))}."
        )
    values = pd.to_numeric(table[column], errors="coerce").to_numpy(float)
    if np.isnan(values).any():
        raise ValueError(f"observation {entry['name']!r}: {column} in row {int(np.isnan(values).argmax()) + 1} of {entry['file']} is no number.")
    return values


def _xy(run: Run, table: pd.DataFrame, entry: Mapping[str, Any]) -> np.ndarray:
    return run.mesh.to_local(np.column_stack([_column(table, "x", entry), _column(table, "y", entry)]))


def _index(run: Run, moment: Any, entry: Mapping[str, Any]) -> int:
    return run.nearest(float(_seconds(run, pd.Series([moment]), entry)[0]))


def _seconds(run: Run, times: pd.Series, entry: Mapping[str, Any]) -> np.ndarray:
    """Seconds of the run from numbers, or from ISO dates in a dated run; dates without a zone are taken as the run's."""
    if not pd.api.types.is_datetime64_any_dtype(times):  # dates would read as numbers of nanoseconds
        numbers = pd.to_numeric(times, errors="coerce").to_numpy(float)
        if np.isfinite(numbers).all():
            return numbers
    if run.times.instants is None:
        raise ValueError(f"observation {entry['name']!r} has dates, but {run.name} has none; give seconds from the run's start.")
    try:
        dates = pd.to_datetime(times, utc=True, format="ISO8601").dt.tz_localize(None).to_numpy("datetime64[ms]")
    except (ValueError, TypeError) as error:
        raise ValueError(f"observation {entry['name']!r}: a time is neither seconds nor an ISO date ({error}).") from error
    return (dates - run.times.instants[0].astype("datetime64[ms]")) / np.timedelta64(1000, "ms")
