"""Steady channel solutions sampled on a mesh: heads, critical section, jump and discharge, with their order."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate
from scipy.optimize import brentq

from hydro.mesh import build_mesh
from hydro.reach import CentreLine
from hydro.section import cut, section_figures
from hydro.section.profile import profile
from hydro.streamfunction import stream_function
from hydro.tracks import along, streamlines
from tests.builders import channel, frame_of, sides

G = 9.81


def bump(x):
    """Goutal & Maurel 1997: 0.2 - 0.05 (x - 10)^2 between 8 and 12 m."""
    return np.where(np.abs(x - 10) < 2, 0.2 - 0.05 * (x - 10) ** 2, 0.0)


def _depth_over_bump(q, energy, x, fast):
    """Depth of the subcritical or supercritical branch at constant head, frictionless (Bernoulli)."""
    out = []
    critical = (q**2 / G) ** (1 / 3)
    for z, is_fast in zip(bump(x), fast, strict=True):
        short = lambda h, z=z: h + q**2 / (2 * G * h**2) + z - energy  # noqa: E731
        low, high = (1e-3, critical) if is_fast else (critical, 5.0)
        out.append(critical if short(critical) > -1e-12 else brentq(short, low, high))
    return np.array(out)


def _bump_frame(nx, q, energy, turns_fast):
    def depth(x, y):
        ux, inverse = np.unique(x, return_inverse=True)
        return _depth_over_bump(q, energy, ux, (ux > 10) & turns_fast)[inverse]

    mesh = channel(nx, 4, 25, 2)
    return frame_of(mesh, depth, (lambda x, y: q / depth(x, y), 0.0), bed=lambda x, y: bump(x), stored_on="node")


def test_subcritical_flow_over_a_bump_keeps_its_head_and_discharge():
    """Source: Goutal & Maurel 1997, q = 4.42 m2/s, level 2 m downstream: constant head (Bernoulli).

    Tolerance: level and flow are linear between nodes 0.125 m apart; the error falls with the square.
    """
    q = 4.42
    energy = 2.0 + q**2 / (2 * G * 2.0**2)

    def worst(nx):
        p = profile(_bump_frame(nx, q, energy, False), [(0.5, 1), (24.5, 1)])
        return np.abs(p.head - energy).max()

    coarse, fine = worst(100), worst(200)
    assert fine < 2e-3 and fine < coarse / 3
    section = cut(_bump_frame(200, q, energy, False), [(10, 2), (10, 0)])
    assert section_figures(section).discharge_m3_s == pytest.approx(2 * q, rel=1e-6)


def test_transcritical_flow_over_a_bump_has_its_critical_section_at_the_crest():
    """Source: Goutal & Maurel 1997, q = 1.53 m2/s without a jump: Fr = 1 at x = 10 m, head 0.2 + 1.5 h_c."""
    q = 1.53
    critical = (q**2 / G) ** (1 / 3)
    p = profile(_bump_frame(400, q, 0.2 + 1.5 * critical, True), [(4, 1), (20, 1)])
    x = 4 + p.distance
    assert x[np.flatnonzero(p.froude > 1)[0]] == pytest.approx(10.0, abs=0.1)
    assert p.critical_level[np.abs(x - 10).argmin()] == pytest.approx(0.2 + critical, abs=2e-3)


def test_head_lost_in_a_channel_with_friction_is_the_integral_of_the_friction_slope():
    """Source: MacDonald et al. 1997 (inverse method): a chosen depth fixes the bed through
    dz/dx = (q^2/(g h^3) - 1) h' - n^2 q^2 / h^(10/3). Head lost between 50 and 450 m is the integral of the last term.
    """
    q, n, length = 2.0, 0.033, 500.0
    depth = lambda x: 1.2 + 0.3 * np.sin(x / 60)  # noqa: E731
    slope = lambda x: 0.3 / 60 * np.cos(x / 60)  # noqa: E731
    friction = lambda x: n**2 * q**2 / depth(x) ** (10 / 3)  # noqa: E731
    s = np.linspace(0, length, 5001)
    fall = (q**2 / (G * depth(s) ** 3) - 1) * slope(s) - friction(s)
    bed = np.concatenate([[0.0], integrate.cumulative_trapezoid(fall, s)])
    mesh = channel(500, 4, length, 10)
    frame = frame_of(
        mesh, lambda x, y: depth(x), (lambda x, y: q / depth(x), 0.0), bed=lambda x, y: np.interp(x, s, bed), stored_on="node"
    )
    centre = CentreLine(np.array([[0.0, 5.0], [length, 5.0]]))
    heads = [section_figures(cut(frame, [(x, 10), (x, 0)], centre_line=centre)).head_m for x in (50, 450)]
    assert heads[0] - heads[1] == pytest.approx(integrate.quad(friction, 50, 450)[0], rel=2e-3)


def test_head_is_one_value_along_a_frictionless_streamline():
    """Source: Bernoulli. Free vortex C = 5 m2/s between r = 20 and 40 m: level rises as C^2/2g (1/r1^2 - 1/r^2)."""
    c, h0 = 5.0, 2.0
    r = lambda x, y: np.hypot(x, y)  # noqa: E731
    depth = lambda x, y: h0 + c**2 / (2 * G) * (1 / 20**2 - 1 / r(x, y) ** 2)  # noqa: E731
    mesh = channel(60, 40, 40, 18, corner=(-20, 21))
    flow = (lambda x, y: c * y / r(x, y) ** 2, lambda x, y: -c * x / r(x, y) ** 2)
    frame = frame_of(mesh, depth, flow, stored_on="node")
    sf = stream_function(frame, boundary_sets=sides(mesh))
    track = streamlines(sf, [(-15.0, 28.0)], direction="down").tracks[0]
    head = along(track, frame).head
    expected = h0 + c**2 / (2 * G) / 20**2
    assert np.nanmax(np.abs(head - expected)) < 5e-4


ACROSS_BEND = [(radius * np.cos(np.pi / 2 - 0.25), radius * np.sin(np.pi / 2 - 0.25)) for radius in (171.0, 129.0)]


def vortex_frame(cells: int):
    """Free vortex C = 375 m2/s in a bend of radii 130 to 170 m, depth 3 m on the outer bank, level bed."""
    c, inner, outer, deepest = 375.0, 130.0, 170.0, 3.0
    r = lambda x, y: np.hypot(x, y)  # noqa: E731
    flat = channel(cells, cells // 2, 1.0, 1.0)
    turn, radius = np.pi / 2 - 0.5 * flat.node_xy[:, 0], inner + (outer - inner) * flat.node_xy[:, 1]
    bend = build_mesh(np.column_stack([radius * np.cos(turn), radius * np.sin(turn)]), flat.face_nodes, origin=(0.0, 0.0))
    depth = lambda x, y: deepest - c**2 / (2 * G) * (1 / r(x, y) ** 2 - 1 / outer**2)  # noqa: E731
    flow = (lambda x, y: c * y / r(x, y) ** 2, lambda x, y: -c * x / r(x, y) ** 2)
    return frame_of(bend, depth, flow, stored_on="node"), (c, inner, outer)


def test_the_surface_of_a_free_vortex_bend_rises_as_its_speed_squared_over_g_r():
    """Source: free vortex, V = C/r (Henderson 1966): cross slope V^2/(g r) at each radius, 0.1761 m from bank to bank
    for C = 375 m2/s between 130 and 170 m; the simple V^2 W/(g R) gives 0.169895 m.

    Tolerance: level is linear in cells of 1 m across, so its slope errs by the cell over the radius, under 1 %.
    """
    frame, (c, inner, outer) = vortex_frame(80)
    section = cut(frame, ACROSS_BEND)
    level = section.level[np.isfinite(section.level).all(axis=1)]
    assert level[0, 0] - level[-1, 1] == pytest.approx(0.1761, abs=1e-3)
    sf = stream_function(frame)
    for radius in (140.0, 150.0, 160.0):
        turn = np.pi / 2 - 0.02
        track = streamlines(sf, [(radius * np.cos(turn), radius * np.sin(turn))], direction="down").tracks[0]
        found = along(track, frame)
        middle = slice(len(track.xy) // 5, -len(track.xy) // 5)
        # Running clockwise about the origin the centre lies to the right, so the surface rises to the left.
        assert np.median(found.cross_slope[middle]) == pytest.approx(c**2 / (G * radius**3), rel=0.02)
        assert np.median(found.bend_slope[middle]) == pytest.approx(c**2 / (G * radius**3), rel=0.03)
        assert np.median(np.hypot(*track.xy[middle].T)) == pytest.approx(radius, abs=0.3)


def test_a_section_of_the_bend_carries_the_integral_of_the_vortex():
    """Source: calculus: the integral of C/r h(r) over the radius. Tolerance: linear fields in cells of 1 m."""
    frame, (c, inner, outer) = vortex_frame(80)
    h = lambda r: 3.0 - c**2 / (2 * G) * (1 / r**2 - 1 / outer**2)  # noqa: E731
    exact = integrate.quad(lambda r: c / r * h(r), inner, outer)[0]
    assert section_figures(cut(frame, ACROSS_BEND)).discharge_m3_s == pytest.approx(exact, rel=1e-3)
