"""Heading-dependent routing against Zermelo's problem in linear shear.

Source: Bryson & Ho 1975, Applied Optimal Control, section 2.7, example 2 (the numbers from memory, recomputed from
its closed form): current u = -y, swimming speed 1, from (3.658658, -1.863703) to the origin; the heading turns
from 105 to 240 degrees and the crossing takes 5.464102.
"""

from __future__ import annotations

import functools

import numpy as np
import pytest
import shapely
from scipy.spatial import Delaunay

from hydro.mesh import build_mesh
from hydro.passage.areas import Places
from hydro.passage.fish import Fish
from hydro.passage.legs import prepare
from hydro.reach import NamedLine
from hydro.settings import Settings
from tests.builders import frame_of

FROM, TO, LEAST = np.array([3.658658, -1.863703]), np.array([0.0, 0.0]), 5.464102
SPECK = 1e-4  # m; start and goal are triangles of this size, so that their own size does not count


@functools.cache
def _crossing(cells: int):
    """Chain and net on triangles of 2/cells m."""
    rng = np.random.default_rng(2)
    x, y = np.linspace(-3, 5.5, int(4.25 * cells) + 1), np.linspace(-3, 1.5, int(2.25 * cells) + 1)
    grid = np.stack(np.meshgrid(x, y), axis=-1).reshape(-1, 2)
    inner = (np.abs(grid - [1.25, -0.75]) < [4.2, 2.2]).all(axis=1)
    grid[inner] += rng.uniform(-0.25, 0.25, (inner.sum(), 2)) * (x[1] - x[0])
    angle = np.array([0.3, 2.4, 4.5])
    speck = SPECK * np.column_stack([np.cos(angle), np.sin(angle)])
    points = np.vstack([grid, FROM + speck, TO + speck])
    mesh = build_mesh(points, Delaunay(points).simplices, origin=(0.0, 0.0))
    frame = frame_of(mesh, 1.0, (lambda x, y: -y, 0.0), stored_on="node")
    swimmer = Fish("swims at 1 m/s", 0.4, 1.0, None, None, 0.1, 1.0, 0.0, 0.5)
    settings = Settings(
        {"passage_time_weight": 1e-3, "passage_direction_error": 1e-4, "passage_points_per_side": 7}
    )
    places = Places(*(NamedLine(n, n, shapely.Point(p)) for n, p in (("start", FROM), ("goal", TO))))
    return prepare(frame, swimmer, places, settings).best_chain()


def test_the_crossing_takes_the_least_time_and_nears_it_as_the_mesh_is_refined():
    """Tolerances: 1 % on triangles of 0.5 m, 0.4 % on 0.125 m. A route on a net can only take longer than the least."""
    coarse, fine = (_crossing(cells).seconds for cells in (4, 16))
    assert LEAST - 3 * SPECK < fine < coarse
    assert coarse < 1.01 * LEAST
    assert fine < 1.004 * LEAST


def test_the_swimmers_heading_turns_from_105_to_240_degrees():
    """Tolerance: 12 degrees, over the first and the last tenth of the way, in which it turns by up to 10."""
    path = _crossing(16).legs[0].path
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(path, axis=0).T))])
    place = np.column_stack([np.interp(np.array([0.0, 0.05, 0.95, 1.0]) * along[-1], along, path[:, k]) for k in (0, 1)])
    for (a, b), expected in (((0, 1), 105.0), ((2, 3), 240.0)):
        step = place[b] - place[a]
        e = step / np.hypot(*step)
        u = np.array([-(place[a] + place[b])[1] / 2, 0.0])
        g = u @ e + np.sqrt(1 - (u[0] * e[1] - u[1] * e[0]) ** 2)
        swim = g * e - u
        assert np.degrees(np.arctan2(swim[1], swim[0])) % 360 == pytest.approx(expected, abs=12)
