"""Long work goes to one thread, in order of who waits, and can be stopped."""

from __future__ import annotations

import threading

import pytest

from dashboard.results import Results, Working

SECONDS = 20.0


def ask(results, key, make, **how):
    """The result, waiting for it as a page would: asked once more when it is ready."""
    try:
        return results.get(key, make, label="making", **how)
    except Working:
        assert results.wait(SECONDS)
        return results.get(key, make, label="making", **how)


def test_a_result_is_made_once_and_remembered():
    results, made = Results(), []
    for _ in range(3):
        assert ask(results, "a", lambda: made.append(1) or len(made)) == 1
    assert made == [1]


def test_asking_says_what_is_being_done_and_does_not_wait():
    results, gate = Results(), threading.Event()
    with pytest.raises(Working, match="making"):
        results.get("slow", gate.wait, label="making")
    assert not results.have("slow")
    gate.set()
    assert results.wait(SECONDS)
    assert results.have("slow")


def test_an_error_is_raised_where_the_result_is_asked_for():
    results = Results()

    def fails():
        raise ValueError("depth is missing at face 7")

    for _ in range(2):
        with pytest.raises(ValueError, match="face 7"):
            ask(results, "bad", fails)
    assert results.peek("bad") is None


def test_one_result_may_be_made_of_others():
    results = Results()

    def sum_of_two():
        return results.get("one", lambda: 1, label="") + results.get("two", lambda: 2, label="")

    assert ask(results, "sum", sum_of_two) == 3


def test_what_is_waited_for_goes_before_work_done_ahead():
    results, gate, order = Results(), threading.Event(), []
    with pytest.raises(Working):
        results.get("first", gate.wait, label="")
    for k in range(4):
        results.ahead(k, lambda k=k: order.append(k), label="", group="story")
    with pytest.raises(Working):
        results.get("now", lambda: order.append("now"), label="")
    gate.set()
    assert results.wait(SECONDS)
    assert order == ["now", 0, 1, 2, 3]


def test_work_done_ahead_moves_up_when_somebody_waits_for_it():
    results, gate, order = Results(), threading.Event(), []
    with pytest.raises(Working):
        results.get("first", gate.wait, label="")
    for k in range(3):
        results.ahead(k, lambda k=k: order.append(k), label="", group="story")
    with pytest.raises(Working):
        results.get(2, lambda: order.append(2), label="")
    gate.set()
    assert results.wait(SECONDS)
    assert order == [2, 0, 1]


def test_stopping_drops_what_has_not_begun_and_keeps_what_is_made():
    results, gate, begun, order = Results(), threading.Event(), threading.Event(), []

    def first():
        begun.set()
        gate.wait()
        order.append("first")

    results.ahead("first", first, label="", group="story")
    assert begun.wait(SECONDS)
    for k in range(4):
        results.ahead(k, lambda k=k: order.append(k), label="", group="story")
    results.stop("story")
    gate.set()
    assert results.wait(SECONDS)
    assert order == ["first"]
    results.ahead(0, lambda: order.append(0), label="", group="story")
    assert results.wait(SECONDS) and order == ["first"]
    results.resume("story")
    results.ahead(0, lambda: order.append(0), label="", group="story")
    assert results.wait(SECONDS) and order == ["first", 0]


def test_large_results_are_let_go_least_used_first_and_small_ones_stay():
    results = Results(heavy=2)
    ask(results, "small", lambda: 0)
    for k in "abc":
        ask(results, k, lambda: 1, heavy=True)
    assert [results.have(k) for k in ("small", "a", "b", "c")] == [True, False, True, True]


def test_listeners_are_told_and_can_leave():
    results, told = Results(), []
    leave = results.listen(told.append)
    ask(results, "a", lambda: 1)
    leave()
    ask(results, "b", lambda: 1)
    assert told == ["a"]
