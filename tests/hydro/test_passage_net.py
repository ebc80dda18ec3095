"""The compiled search against a general-purpose shortest-path library, and the queue under it against heapq."""

from __future__ import annotations

import heapq

import numpy as np
import pytest
import shapely
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import dijkstra

from hydro._kernels import queue, route
from hydro.passage.legs import prepare
from hydro.passage.water import make_routes
from hydro.settings import Settings
from tests.builders import frame_of, free_mesh
from tests.passage_cases import ends, fish


def test_the_queue_gives_items_in_the_order_of_heapq_also_when_they_move_up():
    rng = np.random.default_rng(5)
    n = 200
    heap, place, key = np.empty(n, np.int32), np.full(n, -1, np.int32), np.full(n, np.inf)
    size = np.zeros(1, np.int64)
    for item in rng.permutation(n):
        queue.push(item, rng.integers(0, 50) + 0.5, heap, place, key, size)
    for item in rng.integers(0, n, 80):
        queue.push(item, key[item] - rng.integers(0, 5), heap, place, key, size)
    expected = [(key[i], i) for i in range(n)]
    heapq.heapify(expected)
    taken = [queue.pop(heap, place, key, size) for _ in range(n)]
    assert taken == [heapq.heappop(expected)[1] for _ in range(n)]
    assert size[0] == 0


def _search(per_side: int):
    """A bend of flow with a slow side, as wide as a route may wander."""
    mesh = free_mesh(shapely.box(0, 0, 12, 6), 0.8)
    frame = frame_of(mesh, lambda x, y: 0.5 + 0.05 * y, (lambda x, y: 0.5 + 0.15 * y, lambda x, y: 0.3 * np.sin(x)), stored_on="node")
    settings = Settings({"passage_points_per_side": per_side, "passage_time_weight": 1e-6})
    return prepare(frame, fish(rest={"speed_m_s": 0.0, "depth_m": 9.0}), ends(12, 6, start=11, goal=1), settings)


def _all_links(search) -> coo_matrix:
    """Every link with its weight, written out one by one."""
    routes, water = search.water.routes, search.water
    swimmer = search.fish.swimmer(search.settings)
    to, within = np.empty(400, np.int32), np.empty(400, np.int32)
    rows, columns, weights = [], [], []
    for p in range(routes.n_points):
        count = route.links_of(p, routes.net, len(routes.nodes), to, within)
        assert len(set(to[:count])) == count
        for q, t in zip(to[:count], within[:count]):
            fatigue, seconds = route.link(np.int32(p), q, t, water.points, water.drops, swimmer, False, np.inf)
            if np.isfinite(fatigue):
                rows.append(p), columns.append(q), weights.append(fatigue + 1e-6 * seconds)
    return coo_matrix((weights, (rows, columns)), shape=(routes.n_points,) * 2)


@pytest.mark.parametrize("per_side", [0, 1, 3])
def test_the_least_leg_is_what_scipy_finds_on_the_same_links(per_side):
    """Second method: scipy.sparse.csgraph.dijkstra over every link written out. Tolerance: round-off of sums."""
    search = _search(per_side)
    label = search.areas.labels(search.water.routes)
    far = dijkstra(_all_links(search).tocsr(), indices=np.flatnonzero(label == 0), min_only=True)
    swimmer = search.fish.swimmer(search.settings)
    sources = np.flatnonzero(label == 0).astype(np.int32)
    entry, cost, _ = route.legs_from(
        search.water.routes.net, search.water.points, search.water.drops, swimmer, label, 2, sources, 0, 1, np.inf, False
    )
    least = far[label == 1].min()
    assert cost[entry[1]] @ [1, 1e-6] == pytest.approx(least, rel=1e-12)
    assert search.least_worst() == pytest.approx(cost[entry[1], 0], rel=1e-12)


def test_links_join_the_same_points_both_ways_and_lie_in_the_named_triangle():
    routes = make_routes(free_mesh(shapely.box(0, 0, 5, 3), 0.9), 2)
    points = routes.triangle_points()
    to, within = np.empty(400, np.int32), np.empty(400, np.int32)
    pairs = set()
    for p in range(routes.n_points):
        count = route.links_of(p, routes.net, len(routes.nodes), to, within)
        for q, t in zip(to[:count], within[:count]):
            pairs.add((p, int(q)))
            assert p in points[t] and q in points[t]
    assert pairs == {(q, p) for p, q in pairs}
