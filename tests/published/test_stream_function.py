"""The stream function against closed forms."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from hydro.contours import contour_lines, tube_levels
from hydro.streamfunction import stream_function
from tests import builders


def test_uniform_flow_is_exact_and_any_section_carries_the_difference_of_psi():
    """q = (2, 1) m2/s has psi = 2 y - x (continuity; van Gijzen et al. 1998 for the method).

    Across the segment (0, 0) to (3, 4) go 5 m3/s, whatever line joins the ends. Round-off only: linear
    elements hold a linear psi exactly.
    """
    mesh = builders.channel(12, 8, 3.0, 4.0)
    sf = stream_function(builders.frame_of(mesh, 1.0, (2.0, 1.0)), boundary_sets=builders.sides(mesh))
    x, y = mesh.node_xy.T
    expected = 2 * y - x
    origin, far = (np.hypot(x - px, y - py).argmin() for px, py in ((0, 0), (3, 4)))
    assert sf.psi - sf.psi[origin] == pytest.approx(expected - expected[origin], abs=1e-11)
    assert sf.psi[far] - sf.psi[origin] == pytest.approx(5.0, abs=1e-11)


def test_psi_rises_from_zero_on_the_right_bank_to_the_discharge_on_the_left():
    """A channel 20 m wide, 2 m deep at 1.5 m/s carries 60 m3/s; found without being told what is open."""
    for angle in (0.0, 0.7, 2.5, 4.0):
        turn = np.array([[np.cos(angle), -np.sin(angle)], [np.sin(angle), np.cos(angle)]])
        straight = builders.channel(20, 8)
        mesh = builders.build_mesh(straight.node_xy @ turn.T, straight.face_nodes, origin=(0, 0))
        u, v = turn @ (1.5, 0.0)
        sf = stream_function(builders.frame_of(mesh, 2.0, (u, v)))
        assert {w.id: w.psi_m3_s for w in sf.walls} == pytest.approx({"right bank": 0.0, "left bank": 60.0}, abs=1e-10)
        assert (sf.inflow_m3_s, sf.outflow_m3_s) == pytest.approx((60.0, 60.0))
        across = turn.T @ (mesh.node_xy[sf.wall("left bank").nodes].mean(axis=0))
        assert across[1] == pytest.approx(20.0), "the left bank lies on the left, facing downstream"


def cylinder_error(size: float) -> tuple[float, float, float]:
    """Greatest error of psi on nodes, discharge between the body and y = 2 (x = 0), and the misfit."""
    body = shapely.Point(0, 0).buffer(1.0, quad_segs=64)
    mesh = builders.free_mesh(shapely.box(-5, -4, 5, 4).difference(body), size)

    def velocity(x, y):
        r4 = (x * x + y * y) ** 2
        return 1 - (x * x - y * y) / r4, -2 * x * y / r4

    sf = stream_function(builders.frame_of(mesh, 1.0, velocity), boundary_sets=builders.sides(mesh))
    x, y = mesh.node_xy.T
    expected = y - y / (x * x + y * y)
    (island,) = [w for w in sf.walls if not w.reaches_open]
    top = np.hypot(x, y - 2.0).argmin()
    between = sf.psi[top] - island.psi_m3_s
    return float(np.abs(sf.psi - island.psi_m3_s - expected).max()), float(between - expected[top]), sf.misfit.total


def test_potential_flow_past_a_cylinder_with_second_order():
    """psi = (r - a^2/r) sin(theta) (Milne-Thomson, Theoretical Hydrodynamics, 6.22): 1.5 passes between body and y = 2.

    Linear elements on faces' mean values: psi of second order, the misfit (a gradient) of first.
    """
    coarse, fine = cylinder_error(0.4), cylinder_error(0.1)
    assert abs(fine[1]) < 0.004
    order = np.log(coarse[0] / fine[0]) / np.log(4)
    assert order > 1.6
    assert np.log(coarse[2] / fine[2]) / np.log(4) == pytest.approx(1.0, abs=0.3)


def test_parabolic_channel_and_its_stream_tubes():
    """h = 3 (1 - s^2), s = 2 y / 60, u = 2 (h / 3)^(2/3): Q = 6 * 30 * Beta(1/2, 8/3) = 204.69438 m3/s.

    The tubes that carry 10 % and 25 % from the right bank end at y = -16.04784 and -8.96582 m (derived by
    integrating q; incomplete Beta function). Trapezoidal sums over 0.5 m leave 0.1 % near the banks.
    """
    mesh = builders.channel(10, 120, 20.0, 60.0, corner=(0.0, -30.0))
    depth = lambda x, y: 3 * np.clip(1 - (y / 30) ** 2, 0, None)  # noqa: E731
    frame = builders.frame_of(
        mesh, depth, (lambda x, y: 2 * (depth(x, y) / 3) ** (2 / 3), 0.0), stored_on="node", wet_depth_m=0.01
    )
    sf = stream_function(frame, boundary_sets={k: v for k, v in builders.sides(mesh).items() if k in ("west", "east")})
    assert sf.through_discharge_m3_s == pytest.approx(204.69438, rel=1e-3)
    for share, y in ((0.10, -16.04784), (0.25, -8.96582)):
        (line,) = contour_lines(mesh, sf.psi, share * sf.through_discharge_m3_s, sf.domain)
        assert line[:, 1] == pytest.approx(y, abs=0.03)
        assert line[-1, 0] > line[0, 0], "lines of psi run downstream"


def test_discharge_between_two_islands_and_their_banks():
    """psi built constant on two round islands: y_k plus a smooth blend to y; what passes between is y_2 - y_1.

    Derived; the tolerance is the polygon's sagitta and the second-order error at 0.35 m.
    """
    islands = [(20.0, 6.0), (22.0, 15.0)]

    def psi(x, y):
        out = y.copy()
        for cx, cy in islands:
            t = np.clip((np.hypot(x - cx, y - cy) - 1.5) / 2.0, 0, 1)
            out = out + (cy - y) * (1 - t * t * (3 - 2 * t))
        return out

    holes = [shapely.Point(c).buffer(1.5, quad_segs=24) for c in islands]
    mesh = builders.free_mesh(shapely.box(0, 0, 40, 22).difference(shapely.union_all(holes)), 0.35)
    sf = stream_function(builders.frame_of(mesh, 1.0, builders.flow_of_psi(psi)))
    values = sorted(w.psi_m3_s for w in sf.walls)
    assert values == pytest.approx([0.0, 6.0, 15.0, 22.0], abs=0.03)


def test_edge_discharges_give_psi_to_round_off():
    """Edge discharges that are differences of node values close every face, so a spanning tree of them is exact."""
    rng = np.random.default_rng(4)
    for quads in (False, True):
        mesh = builders.channel(12, 6, quads=quads)
        psi = mesh.node_xy[:, 1] * 3 + rng.normal(0, 0.5, mesh.n_nodes)
        psi[mesh.node_xy[:, 1] == 0], psi[mesh.node_xy[:, 1] == 20] = 0.0, 60.0
        discharge = psi[mesh.edge_nodes[:, 1]] - psi[mesh.edge_nodes[:, 0]]
        sides = {k: v for k, v in builders.sides(mesh).items() if k in ("west", "east")}
        raw = builders.RawFrame("edge", np.ones(mesh.n_faces), None, discharge)
        frame = builders.make_frame(
            mesh, raw, np.zeros(mesh.n_nodes), np.zeros(mesh.n_faces), index=0, seconds=0.0, time=None, kind="instant",
            wet_depth_m=0.05,
        )
        sf = stream_function(frame, boundary_sets=sides)
        assert sf.psi == pytest.approx(psi, abs=1e-10)
        assert sf.misfit.total < 1e-12


def test_linear_filling_is_all_explained_by_storage():
    """A rectangle L x B whose level rises at r everywhere: q = q0 - r x, so psi differs by B (q0 - r L / 2).

    The storage part is (r L / sqrt 12) over the rms of q (derived: q less its mean is a gradient). Tolerances: q at face centres leaves an error of (r dx)^2.
    """
    length, width, q0, r = 40.0, 10.0, 2.0, 0.02
    mesh = builders.channel(80, 20, length, width)
    frame = builders.frame_of(mesh, 1.0, (lambda x, y: q0 - r * x, 0.0))
    sides = {k: v for k, v in builders.sides(mesh).items() if k in ("west", "east")}
    sf = stream_function(frame, boundary_sets=sides, depth_rate=np.full(mesh.n_faces, r))
    assert sf.wall("left bank").psi_m3_s == pytest.approx(width * (q0 - r * length / 2), rel=1e-6)
    rms = np.sqrt(q0**2 - q0 * r * length + (r * length) ** 2 / 3)
    assert sf.misfit.storage == pytest.approx(r * length / np.sqrt(12) / rms, rel=1e-3)
    assert sf.misfit.unexplained < 0.01 * sf.misfit.storage
    assert sf.storage_m3_s == pytest.approx(r * length * width)
    assert sf.inflow_m3_s - sf.outflow_m3_s == pytest.approx(r * length * width, rel=0.01)


def test_tubes_carry_equal_discharge():
    """A drawing in 10 tubes of a 60 m3/s channel has lines every 6 m3/s (definition of a stream tube)."""
    mesh = builders.channel(20, 8)
    sf = stream_function(builders.frame_of(mesh, 2.0, (1.5, 0.0)))
    assert tube_levels(sf, 10) == pytest.approx(np.arange(6.0, 60.0, 6.0))
