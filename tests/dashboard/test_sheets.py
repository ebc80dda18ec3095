"""Sheets that leave the page: whole SVG, with every caution, the map's lines, and no property left unresolved."""

from __future__ import annotations

import re
from xml.etree import ElementTree

import numpy as np
import pytest
import shapely

from dashboard import theme
from dashboard.questions.moments import window_of
from dashboard.questions.stations import typed_ends
from dashboard.raster import View
from dashboard.sheets import Drawn, of_page, resolved, sheet
from dashboard.units import Units
from dashboard.views import map as drawing
from dashboard.views import ribbon
from dashboard.views.scene import LineMark, Scene, ZoneMark
from dashboard.views.vector import map_svg
from hydro.cautions import CAUTIONS

DAY, VIEW = theme.look("day"), View(0.0, 0.0, 100.0, 800, 400)


def test_a_sheet_holds_its_title_words_and_the_full_text_of_every_caution():
    made = sheet("Sections: <script>", ["Passes 3 m\u00b3/s."], [Drawn('<svg viewBox="0 0 1 1"><path d="M0 0"/></svg>', 100, 40)], list(CAUTIONS))
    tree = ElementTree.fromstring(made)
    words = " ".join(t.text or "" for t in tree.iter("{http://www.w3.org/2000/svg}text"))
    assert "Sections: <script>" in words  # escaped in the file, itself again when read
    told = re.sub(r"\s+", " ", words)
    missing = [id_ for id_, c in CAUTIONS.items() if re.sub(r"\s+", " ", c.text) not in told]
    assert missing == []


def test_no_custom_property_or_product_is_left_in_a_sheets_style():
    made = sheet("t", [], [Drawn('<svg viewBox="0 0 1 1"></svg>', 100, 40)], [])
    assert not re.search(r"var\(|calc\(|color-mix\(", made)
    assert theme.LIGHT.signal in made


def test_mixed_colours_are_the_weighted_mean_of_their_channels():
    """CSS Color 5, color-mix in srgb: each channel is the weighted mean."""
    css = resolved("svg .x { fill: color-mix(in srgb, var(--ink) 25%, var(--paper)) }", theme.Palette(
        "#ffffff", *["#111111"], "#000000", *["#111111"] * 11,
    ))
    assert "#bfbfbf" in css


def test_an_unknown_property_is_named():
    with pytest.raises(ValueError, match="--gravel"):
        resolved("svg { fill: var(--gravel) }", theme.LIGHT)


def test_a_drawing_keeps_its_size_in_print():
    """96 px are an inch, 25.4 mm (CSS Values and Units 4)."""
    drawn = of_page('<svg class="section" viewBox="0 0 96 192" width="96" height="192"></svg>')
    assert (drawn.width, drawn.height) == pytest.approx((25.4, 50.8))


def test_a_saved_map_holds_every_line_mark_and_label_of_the_screen():
    outline = shapely.Point(0, 0).buffer(10)
    scene = Scene(
        zones=(ZoneMark("E1 & co", outline, (), "clockwise", np.zeros(2), subject=True),),
        lines=(LineMark("dotted", np.array([[-20.0, 0.0], [20.0, 0.0]]), subject=True),),
    )
    marks = drawing.draw(scene, VIEW, DAY)
    tree = ElementTree.fromstring(map_svg(marks, None, None, VIEW, DAY, Units(), section=((-30.0, 5.0), (30.0, 5.0))))
    named = [t.text for t in tree.iter("{http://www.w3.org/2000/svg}text")]
    assert {"E1 & co", "L", "R", "N"} <= set(named)
    strokes = [p.get("stroke") for p in tree.iter("{http://www.w3.org/2000/svg}path")]
    assert strokes.count(DAY.palette.signal) >= 2
    assert all("nan" not in (p.get("d") or "") for p in tree.iter("{http://www.w3.org/2000/svg}path"))


def test_a_window_of_time_is_bracketed_over_its_own_share_of_the_ribbon():
    course = ribbon.Course(np.arange(0.0, 101.0, 10), None, np.ones(11), (), 5, window=(20.0, 70.0))
    box = ribbon.Box(700)
    drawn = ribbon.draw(course, box, Units())
    low, high = (float(v) for v in re.findall(r"M([\d.]+) [\d.]+ V1", drawn))
    wide = box.right - box.left
    assert ((low - box.left) / wide, (high - box.left) / wide) == pytest.approx((0.2, 0.7), abs=1e-3)
    assert "mean over" in drawn and "data-cursor" not in drawn


def test_levels_are_drawn_from_near_their_least_and_read_to_the_centimetre():
    course = ribbon.Course(np.arange(3.0), None, np.array([103.01, 103.26, 103.52]), (), 1, title="Level", unit="m", from_zero=False)
    drawn = ribbon.draw(course, ribbon.Box(700), Units())
    assert ">103.5<" in drawn and ">50<" not in drawn
    assert "103.260" in ribbon.words(course, Units())


@pytest.mark.parametrize(("form", "said"), [({"from": "a", "to": "5"}, "not numbers"), ({"from": "9", "to": "5"}, "before its end")])
def test_a_window_that_cannot_be_is_told(form: dict, said: str):
    with pytest.raises(ValueError, match=said):
        window_of(form)


def test_typed_ends_are_read_and_wrong_ones_told():
    assert typed_ends({"x1": "1", "y1": "2", "x2": "3.5", "y2": "4"}) == (1.0, 2.0, 3.5, 4.0)
    with pytest.raises(ValueError, match="not numbers"):
        typed_ends({"x1": "east", "y1": "2", "x2": "3", "y2": "4"})
    with pytest.raises(ValueError, match="lie apart"):
        typed_ends({"x1": "1", "y1": "2", "x2": "1", "y2": "2"})
