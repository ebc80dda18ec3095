"""The four flow lines against closed forms and a high-order general-purpose integrator."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from scipy.integrate import solve_ivp

from hydro.streamfunction import stream_function
from hydro.tracks import along, in_polygon, on_line, one_a_tube, pathlines, streaklines, streamlines, timelines
from hydro.tracks.unsteady import FramePair
from tests.builders import channel, disc, flow_of_psi, frame_of, raw_of, run_of, sides, with_hole

U, V, PERIOD = 0.8, 0.3, 120.0
OMEGA = 2 * np.pi / PERIOD


@pytest.fixture(scope="module")
def oscillating():
    """u = U, v = V cos(w t): frames 1 s apart, so that linear interpolation in time errs by under w^2 dt^2 / 8."""
    mesh = channel(60, 30, 120, 60, corner=(-10, -30))
    times = np.arange(0, 121.0, 1.0)
    return run_of(mesh, times, lambda i: raw_of(mesh, 2.0, (U, V * np.cos(OMEGA * times[i])), stored_on="node"))


def test_pathline_streakline_and_streamline_of_an_oscillating_stream_are_three_curves(oscillating):
    """Source: closed forms (t0 = 0, t = 100 s): pathline head (80, -4.96196); streakline y(40) = -7.82675;
    pathline y(40) = 2.86479; streamline of t = 100 s through the origin: y = x V cos(w t) / U, at x = 40 m 7.5 m.

    Tolerance: V w^2 dt^2 / 8 of linear interpolation in time over 100 s is 0.01 m.
    """
    path = pathlines(oscillating, [(0, 0)], begin=0, end=100, every=1.0).tracks[0]
    assert path.xy[-1] == pytest.approx([80, -4.96196], abs=0.01)
    assert np.interp(40, *path.xy.T) == pytest.approx(2.86479, abs=0.01)
    assert path.ended == "afloat" and path.error_m < 0.01
    streak = streaklines(oscillating, [(0, 0)], begin=0, at=100, every=1.0).tracks[0]
    order = np.argsort(streak.xy[:, 0])
    assert np.interp(40, *streak.xy[order].T) == pytest.approx(-7.82675, abs=0.01)
    assert streak.xy[-1] == pytest.approx(path.xy[-1], abs=1e-6)  # the first parcel let go is the pathline's head
    still = run_of(oscillating.mesh, [0.0], [oscillating.read(100)])
    line = pathlines(still, [(0, 0)], begin=0, end=60, every=1.0).tracks[0]
    assert np.interp(40, *line.xy.T) == pytest.approx(40 * V * np.cos(OMEGA * 100) / U, abs=1e-6)


def test_a_timeline_in_a_uniform_stream_keeps_its_shape(oscillating):
    line = np.column_stack([np.zeros(9), np.linspace(-8, 8, 9)])
    later = timelines(oscillating, line, begin=0, times=[30.0]).tracks[-1]
    assert later.xy[:, 0] == pytest.approx(np.full(9, U * 30), abs=1e-6)
    assert np.diff(later.xy[:, 1]) == pytest.approx(np.full(8, 2.0), abs=1e-6)


def test_a_moving_view_of_a_uniform_stream_stands_still():
    """A law: in the view that moves with the water nothing moves (Galileo)."""
    mesh = channel()
    run = run_of(mesh, [0.0], [raw_of(mesh, 1.0, (1.0, 0.2))])
    track = pathlines(run, [(50, 10)], begin=0, end=20, every=5, viewpoint=(1.0, 0.2)).tracks[0]
    assert track.xy == pytest.approx(np.tile([50, 10], (5, 1)), abs=1e-9)


@pytest.fixture(scope="module")
def rotation():
    """Solid rotation, 0.1 1/s, in a closed disc."""
    frame = frame_of(disc(10, 0.8), 1.0, lambda x, y: (-0.1 * y, 0.1 * x))
    return frame, stream_function(frame)


def test_closed_streamlines_close_to_the_bit_and_keep_their_period(rotation):
    """Source: solid rotation: period 2 pi / w. Tolerance 3 %: psi is linear in triangles of 0.8 m."""
    frame, sf = rotation
    for radius in (3.0, 6.0):
        track = streamlines(sf, [(radius, 0.0)]).tracks[0]
        assert track.ended == "closed"
        assert (track.xy[-1] == track.xy[1]).all()
        assert track.seconds[-1] - track.seconds[1] == pytest.approx(2 * np.pi / 0.1, rel=0.03)


def test_a_thousand_turns_along_psi_do_not_drift(rotation):
    """The line is traced again and again from its own last point; after 1,000 turns it is the same line."""
    _, sf = rotation
    first = streamlines(sf, [(5.0, 0.0)], direction="down").tracks[0]
    psi = []
    start = first.xy[3]
    for _ in range(1000):
        track = streamlines(sf, [start], direction="down").tracks[0]
        start = track.xy[-1]
        psi.append(track.psi)
    assert np.ptp(psi) < 1e-9 * abs(psi[0])


def test_streamline_pathline_and_streakline_coincide_in_steady_flow():
    """A law. Tolerance 0.08 m on faces of 1.2 m; the banks stand 15 radii off, so that the closed form fits them."""
    flow = flow_of_psi(_cylinder((20, 30), 2.0, 1.0))
    mesh = with_hole(60, 60, 1.2, hole=shapely.Point(20, 30).buffer(2.0, quad_segs=16))
    frame = frame_of(mesh, 1.0, flow, stored_on="node")
    line = streamlines(stream_function(frame), [(5, 32)], direction="down").tracks[0]
    run = run_of(mesh, [0.0], [raw_of(mesh, 1.0, flow, stored_on="node")])
    path = pathlines(run, [(5, 32)], begin=0, end=40, every=1.0).tracks[0]
    streak = streaklines(run, [(5, 32)], begin=0, at=40, every=1.0).tracks[0]
    curve = shapely.LineString(line.xy)
    assert max(curve.distance(shapely.Point(p)) for p in path.xy) < 0.08
    assert max(shapely.LineString(path.xy).distance(shapely.Point(p)) for p in streak.xy) < 0.01


def _cylinder(at, radius, speed):
    def psi(x, y):
        x, y = x - at[0], y - at[1]
        return speed * y * (1 - radius**2 / np.maximum(x**2 + y**2, radius**2 / 2))

    return psi


def test_travel_time_towards_a_cylinder():
    """Source: potential flow; from 5 to 2 radii ahead of the centre 3.3465736 a/U (no cylinder: 3). Tolerance 1.5 %."""
    a = 4.0
    mesh = with_hole(60, 48, 0.7, hole=shapely.Point(30, 24).buffer(a, quad_segs=24))
    flow = flow_of_psi(_cylinder((30, 24), a, 1.0))
    run = run_of(mesh, [0.0], [raw_of(mesh, 1.0, flow, stored_on="node")])
    track = pathlines(run, [(30 - 5 * a, 24.0)], begin=0, end=20, every=0.02).tracks[0]
    time = np.interp(30 - 2 * a, track.xy[:, 0], track.seconds)
    assert time == pytest.approx(3.3465736 * a, rel=0.015)


def _gyre(t, x, y, amplitude=0.1, eps=0.25, w=2 * np.pi / 10):
    a, b = eps * np.sin(w * t), 1 - 2 * eps * np.sin(w * t)
    f, df = a * x**2 + b * x, 2 * a * x + b
    return -np.pi * amplitude * np.sin(np.pi * f) * np.cos(np.pi * y), np.pi * amplitude * np.cos(np.pi * f) * np.sin(np.pi * y) * df


def test_the_double_gyre_agrees_with_a_high_order_integrator():
    """Source: Shadden, Lekien & Marsden 2005; trajectories from (0.5, 0.25) to t = 5 and (0.3, 0.4) to t = 10.

    Independent values: scipy DOP853 with rtol 1e-12; the first also published as (0.7371173522, 0.7502195914).
    Tolerance 0.004 for a mesh of 1/60 and frames 0.1 apart.
    """
    mesh = channel(120, 60, 2.0, 1.0)
    times = np.arange(0, 10.05, 0.1)
    run = run_of(mesh, times, lambda i: raw_of(mesh, 1.0, lambda x, y: _gyre(times[i], x, y), stored_on="node"))
    for start, end in (((0.5, 0.25), 5.0), ((0.3, 0.4), 10.0)):
        exact = solve_ivp(lambda t, p: _gyre(t, *p), (0, end), start, method="DOP853", rtol=1e-12, atol=1e-12).y[:, -1]
        track = pathlines(run, [start], begin=0, end=end, every=0.5, tolerance_m=1e-6).tracks[0]
        assert track.xy[-1] == pytest.approx(exact, abs=0.004)
    assert exact == pytest.approx([1.7718650867, 0.3811238281], abs=1e-6)


def test_a_particle_in_a_dam_break():
    """Source: Ritter 1892; x = 2 c0 t - 3 c0 t0^(1/3) t^(2/3), t0 = -x0/c0; h0 = 2 m, x0 = -5 m: 24.36787 m at 10 s.

    Tolerance 0.5 %: frames 0.1 s apart on cells of 0.25 m.
    """
    g, h0 = 9.81, 2.0
    c0 = np.sqrt(g * h0)
    mesh = channel(480, 2, 120, 0.6, corner=(-50, 0))
    times = np.arange(0, 10.05, 0.1)

    def frame(i):
        t = max(times[i], 1e-9)
        xi = lambda x: np.clip(x / t, -c0, 2 * c0)  # noqa: E731
        return raw_of(
            mesh, lambda x, y: (2 * c0 - xi(x)) ** 2 / (9 * g), (lambda x, y: 2 / 3 * (c0 + xi(x)), 0.0), stored_on="node"
        )

    run = run_of(mesh, times, frame)
    track = pathlines(run, [(-5.0, 0.3)], begin=0, end=10, every=0.5).tracks[0]
    t0 = 5 / c0
    assert 2 * c0 * 10 - 3 * c0 * t0 ** (1 / 3) * 10 ** (2 / 3) == pytest.approx(24.36787, abs=1e-5)
    assert track.xy[-1, 0] == pytest.approx(24.36787, rel=0.005)


def test_parcels_leave_at_open_boundaries_slide_along_walls_and_wait_aground():
    mesh = channel()
    plain = raw_of(mesh, 1.0, (1.0, 0.0))
    run = run_of(mesh, [0.0], [plain], boundary_sets=sides(mesh))
    sf = stream_function(run.frame(0), boundary_sets={k: v for k, v in sides(mesh).items() if k in ("west", "east")})
    found = pathlines(run, [(90, 10), (500, 10)], begin=0, end=60, every=5, boundaries=sf.open_boundaries).tracks
    assert [t.ended for t in found] == ["left", "outside the water"] and len(found[1].xy) == 1
    toward = run_of(mesh, [0.0], [raw_of(mesh, 1.0, (0.5, -0.5), stored_on="node")])
    slid = pathlines(toward, [(20, 5)], begin=0, end=40, every=5).tracks[0]
    assert slid.touches > 0 and slid.xy[-1, 1] == pytest.approx(0, abs=0.01) and slid.xy[-1, 0] > 38
    drying = run_of(mesh, [0, 10, 20, 30], [raw_of(mesh, h, (1.0, 0.0), stored_on="node") for h in (1.0, 0.0, 0.0, 1.0)])
    waited = pathlines(drying, [(10, 10)], begin=0, end=15, every=5).tracks[0]
    assert waited.ended == "aground"
    freed = pathlines(drying, [(10, 10)], begin=0, end=30, every=5).tracks[0]
    assert freed.ended == "afloat" and freed.xy[-1, 0] > waited.xy[-1, 0] + 1


def test_the_surface_rises_away_from_the_centre_of_curvature():
    """Source: Euler's n-equation, slope V^2 / (g R): solid rotation w = 0.2 1/s, surface w^2 r^2 / 2g (closed form)."""
    w, g = 0.2, 9.81
    frame = frame_of(disc(10, 0.8), lambda x, y: 2 + w**2 * (x**2 + y**2) / (2 * g), lambda x, y: (-w * y, w * x), stored_on="node")
    track = streamlines(stream_function(frame), [(6.0, 0.0)], direction="down").tracks[0]
    found = along(track, frame)
    inside = slice(len(track.xy) // 5, -len(track.xy) // 5)
    assert np.median(found.curvature[inside]) == pytest.approx(1 / 6, rel=0.03)
    assert np.median(found.cross_slope[inside]) == pytest.approx(-(w**2) * 6 / g, rel=0.05)
    assert np.median(found.bend_slope[inside]) == pytest.approx(-(w**2) * 6 / g, rel=0.05)


def test_streamlines_of_one_instant_do_not_cross():
    """Common practice, no source: psi is one value along each."""
    frame = frame_of(with_hole(size=1.0), 1.0, flow_of_psi(_cylinder((20, 12), 2.0, 1.0)))
    sf = stream_function(frame)
    lines = [shapely.LineString(t.xy) for t in streamlines(sf, on_line(np.array([[3, 23], [3, 1.0]]), 1.5)).tracks if len(t.xy) > 2]
    assert len(lines) > 10
    assert not any(a.crosses(b) for i, a in enumerate(lines) for b in lines[i + 1 :])


def test_one_streamline_a_tube_carries_equal_shares():
    frame = frame_of(channel(40, 20), 1.0, (lambda x, y: 0.5 + y / 20, 0.0), stored_on="node")
    sf = stream_function(frame)
    points = one_a_tube(sf, np.array([[50, 20], [50, 0.0]]), 8)
    # u = 0.5 + y/20: psi = y/2 + y^2/40, whole 20 m3/s; the middles of eight tubes lie at psi = 20 (k + 1/2) / 8.
    psi = np.sort(points[:, 1] / 2 + points[:, 1] ** 2 / 40)
    assert psi == pytest.approx(20 * (np.arange(8) + 0.5) / 8, abs=0.1)


def test_releases_have_their_spacing_and_density_and_refuse_none():
    assert len(on_line(np.array([[0, 0], [10.0, 0]]), 2.0)) == 5
    assert len(in_polygon(shapely.box(0, 0, 40, 40), 4.0)) == pytest.approx(400, rel=0.06)
    with pytest.raises(ValueError, match="above 0"):
        on_line(np.zeros((2, 2)), 0.0)


def test_times_outside_the_run_are_refused(oscillating):
    with pytest.raises(ValueError, match="lie outside the run"):
        pathlines(oscillating, [(0, 0)], begin=0, end=500, every=1.0)
    assert FramePair(oscillating).stops(0.5, 3.0) == [1.0, 2.0, 3.0]
