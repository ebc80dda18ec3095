"""The demonstration solver against closed forms: rest, dam breaks, uniform flow, and the balance of water."""

import numpy as np
import pytest
from scipy.optimize import brentq
from scipy.spatial import Delaunay

from sample_reach.flow import OUTFLOW, RIVER, G
from sample_reach.solver import Drive, Model, topology


def _grid(length, width, spacing, seed=None):
    """Triangles over a rectangle; with a seed the inner nodes are shaken by up to a fifth of the spacing."""
    nx, ny = round(length / spacing), round(width / spacing)
    x, y = np.meshgrid(np.linspace(0, length, nx + 1), np.linspace(0, width, ny + 1), indexing="ij")
    inner = np.zeros(x.shape, bool)
    inner[1:-1, 1:-1] = True
    xy = np.column_stack([x.ravel(), y.ravel()])
    if seed is not None:
        xy[inner.ravel()] += np.random.default_rng(seed).uniform(-0.2, 0.2, (inner.sum(), 2)) * spacing
        cells = Delaunay(xy).simplices
    else:
        n = np.arange(xy.shape[0]).reshape(x.shape)
        a, b, c, d = n[:-1, :-1].ravel(), n[1:, :-1].ravel(), n[1:, 1:].ravel(), n[:-1, 1:].ravel()
        turn = (np.add.outer(np.arange(nx), np.arange(ny)) % 2).ravel() == 0
        first = np.where(turn[:, None], np.column_stack([a, b, c]), np.column_stack([a, b, d]))
        second = np.where(turn[:, None], np.column_stack([a, c, d]), np.column_stack([b, c, d]))
        cells = np.vstack([first, second])
    p = xy[cells]
    area = np.cross(np.c_[p[:, 1] - p[:, 0], 0 * p[:, 0, 0]], np.c_[p[:, 2] - p[:, 0], 0 * p[:, 0, 0]])[:, 2]
    cells = np.where(area[:, None] < 0, cells[:, ::-1], cells)[np.abs(area) > 1e-9]
    return topology(xy, cells.astype(np.int32))


def _model(t, node_bed, roughness=0.0, **options):
    bed = node_bed[t.cells].mean(axis=1)
    return Model(t, bed, np.full(len(bed), float(roughness)), **options)


def test_a_lake_over_an_uneven_bed_with_an_island_and_a_dry_shore_stays_at_rest():
    """Law: still water stays still. Source of the scheme's claim: Audusse et al. 2004, SIAM J. Sci. Comput. 25(6).

    Tolerance: rounding. Depths of 1 m give fluxes g h^2 / 2 of 5 m3/s2, whose rounding is 1e-15; some
    hundreds of steps add them up to 1e-12.
    """
    t = _grid(30, 20, 1.0, seed=4)
    x, y = t.xy.T
    bed = np.random.default_rng(1).uniform(0, 0.5, len(x)) + 0.12 * (x - 10).clip(0)  # a shore at the right end
    bed += 2.5 * np.exp(-((x - 8) ** 2 + (y - 10) ** 2) / 8)  # an island
    m = _model(t, bed, 0.03, alpha=0.3)
    m.h[:] = np.maximum(1.2 - m.bed, 0)
    dry = m.h == 0
    assert dry[np.hypot(t.centre[:, 0] - 8, t.centre[:, 1] - 10) < 1].all() and dry.sum() > 50
    before = m.h.copy()
    m.advance(20.0)
    assert m.state[5] > 200
    assert max(np.abs(m.hu).max(), np.abs(m.hv).max()) < 1e-12
    assert np.abs(m.h - before).max() < 1e-13


def _ritter(x, time, h0):
    """Depth after a dam at x = 0 fails over a dry frictionless bed (Ritter 1892)."""
    c = np.sqrt(G * h0)
    return np.where(x < -c * time, h0, np.where(x > 2 * c * time, 0, (2 * c - x / time) ** 2 / (9 * G)))


def _stoker(x, time, h0, h1):
    """Depth after a dam at x = 0 fails over shallower still water (Stoker 1957, Water Waves, section 10.8)."""
    c0, c1 = np.sqrt(G * h0), np.sqrt(G * h1)

    def mismatch(s):  # speed of the shock; the speed behind it must meet the fan
        c2 = c1 * np.sqrt((np.sqrt(1 + 8 * (s / c1) ** 2) - 1) / 2)
        return s - c1**2 / (4 * s) * (1 + np.sqrt(1 + 8 * (s / c1) ** 2)) + 2 * c2 - 2 * c0

    s = brentq(mismatch, 1.0001 * c1, 10 * c0)
    c2 = c1 * np.sqrt((np.sqrt(1 + 8 * (s / c1) ** 2) - 1) / 2)
    u2 = 2 * (c0 - c2)
    fan = (2 * c0 - x / time) ** 2 / (9 * G)
    return np.select([x < -c0 * time, x < (u2 - c2) * time, x < s * time], [h0 + 0 * x, fan, c2**2 / G + 0 * x], h1)


