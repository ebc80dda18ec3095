"""Eddies followed through hand-made frames: births, gaps, splits, mergers, reversals, and frames too far apart."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import shapely

from hydro.eddies import Zone
from hydro.ledger import follow
from hydro.ledger.follow import time_weights
from hydro.ledger.windows import measured_period
from hydro.settings import Settings

AREA = np.ones(400)


def eddy(first: int, last: int, *, rotation: str = "clockwise", at: float | None = None, flow: float = 1.0, period: float | None = None) -> Zone:
    """A zone whose core is the nodes first to last, a metre each along a bank."""
    core = np.arange(first, last + 1, dtype=np.int32)
    centre = np.array([(first + last) / 2 if at is None else at, 0.0])
    size = float(len(core))
    wake = None if period is None else SimpleNamespace(expected_period_s=period)
    return Zone(
        id="", name="bank", kind="at bank", wall="right bank", rotation=rotation, centre=centre, chainage_m=centre[0], offset_m=0.0,
        area_m2=size, volume_m3=size, length_m=size, width_m=1.0, mean_depth_m=1.0, max_depth_m=1.0, psi_centre_m3_s=flow,
        psi_edge_m3_s=0.0, psi_wall_m3_s=0.0, recirculating_discharge_m3_s=flow, share_of_through_discharge=0.1, rotation_time_s=size / flow,
        separation=None, reattachment=None, triangles_across=5.0, max_reverse_speed_m_s=0.1, flags=(), sensitivity={}, cautions=(),
        wake=wake, contour=shapely.box(first, 0, last, 1), inner=shapely.box(first, 0, last, 1), streamlines=[], along=np.array([1.0, 0.0]),
        noise_m3_s=0.0, region=SimpleNamespace(sign=1), core=core,  # type: ignore[arg-type]
    )


def lives_of(*frames: list[Zone], step: float = 10.0):
    seconds = step * np.arange(len(frames))
    lives, named = follow(list(frames), seconds, AREA, Settings())
    return {life.id: life for life in lives}, named


def test_an_eddy_that_stays_keeps_its_id_and_its_share_of_time_is_weighted_by_time():
    """Frames at 0, 10, 20, 60 s stand for 5, 10, 25 and 20 s (half the way to each neighbour); seen in the first three: 40 of 60 s."""
    seconds = np.array([0.0, 10.0, 20.0, 60.0])
    lives, named = follow([[eddy(10, 30)], [eddy(11, 31)], [eddy(12, 32)], []], seconds, AREA, Settings())
    assert [z.id for frame in named for z in frame] == ["E1", "E1", "E1"]
    assert time_weights(seconds).tolist() == [5, 10, 25, 20]
    assert lives[0].share_of_time == pytest.approx(40 / 60)
    assert (lives[0].first_s, lives[0].last_s, lives[0].followed) == (0.0, 20.0, True)


def test_ranges_hold_the_least_and_the_greatest_of_the_frames():
    lives, _ = lives_of([eddy(10, 30, flow=1.0)], [eddy(10, 34, flow=3.0)], [eddy(10, 32, flow=2.0)])
    assert lives["E1"].ranges["recirculating_discharge_m3_s"] == (1.0, 3.0)
    assert lives["E1"].ranges["area_m2"] == (21.0, 25.0)
    assert lives["E1"].unsteady


def test_the_larger_part_of_a_split_keeps_the_id_and_the_other_names_its_parent():
    lives, named = lives_of([eddy(10, 50)], [eddy(10, 35), eddy(40, 50)])
    assert [z.id for z in named[1]] == ["E1", "E2"]
    assert lives["E2"].parent == "E1" and lives["E1"].parent is None


def test_a_merged_eddy_ends_and_names_the_one_it_went_into():
    lives, named = lives_of([eddy(10, 35), eddy(40, 50)], [eddy(10, 50)])
    assert [z.id for z in named[1]] == ["E1"]
    assert lives["E2"].merged_into == "E1" and lives["E2"].last_s == 0.0


def test_a_gap_of_the_allowed_length_is_bridged_and_a_longer_one_is_not():
    gap = int(Settings()["follow_gap_frames"])
    bridged, _ = lives_of([eddy(10, 30)], *[[] for _ in range(gap)], [eddy(10, 30)])
    lost, _ = lives_of([eddy(10, 30)], *[[] for _ in range(gap + 1)], [eddy(10, 30)])
    assert len(bridged) == 1 and len(lost) == 2
    assert bridged["E1"].frames == (0, gap + 1)


def test_an_eddy_that_turns_the_other_way_is_another_eddy():
    lives, named = lives_of([eddy(10, 30)], [eddy(10, 30, rotation="anticlockwise")])
    assert [z.id for frame in named for z in frame] == ["E1", "E2"]
    assert lives["E2"].parent is None


def test_an_eddy_that_moves_more_than_half_its_length_between_frames_is_not_followed():
    lives, named = lives_of([eddy(10, 30, at=20.0)], [eddy(14, 34, at=33.0)])
    assert not lives["E1"].followed and lives["E1"].why == "frames too far apart"
    assert any("not followed" in flag for flag in named[0][0].flags)


def test_frames_rarer_than_a_quarter_of_the_shedding_period_cannot_follow_a_core_that_jumps():
    jumping = [[eddy(10, 30, period=12.0)], [eddy(20, 40, period=12.0, at=27.0)], [eddy(10, 30, period=12.0)]]
    often, _ = lives_of(*jumping, step=1.0)
    rare, _ = lives_of(*jumping, step=10.0)
    assert all(life.followed for life in often.values())
    assert not any(life.followed for life in rare.values())


@pytest.mark.parametrize("period", [7.3, 12.5])
def test_the_period_of_a_swinging_signal_is_measured_on_uneven_times(period: float):
    """Source: the signal's own period; noise of a third of its size."""
    chance = np.random.default_rng(5)
    t = np.sort(chance.uniform(0, 90, 120))
    signal = np.sin(2 * np.pi * t / period) + 0.33 * chance.standard_normal(len(t))
    assert measured_period(t, signal) == pytest.approx(period, rel=0.02)


def test_noise_alone_has_no_measured_period():
    chance = np.random.default_rng(6)
    assert measured_period(np.arange(90.0), chance.standard_normal(90)) is None
