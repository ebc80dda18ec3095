"""One state: it goes through the address unharmed, and the way back goes step by step."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from dashboard.choices import MODES, QUESTIONS, SHADES, TUBES, UNITS, Choices, History, from_query

cents = st.integers(-10**9, 10**9).map(lambda n: n / 100)
chosen = st.builds(
    Choices,
    question=st.sampled_from(QUESTIONS), run=st.text(max_size=12), against=st.text(max_size=5),
    seconds=st.none() | st.integers(0, 10**7).map(lambda n: n / 8), subject=st.text(max_size=12),
    section=st.none() | st.tuples(cents, cents, cents, cents),
    view=st.none() | st.tuples(cents, cents, st.integers(1, 10**7).map(lambda n: n / 100)),
    shade=st.sampled_from(SHADES), tubes=st.sampled_from(TUBES), units=st.sampled_from(UNITS), mode=st.sampled_from(MODES),
    hall=st.booleans(),
)


@given(chosen)
def test_a_link_opens_the_same_view(choices):
    assert from_query("?" + choices.query()) == choices


def test_the_plain_view_has_a_plain_address():
    assert Choices().query() == ""


@pytest.mark.parametrize("query", [
    "view=1,2", "view=1,2,-5", "section=1,2,3", "section=1,2,3,nan", "seconds=soon", "tubes=many", "hall=perhaps", "mode=dusk",
    "question=weather", "tubes=23",
])
def test_an_address_that_cannot_be_read_is_named(query):
    with pytest.raises(ValueError, match=query.split("=")[0]):
        from_query(query)


def test_parts_of_other_programs_in_the_address_are_left_alone():
    assert from_query("?utm=1&tubes=44") == Choices(tubes=44)


def test_undo_and_redo_walk_the_same_steps():
    history = History(Choices())
    steps = [Choices(tubes=11), Choices(tubes=11, mode="night"), Choices(tubes=44, mode="night")]
    for step in steps:
        assert history.go(step)
    back = [history.now]
    while history.undo():
        back.append(history.now)
    assert back == [*steps[::-1], Choices()]
    forward = []
    while history.redo():
        forward.append(history.now)
    assert forward == steps


def test_a_sweep_through_time_is_one_step_back():
    history = History(Choices())
    for t in range(50):
        history.go(Choices(seconds=float(t)))
    assert history.undo()
    assert history.now == Choices()
    assert not history.can_undo


def test_choosing_anew_ends_the_way_forward():
    history = History(Choices())
    history.go(Choices(tubes=11))
    history.undo()
    history.go(Choices(tubes=44))
    assert not history.redo()


def test_taking_the_same_choices_again_is_no_step():
    history = History(Choices())
    assert not history.go(Choices())
    assert not history.can_undo
