"""Figures are shown in the chosen units, rounded to what they can bear."""

from __future__ import annotations

import pytest

from dashboard import text
from dashboard.units import Units, round_step


def test_both_feet_are_exact_and_kept_apart():
    """Source: the international foot is 0.3048 m; the US survey foot 1200/3937 m (NIST SP 811, appendix B.6)."""
    assert Units("international feet").factor("m") == pytest.approx(1 / 0.3048, rel=1e-15)
    assert Units("US survey feet").factor("m") == pytest.approx(3937 / 1200, rel=1e-15)
    assert Units("US survey feet").quantity(0.3048, "m", digits=7) != Units("international feet").quantity(0.3048, "m", digits=7)


def test_areas_volumes_and_rates_go_with_their_power():
    """1 m3/s is 35.3147 ft3/s, 1 m2 is 10.7639 ft2, 1 m/s 3.28084 ft/s (NIST SP 811)."""
    u = Units("international feet")
    assert u.factor("m3/s") == pytest.approx(35.3147, rel=1e-6)
    assert u.factor("m2") == pytest.approx(10.7639, rel=1e-6)
    assert u.factor("m/s") == pytest.approx(3.28084, rel=1e-6)
    assert u.factor("s") == 1.0


def test_a_number_never_breaks_from_its_unit():
    assert Units().quantity(456.0, "m2") == "456\u00a0m\u00b2"
    assert "\u00a0" in text.percent(0.061) and "\u00a0" in text.elapsed(95)


@pytest.mark.parametrize(("value", "low", "high", "shown"), [
    (456.31, 440.2, 474.9, "460"), (456.31, None, None, "456"), (-3.21, None, None, "\u22123.21"), (None, None, None, "n/a"),
    (float("nan"), None, None, "n/a"), (123456.0, None, None, "123\u202f000"),
])
def test_numbers_are_rounded_to_their_sensitivity(value, low, high, shown):
    assert Units().number(value, "m2", low, high) == shown


@pytest.mark.parametrize(("seconds", "shown"), [
    (12.44, "12.4\u00a0s"), (95, "1\u00a0min\u00a035\u00a0s"), (3900, "1\u00a0h 5\u00a0min"), (7199.9, "2\u00a0h"), (120, "2\u00a0min"),
])
def test_lengths_of_time_read_like_speech(seconds, shown):
    assert text.elapsed(seconds).replace("min ", "min\u00a0").replace("\u00a0h\u00a0", "\u00a0h ") == shown


def test_what_a_user_wrote_is_only_text():
    assert text.safe('<script>alert("x")</script>') == "&lt;script&gt;alert(&quot;x&quot;)&lt;/script&gt;"


@pytest.mark.parametrize(("target", "step"), [(0.9, 0.5), (1.0, 1.0), (3.7, 2.0), (69.0, 50.0), (1000.0, 1000.0)])
def test_scales_step_by_one_two_and_five(target, step):
    assert round_step(target) == pytest.approx(step)
