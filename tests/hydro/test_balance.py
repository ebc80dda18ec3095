"""The water balance against fields whose sources are known."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely

from hydro.balance import Gauges, balance_of, compact_sources
from hydro.reach import CentreLine, Structure
from hydro.streamfunction import stream_function
from tests import builders

AXIS = CentreLine(np.array([[-6.0, 0.0], [6.0, 0.0]]))


def with_source(strength: float, at: tuple[float, float], radius: float = 0.4):
    """A stream of 1 m/s with a source (m2/s) spread evenly over a disc: outside it m/(2 pi r), inside linear in r."""
    def velocity(x, y):
        dx, dy = x - at[0], y - at[1]
        r2 = np.maximum(dx * dx + dy * dy, radius**2)
        return 1 + strength / (2 * np.pi) * dx / r2, strength / (2 * np.pi) * dy / r2

    return velocity


def solved(velocity, series=None, *links):
    mesh = builders.free_mesh(shapely.box(-6, -5, 6, 5), 0.25)
    frame = replace(builders.frame_of(mesh, 1.0, velocity), series=series or {})
    return stream_function(frame, structures=links, boundary_sets=builders.sides(mesh), centre_line=AXIS)


def test_a_planted_source_is_found_at_its_place_with_its_discharge():
    """Source: continuity: the flux out of any curve round the disc is its strength."""
    sf = solved(with_source(2.0, (1.5, -1.0)))
    (found,) = compact_sources(sf, None, AXIS)
    assert found.discharge_m3_s == pytest.approx(2.0, rel=0.05)
    assert np.hypot(found.at[0] - 1.5, found.at[1] + 1.0) < 0.5
    assert found.chainage_m == pytest.approx(6 + found.at[0]) and found.offset_m == pytest.approx(found.at[1])


def test_a_sink_counts_negative_and_a_stream_without_either_has_none():
    (found,) = compact_sources(solved(with_source(-2.0, (0.0, 1.0))))
    assert found.discharge_m3_s == pytest.approx(-2.0, rel=0.05)
    assert compact_sources(solved(with_source(0.0, (0.0, 0.0)))) == ()


def test_a_declared_link_is_no_undeclared_source():
    link = Structure("k", "Pipe", "culvert", "link", shapely.LineString([(1.5, -1.0), (-2.0, 1.0)]), discharge_variable="q")

    def both(x, y):
        u, v = with_source(-2.0, (1.5, -1.0))(x, y)
        more_u, more_v = with_source(2.0, (-2.0, 1.0))(x, y)
        return u + more_u - 1, v + more_v

    assert len(compact_sources(solved(both))) == 2
    assert compact_sources(solved(both, {"q": 2.0}, link)) == ()


def test_sections_of_a_river_that_fills_evenly_differ_by_nothing_that_is_not_stored():
    """Source: continuity: with q = q0 - r x the level rises by r everywhere; inflow minus storage is due at each section."""
    mesh, rise = builders.channel(60, 20, 60.0, 20.0), 0.01
    frame = builders.frame_of(mesh, 2.0, (lambda x, y: (3.0 - rise * x) / 2.0, 0.0))
    axis = CentreLine(np.array([[0.0, 10.0], [60.0, 10.0]]))
    rate = np.full(mesh.n_faces, rise)
    sf = stream_function(frame, depth_rate=rate, centre_line=axis)
    gauges = Gauges(frame, axis, 5.0)
    assert gauges.discharge(frame) == pytest.approx(20 * (3.0 - rise * gauges.chainage), abs=20 * rise)  # to one face
    with_storage = balance_of(sf, gauges, rate).step
    without = balance_of(sf, gauges, None).step
    assert with_storage is not None and without is not None
    assert with_storage.share < 0.005
    assert without.difference_m3_s == pytest.approx(-5.0 * 20 * rise, rel=0.25)


def test_single_moments_of_an_unsteady_run_are_not_searched_for_sources():
    assert balance_of(solved(with_source(2.0, (0.0, 0.0))), None, None, moment=True).sources is None
