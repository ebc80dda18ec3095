"""Travelling eddies against Lamb and Oseen's vortex carried by a stream.

Source: Lamb 1932, Hydrodynamics, art. 334a (from memory): round speed G/(2 pi r) (1 - exp(-r^2/a^2)). Added to a uniform
stream it solves the equations of an observer who moves with the stream.
"""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from hydro.eddies import find_zones
from hydro.eddies.travelling import swirl_cores, travelling_eddies
from hydro.streamfunction import stream_function
from tests import builders

GAMMA, A, U = 3.0, 1.0, np.array([1.0, 0.2])


@pytest.fixture(scope="module")
def mesh():
    return builders.free_mesh(shapely.box(-8, -6, 8, 6), 0.3)


def vortex(mesh, seconds: float, *, gamma: float = GAMMA, stream=U, stored_on: str = "node"):
    """A frame of the vortex that was at (-3, 0) at the start."""
    x0, y0 = np.array([-3.0, 0.0]) + np.asarray(stream) * seconds

    def velocity(x, y):
        r2 = np.maximum((x - x0) ** 2 + (y - y0) ** 2, 1e-12)
        f = gamma / (2 * np.pi * r2) * (1 - np.exp(-r2 / A**2))
        return stream[0] - f * (y - y0), stream[1] + f * (x - x0)

    return builders.frame_of(mesh, 2.0, velocity, stored_on=stored_on, seconds=seconds)


def solved(frame):
    return stream_function(frame, boundary_sets=builders.sides(frame.mesh))


def test_the_core_of_a_carried_vortex_its_drift_and_circulation_are_recovered(mesh):
    """Within a fifth of a triangle, 1 % of the stream, and 3 % of G (1 - exp(-r^2/a^2)) at the core's own radius."""
    frame = vortex(mesh, 2.0)
    (core,) = swirl_cores(frame, solved(frame).domain)
    assert core.centre == pytest.approx([-1.0, 0.4], abs=0.06)
    assert core.drift == pytest.approx(U, abs=0.01)
    assert core.circulation_m2_s == pytest.approx(GAMMA * (1 - np.exp(-((core.radius_m / A) ** 2))), rel=0.03)
    assert core.rotation == "anticlockwise"
    # Half the vorticity at the middle; the mean over the triangles round a node is a little less.
    assert core.swirl_1_s == pytest.approx(GAMMA / (2 * np.pi * A**2), rel=0.08)


def test_it_has_no_zone_in_the_fixed_frame_and_one_in_its_own(mesh):
    """Its round speed is 0.638 G/(2 pi a) = 0.30 m/s at most, less than the stream: no streamline closes in the fixed frame."""
    frame = vortex(mesh, 2.0)
    sf = solved(frame)
    zones = find_zones(sf).zones
    assert zones == ()
    (eddy,) = travelling_eddies(sf, zones, swirl_cores(frame, sf.domain))
    assert not eddy.core_only and eddy.misfit < 0.1
    assert eddy.speed_from.startswith("assumed")
    assert eddy.contour.contains(shapely.Point(-1.0, 0.4))
    # In its own view streamlines are circles: psi from the middle to r holds depth times the integral of the round speed.
    r = np.sqrt(eddy.area_m2 / np.pi)
    s = np.linspace(1e-6, r, 2000)
    expected = 2.0 * np.trapezoid(GAMMA / (2 * np.pi * s) * (1 - np.exp(-(s**2) / A**2)), s)
    assert eddy.recirculating_discharge_m3_s == pytest.approx(expected, rel=0.03)


def test_its_speed_comes_from_cores_matched_between_frames(mesh):
    first, second = vortex(mesh, 2.0), vortex(mesh, 3.5)
    sf = solved(first)
    cores, later = swirl_cores(first, sf.domain), swirl_cores(second, sf.domain)
    (eddy,) = travelling_eddies(sf, (), cores, later=later, gap_s=1.5)
    assert eddy.speed_from == "matched cores"
    assert eddy.speed == pytest.approx(U, abs=0.05)


def test_seen_with_a_wrong_speed_the_view_fits_less(mesh):
    """Galilean change: only the observer who moves with the vortex sees its own flow alone."""
    frame = vortex(mesh, 2.0, stored_on="face")
    sf = solved(frame)
    (core,) = swirl_cores(frame, sf.domain)
    own = travelling_eddies(sf, (), [core])[0]
    assert own.area_m2 is not None
    still = vortex(mesh, 0.0, stream=(0.0, 0.0))
    alone = solved(still)
    (core_still,) = swirl_cores(still, alone.domain)
    fixed = travelling_eddies(alone, (), [core_still])[0]
    assert fixed.area_m2 == pytest.approx(own.area_m2, rel=0.1)
    assert fixed.speed == pytest.approx([0, 0], abs=0.01)


def test_a_vortex_that_turns_the_other_way_is_told_clockwise(mesh):
    frame = vortex(mesh, 2.0, gamma=-GAMMA)
    (core,) = swirl_cores(frame, solved(frame).domain)
    assert core.rotation == "clockwise" and core.circulation_m2_s < 0


def test_shear_and_a_weak_swirl_are_no_cores(mesh):
    shear = builders.frame_of(mesh, 2.0, lambda x, y: (1 + 0.1 * y, 0.0 * x), stored_on="node")
    assert swirl_cores(shear, solved(shear).domain) == []
    weak = vortex(mesh, 2.0, gamma=0.2)
    assert swirl_cores(weak, solved(weak).domain) == []
