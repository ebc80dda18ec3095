"""Two runs side by side stand at one moment and on one scale, and the sentence's subject is the first one's alone."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import shapely

from dashboard import pair
from dashboard.views.scene import LineMark, Scene, Water, ZoneMark


def run(start: str | None, seconds: list[float]):
    instants = None if start is None else np.datetime64(start) + (np.array(seconds) * 1000).astype("timedelta64[ms]")
    return SimpleNamespace(times=SimpleNamespace(seconds=np.array(seconds), instants=instants))


@pytest.mark.parametrize("here, there, expected", [
    (run("2031-03-02T06:00", [0, 60, 120]), run("2031-03-02T06:01", [0, 60, 120]), 60.0),
    (run("2031-03-02T06:00", [0, 60, 120]), run("2031-03-02T05:30", [0, 60]), 1920.0),
    (run(None, [0, 60, 120]), run("2031-03-02T05:30", [0, 60]), 120.0),
])
def test_dated_runs_meet_by_date_and_others_by_the_time_since_their_start(here, there, expected):
    """At the first run's third frame, two minutes after its start; by hand."""
    assert pair.same_moment(here, there, 2) == expected


def test_the_second_map_takes_the_first_one_s_shades_and_has_no_subject():
    square = shapely.box(0, 0, 1, 1)
    zone = ZoneMark("E1", square, (), "clockwise", np.zeros(2), subject=True)
    scene = Scene(water=Water(None, np.zeros(1), 5.0), zones=(zone,), lines=(LineMark("dotted", np.zeros((2, 2)), subject=True),))
    out = pair.alike(scene, 3.0)
    assert out.water.top == 3.0
    assert not out.zones[0].subject and not out.lines[0].subject
