"""Figures are shown in the chosen units, rounded to what they can bear."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

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


SENTENCES = [
    # 1 m = 3.28084 ft, 1 m2 = 10.7639 ft2, 1 m3/s = 35.3147 ft3/s (NIST SP 811), each to the resolution of the number.
    ("Chainage 523 m, 15 m left of the centre line.", "Chainage 1716 ft, 49 ft left of the centre line."),
    ("It is 0.30 m deep.", "It is 0.98 ft deep."),
    ("The level rises by +0.012 m.", "The level rises by +0.039 ft."),
    ("It falls by -0.30 m.", "It falls by \u22120.98 ft."),
    ("112 m3/s pass.", "3960 ft\u00b3/s pass."),
    ("2.54 m3/s pass.", "89.7 ft\u00b3/s pass."),
    ("Edges of 0.61 to 6.28 m.", "Edges of 2.00 to 20.60 ft."),
    ("1,240 m2 become wet.", "13\u202f350 ft\u00b2 become wet."),
    ("9.0 m/s in 0.11 m of water", "29.5 ft/s in 0.36 ft of water"),
    ("0.5 m2/s", "5 ft\u00b2/s"),
]


@pytest.mark.parametrize(("said", "shown"), SENTENCES)
def test_quantities_of_a_sentence_are_shown_in_feet_to_their_own_resolution(said, shown):
    assert Units("international feet").sentence(said).replace("\u00a0", " ") == shown


def test_a_sentence_in_si_keeps_its_numbers_and_has_the_screens_units():
    said = Units().sentence("Takes 2.54 m3/s round on 1,240 m2, -0.30 m below 0.6 to 6.3 m.")
    assert said == "Takes 2.54\u00a0m\u00b3/s round on 1240\u00a0m\u00b2, \u22120.30\u00a0m below 0.6 to 6.3\u00a0m."


@pytest.mark.parametrize("said", [
    "Frames 3 and 4 stand 10 s apart.", "Pier 2 must be asked about.", "52440.9 E, 31145.3 N", "Manning's n of 0.033", "12.3 % of the water",
    "5 min later", "a slope of 0.5 m/m", "3 mm", "SHA-256 12 months", "at 88 degrees to the flow", "h2m 5 metres",
])
def test_what_is_no_length_area_or_flow_stays_as_it_is(said):
    assert Units("US survey feet").sentence(said) == said


@given(st.floats(0.01, 5000), st.integers(0, 3), st.sampled_from(["m", "m2", "m3", "m/s", "m2/s", "m3/s"]))
def test_a_sentences_number_is_the_si_number_times_the_factor_within_its_last_digit(value, decimals, unit):
    """Law: a printed number stands for itself and half its last digit either way; so must the converted one."""
    u = Units("international feet")
    printed = f"{value:.{decimals}f}"
    shown = u.sentence(f"{printed} {unit}").split("\u00a0")[0].replace("\u202f", "")
    last = 10.0 ** -decimals * u.factor(unit)
    assert float(shown) == pytest.approx(float(printed) * u.factor(unit), abs=0.5 * last + 1e-9)


@pytest.mark.parametrize("name", ["SI", "US survey feet"])
def test_a_number_made_of_a_figure_and_one_read_from_a_sentence_show_one_unit(name):
    u = Units(name)
    assert u.quantity(112.0, "m3/s").split("\u00a0")[1] == u.sentence("112 m3/s").split("\u00a0")[1] == u.label("m3/s")
