"""Open-channel and weir relations against worked examples.

Formulas: Manning 1891; Chow 1959; Henderson 1966; ISO 3846, ISO 1438 and Villemonte 1947 (coefficients
from memory). A weir formula checks the formula, not a 2D field. Numbers that follow from a closed form
were worked by hand and are held to 1e-5 relative.
"""

from __future__ import annotations

import numpy as np
import pytest

from hydro.section import relations as r
from hydro.section import weir as w


def close(value: float) -> object:
    return pytest.approx(value, rel=1e-5)


def test_manning_in_a_rectangle_and_in_a_wide_cell():
    assert 40 * r.manning_velocity(20 * 2 / 24, 0.001, 0.030) == close(59.2704)
    assert 2 * r.manning_velocity(2.0, 0.001, 0.030) == close(3.34654)


def test_chow_trapezoid_normal_and_critical_depth():
    """Source: Chow 1959, Examples 4-2 and 6-2 (from memory): 3.36 ft and 2.15 ft; tolerance 0.5 % (1.49 against 1.486)."""
    ft = 0.3048
    q = 400 * ft**3
    assert r.normal_depth(q, 20 * ft, 2, 0.0016, 0.025) / ft == pytest.approx(3.36, rel=0.005)
    assert r.critical_depth(q, 20 * ft, 2) / ft == pytest.approx(2.15, rel=0.005)


def test_critical_depth_and_specific_energy_of_a_rectangle():
    critical = r.critical_depth(3.0, 1.0)
    assert critical == close(0.971683)
    assert r.specific_energy(critical, 3.0) == close(1.45752)
    assert r.specific_energy(1.5, 3.0) == close(1.70387)
    assert r.specific_energy(0.664255, 3.0) == close(1.70387)


def test_hydraulic_jump_depth_and_both_ways_of_its_loss():
    after = r.conjugate_depth(0.4, 2.4)
    assert after == close(1.52504)
    assert r.jump_loss(0.4, after) == close(0.583589)
    assert r.specific_energy(0.4, 2.4) - r.specific_energy(after, 2.4) == pytest.approx(r.jump_loss(0.4, after), abs=1e-12)


def test_bend_rise_by_the_simple_formula_and_by_the_free_vortex():
    assert r.bend_rise(2.5, 40, 150) == close(0.169895)
    assert r.free_vortex_rise(375, 130, 170) == pytest.approx(0.1761, abs=5e-5)


def test_bed_shear():
    assert r.bed_shear(1.5, 2.0, 0.030) == close(15.7671)


def test_a_drop_and_its_submergence():
    toe = r.drop_toe_depth(1.5, 1.5)
    assert toe == close(0.228869)
    after = r.conjugate_depth(toe, 1.5)
    assert after == pytest.approx(1.3059, abs=5e-5)
    got = [r.submergence(t, after) for t in (0.8, 1.3, 2.2)]
    assert got == [pytest.approx(v, abs=1e-5) for v in (-0.387398, -0.00452122, 0.684656)]


def test_weir_relations():
    assert w.broad_crested(0.60, 10.0, coefficient=1.0) == close(7.92364)
    assert w.broad_crested(0.60, 10.0) == close(6.84602)
    assert w.rehbock(0.30, 2.0, 0.8) == close(0.618102)
    assert w.kindsvater_carter(0.30, 2.0, 0.8) == close(0.614284)
    assert w.kindsvater_carter(0.25, 1.0, 0.6, width_ratio=0.5) == close(0.222198)


def test_villemonte_and_its_limits():
    got = [w.villemonte(x) for x in (0.2, 0.5, 0.8, 0.9)]
    assert got == [close(v) for v in (0.964569, 0.845386, 0.616307, 0.476966)]
    assert w.villemonte(-0.3) == 1.0 and w.villemonte(1.0) == 0.0


def test_a_weir_outside_its_range_says_so_and_a_drowned_one_carries_less():
    free = w.weir_discharge("broad-crested", upstream_head_m=0.5, downstream_head_m=-1, width_m=30, crest_height_m=1.2)
    drowned = w.weir_discharge("broad-crested", upstream_head_m=0.5, downstream_head_m=0.4, width_m=30, crest_height_m=1.2)
    assert drowned.discharge_m3_s == pytest.approx(free.discharge_m3_s * w.villemonte(0.8))
    assert any("drowned" in text for text in drowned.outside) and not free.outside
    with pytest.raises(ValueError, match="rehbock"):
        w.weir_discharge("ogee", upstream_head_m=0.5, downstream_head_m=0, width_m=1, crest_height_m=1)
    with pytest.raises(ValueError, match="check the crest level"):
        w.weir_discharge("rehbock", upstream_head_m=-0.5, downstream_head_m=0, width_m=1, crest_height_m=1)


def test_oblique_jump_relations_hold():
    """Source: Ippen 1951 (from memory): Froude 2.74 at a wall turned 8.95 deg gives a front at 29.99 deg, ratio 1.5003.

    The ratio follows from the front by the jump relation with the normal Froude number.
    """
    normal = 2.74 * np.sin(np.radians(29.99))
    depth = 1.0
    q = normal * np.sqrt(r.G * depth**3)
    assert r.conjugate_depth(depth, q) == pytest.approx(1.5003, abs=1e-3)
