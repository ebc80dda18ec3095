"""Endurance and legs against the closed forms of Castro-Santos 2005 and worked examples made from them.

Source: Castro-Santos 2005, J. Exp. Biol. 208, 421-432: the ground speed that carries farthest against a uniform flow
is -1/b, whatever the flow, one value a mode. The greatest distance exp(a + b U_f - 1)/|b| and the flow at which the
mode switches follow from it by calculus. The fish is made up: 0.40 m, speeds in body lengths a second,
ln T = 8.5 - 1.2 U (prolonged) and 5.0 - 0.45 U (sprint).
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from hydro._kernels import swim
from hydro.passage.fish import EnduranceLine, switch_of_mode
from hydro.passage.legs import prepare
from hydro.settings import Settings
from tests.builders import channel, frame_of
from tests.passage_cases import ends, fish

PROLONGED = EnduranceLine(8.5, -1.2, 0.0, 99.0)
SPRINT = EnduranceLine(5.0, -0.45, 0.0, 99.0)


def test_best_ground_speed_and_greatest_distance_of_the_worked_example():
    """Derived from the source; six digits as printed."""
    assert PROLONGED.best_ground_speed == pytest.approx(0.833333, rel=1e-5)
    assert SPRINT.best_ground_speed == pytest.approx(2.22222, rel=1e-5)
    assert [PROLONGED.farthest(u) for u in (4, 6)] == pytest.approx([12.3998, 1.12488], rel=1e-5)
    assert [SPRINT.farthest(u) for u in (4, 6)] == pytest.approx([20.0556, 8.15399], rel=1e-5)
    switch = switch_of_mode(PROLONGED, SPRINT)
    assert switch == pytest.approx(3.35889, rel=1e-5)
    assert [line.farthest(switch) for line in (PROLONGED, SPRINT)] == pytest.approx([26.7626, 26.7626], rel=1e-5)


@pytest.mark.parametrize("flow", [2.0, 3.3, 3.4, 4.0, 6.0])
def test_a_metre_against_the_flow_costs_one_over_the_greatest_distance_in_the_better_mode(flow):
    """The mode switches at 3.359 body lengths a second. Tolerance: round-off."""
    one = fish()
    fatigue, seconds = swim.metre(-flow * 0.4, 0.0, one.swimmer(Settings()))
    best = max((PROLONGED, SPRINT), key=lambda line: line.farthest(flow))
    assert fatigue == pytest.approx(1 / (0.4 * best.farthest(flow)), rel=1e-12)
    assert 1 / seconds == pytest.approx(0.4 * best.best_ground_speed, rel=1e-12)


def _log_fatigue(g, a, b, along, across):
    return -a - b * math.hypot(g - along, across) - math.log(g)


def test_oblique_headings_cost_what_a_search_over_ground_speeds_finds():
    """Second method: scipy's bounded search of exp(-a - b s)/g on each admissible stretch. Tolerance: 1e-5 of the fatigue."""
    rng = np.random.default_rng(7)
    checked = 0
    for _ in range(300):
        along, across = rng.uniform(-3, 3), rng.uniform(-2, 2)
        a, b, low = rng.uniform(3, 9), -rng.uniform(0.5, 5), rng.uniform(0, 1.5)
        high = low + rng.uniform(0.5, 3)
        fatigue, ground = swim.mode_metre(along, across, a, b, low, high)
        if abs(across) >= high or along + math.sqrt(high**2 - across**2) <= 1e-3:
            assert not ground > 1e-3
            continue
        fastest = along + math.sqrt(high**2 - across**2)
        slowest = max(along + math.sqrt(max(low**2 - across**2, 0.0)), 1e-9)
        found = minimize_scalar(
            _log_fatigue, bounds=(slowest, fastest), args=(a, b, along, across), method="bounded",
            options={"xatol": 1e-10},
        )
        assert math.log(fatigue) <= found.fun + 1e-5
        assert low - 1e-9 <= math.hypot(ground - along, across) <= high + 1e-9
        assert fatigue == pytest.approx(math.exp(-a - b * math.hypot(ground - along, across)) / ground, rel=1e-12)
        checked += 1
    assert checked > 100


def test_fatigue_adds_up_over_three_reaches_as_in_the_worked_example():
    """Prolonged line only, best ground speed: 6 m at 0.8, 2 m at 1.6, 10 m at 0.5 m/s; six digits as printed."""
    one = fish(sprint=None).swimmer(Settings())
    parts = [(length, *swim.metre(-flow, 0.0, one)) for length, flow in ((6.0, 0.8), (2.0, 1.6), (10.0, 0.5))]
    assert [length * f for length, f, _ in parts] == pytest.approx([0.109741, 0.403233, 0.0743626], rel=1e-5)
    assert [length * s for length, _, s in parts] == pytest.approx([18, 6, 30], rel=1e-9)
    assert sum(length * f for length, f, _ in parts) == pytest.approx(0.587337, rel=1e-5)


@pytest.mark.parametrize("flow", [2.5, 3.3, 3.4, 4.0, 6.0])
def test_a_leg_up_a_uniform_channel_costs_its_length_over_the_greatest_distance(flow):
    """3 m of uniform flow between start and goal, mesh lines along it. Tolerance: round-off."""
    frame = frame_of(channel(40, 8, 20, 4), 1.0, (flow * 0.4, 0.0), stored_on="node")
    chain = prepare(frame, fish(), ends(20, 4, start=13, goal=10), Settings()).best_chain()
    best = max((PROLONGED, SPRINT), key=lambda line: line.farthest(flow))
    assert chain.worst == pytest.approx(3 / (0.4 * best.farthest(flow)), rel=1e-9)
    assert chain.seconds == pytest.approx(3 / (0.4 * best.best_ground_speed), rel=1e-9)


def test_below_the_sustained_speed_no_fatigue_is_added_and_beyond_the_range_there_is_no_way():
    swimmer = fish().swimmer(Settings())
    assert swim.metre(-0.3, 0.0, swimmer) == (0.0, pytest.approx(1 / 0.1))  # sustained speed: 1 BL/s = 0.4 m/s
    assert swim.metre(-4.81, 0.0, swimmer) == (math.inf, math.inf)  # sprint ends at 12 BL/s = 4.8 m/s
    assert math.isnan(fish().sprint.seconds(4.81))
