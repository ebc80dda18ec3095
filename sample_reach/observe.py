"""Invented observations for the sample review: the model's own figures with a stated offset and scatter.

They show how a comparison looks; they are no evidence of anything. Every number depends on the seed alone.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pyproj

from hydro.observed import levels
from hydro.review import Review
from hydro.run import Run
from hydro.section import cut
from hydro.section.figures import verticals
from hydro.tracks import pathlines

from .write import crs_wkt

_SEED = 20310312
_MARKS = ((120.0, 15.0), (300.0, -14.0), (470.0, 14.0), (560.0, -13.0), (640.0, 15.0), (760.0, -14.0))  # chainage, offset, m
_MARK_OFFSET, _MARK_SCATTER, _MARK_ACCURACY = 0.02, 0.03, 0.05  # m
_GAUGE = (600.0, 10.0)
_GAUGE_SCATTER, _BOAT_SCATTER = 0.008, 0.06  # m, m/s
_DROGUE_START, _DROGUE_WALK = (150.0, 3.0), 0.35  # chainage and offset, m; random step of a fix, m


def write_observations(review: Review, folder: Path) -> None:
    """Write flood marks, a gauge's series, a boat's transect, a drogue's track and a dye front into ``folder``."""
    folder.mkdir(exist_ok=True)
    chance = np.random.default_rng(_SEED)
    flood, steady = review.open("existing_flood"), review.open("existing_bankfull")
    _marks(review, flood, folder / "flood_marks.csv", chance)
    _gauge(review, flood, folder / "bridge_gauge.csv", chance)
    _boat(review, steady, folder / "boat_transect.csv", chance)
    _drogue(review, steady, folder / "drogue.gpx", chance)


def _head(what: str) -> str:
    return f"# {what} Invented: the model's own figures with a stated offset and scatter.\n"


def _place(review: Review, places) -> np.ndarray:
    assert review.reach.centre_line is not None
    return np.vstack([review.reach.centre_line.at(np.array([s]), n) for s, n in places])


def _marks(review: Review, run: Run, path: Path, chance: np.random.Generator) -> None:
    xy = _place(review, _MARKS)
    series = np.full((run.n_frames, len(xy)), np.nan)
    for i in range(run.n_frames):
        for k in range(len(xy)):
            value = levels(run.frame(i), xy[k : k + 1], np.zeros(1)).model
            series[i, k] = value[0] if value.size else np.nan
    world, found = run.mesh.to_world(xy), np.nanmax(series, axis=0) + _MARK_OFFSET + _MARK_SCATTER * chance.standard_normal(len(xy))
    table = pd.DataFrame({"x": world[:, 0].round(2), "y": world[:, 1].round(2), "level_m": found.round(3), "accuracy_m": _MARK_ACCURACY})
    path.write_text(_head("Flood marks.") + table.to_csv(index=False), encoding="utf-8")


def _gauge(review: Review, run: Run, path: Path, chance: np.random.Generator) -> None:
    xy = _place(review, [_GAUGE])
    level = np.array([levels(run.frame(i), xy, np.zeros(1)).model[0] for i in range(run.n_frames)])
    seconds = np.arange(0.0, run.times.seconds[-1] + 1, 30.0)
    found = np.interp(seconds, run.times.seconds, level) + _GAUGE_SCATTER * chance.standard_normal(len(seconds))
    assert run.times.instants is not None
    times = [f"{np.datetime_as_string(run.times.instants[0] + np.timedelta64(int(s), 's'), unit='s')}Z" for s in seconds]
    path.write_text(_head("Gauge at the bridge.") + pd.DataFrame({"time": times, "level_m": found.round(3)}).to_csv(index=False), encoding="utf-8")


def _boat(review: Review, run: Run, path: Path, chance: np.random.Generator) -> None:
    line = np.asarray(review.reach.find("sections", "Bridge").geometry.coords)[:, :2]
    b, d, v = verticals(cut(run.frame(0), line))
    at = np.arange(b[0] + 3.0, b[-1] - 3.0, 2.0)
    wet = np.interp(at, b, d) > 0.3
    speed = np.interp(at, b, v) + _BOAT_SCATTER * chance.standard_normal(len(at))
    table = pd.DataFrame({"distance_m": at[wet].round(2), "velocity_m_s": speed[wet].round(3)})
    path.write_text(_head("Velocities from a moving boat, mean over depth.") + table.to_csv(index=False), encoding="utf-8")


def _drogue(review: Review, run: Run, path: Path, chance: np.random.Generator) -> None:
    """A GPX track: a parcel's path, fixed every ten seconds, with a random walk of its own."""
    track = pathlines(run, _place(review, [_DROGUE_START]), begin=0.0, end=240.0, every=10.0).tracks[0]
    walk = np.cumsum(_DROGUE_WALK * chance.standard_normal(track.xy.shape), axis=0)
    walk -= walk[0]
    to_world = pyproj.Transformer.from_crs(crs_wkt(), "EPSG:4326", always_xy=True)
    points = []
    for (x, y), seconds in zip(run.mesh.to_world(track.xy + walk), track.seconds, strict=True):
        lon, lat = to_world.transform(x, y)
        stamp = np.datetime_as_string(np.datetime64("2031-03-02T06:00:00") + np.timedelta64(int(round(seconds)), "s"), unit="s")
        points.append(f'<trkpt lat="{lat:.8f}" lon="{lon:.8f}"><time>{stamp}Z</time></trkpt>')
    path.write_text(
        '<?xml version="1.0" encoding="UTF-8"?>\n<gpx version="1.1" creator="invented" xmlns="http://www.topografix.com/GPX/1/1">'
        f"<trk><name>Drogue (invented)</name><trkseg>\n{chr(10).join(points)}\n</trkseg></trk></gpx>\n", encoding="utf-8",
    )
