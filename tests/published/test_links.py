"""Links and single sources as jumps of psi, against closed forms of a source and a sink in a stream.

Source: Rankine's oval and half-body, e.g. Milne-Thomson, Theoretical Hydrodynamics, 1968 (from memory): u = U + sum of
m/(2 pi) r/|r|^2; with m = 2 pi U a the oval is sqrt(3) a long and 1.306542 a wide from its middle; the half-body of
a source m is m/(4 U) wide abreast of it.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely
from scipy.optimize import brentq

from hydro.contours import psi_lines
from hydro.reach import Structure
from hydro.section import cut, section_figures
from hydro.streamfunction import stream_function
from hydro.tracks import streamlines
from hydro.transfer import barycentric
from tests import builders

A, U = 1.0, 1.0
M = 2 * np.pi * U * A
PAIR = Structure("k", "Culvert", "culvert", "link", shapely.LineString([(A, 0), (-A, 0)]), discharge_variable="pair")
ALONE = Structure("s", "Outfall", "culvert", "link", shapely.LineString([(-30, 0), (0, 0)]), discharge_variable="alone")


def stream(*sources: tuple[float, float]):
    """Velocity of a uniform stream U with sources (x, strength) on the axis, unit depth."""
    def velocity(x, y):
        u, v = np.full_like(x, U), np.zeros_like(x)
        for at, strength in sources:
            r2 = np.maximum((x - at) ** 2 + y**2, 1e-4)
            u, v = u + strength / (2 * np.pi) * (x - at) / r2, v + strength / (2 * np.pi) * y / r2
        return u, v

    return velocity


def solved(size: float, velocity, series: dict[str, float], *links: Structure):
    fine = [(shapely.box(-2.2, -1.7, 2.2, 1.7), size / 5)]
    mesh = builders.free_mesh(shapely.box(-6, -5, 6, 5), size, finer=fine)
    frame = replace(builders.frame_of(mesh, 1.0, velocity), series=series)
    return stream_function(frame, structures=links, boundary_sets=builders.sides(mesh))


def psi_at(sf, points) -> np.ndarray:
    points = np.atleast_2d(points)
    t = sf.frame.mesh.find(points)
    return (barycentric(sf.frame.mesh.node_xy, sf.frame.mesh.triangles[t], points) * sf.corners(t)).sum(axis=1)


def half_width(sf, x: float, level: float) -> float:
    return float(brentq(lambda y: psi_at(sf, [(x, y)])[0] - level, 0.2, 4.5))


def test_the_dividing_streamline_of_a_source_and_a_sink_is_rankines_oval():
    """Error of the half-width falls with the mesh: within 2 % at half a metre, 0.3 % at a quarter."""
    for size, tolerance in ((0.5, 0.02), (0.25, 0.003)):
        sf = solved(size, stream((-A, M), (A, -M)), {"pair": M}, PAIR)
        axis = psi_at(sf, [(-5.0, 0.0)])[0]
        assert half_width(sf, 0.0, axis) == pytest.approx(1.306542 * A, rel=tolerance)
        # Near the nose, where the oval is 0.3 wide: its length from the closed form psi = U y + m/(2 pi)(angle difference).
        nose = brentq(lambda x: U * 0.3 + M / (2 * np.pi) * (np.arctan2(0.3, x + A) - np.arctan2(0.3, x - A)), -1.8, -1.2)
        outline = [line for line in psi_lines(sf, axis) if (line[:, 1] > 0.25).any()]
        upper = np.vstack(outline)
        near = upper[(np.abs(upper[:, 1] - 0.3) < 0.1) & (upper[:, 0] < 0)]
        assert np.interp(0.3, *near[near[:, 1].argsort()].T[::-1]) == pytest.approx(nose, abs=0.1 * size)
    assert abs(nose) < np.sqrt(3) * A


def test_the_link_halves_the_misfit_again_and_again_where_without_it_none_falls():
    """A pair of sources is no part of any stream function of one value: without the link the misfit stays as it is."""
    with_link = [solved(s, stream((-A, M), (A, -M)), {"pair": M}, PAIR).misfit.total for s in (0.5, 0.25)]
    without = [solved(s, stream((-A, M), (A, -M)), {}).misfit.total for s in (0.5, 0.25)]
    assert with_link[1] < 0.75 * with_link[0]
    assert without[1] > 0.95 * without[0]


def test_psi_jumps_by_the_links_discharge_and_sections_by_psi_keep_the_fields():
    sf = solved(0.25, stream((-A, M), (A, -M)), {"pair": M}, PAIR)
    above, below = psi_at(sf, [(0.0, 0.3), (0.0, -0.3)])
    field = 0.6 * U + 2 * M / np.pi * np.arctan(0.3 / A)  # integral of u between them: U + m/pi a/(a^2 + y^2)
    assert above - below + M == pytest.approx(field, abs=0.01 * M)
    section = cut(sf.frame, np.array([[0.0, 4.9], [0.0, -4.9]]))
    figures = section_figures(section, sf=sf)
    assert figures.discharge_psi_m3_s == pytest.approx(figures.discharge_m3_s, rel=1e-3)


def test_a_single_source_joined_to_the_inflow_makes_rankines_half_body():
    sf = solved(0.25, stream((0.0, M)), {"alone": M}, ALONE)
    assert sf.links_left_out == ()
    at = np.array([-3.0, 1.0])  # psi = U y - m/(2 pi) (pi - angle) is 0 on the body
    body = psi_at(sf, at)[0] - (U * at[1] - M / (2 * np.pi) * (np.pi - np.arctan2(at[1], at[0])))
    assert half_width(sf, 0.0, body) == pytest.approx(M / (4 * U), rel=0.01)


def test_a_streamline_from_the_source_ends_in_the_sink_or_round_it_and_none_stops_at_the_path():
    sf = solved(0.25, stream((-A, M), (A, -M)), {"pair": M}, PAIR)
    outer = streamlines(sf, [(-4.0, 2.0), (-4.0, -2.0)], direction="down").tracks
    assert [t.ended for t in outer] == ["left", "left"]
    inner = streamlines(sf, [(-0.5, 0.4)], direction="down").tracks[0]
    assert np.hypot(*(inner.xy - [A, 0]).T).min() < 0.1  # it finds the sink
    crossing = streamlines(sf, [(0.0, 0.4)], direction="up").tracks[0]
    assert np.hypot(*(crossing.xy - [-A, 0]).T).min() < 0.1


def test_a_link_that_ends_on_dry_ground_is_named_and_left_out():
    mesh = builders.channel(40, 20, 40.0, 20.0)
    frame = builders.frame_of(mesh, lambda x, y: np.maximum(y - 10, 0.0), (1.0, 0.0))
    link = Structure("k", "High culvert", "culvert", "link", shapely.LineString([(5, 2), (30, 2)]), discharge_variable="q")
    sf = stream_function(replace(frame, series={"q": 1.0}), structures=(link,))
    assert sf.links == () and sf.links_left_out == ("High culvert",)
