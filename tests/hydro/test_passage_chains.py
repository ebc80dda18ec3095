"""Chains of legs against enumeration, corridors of known cost, and limits met at a computed discharge."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
import shapely

from hydro._kernels import route
from hydro.passage.areas import Places
from hydro.passage.legs import prepare
from hydro.settings import Settings
from tests.builders import channel, frame_of, free_mesh
from tests.passage_cases import ends, fish, place

NO_REST = {"speed_m_s": 0.0, "depth_m": 9.0}  # only declared resting places count
COARSE = Settings({"passage_points_per_side": 1})


def _two_corridors(lower: float, upper: float, rests=()):
    """16 m of corridor from x = 20 to 4 either side of a dry strip, with a uniform flow (body lengths a second) each."""
    mesh = channel(48, 8, 24, 4)
    frame = frame_of(
        mesh, lambda x, y: np.where(np.abs(y - 2) < 0.1, 0.0, 1.0),
        (lambda x, y: 0.4 * np.where(y < 2, lower, upper), 0.0), stored_on="node",
    )
    places = ends(24, 4, start=20, goal=4)
    return prepare(frame, fish(rest=NO_REST), Places(places.start, places.goal, tuple(rests)), COARSE)


def _greatest_distance(flow: float) -> float:
    """Against a uniform flow in body lengths a second, in the better mode; m."""
    return 0.4 * max(math.exp(8.5 - 1.2 * flow - 1) / 1.2, math.exp(5.0 - 0.45 * flow - 1) / 0.45 if flow + 1 / 0.45 > 0 else 0)


def test_of_two_corridors_the_one_of_less_known_cost_is_taken():
    """Closed form: length over the greatest distance (Castro-Santos 2005)."""
    chain = _two_corridors(2.8, 2.6).best_chain()
    assert chain.worst == pytest.approx(16 / _greatest_distance(2.6), rel=1e-9)
    assert (chain.legs[0].path[:, 1] > 2).all()


def test_with_resting_pools_the_least_worst_leg_beats_the_least_total():
    """Corridor A has no pool and less fatigue in all; corridor B three pools, so its worst leg, 4 m, is less.

    All chains by hand: A alone, and B with every choice of its pools; a pool that is passed without rest still
    has to be swum through.
    """
    pools = [(8.0, 9.0), (12.0, 13.0), (16.0, 17.0)]
    a, b = 16 / _greatest_distance(2.4), {}
    for used in itertools.chain.from_iterable(itertools.combinations(pools, k) for k in range(4)):
        stops = [(20.0, 20.0), *[(high, low) for low, high in reversed(used)], (4.0, 4.0)]
        lengths = [before[1] - after[0] for before, after in itertools.pairwise(stops)]
        b[used] = [x / _greatest_distance(3.0) for x in lengths]
    assert a < min(sum(legs) for legs in b.values())
    least = min(max(legs) for legs in b.values())
    assert least < a

    rests = [place(f"Pool {i}", low, 2.1, high, 4) for i, (low, high) in enumerate(pools)]
    search = _two_corridors(2.4, 3.0, rests)
    chain = search.best_chain()
    assert chain.worst == pytest.approx(least, rel=1e-6)
    assert [leg.to_area.name for leg in chain.legs] == ["Pool 2", "Pool 1", "Pool 0", "goal"]
    assert search.best_chain(recovering=False).worst == pytest.approx(a, rel=1e-6)


def test_the_least_worst_leg_is_the_least_over_all_chains_of_scattered_pools():
    """Enumeration of every order of five pools over the legs between them. Tolerance: round-off."""
    rng = np.random.default_rng(11)
    mesh = free_mesh(shapely.box(0, 0, 20, 10), 0.8)
    frame = frame_of(mesh, 1.0, (lambda x, y: 0.9 + 0.04 * y, lambda x, y: 0.2 * np.sin(x / 2)), stored_on="node")
    spots = rng.uniform([3, 1], [16, 9], (5, 2))
    rests = tuple(place(f"P{i}", x, y, x + 0.8, y + 0.8) for i, (x, y) in enumerate(spots))
    both = ends(20, 10, start=18.5, goal=1.5)
    search = prepare(frame, fish(rest=NO_REST), Places(both.start, both.goal, rests), COARSE)
    label = search.areas.labels(search.water.routes)
    legs = np.full((7, 7), np.inf)
    for area in range(7):
        entry, cost, _ = route.legs_from(
            search.water.routes.net, search.water.points, search.water.drops, search.fish.swimmer(COARSE), label, 7,
            np.flatnonzero(label == area).astype(np.int32), area, -1, np.inf, False,
        )
        legs[area, entry >= 0] = cost[entry[entry >= 0], 0]
    chains = (
        [0, *order, 1] for k in range(6) for chosen in itertools.combinations(range(2, 7), k)
        for order in itertools.permutations(chosen)
    )
    least = min(max(legs[a, b] for a, b in itertools.pairwise(chain)) for chain in chains)
    assert least < legs[0, 1]
    assert search.least_worst() == pytest.approx(least, rel=1e-12)


def _slot(speed: float, one):
    """Slack water, and 1 m of slot from x = 9.5 to 10.5 with this speed (m/s), which rises and falls over 0.1 m."""
    mesh = channel(200, 4, 20, 2)
    u = np.where(np.abs(mesh.node_xy[:, 0] - 10) < 0.55, speed, 0.05)
    return prepare(frame_of(mesh, 1.0, (u, 0.0), stored_on="node"), one, ends(20, 2, start=15, goal=5), COARSE)


def test_a_slot_is_barred_from_the_discharge_at_which_its_speed_meets_the_highest_of_the_data():
    """Slot 2 m wide and 1 m deep: the sprint data end at 12 body lengths a second, 4.8 m/s, so at 9.6 m3/s."""
    strong = fish(sprint={"a": 12.0, "b": -0.45, "lowest": 1.0, "highest": 12.0, "source": "made up"})
    limit = 4.8 * 2.0 * 1.0
    assert _slot((limit - 0.05) / 2.0, strong).least_worst(bound=1.0) < 1.0
    barred = _slot((limit + 0.05) / 2.0, strong)
    assert barred.least_worst() == math.inf
    assert barred.best_chain() is None
    assert barred.best_chain(relaxed=True).worst > 1.0


def test_a_slot_exhausts_the_fish_at_the_discharge_of_the_closed_form():
    """1.0 m of slot at one speed, with a rise and a fall of 0.1 m each that count as their share of exp(-b u):
    integral of |b| exp(1 - a - b u) along them. Solved for fatigue 1 by bisection; 1 % either side decides."""
    a, b = 5.0, -0.45 / 0.4
    one = fish(prolonged=None, sustained=1.0)

    def fatigue(u):
        ramp = abs(b) * math.exp(1 - a) * (math.exp(-b * u) - math.exp(-b * 0.4)) / (-b) / (u - 0.05) * 0.1
        return abs(b) * math.exp(1 - a - b * u) * 1.0 + 2 * ramp

    low, high = 1.0, 3.9
    for _ in range(60):
        low, high = ((low + high) / 2, high) if fatigue((low + high) / 2) < 1 else (low, (low + high) / 2)
    assert low + -1 / b < 4.8  # the best ground speed is within the data
    assert _slot(0.99 * low, one).least_worst() < 1.0 < _slot(1.01 * low, one).least_worst()


def test_water_shallower_than_the_least_depth_bars_the_way():
    mesh = channel(40, 4, 20, 2)
    for depth, finds in ((0.19, False), (0.21, True)):
        depths = np.where(np.abs(mesh.node_xy[:, 0] - 10) < 0.6, depth, 1.0)
        frame = frame_of(mesh, depths, (0.05, 0.0), bed=-depths, stored_on="node")
        search = prepare(frame, fish(), ends(20, 2, start=15, goal=5), COARSE)
        assert math.isfinite(search.least_worst()) is finds


@pytest.mark.parametrize(("fall", "finds"), [(0.24, True), (0.26, False)])
def test_a_drop_over_three_body_lengths_bars_the_way_up_and_not_down(fall, finds):
    """Greatest drop 0.25 m; the level falls over 0.5 m, less than three body lengths of 0.4 m."""
    mesh = channel(80, 4, 20, 2)
    bed = np.interp(mesh.node_xy[:, 0], [10.0, 10.5], [fall, 0.0])
    frame = frame_of(mesh, 1.0, (0.05, 0.0), bed=bed, stored_on="node")
    assert math.isfinite(prepare(frame, fish(), ends(20, 2, start=15, goal=5), COARSE).least_worst()) is finds
    down = Places(place("start", 0, 0, 5, 2), place("goal", 15, 0, 20, 2))
    assert math.isfinite(prepare(frame, fish(), down, COARSE).least_worst())


def test_a_declared_sill_counts_the_levels_a_whole_window_either_side():
    """The level falls 0.3 m over 2 m: over three body lengths (1.2 m) only 0.18 m, but over the sill's 2.4 m all of it."""
    mesh = channel(80, 4, 20, 2)
    frame = frame_of(mesh, 1.0, (0.05, 0.0), bed=lambda x, y: np.interp(x, [9.0, 11.0], [0.3, 0.0]), stored_on="node")
    both = ends(20, 2, start=15, goal=5)
    sill = np.array([[10.1, -0.5], [10.1, 2.5]])
    assert math.isfinite(prepare(frame, fish(), both, COARSE).least_worst())
    assert prepare(frame, fish(), both, COARSE, sills=(sill,)).least_worst() == math.inf


def test_a_linear_rise_of_speed_costs_its_integral_to_fourth_order():
    """Closed form: integral of |b| exp(1 - a - b u) over x, u linear in x. Two-point Gauss: halving the cells divides
    the error by 16 (at least 12 is asked)."""
    a, b = 8.5, -3.0
    errors = []
    for nx in (10, 20):
        mesh = channel(nx, 2, 10, 2)
        frame = frame_of(mesh, 1.0, (lambda x, y: 0.5 + 0.08 * x, 0.0), stored_on="node")
        found = prepare(frame, fish(sprint=None, rest=NO_REST), ends(10, 2, start=8, goal=2), Settings({"passage_points_per_side": 0})).least_worst()
        exact = abs(b) * math.exp(1 - a) * (math.exp(-b * 1.14) - math.exp(-b * 0.66)) / (-b * 0.08)
        errors.append(abs(found - exact))
    assert errors[0] / errors[1] > 12
