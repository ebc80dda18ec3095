"""What a record lacks is named, and its parts are chosen in the review itself."""

from __future__ import annotations

import shutil

import pytest

from hydro.queries import ask, change
from hydro.record.build import PARTS
from hydro.record.missing import choose_parts, missing
from hydro.review import SAMPLE, open_review


@pytest.fixture
def folder(tmp_path):
    """The sample review with one of its results only."""
    where = tmp_path / "review"
    (where / "results").mkdir(parents=True)
    shutil.copy(SAMPLE / "review.toml", where)
    shutil.copy(SAMPLE / "lines.gpkg", where)
    shutil.copy(SAMPLE / "results" / "existing_low.nc", where / "results")
    return where


def _of(folder, part):
    return [lack.sentence for lack in missing(open_review(folder)) if lack.part == part]


def test_documents_that_did_not_come_are_named(folder):
    assert len(_of(folder, "documents")) == 2 and any("weir's crest" in s for s in _of(folder, "documents"))


def test_a_run_whose_file_is_not_there_is_named_and_one_that_is_there_is_not(folder):
    told = _of(folder, "runs")
    assert len(told) == len(open_review(folder).runs) - 1 and not any(s.startswith("Existing, low flow") for s in told)


def test_a_query_is_missing_until_it_is_answered(folder):
    ask(folder, "Which datum?", who="A. Reviewer")
    assert _of(folder, "queries") == ["Query 1 is not answered: Which datum?"]
    change(folder, 1, who="A. Reviewer", state="answered", answer="The local one.")
    assert _of(folder, "queries") == []


def test_a_check_at_a_place_that_is_not_drawn_has_no_answer(folder):
    path = folder / "review.toml"
    path.write_text(path.read_text(encoding="utf-8").replace('place = "e2gk"', 'place = "nowhere"'), encoding="utf-8")
    assert [s for s in _of(folder, "checks") if "nowhere" in s]


def test_parts_are_written_in_the_record_s_order_and_nothing_else_changes(folder):
    before = (folder / "review.toml").read_text(encoding="utf-8")
    review = choose_parts(open_review(folder), ["change", "documents"], list(PARTS), who="A. Reviewer")
    assert review.contents.record["parts"] == ["documents", "change"]
    assert (folder / "review.toml").read_text(encoding="utf-8").startswith(before.rstrip())
    assert review.logged()[-1]["who"] == "A. Reviewer"


@pytest.mark.parametrize(("chosen", "words"), [([], "at least one"), (["sums"], "no part 'sums'")])
def test_no_part_and_an_unknown_part_are_refused(folder, chosen, words):
    before = (folder / "review.toml").read_bytes()
    with pytest.raises(ValueError, match=words):
        choose_parts(open_review(folder), chosen, list(PARTS), who="A. Reviewer")
    assert (folder / "review.toml").read_bytes() == before
