"""Checks answer in four words, need a source, and know when they cannot tell."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from hydro import checks
from hydro.cautions import CAUTIONS
from hydro.figure import Figure
from hydro.reach import CentreLine, NamedLine, Reach, Structure
from hydro.section.receptors import Series, reading
from tests.builders import channel, frame_of

TABLE = {
    "id": "a", "name": "Speed at the gravel", "figure": "mean speed", "place": "gravel", "comparison": "at most",
    "value": 1.2, "unit": "m/s", "source": "Example county note (invented), clause 8",
}


@pytest.mark.parametrize(("value", "low", "high", "says"), [
    (1.0, 0.9, 1.1, checks.WITHIN), (1.5, 1.4, 1.6, checks.BEYOND), (1.2, 1.1, 1.3, checks.TOO_CLOSE),
    (None, None, None, checks.NOT_ASSESSED), (float("nan"), None, None, checks.NOT_ASSESSED), (1.0, None, None, checks.WITHIN),
])  # fmt: skip
def test_the_four_answers(value, low, high, says):
    check = checks.read_checks([TABLE])[0]
    got = checks.judge(Figure("mean speed", value, "m/s", low, high), check)
    assert got.answer == says
    assert "safe" not in got.sentence.lower() and "pass" not in got.sentence.lower()


@pytest.mark.parametrize(("change", "says"), [
    ({"source": " "}, "has no source"), ({"figure": "luck"}, "the figures are"), ({"comparison": "below"}, "at most or at least"),
    ({"unit": "ft/s"}, "give it in m/s"), ({"colour": "red"}, "'colour' is not known"),
])  # fmt: skip
def test_a_check_that_cannot_be_derived_again_is_refused(change, says):
    with pytest.raises(ValueError, match=says):
        checks.read_checks([{**TABLE, **change}])


def test_every_figure_owes_cautions_that_exist():
    for quantity in checks.FIGURES.values():
        assert quantity.cautions and all(c in CAUTIONS for c in quantity.cautions)


def _place(shape):
    return Reach((0.0, 0.0), None, (), {"receptors": (NamedLine("gravel", "Gravel", shape),)})


def test_the_worst_frame_answers():
    mesh = channel(20, 10)
    slow, fast = (frame_of(mesh, 1.0, (v, 0.0)) for v in (1.0, 1.5))
    check = checks.read_checks([TABLE])[0]
    reach = _place(shapely.box(20, 5, 40, 15))
    assert checks.answer(check, [slow], reach).answer == checks.WITHIN
    assert checks.answer(check, [slow, fast], reach).answer == checks.BEYOND
    assert checks.answer(check, [frame_of(mesh, 0.0, (0.0, 0.0))], reach).answer == checks.NOT_ASSESSED


def test_freeboard_with_the_level_above_the_soffit_is_not_assessed():
    deck = Structure("d", "Deck", "deck", "absent", shapely.box(48, 0, 52, 20), levels={"soffit_m": 13.0})
    openings = (NamedLine("o", "Opening", shapely.LineString([(50, 18), (50, 2)])),)
    reach = Reach((0.0, 0.0), CentreLine(np.array([[0.0, 10], [100, 10]])), (deck,), {"openings": openings})
    table = {**TABLE, "figure": "least freeboard", "place": "d", "comparison": "at least", "value": 0.6, "unit": "m"}
    check = checks.read_checks([table])[0]
    mesh = channel(20, 10)
    answers = [checks.answer(check, [frame_of(mesh, h, (1.0, 0.0), bed=10.0)], reach).answer for h in (2.0, 2.8, 3.5)]
    assert answers == [checks.WITHIN, checks.BEYOND, checks.NOT_ASSESSED]


def test_afflux_within_the_noise_of_the_value_is_too_close_to_tell():
    table = {**TABLE, "figure": "afflux", "unit": "m", "value": 0.01}
    check = checks.read_checks([table])[0]
    assert checks.answer_afflux(check, 0.012, 0.005).answer == checks.TOO_CLOSE
    assert checks.answer_afflux(check, 0.030, 0.005).answer == checks.BEYOND
    assert checks.answer_afflux(check, None, None).answer == checks.NOT_ASSESSED


def test_a_receptors_greatest_product_is_taken_at_one_spot():
    """A law: max of d v is at most max d times max v, and here the deepest water is the slowest."""
    mesh = channel(40, 20, quads=True)
    frame = frame_of(mesh, lambda x, y: np.where(x < 50, 2.0, 0.5), (lambda x, y: np.where(x < 50, 0.2, 1.5), 0.0))
    got = reading(frame, NamedLine("p", "P", shapely.box(30, 2, 70, 18)))
    assert got.depth_speed_max == pytest.approx(0.75) and got.depth_max * got.speed_max == pytest.approx(3.0)


def test_durations_and_arrivals_are_linear_between_frames():
    """Source: geometry of a triangle: 0 to 2 to 0 over 20 s stands above 1 for 10 s, from second 5."""
    series = Series("p", np.array([0.0, 10, 20]), {"depth_max": np.array([0.0, 2, 0])})
    assert series.duration_above("depth_max", 1.0) == pytest.approx(10.0)
    assert series.arrival("depth_max", 1.0) == pytest.approx(5.0)
    assert series.peak("depth_max") == (2.0, 10.0)
    assert series.arrival("depth_max", 3.0) is None


def test_a_place_outside_the_model_says_so():
    frame = frame_of(channel(), 1.0, (1.0, 0.0))
    with pytest.raises(ValueError, match="outside the mesh"):
        reading(frame, NamedLine("p", "Mill", shapely.Point(500, 5)))
    with pytest.raises(ValueError, match="holds no face"):
        reading(frame, NamedLine("p", "Mill", shapely.box(500, 5, 600, 9)))
