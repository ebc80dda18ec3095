"""Units: every spelling of one unit is that unit; others are refused, never guessed."""

from __future__ import annotations

import pytest

from hydro.readers.units import factor_to_si, fits, is_degrees, parse_unit


@pytest.mark.parametrize(
    ("quantity", "spellings", "factor"),
    [
        ("depth", ["m", "metre", "meters", "M"], 1.0),
        ("depth", ["ft", "foot", "feet", "international_foot"], 0.3048),
        ("level", ["US_survey_foot", "us-ft", "survey_feet"], 1200 / 3937),
        ("depth", ["mm", "millimetres"], 0.001),
        ("velocity_x", ["m s-1", "m/s", "m s^-1", "m.s-1", "m s**-1", "m*s**-1", "metre per second", "m·s-1", "mps"], 1.0),
        ("velocity_x", ["ft/s", "ft s-1", "fps", "feet per second"], 0.3048),
        ("velocity_y", ["km/h", "km h-1", "km/hr"], 1 / 3.6),
        ("unit_discharge_x", ["m2 s-1", "m2/s", "m^2/s", "m**2 s-1", "m3 s-1 m-1", "m3/s/m", "m3/(s m)"], 1.0),
        ("unit_discharge_x", ["ft2/s", "ft^2 s-1"], 0.3048**2),
        ("edge_discharge", ["m3 s-1", "m3/s", "cumec", "m^3/s", "m2 s-1 m"], 1.0),
        ("edge_discharge", ["cfs", "ft3/s", "ft^3 s-1"], 0.3048**3),
        ("edge_discharge", ["l/s", "litre s-1"], 0.001),
        ("roughness", ["s m-1/3", "s/m^(1/3)", "m^(-1/3) s", "s m**-1/3", "s.m-1/3"], 1.0),
        ("time", ["s", "seconds", "sec"], 1.0),
        ("time", ["d", "days"], 86400.0),
    ],
)
def test_spellings(quantity, spellings, factor):
    """Factors: NIST SP 811, appendix B (1 ft = 0.3048 m; 1 US survey foot = 1200/3937 m), from memory."""
    for text in spellings:
        assert factor_to_si(text, quantity) == pytest.approx(factor, rel=1e-12), text


@pytest.mark.parametrize("text", ["", "furlong", "m//s", "m/", "(m", "m)", "2 m", "m s-1 -", "%", "ms", "knots?"])
def test_what_is_not_understood_is_refused(text):
    assert not fits(text, "velocity_x")


def test_a_unit_of_something_else_is_refused_with_an_example():
    with pytest.raises(ValueError, match=r"'m' does not measure velocity x \(as 'm s-1' does\)"):
        factor_to_si("m", "velocity_x")


def test_the_two_feet_stay_apart():
    assert parse_unit("ft").factor != parse_unit("US_survey_foot").factor


@pytest.mark.parametrize("text", ["degrees_east", "degree_north", "degrees", "deg", "degreesE", "degree_N"])
def test_degrees(text):
    assert is_degrees(text)
    assert not is_degrees("m")
