"""Screening relations against published samples and worked examples.

Sources: FHWA HEC-18 5th ed. (pier scour; a published sample of an online calculator, answer 10.484 m, and a
published spreadsheet, K2 3.2 and 7.7 ft); Defra/EA 2008 (HR); AIDR 7-3 2017 (classes, edges from memory).
"""

from __future__ import annotations

import pytest

from hydro import screening as s


def test_published_sample_of_pier_scour():
    found = s.pier_scour(5.334, 7.15, 4.52, length_m=5.1, nose="cylinder", k3=1.1)
    assert found.froude == pytest.approx(0.988428, abs=1e-6)
    assert found.uncapped_m == pytest.approx(10.484, abs=0.002)


def test_an_aligned_round_pier_is_capped_and_says_so():
    found = s.pier_scour(3.12, 3.36, 1.22, k3=1.1)
    assert found.uncapped_m == pytest.approx(3.00874, abs=1e-5)
    assert found.depth_m == pytest.approx(2.4 * 1.22) and found.capped and found.notes


def test_a_skewed_long_pier_is_not_capped_and_its_length_is_cut():
    found = s.pier_scour(3.12, 3.36, 1.22, length_m=18, angle_deg=20, k3=1.1)
    assert found.k2 == pytest.approx(2.86286, abs=1e-5)
    assert found.depth_m == pytest.approx(8.6136, abs=1e-3) and not found.capped
    ft = 0.3048
    sheet = s.pier_scour(2 * ft, 2 * ft, 2 * ft, length_m=30 * ft, angle_deg=25, k3=1.1)
    assert sheet.k2 == pytest.approx(3.2, abs=0.05) and sheet.depth_m / ft == pytest.approx(7.7, abs=0.05)


def test_blockage_and_projected_width():
    assert s.blockage([1.2] * 3, 60) == (pytest.approx(0.06), pytest.approx(1.06383, abs=1e-5))
    assert s.projected_width(1.5, 9, 15) == pytest.approx(3.77826, abs=1e-5)


def test_hazard_rating_examples():
    assert s.hazard_rating(0.5, 0.4, 0.5) == (pytest.approx(0.95), "danger for some")
    assert s.hazard_rating(0.2, 0.3, 0.0) == (pytest.approx(0.16), "low")
    assert s.hazard_rating(0.8, 1.2, 1.0) == (pytest.approx(2.36), "danger for all")


@pytest.mark.parametrize(("depth", "speed", "expected"), [
    (0.25, 1.0, "H1"), (0.4, 1.2, "H2"), (1.0, 0.5, "H3"), (1.5, 0.5, "H4"), (1.0, 2.5, "H5"), (2.5, 0.1, "H5"),
    (5.0, 0.1, "H6"), (0.3, 1.0, "H1"), (0.5, 1.2, "H2"), (1.2, 0.5, "H3"), (2.0, 0.5, "H4"),
])  # fmt: skip
def test_classes_for_people_on_and_off_their_edges(depth, speed, expected):
    assert s.people_class(depth, speed) == expected