@pytest.mark.parametrize(
    ("exact", "low", "most"),
    [(lambda x, t: _stoker(x, t, 2.0, 0.5), 0.5, 0.012), (lambda x, t: _ritter(x, t, 2.0), 0.0, 0.012)],
    ids=["Stoker 1957", "Ritter 1892"],
)
def test_a_dam_break_follows_the_closed_form_and_the_error_falls_with_the_mesh(exact, low, most):
    """Sources: Stoker 1957; Ritter 1892.

    Tolerance: a second-order scheme is of order one in L1 at a shock and at a kink (LeVeque 2002,
    Finite Volume Methods, section 8.7); measured here 1.0 (Stoker) and 0.8 (Ritter, whose front is a thin film). The limits on the errors are 0.6 %
    and 0.15 % of the 2 m dam.
    """
    errors = []
    for spacing in (1.0, 0.5, 0.25):
        t = _grid(100, 3, spacing)
        m = _model(t, np.zeros(len(t.xy)))
        x = t.centre[:, 0] - 50
        m.h[:] = np.where(x < 0, 2.0, low)
        m.advance(5.0)
        errors.append(np.sum(t.area * np.abs(m.h - exact(x, m.time))) / t.area.sum())
    assert errors[0] < most
    assert errors[2] < 0.003
    assert np.log2(errors[0] / errors[2]) / 2 > 0.7


def test_a_long_slope_comes_to_the_depth_of_manning():
    """Source: Manning's formula for a wide channel, q = h^(5/3) sqrt(S) / n (Chow 1959, section 6-2).

    Tolerance: bed steps of half a cell at the two ends move the depth there by parts in a thousand;
    the middle half is held to 0.1 %.
    """
    q, slope, n = 3.0, 0.0015, 0.03
    depth = (q * n / np.sqrt(slope)) ** 0.6
    t = _grid(200, 8, 4.0, seed=3)
    kind = _model(t, np.zeros(len(t.xy))).kind
    kind[(t.right < 0) & (t.middle[:, 0] < 1e-6)] = RIVER
    kind[(t.right < 0) & (t.middle[:, 0] > 200 - 1e-6)] = OUTFLOW
    m = _model(t, -slope * t.xy[:, 0], n, kind=kind, alpha=0.1)
    m.h[:] = 0.9 * depth
    m.hu[:] = q
    zero = np.zeros(1)
    level = np.array([-slope * 200 + depth])
    m.advance(900.0, Drive(zero, np.array([q * 8]), zero, zero, level))
    middle = np.abs(t.centre[:, 0] - 100) < 50
    assert m.h[middle].mean() == pytest.approx(depth, rel=1e-3)
    held = m.state[2] - m.state[3] + m.state[4] + 0.9 * depth * 1600
    assert m.volume == pytest.approx(held, rel=1e-12)  # what came in less what went out, to rounding


def test_water_sloshing_in_a_closed_basin_is_conserved():
    """Law: conservation of volume. Tolerance: rounding of some hundreds of steps over 1e3 m3."""
    t = _grid(30, 20, 1.0, seed=5)
    m = _model(t, 0.05 * np.abs(t.xy[:, 0] - 15), 0.02, alpha=0.3)
    m.h[:] = np.maximum(np.where(t.centre[:, 0] < 12, 1.5, 0.6) - m.bed, 0)
    before = m.volume
    m.advance(15.0)
    assert np.abs(m.hu).max() > 0.1
    assert m.volume - m.state[4] == pytest.approx(before, rel=1e-13)


def test_the_culvert_moves_water_and_makes_none():
    """Law: what leaves the inlet's pond arrives in the outlet's; a ridge parts the two ponds.

    Tolerance: rounding.
    """
    t = _grid(20, 5, 1.0, seed=6)
    inlet, outlet = (int(np.hypot(t.centre[:, 0] - x, t.centre[:, 1] - 2.5).argmin()) for x in (4, 16))
    m = _model(t, 3.0 * np.exp(-((t.xy[:, 0] - 10) ** 2)), link=(inlet, outlet), link_area=0.28, link_loss=1.8)
    upper = t.centre[:, 0] < 10
    m.h[:] = np.maximum(np.where(upper, 1.5, 0.5) - m.bed, 0)
    before, high = m.volume, np.sum((m.h * t.area)[upper])
    m.advance(0.002)
    # Full pipe: Q = A sqrt(2 g fall / loss), with the fall of 1 m that the cells' levels still have.
    assert m.state[8] / 0.002 == pytest.approx(0.28 * np.sqrt(2 * G * 1.0 / 1.8), rel=0.01)
    m.advance(3.0)
    assert m.volume == pytest.approx(before, rel=1e-13)
    assert high - np.sum((m.h * t.area)[upper]) == pytest.approx(m.state[8], rel=1e-9)
