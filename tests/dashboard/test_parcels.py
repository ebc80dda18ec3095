"""A parcel let go on the desk goes where the field takes it, says why it ended, and what it must not be used for."""

from __future__ import annotations

import contextlib
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from dashboard.parcels import A_TICK, Parcel, Parcels
from dashboard.reading import Reading
from dashboard.results import Working
from dashboard.units import Units
from dashboard.views import parcel as view
from dashboard.views.scene import Scene
from hydro.review import SAMPLE

LONG = 300.0  # s: on a busy machine with nothing compiled


def got(reading: Reading, make):
    """What `make` gives once all that it waits for is made."""
    for _ in range(12):
        try:
            return make()
        except Working:
            assert reading.results.wait(LONG) and reading.long.wait(LONG)
    raise AssertionError("it still waits")


def drifting(tmp_path: Path) -> Path:
    """A few frames of the sample's flood as a results file of its own."""
    path = tmp_path / "few.nc"
    with xr.open_dataset(SAMPLE / "results" / "existing_flood.nc", engine="h5netcdf", decode_cf=False) as whole:
        whole.isel(time=slice(20, 24)).to_netcdf(path, engine="h5netcdf")
    return path


@pytest.fixture(scope="module")
def flood(tmp_path_factory):
    reading = Reading(drifting(tmp_path_factory.mktemp("few")))
    run = got(reading, lambda: reading.run("file"))
    return reading, run, Parcels(reading)


def test_in_a_run_with_frames_it_moves_at_the_water_s_speed(flood):
    """Second method: its first second against speed times time in the frame it starts in; within a tenth, for the water changes."""
    reading, run, parcels = flood
    start = run.mesh.to_world(reading_middle(reading, run))
    place = (float(start[0]), float(start[1]), float(run.times.seconds[0]))
    found = got(reading, lambda: parcels.parcel("file", 0, place))
    assert not found.steady and found.seconds[0] == run.times.seconds[0] and found.tick_s > 0
    np.testing.assert_allclose(np.diff(found.seconds)[:-1], found.tick_s / A_TICK, rtol=1e-9)
    frame = got(reading, lambda: reading.frame("file", 0))
    corner = run.mesh.triangles[run.mesh.find(found.xy[:1])[0]]
    speed = float(frame.speed[corner].mean())
    moved = float(np.hypot(*(found.xy[1] - found.xy[0])))
    assert moved == pytest.approx(speed * (found.seconds[1] - found.seconds[0]), rel=0.15)
    assert found.ended in ("afloat", "left")


def reading_middle(reading: Reading, run) -> np.ndarray:
    """The deepest node of the first frame, a little inside a triangle."""
    frame = got(reading, lambda: reading.frame("file", 0))
    node = int(np.argmax(frame.depth * (frame.speed > 0.3)))
    triangle = run.mesh.triangles[np.flatnonzero((run.mesh.triangles == node).any(axis=1))[0]]
    return run.mesh.node_xy[triangle].mean(axis=0)


def test_let_go_in_the_last_frame_it_says_that_nothing_follows(flood):
    reading, run, parcels = flood
    start = run.mesh.to_world(reading_middle(reading, run))
    with pytest.raises(ValueError, match="choose an earlier time"):
        got(reading, lambda: parcels.parcel("file", 3, (float(start[0]), float(start[1]), float(run.times.seconds[-1]))))


def test_off_the_water_it_says_so(flood):
    reading, run, parcels = flood
    west, south, _, _ = run.mesh.bounds
    x, y = run.mesh.to_world(np.array([west - 50, south - 50]))
    found = got(reading, lambda: parcels.parcel("file", 0, (float(x), float(y), float(run.times.seconds[0]))))
    assert found.ended == "outside the water"
    assert "there is no water there" in view.words(found, (x, y, 0.0), Units("SI"), True)


def test_in_a_single_frame_it_follows_the_streamline_evenly_in_time():
    reading = Reading(SAMPLE / "results" / "existing_bankfull_coarse.nc")
    with contextlib.suppress(Working):
        reading.matter()
    run_id = got(reading, lambda: reading.matter().runs[0][0])
    run = got(reading, lambda: reading.run(run_id))
    frame = got(reading, lambda: reading.frame(run_id, 0))
    at = run.mesh.node_xy[int(np.argmax(frame.depth * frame.speed))]
    x, y = run.mesh.to_world(at + 0.01)
    parcels = Parcels(reading)
    found = got(reading, lambda: parcels.parcel(run_id, 0, (float(x), float(y), 0.0)))
    line = got(reading, lambda: parcels.streamline(run_id, 0, (float(x), float(y), 0.0)))
    assert found.steady and found.seconds[0] == 0.0
    np.testing.assert_allclose(np.diff(found.seconds)[:-1], found.tick_s / A_TICK)
    nearest = [np.hypot(*(line - p).T).min() for p in found.xy]
    assert max(nearest) < 6.0  # no farther than the line's own points lie apart
    assert len(line) > len(found.xy) / 10


def test_what_is_said_names_length_time_end_and_what_it_is_not_for():
    parcel = Parcel(np.array([[0.0, 0.0], [30.0, 40.0]]), np.array([10.0, 135.0]), "aground", 10.0, steady=False)
    words = view.words(parcel, (52000.0, 31000.0, 10.0), Units("SI"), False)
    assert "50.0\u00a0m in 2\u00a0min 5\u00a0s" in words and "then runs aground" in words and "a tick every 10\u00a0s" in words
    assert "not for judging swimming, boating or rescue" in words and "not forecasts" in words


def test_it_stands_where_it_is_at_the_shown_moment():
    parcel = Parcel(np.array([[0.0, 0.0], [30.0, 40.0]]), np.array([10.0, 20.0]), "left", 10.0, steady=False)
    (point,) = view.onto(Scene(), parcel, None, 15.0).points
    assert point.at.tolist() == [15.0, 20.0]
    assert [m.kind for m in view.onto(Scene(), parcel, np.zeros((3, 2)), 0.0).lines] == ["streamline", "pathline"]
