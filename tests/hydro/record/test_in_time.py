"""Eddies in time in the record: persistence by the time each frame stands for, and a mean beside its instants."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from hydro.ledger import Life, frame_ledger
from hydro.record.eddies import read
from hydro.record.in_time import _notes, persistence, read_in_time, steady_stretch
from hydro.review import SAMPLE, open_review
from hydro.run import Run


def _shortened(run: Run, frames: int) -> Run:
    """The first frames of a run."""
    t = run.times
    instants = None if t.instants is None else t.instants[:frames]
    times = replace(t, seconds=t.seconds[:frames], instants=instants, kinds=t.kinds[:frames], intervals_s=t.intervals_s[:frames])
    return replace(run, times=times)


@pytest.fixture(scope="module")
def burst():
    review = open_review(SAMPLE)
    run = _shortened(review.open("existing_burst"), 5)
    return read_in_time(read(review, review.entry("existing_burst"), run))


def test_the_mean_s_window_holds_the_peak_and_ends_where_the_river_has_risen_or_fallen():
    through = np.array([60.0, 96.0, 94.0, 98.0, 100.0, 101.0, 90.0, 99.0])
    assert steady_stretch(through, 4) == (3, 5)  # 94 is 6 % below; what comes after a break does not count
    assert steady_stretch(np.array([1.0, 50.0, 1.0]), 1) == (1, 1)


def test_an_eddy_seen_in_every_frame_lasts_the_whole_time(burst):
    always = [life for life in burst.lives if len(life.frames) == burst.frames]
    assert always  # the bay turns at every stage of the flood
    (part,) = [t for t in persistence([burst]).tables if t.id.startswith("persistence-")]
    shown = {row[0]: row for row in part.rows}
    for life in always:
        assert shown[life.id][4].value == pytest.approx(100.0)
        assert shown[life.id][3].value - shown[life.id][2].value == pytest.approx(burst.span_s)


def test_least_and_greatest_of_the_instants_are_those_of_the_frames_themselves(burst):
    """The bay's eddy is alone of its size: its instants are found here by area, without the matching under test."""
    mean = next(t for t in persistence([burst]).tables if t.id.startswith("mean-"))
    review = open_review(SAMPLE)
    run = burst.reading.run
    largest = [
        max(z.area_m2 for z in frame_ledger(run, i, reach=review.reach_for(run)).zones.zones) for i in range(burst.frames)
    ]
    row = max(mean.rows, key=lambda r: r[2].value)
    assert row[3].value == pytest.approx(min(largest)) and row[4].value == pytest.approx(max(largest))
    assert row[3].value <= row[4].value


def test_what_befell_an_eddy_is_said():
    life = Life("E4", "Pier 1", "behind structure", "clockwise", None, (1,), 0.0, 1.0, 0.5, "E2", "E1", False, "frames too far apart", {}, True)
    assert _notes(life) == "not followed: frames too far apart; split from E2; merged into E1; unsteady"


def test_a_run_of_one_frame_has_nothing_to_say_in_time():
    review = open_review(SAMPLE)
    entry = review.entry("existing_bankfull_coarse")
    with pytest.raises(ValueError, match="two or more"):
        read_in_time(read(review, entry, review.open(entry.id)))
    assert "one frame" in persistence([]).paragraphs[0]
