"""The review folder keeps what people wrote, and loses nothing."""

from __future__ import annotations

import pytest

from hydro.review import new_review, open_review
from hydro.review_log import append_line, read_log


def test_a_new_review_opens_and_keeps_comments_through_an_edit(tmp_path):
    review = new_review(tmp_path / "r", "Two piers")
    path = review.folder / "review.toml"
    path.write_text(path.read_text() + "# asked by the county\n")
    edited = open_review(review.folder).edit(
        lambda d: d.update({"place": "Invented"}), who="A. Reader", what="named the place"
    )
    assert edited.contents.place == "Invented"
    assert "# asked by the county" in path.read_text()
    assert [e["what"] for e in edited.logged()] == ["named the place"]


def test_a_save_over_somebody_elses_change_is_refused_and_writes_nothing(tmp_path):
    first = new_review(tmp_path / "r", "One")
    second = open_review(first.folder)
    second.edit(lambda d: d.update({"place": "theirs"}), who="B", what="place")
    with pytest.raises(ValueError, match="saved by somebody else"):
        first.edit(lambda d: d.update({"place": "mine"}), who="A", what="place")
    assert open_review(first.folder).contents.place == "theirs"


def test_a_change_that_makes_the_review_invalid_is_refused_and_writes_nothing(tmp_path):
    review = new_review(tmp_path / "r", "One")
    before = (review.folder / "review.toml").read_bytes()
    with pytest.raises(ValueError, match="unknown setting"):
        review.edit(lambda d: d.update({"settings": {"wetness": 1.0}}), who="A", what="x")
    assert (review.folder / "review.toml").read_bytes() == before
    assert review.logged() == []


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("title = ", "is not TOML"),
        ('titel = "x"', "title"),
        ('title = "x"\n[[runs]]\nid = "a"\nfile = "a.nc"\n[[runs]]\nid = "a"\nfile = "b.nc"', "two runs have the id"),
        ('schema = "other/9"\ntitle = "x"', "this version reads"),
        ('title = "x"\n[settings]\nwet_depth_m = -1', "give a value from"),
    ],
)
def test_a_bad_review_says_what_is_wrong_in_one_sentence(tmp_path, text, says):
    (tmp_path / "review.toml").write_text(text)
    with pytest.raises(ValueError, match=says):
        open_review(tmp_path)


def test_a_folder_without_a_review_says_what_to_give(tmp_path):
    with pytest.raises(ValueError, match="give a folder that holds a review"):
        open_review(tmp_path)


def test_a_broken_log_line_is_named(tmp_path):
    path = tmp_path / "log.jsonl"
    append_line(path, {"what": "first"})
    path.write_text(path.read_text() + "{half")
    with pytest.raises(ValueError, match="line 2"):
        read_log(path)
