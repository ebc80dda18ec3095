"""Logs against closed forms: draft, a rod in shear, translation, mixing, and the intervals of a reference library."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from scipy import stats

from hydro._kernels.wood import over_draft, uniform
from hydro.drift import Rules, design_log_length, draft, drift, logs, share_of, wilson
from hydro.drift.wood import Wood
from hydro.reach import NamedLine, Structure
from hydro.streamfunction import stream_function
from tests.builders import channel, raw_of, run_of, sides

TABLE = {
    "name": "made", "number": 400, "seed": 7, "length_m": {"distribution": "uniform", "least": 2.0, "greatest": 6.0},
    "diameter_m": 0.3, "density_ratio": 0.6,
}


def _wood(n=1, length=4.0, diameter=0.3, angle=0.0, place=0.5, released=0.0):
    one = lambda v: np.broadcast_to(np.asarray(v, float), n).copy()  # noqa: E731
    return Wood(one(length), one(diameter), one(0.5), one(angle), one(place), one(released))


def test_draft_of_a_cylinder_and_the_trap():
    """Source: Archimedes; d/D for ratios 0.3 to 0.9. The trap: 2.4 m at 0.4 draws 1.0107 m, not the 0.041 m once printed."""
    ratios = np.array([0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9])
    expected = [0.340154, 0.421132, 0.5, 0.578868, 0.659846, 0.745931, 0.843524]
    assert draft(np.ones(7), ratios) == pytest.approx(expected, abs=1e-6)
    assert draft(2.4, 0.4) == pytest.approx(1.0107, abs=1e-4)
    assert draft(1.0, 0.3) + draft(1.0, 0.7) == pytest.approx(1.0)
    with pytest.raises(ValueError, match="between 0 and 1"):
        draft(1.0, 1.2)


def test_velocity_over_the_draft_of_a_power_profile():
    """Source: integral of z^(1/m); at the surface (m+1)/m, over the whole depth 1."""
    assert over_draft(0.0, 2.0, 7.0) == pytest.approx(8 / 7)
    assert over_draft(2.0, 2.0, 7.0) == pytest.approx(1.0)
    assert over_draft(0.5, 2.0, 7.0) == pytest.approx((1 - 0.75 ** (8 / 7)) / 0.25)


def test_a_slender_rod_in_shear_turns_as_jeffery_says():
    """Source: Jeffery 1922, slender limit: d theta/dt = -G sin^2 theta, so cot theta = cot theta_0 + G t.

    Tolerance 1 %: steps of 0.02 s and five points along the axis (exact for linear shear).
    """
    shear = 0.2
    mesh = channel(60, 20, 60, 20, corner=(-30, -10))
    run = run_of(mesh, [0.0], [raw_of(mesh, 3.0, (lambda x, y: shear * y, 0.0), stored_on="node")])
    start = np.pi / 2
    found = drift(run, [("r", np.array([[0.0, 0.0]]), _wood(angle=start))], rules=Rules(profile=0, step_s=0.02), duration_s=20, every_s=5)
    angle = np.arctan2(np.sin(found.paths[0, :, 2]), np.cos(found.paths[0, :, 2]))
    expected = np.arctan2(1.0, 1 / np.tan(start) + shear * found.times)
    assert angle[1:] == pytest.approx(expected[1:], rel=0.01)
    assert found.paths[0, -1, :2] == pytest.approx([0, 0], abs=1e-4)


def test_a_log_in_a_uniform_stream_moves_with_the_water_and_leaves():
    mesh = channel()
    run = run_of(mesh, [0.0], [raw_of(mesh, 2.0, (1.0, 0.0))])
    open_ = stream_function(run.frame(0), boundary_sets={k: v for k, v in sides(mesh).items() if k in ("west", "east")}).open_boundaries
    found = drift(run, [("r", np.array([[10.0, 10.0]]), _wood())], boundaries=open_, rules=Rules(profile=0), duration_s=200, every_s=10)
    assert found.paths[0, 5, 0] == pytest.approx(60, abs=1e-3)
    assert found.state[0] == 1  # left


def test_mixing_spreads_logs_by_two_k_t():
    """Source: variance 2 K t; with 2,000 logs its sampling error is 3 %: 12 % is four standard errors (1 in 16,000)."""
    mesh = channel(100, 100, 200, 200, corner=(-100, -100))
    run = run_of(mesh, [0.0], [raw_of(mesh, 3.0, (0.0, 0.0))])
    found = drift(run, [("r", np.array([[0.0, 0.0]]), _wood(2000, length=1.0))], rules=Rules(mixing_m2_s=0.5), duration_s=60, every_s=60)
    assert found.paths[:, -1, :2].var(axis=0) == pytest.approx(2 * 0.5 * 60, rel=0.12)


def test_numbers_depend_on_their_key_alone_and_are_uniform():
    """Kolmogorov-Smirnov against the uniform law; the level 1e-4 is the false-alarm rate."""
    u = np.array([uniform(3, i, 5, 1) for i in range(4000)])
    assert stats.kstest(u, "uniform").pvalue > 1e-4
    assert uniform(3, 17, 5, 1) == u[17]
    assert abs(np.corrcoef(u[:-1], u[1:])[0, 1]) < 0.07


def test_wilson_intervals_agree_with_a_reference_library():
    """Source: scipy.stats.binomtest(...).proportion_ci(method='wilson')."""
    for count, whole in ((0, 20), (31, 100), (1999, 2000)):
        ci = stats.binomtest(count, whole).proportion_ci(method="wilson")
        assert wilson(count, whole) == pytest.approx((ci.low, ci.high), abs=1e-12)


def test_logs_that_fare_alike_together_widen_the_interval():
    groups = np.repeat(np.arange(20), 50)
    alike = np.isin(groups, np.arange(0, 20, 2))
    mixed = np.tile([True, False], 500)
    assert share_of(alike, groups).low < share_of(mixed, groups).low - 0.1
    assert share_of(alike, groups).value == share_of(mixed, groups).value == 0.5


def _pier(x=50.0, y=10.0, r=1.5):
    return Structure("p", "Pier 1", "pier", "hole", shapely.Point(x, y).buffer(r, quad_segs=8))


def _past_a_pier(rules, seed=1):
    mesh = channel()
    run = run_of(mesh, [0.0], [raw_of(mesh, 2.0, (1.0, 0.0))])
    openings = (
        NamedLine("l", "Left", shapely.LineString([(50, 20), (50, 10)])), NamedLine("r", "Right", shapely.LineString([(50, 10), (50, 0)])),
    )
    wood = logs(TABLE)
    line = np.array([[20.0, 2.0], [20.0, 18.0]])
    open_ = stream_function(run.frame(0), boundary_sets={k: v for k, v in sides(mesh).items() if k in ("west", "east")}).open_boundaries
    return drift(run, [("r", line, wood)], piers=[_pier()], openings=openings, rules=rules, seed=seed, boundaries=open_, duration_s=120)


def test_the_share_that_touches_a_pier_is_the_width_it_sweeps():
    """Source: geometry: straight paths; a log at angle a touches when its middle is within r + D/2 + (L/2)|sin a| of the pier.

    Tolerance: four binomial standard errors of 400 logs, and the rounding of the outline to 32 sides.
    """
    found = _past_a_pier(Rules(profile=0, lodge_share=0.0, step_s=0.05))
    w = found.wood
    reach = np.abs(2.0 + 16.0 * w.place - 10.0) <= 1.5 + w.diameter / 2 + w.length / 2 * np.abs(np.sin(w.angle))
    expected = reach.mean()
    assert found.touches(0).value == pytest.approx(expected, abs=4 * np.sqrt(expected * (1 - expected) / 400) / 4)
    assert (found.touched[:, 0] <= reach | (np.abs(2.0 + 16.0 * w.place - 10.0) < 5)).all()
    assert found.passes(0).count + found.passes(1).count == 400


def test_the_rule_for_lodging_decides_and_never_lets_more_lodge_than_touch():
    never, middle = _past_a_pier(Rules(profile=0, lodge_share=0.0)), _past_a_pier(Rules(profile=0, lodge_share=0.3))
    assert never.lodges(0).count == 0 < middle.lodges(0).count <= middle.touches(0).count


def test_the_same_seed_gives_the_same_digits_and_the_corridor_sums_to_the_logs():
    a, b = _past_a_pier(Rules(mixing_m2_s=0.02), seed=5), _past_a_pier(Rules(mixing_m2_s=0.02), seed=5)
    np.testing.assert_array_equal(a.paths, b.paths)
    assert a.corridor(2.0)[0].sum() == pytest.approx(400)
    assert sum(a.fed(0).values()) == a.touches(0).count
    assert not np.array_equal(a.paths, _past_a_pier(Rules(mixing_m2_s=0.02), seed=6).paths)


def test_a_log_grounds_where_the_water_is_shallower_than_its_draft_and_floats_off_later():
    mesh = channel()
    depths = (1.0, 0.05, 0.05, 1.0)
    run = run_of(mesh, [0, 10, 20, 30.0], [raw_of(mesh, h, (1.0, 0.0), stored_on="node") for h in depths])
    found = drift(run, [("r", np.array([[10.0, 10.0]]), _wood())], rules=Rules(profile=0), every_s=1.0)
    x = found.paths[0, :, 0]
    assert np.ptp(x[11:20]) == pytest.approx(0, abs=1e-6) and x[-1] > x[19] + 1


def test_deck_contact_is_by_the_log_tops_level():
    found = _past_a_pier(Rules(profile=0, lodge_share=0.0))
    top = 2.0 - found.wood.draft[0] + 0.3
    assert found.deck_contacts(top - 0.01).count == 400 and found.deck_contacts(top + 0.01).count == 0


def test_design_log_length():
    """Source: Diehl 1997, FHWA-RD-97-028 (rule from memory)."""
    assert [design_log_length(w) for w in (8, 12, 20, 40, 80)] == [8, 12, 14, 19, 24]


@pytest.mark.parametrize(("change", "says"), [
    ({"number": 0}, "at least one log"), ({"density_ratio": 1.0}, "stays below 1"), ({"diameter_m": 9.0}, "thicker than long"),
    ({"length_m": {"distribution": "magic"}}, "uniform or lognormal"), ({"colour": 1}, "'colour' is not known"),
])  # fmt: skip
def test_a_release_that_cannot_be_says_why(change, says):
    with pytest.raises(ValueError, match=says):
        logs({**TABLE, **change})


def test_a_release_outside_the_water_says_so():
    mesh = channel()
    run = run_of(mesh, [0.0], [raw_of(mesh, 2.0, (1.0, 0.0))])
    with pytest.raises(ValueError, match="outside the mesh"):
        drift(run, [("r", np.array([[500.0, 0.0]]), _wood())])
