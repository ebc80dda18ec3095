"""Two runs on one map: each only on its side of the divider."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from dashboard.raster import View
from dashboard.views import swipe
from dashboard.views.scene import Beside, Scene, StructureMark, Water, ZoneMark


def _scene(lines, zones=(), structures=()) -> Scene:
    water = Water(None, np.zeros(1), 1.0, tube_lines=tuple(np.array(line, float) for line in lines))  # type: ignore[arg-type]
    return Scene(water=water, shore=water.tube_lines, zones=tuple(zones), structures=tuple(structures))


def _zone(x: float, tag: str) -> ZoneMark:
    return ZoneMark(tag, shapely.box(x - 5, 0, x + 5, 10), (), "clockwise", np.array([x, 5.0]), separation=np.array([x - 4, 0.0]))


def _joined(first: Scene, second: Scene, x: float, shift=(0.0, 0.0)) -> Scene:
    return swipe.joined(first, second, "b", x, np.array(shift, float), ("before", "after"))


def test_the_first_run_s_lines_end_where_the_second_s_begin():
    both = _joined(_scene([[(0, 0), (100, 0)]]), _scene([[(0, 7), (100, 7)]]), 30.0)
    left, right = both.shore
    assert left[:, 0].min() == 0 and left[:, 0].max() == 30 and set(left[:, 1]) == {0.0}
    assert right[:, 0].min() == 30 and right[:, 0].max() == 100 and set(right[:, 1]) == {7.0}
    assert len(both.water.tube_lines) == 2


def test_a_line_that_turns_back_over_the_divider_keeps_each_of_its_parts():
    both = _joined(_scene([[(0, 0), (60, 0), (60, 10), (0, 10)]]), _scene([]), 30.0)
    assert len(both.shore) == 2 and all(line[:, 0].max() == 30 for line in both.shore)


def test_the_second_run_s_own_origin_is_allowed_for():
    both = _joined(_scene([]), _scene([[(0, 0), (50, 0)]], [_zone(20.0, "E1")]), 40.0, shift=(30.0, 2.0))
    (line,), (zone,) = both.shore, both.zones
    assert line.tolist() == [[40.0, 2.0], [80.0, 2.0]]
    assert zone.centre.tolist() == [50.0, 7.0] and zone.outline.bounds == (45.0, 2.0, 55.0, 12.0)


def test_an_eddy_under_the_divider_is_shown_by_halves_and_named_once():
    both = _joined(_scene([], [_zone(31.0, "E1")]), _scene([], [_zone(31.0, "E1")]), 30.0)
    left, right = both.zones
    assert left.outline.area + right.outline.area == pytest.approx(100.0)
    assert (left.tag, right.tag) == ("", "E1")
    assert left.separation is not None and right.separation is None  # it lies at 27


def test_a_structure_of_one_design_stands_on_that_design_s_side_only():
    pier = StructureMark("Pier 1", "pier", shapely.box(50, 0, 54, 9))
    assert not _joined(_scene([], structures=[pier]), _scene([]), 30.0).structures
    assert [s.name for s in _joined(_scene([]), _scene([], structures=[pier]), 30.0).structures] == ["Pier 1"]


@pytest.mark.parametrize(("x", "columns"), [(-10.0, 0), (-5.0, 0), (0.0, 5), (0.4, 5), (0.6, 6), (5.0, 10), (9.0, 10)])
def test_a_pixel_belongs_to_the_side_that_its_middle_lies_on(x, columns):
    view = View(0.0, 0.0, 10.0, 10, 2)  # a metre a pixel, from -5 to 5: middles at -4.5, -3.5 and so on
    water = Beside("b", Water(None, np.zeros(1), 1.0), x, (0.0, 0.0), ("a", "b"))  # type: ignore[arg-type]
    picture = swipe.composed(np.zeros((2, 10), np.uint8), np.ones((2, 10), np.uint8), view, water)
    assert (picture == 0).sum(axis=1).tolist() == [columns, columns]
