"""Observed data against made fields whose difference is known."""

from __future__ import annotations

import numpy as np
import pytest

from hydro.observed import drogue, dye_front, gauge, levels, transect
from tests.builders import channel, frame_of, raw_of, run_of


def _frame():
    return frame_of(channel(40, 10), 2.0, (1.0, 0.0), bed=lambda x, y: 10 - 0.01 * x, stored_on="node")


def test_levels_tell_bias_rmse_and_the_worst_mark():
    """Source: arithmetic: model 12 - x/100; marks 0.1 below, 0.1 below and 0.4 above it: bias -0.2/3, rmse sqrt(0.06)."""
    xy = np.array([[10, 5], [50, 10], [90, 15], [500, 5.0]])
    observed = 12 - xy[:, 0] / 100 + np.array([-0.1, -0.1, 0.4, 0.0])
    found = levels(_frame(), xy, observed, 0.15)
    assert found.left_out == 1
    assert found.bias == pytest.approx(-0.2 / 3) and found.rmse == pytest.approx(np.sqrt(0.06))
    assert found.worst == (2, pytest.approx(-0.4)) and found.within == pytest.approx(2 / 3)


def test_a_gauge_is_linear_between_frames():
    mesh = channel()
    run = run_of(mesh, [0.0, 10.0], [raw_of(mesh, h, (1.0, 0.0), stored_on="node") for h in (1.0, 2.0)], bed=10.0)
    found = gauge(run, np.array([50.0, 10.0]), np.array([0, 5, 10, 99.0]), np.array([11, 11.4, 12, 12.0]))
    assert found.difference == pytest.approx([0, 0.1, 0]) and found.left_out == 1


def test_a_transect_compares_velocity_across_the_line():
    frame = frame_of(channel(40, 40), 2.0, (lambda x, y: 0.5 + y / 40, 0.0), stored_on="node")
    at = np.array([2.0, 10, 18])
    found = transect(frame, np.array([[50, 20], [50, 0.0]]), at, 0.5 + (20 - at) / 40 + 0.05)
    assert found.bias == pytest.approx(-0.05, abs=1e-6)


def test_a_drogue_that_moves_with_the_water_has_skill_one_and_one_twice_as_fast_less():
    """Source: Liu and Weisberg 2011 (from memory): c = sum of separations over sum of path lengths: 1/2 at twice the speed."""
    mesh = channel()
    run = run_of(mesh, [0.0], [raw_of(mesh, 1.0, (1.0, 0.0))])
    t = np.arange(0, 21, 1.0)
    same = drogue(run, np.column_stack([10 + t, 10 + 0 * t]), t)
    assert same.skill == pytest.approx(1.0, abs=1e-6) and same.travel_time_error == pytest.approx(0, abs=1e-6)
    fast = drogue(run, np.column_stack([10 + 2 * t, 10 + 0 * t]), t)
    assert fast.skill == pytest.approx(0.5, abs=1e-6) and fast.separation[-1] == pytest.approx(20, abs=1e-6)
    with pytest.raises(ValueError, match="growing times"):
        drogue(run, np.zeros((3, 2)), np.array([0, 0, 1.0]))


def test_dye_reaches_the_front_where_the_water_takes_it():
    mesh = channel()
    run = run_of(mesh, [0.0], [raw_of(mesh, 1.0, (1.0, 0.0))])
    source = np.array([[10, 5], [10, 15.0]])
    away = dye_front(run, source, 0.0, np.array([[43, 0], [43, 20.0]]), 30.0)
    assert away == pytest.approx([3.0, 3.0], abs=1e-6)
