"""Sentences of hydro keep one rule: plain SI units, a space before %, no sign on a zero."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from hydro.arrival import audit
from hydro.change import Pair, compare
from hydro.figure import percent, printed, signed
from hydro.review import SAMPLE, open_review

ODD = re.compile(r"[\u00b2\u00b3]|[-\u2212+]0(?:\.0+)?(?![\d.])|\d%|\be[+-]\d\d\b|\d(?:m3/s|m2|m)\b|\bsq\b|\bcumecs?\b")


@given(st.floats(-1e6, 1e6), st.integers(0, 4))
def test_a_difference_has_its_sign_but_none_where_it_rounds_to_zero(value, decimals):
    text = signed(value, decimals)
    assert float(text) == pytest.approx(value, abs=0.5 * 10.0**-decimals * (1 + 1e-9))
    assert (text[0] in "+-") == (float(text) != 0)


@given(st.floats(-1e-3, 1e-3))
def test_no_printed_number_is_a_negative_zero(value):
    for text in (printed(value), printed(value, value - 1, value + 1), percent(value).split()[0], percent(value, 2).split()[0]):
        assert float(text) != 0 or not text.startswith("-")


@pytest.fixture(scope="module")
def said():
    """Every sentence of the audit of two runs of the sample, of the two compared, and of one with itself."""
    review = open_review(SAMPLE)
    a, b = review.open("existing_bankfull_coarse"), review.open("proposed_low")
    reaches = review.reach_for(a), review.reach_for(b)
    out = [part for run, reach in zip((a, b), reaches, strict=True) for f in audit(run, reach) for part in (f.sentence, f.meaning, f.question)]
    for other, reach in ((b, reaches[1]), (a, reaches[0])):
        change = compare(a, other, Pair(0, 0, "test", 0.0), reach_a=reaches[0], reach_b=reach)
        out += [f.sentence for f in change.findings] + [d.sentence for d in change.setup if d.what != "statement"]
    return out


def test_no_sentence_of_the_sample_breaks_the_rule(said):
    assert len(said) > 40
    assert [s for s in said if ODD.search(s)] == []


def test_a_run_compared_with_itself_differs_by_a_plain_zero(said):
    assert any("Inflow differs by 0.00 m3/s and the downstream level by 0.000 m." in s for s in said)
