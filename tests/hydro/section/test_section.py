"""Sections carry the discharge that closed forms and the law of continuity say they must."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, special

from hydro.reach import CentreLine
from hydro.section import cut, section_figures, shares, velocity_area
from hydro.streamfunction import stream_function
from tests.builders import channel, frame_of, with_hole

EAST = CentreLine(np.array([[0.0, 0.0], [100.0, 0.0]]))


def _channel(nx=40, ny=60):
    return channel(nx, ny, 100, 60, corner=(0, -30))


@pytest.mark.parametrize(
    "line", [[(50, 30), (50, -30)], [(30, 30), (60, -30)], [(50, 30), (70, 10), (55, 5), (50, -30)], [(50, -30), (50, 30)]]
)
def test_any_line_from_bank_to_bank_in_uniform_flow_carries_one_discharge(line):
    """Source: continuity; q = 3 m2/s over 60 m is 180 m3/s whatever the line. Tolerance: round-off."""
    section = cut(frame_of(_channel(), 1.5, (2.0, 0.0)), line, centre_line=EAST)
    assert section_figures(section).discharge_m3_s == pytest.approx(180.0, rel=1e-12)


def test_an_oblique_section_in_uniform_flow_carries_sixty():
    """Source: algebra: q = (3, 0) across the segment (0,0) to (10,20) of length 22.3607 m carries 60 m3/s."""
    section = cut(frame_of(_channel(), 1.5, (2.0, 0.0)), [(10, 20), (0.0, 0.0)])
    assert section.length == pytest.approx(22.3607, abs=1e-4)
    assert section_figures(section).discharge_m3_s == pytest.approx(60.0, rel=1e-12)


def test_reversed_flow_stays_negative_when_the_centre_line_decides():
    section = cut(frame_of(_channel(), 1.5, (-2.0, 0.0)), [(50, -30), (50, 30)], centre_line=EAST)
    assert section.turned and section.points[0, 1] == 30
    assert section_figures(section).discharge_m3_s == pytest.approx(-180.0)


def test_a_parabolic_bed_carries_the_closed_form_with_second_order():
    """Source: h = 3 (1 - s^2), s = 2y/60, u = 2 (h/3)^(2/3): Q = 2*3*30*Beta(1/2, 8/3) = 204.694 m3/s.

    The error falls with the square of the width of a cell (linear fields), so halving it must cut
    the error by three at least.
    """
    exact = 2 * 3 * 30 * special.beta(0.5, 8 / 3)
    assert exact == pytest.approx(204.69438, abs=1e-5)

    def error(ny):
        depth = lambda x, y: 3 * (1 - (2 * y / 60) ** 2)  # noqa: E731
        frame = frame_of(
            channel(10, ny, 100, 60, corner=(0, -30)), depth, (lambda x, y: 2 * (depth(x, y) / 3) ** (2 / 3), 0.0),
            stored_on="node", wet_depth_m=0.0,
        )
        return abs(section_figures(cut(frame, [(45, 30), (45, -30)])).discharge_m3_s - exact)

    coarse, fine = error(20), error(40)
    assert fine < coarse / 3 and fine < 0.002 * exact


def test_hydraulic_figures_of_a_rectangular_canal():
    """Source: definitions (Chow 1959): b 60 m, h 2 m, v 1.5 m/s: A 120, T 60, Fr = v / sqrt(g h)."""
    figures = section_figures(cut(frame_of(_channel(), 2.0, (1.5, 0.0), bed=10.0), [(50, 30), (50, -30)]))
    assert figures.area_m2 == pytest.approx(120) and figures.width_m == pytest.approx(60)
    assert figures.froude == pytest.approx(1.5 / np.sqrt(9.81 * 2.0))
    assert figures.alpha == pytest.approx(1) and figures.beta == pytest.approx(1)
    assert figures.head_m == pytest.approx(12 + 1.5**2 / (2 * 9.81))
    assert figures.mean_level_m == pytest.approx(12)


def test_alpha_and_beta_of_a_linear_velocity_distribution():
    """Source: calculus: v = y/60 + 1/2 over a rectangle from y = -30 to 30: alpha and beta by quadrature."""
    frame = frame_of(_channel(), 2.0, (lambda x, y: 0.5 + y / 60, 0.0), stored_on="node")
    figures = section_figures(cut(frame, [(50, 30), (50, -30)]))
    v = lambda y: 0.5 + y / 60  # noqa: E731
    mean = integrate.quad(v, -30, 30)[0] / 60
    expected = integrate.quad(lambda y: v(y) ** 3, -30, 30)[0] / 60 / mean**3
    assert figures.alpha == pytest.approx(expected, rel=1e-9)
    assert figures.beta == pytest.approx(integrate.quad(lambda y: v(y) ** 2, -30, 30)[0] / 60 / mean**2, rel=1e-9)


def test_discharge_by_psi_equals_the_field_in_a_conserving_flow():
    frame = frame_of(_channel(), 1.5, (2.0, 0.0))
    section = cut(frame, [(50, 30), (55, -30)])
    figures = section_figures(section, sf=stream_function(frame))
    assert figures.discharge_psi_m3_s == pytest.approx(180.0, rel=1e-9)


def test_a_section_across_a_pier_skips_it_and_still_has_all_the_water_by_psi():
    frame = frame_of(with_hole(), 1.0, (1.0, 0.0))
    figures = section_figures(cut(frame, [(20, 24), (20, 0)]), sf=stream_function(frame))
    assert figures.width_m == pytest.approx(20, abs=0.05)
    assert figures.discharge_psi_m3_s == pytest.approx(24.0, rel=0.02)


def test_velocity_area_worked_example():
    """Source: the rules of ISO 748 (wording from memory) applied by hand to nine verticals: 16.782 and 16.2248 m3/s."""
    b = np.array([0, 2, 4, 7, 10, 13, 16, 18, 20.0])
    d = np.array([0, 0.6, 1.1, 1.7, 2.0, 1.8, 1.2, 0.7, 0])
    v = np.array([0, 0.25, 0.48, 0.72, 0.85, 0.80, 0.55, 0.30, 0])
    mid, mean = velocity_area(b, d, v)
    assert mid == pytest.approx(16.782, abs=5e-4) and mean == pytest.approx(16.2248, abs=5e-5)


def test_both_velocity_area_rules_converge_to_the_integral():
    """Source: calculus; the parabolic channel above. Each halving of the spacing must bring both nearer."""
    exact = 2 * 3 * 30 * special.beta(0.5, 8 / 3)
    errors = []
    for n in (20, 40, 80, 160):
        y = np.linspace(-30, 30, n + 1)
        h = 3 * (1 - (y / 30) ** 2)
        errors.append([abs(q - exact) for q in velocity_area(y, h, 2 * (h / 3) ** (2 / 3))])
    errors = np.array(errors)
    assert (errors[1:] < errors[:-1] / 2.5).all() and errors[-1].max() < 1e-3 * exact


def test_both_rules_on_a_sections_own_verticals_converge_to_the_integral():
    """Source: calculus; the parabolic channel above through meshes of half the cell each time.

    The verticals are where the line crosses sides of triangles, so each halving brings both rules nearer.
    """
    exact = 2 * 3 * 30 * special.beta(0.5, 8 / 3)
    depth = lambda x, y: 3 * (1 - (2 * y / 60) ** 2)  # noqa: E731
    errors = []
    for ny in (15, 30, 60, 120):
        frame = frame_of(
            channel(10, ny, 100, 60, corner=(0, -30)), depth, (lambda x, y: 2 * (depth(x, y) / 3) ** (2 / 3), 0.0),
            stored_on="node", wet_depth_m=0.0,
        )
        f = section_figures(cut(frame, [(47, 31), (43, -31)]))
        errors.append([abs(q - exact) for q in (f.discharge_mid_section_m3_s, f.discharge_mean_section_m3_s)])
    errors = np.array(errors)
    assert (errors[1:] < errors[:-1] / 2).all() and errors[-1].max() < 1e-3 * exact


SHEARED = [
    [(30, 25), (60, -25)], [(30, 25), (80, 20), (60, -25)], [(30, 25), (35, 0), (20, -10), (60, -25)],
    [(30, 25), (70, 5), (30, 5), (70, -8), (60, -25)],
]


@pytest.mark.parametrize("line", SHEARED, ids=["oblique", "one bend", "two bends", "there and back"])
@pytest.mark.parametrize("stored_on", ["node", "face"])
def test_oblique_and_broken_sections_between_two_points_carry_the_difference_of_psi(line, stored_on):
    """Source: continuity: psi(A) - psi(B) for psi = 3 y + 4 sin(x/20) cos(pi y/60), whichever way the line takes.

    Tolerance 0.5 %: fields of cells of 1 m against waves of 60 m; halving the cells must not be needed for it.
    """
    psi = lambda x, y: 3 * y + 4 * np.sin(x / 20) * np.cos(np.pi * y / 60)  # noqa: E731
    u = lambda x, y: 3 - 4 * np.pi / 60 * np.sin(x / 20) * np.sin(np.pi * y / 60)  # noqa: E731
    v = lambda x, y: -4 / 20 * np.cos(x / 20) * np.cos(np.pi * y / 60)  # noqa: E731
    frame = frame_of(_channel(100, 60), 1.0, (u, v), stored_on=stored_on)
    carried = section_figures(cut(frame, line)).discharge_m3_s
    assert carried == pytest.approx(psi(*line[0]) - psi(*line[-1]), rel=0.005)


def test_shares_of_discharge_follow_the_width_in_uniform_flow():
    section = cut(frame_of(_channel(), 1.5, (2.0, 0.0)), [(50, 30), (50, -30)])
    np.testing.assert_allclose(shares(section, np.array([0, 15, 45, 60])), [0.25, 0.5, 0.25], atol=1e-12)


def test_chainage_and_offset_go_there_and_back_within_a_millimetre():
    line = CentreLine(np.array([[0, 0], [40, 5], [80, 30], [100, 80.0]]))
    rng = np.random.default_rng(0)
    s, n = rng.uniform(5, 30, 200), rng.uniform(-8, 8, 200)
    back = line.locate(line.at(s, n))
    np.testing.assert_allclose(back, [s, n], atol=1e-3)


def test_places_beside_a_curved_line_come_back_within_a_millimetre():
    """A circle of 200 m radius in chords of 2 degrees: offsets well within the radius have one nearest point."""
    turn = np.radians(np.arange(0, 91, 2))
    line = CentreLine(200 * np.column_stack([np.sin(turn), np.cos(turn)]))
    rng = np.random.default_rng(1)
    s, n = rng.uniform(1, line.length - 1, 500), rng.uniform(-60, 60, 500)
    places = line.at(s, n)
    again = line.at(*line.locate(places))
    assert np.hypot(*(again - places).T).max() < 1e-3


@pytest.mark.parametrize(("points", "says"), [([(1, 1)], "two different points"), ([(900, 0), (900, 9)], "does not meet the mesh")])
def test_a_line_that_is_no_section_says_so(points, says):
    with pytest.raises(ValueError, match=says):
        cut(frame_of(_channel(), 1.0, (1.0, 0.0)), points)
