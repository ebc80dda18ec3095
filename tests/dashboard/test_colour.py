"""The theme's colours keep the promises that the look makes."""

from __future__ import annotations

import numpy as np
import pytest

from dashboard import colour, theme
from dashboard.theme import DARK, HALL, LIGHT

# Sharma, Wu & Dalal 2005, table 1, pairs 1, 2, 3, 7, 9, 17, 18, 25, 31, 33 and 34 (from memory).
SHARMA = [
    ((50.0, 2.6772, -79.7751), (50.0, 0.0, -82.7485), 2.0425),
    ((50.0, 3.1571, -77.2803), (50.0, 0.0, -82.7485), 2.8615),
    ((50.0, 2.8361, -74.0200), (50.0, 0.0, -82.7485), 3.4412),
    ((50.0, 0.0, 0.0), (50.0, -1.0, 2.0), 2.3669),
    ((50.0, 2.4900, -0.0010), (50.0, -2.4900, 0.0009), 7.1792),
    ((50.0, 2.5, 0.0), (50.0, 0.0, -2.5), 4.3065),
    ((50.0, 2.5, 0.0), (73.0, 25.0, -18.0), 27.1492),
    ((60.2574, -34.0099, 36.2677), (60.4626, -34.1751, 39.4387), 1.2644),
    ((22.7233, 20.0904, -46.6940), (23.0331, 14.9730, -42.5619), 2.0373),
    ((90.9257, -0.5406, -0.9208), (88.6381, -0.8985, -0.7239), 1.5381),
    ((2.0776, 0.0795, -1.1350), (0.9033, -0.0636, -0.5514), 0.9082),
]


@pytest.mark.parametrize(("first", "second", "expected"), SHARMA)
def test_ciede2000_gives_the_published_differences(first, second, expected):
    """Tolerance: the table has four decimals."""
    assert colour.ciede2000(np.array(first), np.array(second)) == pytest.approx(expected, abs=5e-5)


def test_white_and_mid_grey_have_their_lab_values():
    """sRGB #777777 has L* 50.03 (CIE 15 with IEC 61966-2-1); white is (100, 0, 0)."""
    assert colour.lab(colour.rgb("#ffffff")) == pytest.approx([100, 0, 0], abs=0.02)
    assert colour.lab(colour.rgb("#777777"))[0] == pytest.approx(50.03, abs=0.01)


def test_a_colour_survives_the_way_through_lab():
    for name in ("#E1EDEF", "#508CAB", "#A8321A"):
        assert colour.hexed(colour.from_lab(colour.lab(colour.rgb(name)))) == name.lower()


@pytest.mark.parametrize("palette", [LIGHT, DARK, HALL], ids=["day", "night", "hall"])
def test_the_water_ramp_is_even_to_the_eye(palette):
    """Equal steps: no CIEDE2000 step differs by more than a twentieth from their mean (8-bit colours aside)."""
    ramp = colour.ramp([palette.slow, palette.middle, palette.fast], 127)
    steps = colour.ciede2000(ramp[:-1], ramp[1:])
    assert np.abs(steps / steps.mean() - 1).max() < 0.05


def contrast(first: str, second: str) -> float:
    """Contrast ratio of two "#rrggbb" by WCAG 2.2, 1 to 21."""
    def luminance(hex_colour: str) -> float:
        c = colour.rgb(hex_colour)
        linear = np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)
        return float(linear @ np.array([0.2126, 0.7152, 0.0722]))

    dark, light = sorted(luminance(c) for c in (first, second))
    return (light + 0.05) / (dark + 0.05)



@pytest.mark.parametrize("palette", [LIGHT, DARK, HALL], ids=["day", "night", "hall"])
def test_contrasts_are_those_of_wcag(palette):
    """WCAG 2.2, 1.4.3 and 1.4.11: text 4.5:1, graphics 3:1; ink is seen on every shade of water."""
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)
    for text in (palette.ink, palette.ink2, palette.signal):
        assert contrast(text, palette.paper) >= 4.5
    assert contrast(palette.on_signal, palette.signal) >= 4.5
    assert contrast(palette.edge, palette.paper) >= 3.0
    for shade in theme.water_palette(palette)[theme.EVEN : theme.EVEN + 2 * theme.SHADES]:
        assert contrast(palette.ink, shade) >= 3.0


def test_every_second_tube_is_seven_lightness_steps_away():
    """Tolerance: 8-bit colours move L* by up to 0.3."""
    shades = theme.water_palette(LIGHT)
    even, odd = (colour.lab(colour.rgb(list(shades[k : k + theme.SHADES]))) for k in (theme.EVEN, theme.ODD))
    assert even[:, 0] - odd[:, 0] == pytest.approx(7.0, abs=0.4)
