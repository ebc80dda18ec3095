"""Recirculation zones against closed forms."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from scipy.integrate import quad

from hydro.eddies import find_zones
from hydro.streamfunction import stream_function
from tests import builders
from tests.published.flows import chaplygin_psi


def dipole(size: float):
    mesh = builders.free_mesh(shapely.box(-25, -20, 25, 20), size)
    frame = builders.frame_of(mesh, 2.0, builders.flow_of_psi(chaplygin_psi()))
    return find_zones(stream_function(frame, boundary_sets=builders.sides(mesh)))


def test_lamb_chaplygin_dipole():
    """Lamb 1895 and Chaplygin 1903, stream 1 m/s, radius 10 m, depth 2 m (numbers derived from the Bessel functions).

    The bubble is a circle: two half discs of 157.08 m2, 20 m long, centres at (0, +-4.80513), psi there
    -+7.54075 m3/s a metre of depth, reverse speed on the axis 2.482872 m/s. At 40 cells a diameter 2 % are allowed
    for areas and 1 % for the rest: second-order elements, first-order outline.
    """
    zones = dipole(0.5).zones
    upper = max(zones, key=lambda z: z.centre[1])
    lower = min(zones, key=lambda z: z.centre[1])
    assert upper.rotation == "clockwise", "the stream drags the outside of the upper eddy to the right"
    for zone, sign in ((upper, 1), (lower, -1)):
        assert zone.area_m2 == pytest.approx(np.pi * 50, rel=0.02)
        assert zone.volume_m3 == pytest.approx(np.pi * 100, rel=0.02)
        assert zone.length_m == pytest.approx(20.0, rel=0.02)
        assert zone.width_m == pytest.approx(10.0, rel=0.02)
        assert zone.centre == pytest.approx((0.0, sign * 4.80513), abs=0.05)
        assert zone.recirculating_discharge_m3_s == pytest.approx(2 * 7.54075, rel=0.01)
        assert zone.rotation_time_s == pytest.approx(np.pi * 50 / 7.54075, rel=0.03)
        assert zone.max_reverse_speed_m_s == pytest.approx(2.482872, rel=0.01)
        assert zone.kind == "free" and zone.separation is None


def test_dipole_figures_converge():
    """Triangles halved twice: centres within a twentieth of a triangle, the discharge's error falls with the mesh.

    The peak of the speed is only once differentiable at the rim and the meshes are not nested, so an order
    between one and two is expected.
    """
    errors = []
    for size in (2.0, 0.5):
        (a, b) = dipole(size).zones
        errors.append(abs((a.recirculating_discharge_m3_s + b.recirculating_discharge_m3_s) / 4 - 7.54075))
        for zone in (a, b):
            assert abs(abs(zone.centre[1]) - 4.80513) < 0.05 * size
    assert np.log(errors[0] / errors[1]) / np.log(4) > 1.0


@pytest.mark.parametrize(("name", "speed"), [
    ("Rankine", lambda r: np.where(r <= 4.0, 0.5 * r, 0.5 * 16.0 / np.maximum(r, 1e-12))),
    ("Lamb-Oseen", lambda r: 12 / (2 * np.pi * np.maximum(r, 1e-12)) * (1 - np.exp(-((r / 3.0) ** 2)))),
])
def test_vortex_in_a_round_basin(name, speed):
    """Rankine (core 4 m, 0.5 1/s) and Lamb-Oseen (12 m2/s, core 3 m) in a basin of radius 15 m, depth 1.5 m.

    The whole basin recirculates; the discharge is the integral of speed times depth over a radius (continuity).
    The basin has no open boundary, so a share of through-discharge does not exist.
    """
    mesh = builders.disc(15.0, 0.5)

    def velocity(x, y):
        r = np.hypot(x, y)
        return -speed(r) * y / np.maximum(r, 1e-12), speed(r) * x / np.maximum(r, 1e-12)

    sf = stream_function(builders.frame_of(mesh, 1.5, velocity))
    (zone,) = find_zones(sf).zones
    expected = 1.5 * quad(lambda r: float(speed(np.array(r))), 0, 15)[0]
    assert zone.recirculating_discharge_m3_s == pytest.approx(expected, rel=0.005)
    assert zone.rotation == "anticlockwise"
    assert zone.centre == pytest.approx((0, 0), abs=0.02)
    assert zone.area_m2 == pytest.approx(np.pi * 225, rel=0.002)
    assert zone.share_of_through_discharge is None and sf.through_discharge_m3_s == 0.0
    assert zone.psi_edge_m3_s == zone.psi_wall_m3_s == 0.0


def test_kovasznay_eddies_are_open_to_the_boundary():
    """Kovasznay 1948, Re = 40: psi = y - exp(lambda x) sin(2 pi y) / (2 pi).

    The model's edge at x = -0.5 cuts the eddies: where cos(2 pi y) = exp(lambda / 2) = 0.618, psi has extrema along the
    edge, two a period, four here. They are listed apart, as no zones.
    """
    lam = 20 - np.sqrt(400 + 4 * np.pi**2)
    psi = lambda x, y: y - np.exp(lam * x) * np.sin(2 * np.pi * y) / (2 * np.pi)  # noqa: E731
    mesh = builders.channel(60, 60, 1.5, 2.0, corner=(-0.5, -0.5))
    frame = builders.frame_of(mesh, 1.0, builders.flow_of_psi(psi))
    found = find_zones(stream_function(frame, boundary_sets=builders.sides(mesh)))
    assert found.zones == ()
    assert len(found.open_to_boundary) == 4
    assert {s.why for s in found.open_to_boundary} == {"open to the boundary"}


def test_simple_shear_is_no_eddy():
    """u = G y has vorticity everywhere and no closed streamline (definition): no zone, nothing under the floor."""
    mesh = builders.channel(30, 12)
    sf = stream_function(builders.frame_of(mesh, 1.0, (lambda x, y: 0.1 * y, 0.0)))
    found = find_zones(sf)
    assert found.zones == () and found.small == () and found.open_to_boundary == ()


@pytest.mark.parametrize("swing", [-0.25, -0.1, 0.0, 0.15, 0.25])
def test_the_two_areas_of_the_double_gyre_through_its_cycle(swing: float):
    """Source: Shadden, Lekien & Marsden 2005: psi = A sin(pi f) sin(pi y), f = e x^2 + (1 - 2 e) x with e = 0.25 sin(omega t).

    The line between the gyres stands where f = 1. Tolerance: the boundary comes from psi linear between nodes.
    """
    def psi(x, y):
        return 0.1 * np.sin(np.pi * (swing * x * x + (1 - 2 * swing) * x)) * np.sin(np.pi * y)

    mesh = builders.channel(80, 40, 2.0, 1.0)
    sf = stream_function(builders.frame_of(mesh, 1.0, builders.flow_of_psi(psi), stored_on="node"), boundary_sets={})
    between = 1.0 if swing == 0 else (-(1 - 2 * swing) + np.sqrt((1 - 2 * swing) ** 2 + 4 * swing)) / (2 * swing)
    zones = sorted(find_zones(sf).zones, key=lambda z: z.centre[0])
    assert [z.rotation for z in zones] == ["anticlockwise", "clockwise"]  # psi is higher on the left of the flow
    assert [z.area_m2 for z in zones] == pytest.approx([between, 2 - between], rel=0.02)
    assert [z.recirculating_discharge_m3_s for z in zones] == pytest.approx([0.1, 0.1], rel=0.01)
