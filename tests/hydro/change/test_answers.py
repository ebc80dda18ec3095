"""Answers of two runs side by side: what is told apart, and whether a decision changes."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import shapely

from hydro.change import compare, pair_frames
from hydro.change.answers import Beside, answer_values, answers_table, passage, side_by_side, wood
from hydro.change.export import change_json
from hydro.checks import BEYOND, NOT_ASSESSED, WITHIN, Check
from hydro.drift.share import Share
from hydro.figure import Figure
from hydro.reach import CentreLine, NamedLine, Reach
from tests.builders import channel, raw_of, run_of


def _beside(a, b, noise=None, answers=None) -> Beside:
    return Beside("check", "Gravel", "mean speed", "m/s", Figure("v", *a), Figure("v", *b), noise, answers)


def test_a_difference_under_the_noise_is_not_told_apart_and_one_above_is():
    assert _beside((1.00, "m"), (1.03, "m"), noise=0.05).told_apart is False
    assert _beside((1.00, "m"), (1.08, "m"), noise=0.05).told_apart is True
    assert "not distinguishable" in _beside((1.00, "m"), (1.03, "m"), noise=0.05).sentence


@pytest.mark.parametrize(("b", "apart"), [((7.0, "%", 6.0, 8.5), False), ((9.0, "%", 8.6, 9.9), True), ((2.0, "%", 1.0, 2.9), True)])
def test_intervals_that_meet_are_not_told_apart(b, apart):
    assert _beside((5.0, "%", 3.0, 8.0), b).told_apart is apart


def test_without_noise_or_ranges_nothing_is_claimed():
    assert _beside((1.0, "m/s"), (3.0, "m/s")).told_apart is None
    assert _beside((None, "m/s"), (3.0, "m/s"), noise=0.1).told_apart is None


def test_a_decision_changes_only_where_both_runs_were_assessed():
    assert _beside((1.0, "m"), (2.0, "m"), answers=(WITHIN, BEYOND)).decision_changes is True
    assert _beside((1.0, "m"), (1.1, "m"), answers=(WITHIN, WITHIN)).decision_changes is False
    assert _beside((1.0, "m"), (1.1, "m"), answers=(NOT_ASSESSED, BEYOND)).decision_changes is None
    assert "the decision changes" in _beside((1.0, "m"), (2.0, "m"), answers=(WITHIN, BEYOND)).sentence


def _drifted(**piers: int):
    base = SimpleNamespace(
        piers=[SimpleNamespace(name=n) for n in piers], openings=[],
        touches=lambda i: Share(list(piers.values())[i], 100, 0.01, 0.2), passes=None,
    )
    return SimpleNamespace(base=base)


def test_wood_is_compared_by_the_pier_s_name_not_by_its_order():
    rows = wood(_drifted(North=10, South=2), _drifted(South=3, New=50, North=12))  # type: ignore[arg-type]
    assert [(r.place, r.a.value, r.b.value) for r in rows] == [("North", 10.0, 12.0), ("South", 2.0, 3.0)]


def _way(name: str, status: str, fatigue: float):
    return SimpleNamespace(fish=SimpleNamespace(name=name), status=status, worst_leg=SimpleNamespace(fatigue=fatigue), reason="")


def test_a_way_that_opens_is_a_changed_decision():
    (row,) = passage([_way("one", "excluded", 1.2), _way("two", "excluded", 2.0)], [_way("one", "not excluded", 0.8)])  # type: ignore[list-item]
    assert row.decision_changes is True and row.difference == pytest.approx(-0.4)


def test_the_table_holds_both_values_in_full_digits_with_their_sentence():
    row = _beside((1.23456789, "m"), (1.3, "m"), noise=0.01)
    assert answers_table([row]).loc[0, "a"] == 1.23456789
    assert answer_values(row)["sentence"] == row.sentence


def _both_depths(before: float, after: float, value: float):
    """A channel whose water is raised evenly, with a receptor in it and a check of its level; bed at 10 m."""
    mesh = channel(40, 10)
    a, b = (run_of(mesh, [0.0], [raw_of(mesh, d, (1.0, 0.0), stored_on="node")], bed=10.0) for d in (before, after))
    place = NamedLine("r1", "Landing", shapely.box(30, 5, 50, 15), {})
    reach = Reach((0.0, 0.0), CentreLine(np.array([[0.0, 10.0], [100.0, 10.0]])), layers={"receptors": (place,)})
    checks = [
        Check("c1", "Depth at the landing", "mean depth", "Landing", "at most", value, "m", "invented"),
        Check("c2", "Rise at the landing", "afflux", "Landing", "at most", 0.1, "m", "invented"),
        Check("c3", "Of another event", "mean depth", "Landing", "at most", value, "m", "invented", events=("low",)),
    ]
    change = compare(a, b, pair_frames(a, b)[0], reach_a=reach, reach_b=reach, quiet=(90, 100))
    return change, side_by_side(change, (reach, reach), checks, "bankfull")


def test_receptors_show_the_rise_that_was_put_in():
    """Source: the change imposed: 0.25 m more water everywhere."""
    _, rows = _both_depths(2.0, 2.25, 2.1)
    level = next(r for r in rows if r.figure == "mean level")
    assert (level.a.value, level.b.value) == pytest.approx((12.0, 12.25)) and level.difference == pytest.approx(0.25)


def test_a_check_s_decision_changes_where_the_rise_takes_it_over_the_value_entered():
    _, rows = _both_depths(2.0, 2.25, 2.1)
    check = next(r for r in rows if r.place == "Depth at the landing")
    assert check.answers == (WITHIN, BEYOND) and check.decision_changes is True
    _, rows = _both_depths(2.0, 2.25, 3.0)
    assert next(r for r in rows if r.place == "Depth at the landing").decision_changes is False


def test_an_afflux_check_answers_for_the_pair_and_checks_of_other_events_are_left_out():
    change, rows = _both_depths(2.0, 2.25, 2.1)
    afflux = next(r for r in rows if r.figure == "afflux")
    assert afflux.b.value == pytest.approx(0.25) and afflux.difference is None
    assert "Of another event" not in {r.place for r in rows}
    assert change_json(change, rows)["answers"][0]["place"] == "Landing"


def test_a_place_that_is_dry_in_both_runs_is_called_dry():
    row = Beside("receptor", "Garden", "mean depth", "m", Figure("v", float("nan"), "m", note="dry"), Figure("v", None, "m", note="dry"))
    assert row.sentence == "Garden, mean depth: dry and dry."
