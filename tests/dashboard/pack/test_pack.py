"""What a pack holds and leaves out, read back from its files by a second reader."""

from __future__ import annotations

import base64
import gzip
import json
import re
import shutil
from pathlib import Path

import numpy as np
import pytest

from dashboard.pack import gather, write_folder, write_single
from dashboard.pack.items import block, quantised, signed

from .reviews import PERSON, QUERY, RUN, TITLE, small_review

KINDS = {"u1": "<u1", "u2": "<u2", "i2": "<i2", "u4": "<u4", "f4": "<f4"}


@pytest.fixture(scope="module")
def review(tmp_path_factory):
    return small_review(tmp_path_factory.mktemp("pack") / "review")


@pytest.fixture(scope="module")
def pack(review):
    return gather(review.folder)


def read(text: str):
    """A block back into its content and arrays, by the description at the head of items.py."""
    whole = gzip.decompress(base64.b64decode(text))
    length = int.from_bytes(whole[:4], "little")
    head = json.loads(whole[4 : 4 + length])
    at, arrays = 4 + length, {}
    for name, kind, size in head["arrays"]:
        raw = np.frombuffer(whole, np.uint8, size * int(kind[1]), at)
        at += raw.size
        if kind[1] == "2":
            raw = raw.reshape(2, -1).T.copy().ravel()
        arrays[name] = raw.view(KINDS[kind])
    assert at == len(whole)
    return head["content"], arrays


def all_text(pack) -> str:
    return "\n".join([*(json.dumps(read(text)[0], ensure_ascii=False) for text in pack.items.values()), *pack.places.values()])


def test_whole_numbers_are_off_by_no_more_than_half_a_step_and_nothing_stays_nothing():
    for low, high in ((-3.0, 7.0), (0.0, 2.5), (4.0, 4.5), (-0.1, 0.0), (1.0, 1.0)):
        values = np.append(np.linspace(low, high, 1001), 0.0 if low <= 0.0 <= high else low)
        q = quantised(values)
        back = q.low + q.step * q.numbers
        assert np.abs(back - values).max() <= 0.5 * q.step * (1 + 1e-9)
        assert (back[values == 0.0] == 0.0).all()
    s = signed(np.array([-2.0, 0.0, 1.3]))
    assert s.numbers[1] == 0 and s.numbers[0] * s.step == pytest.approx(-2.0)


def test_a_block_comes_back_as_it_went_in():
    arrays = {"a": np.array([1, 65535, 256], np.uint16), "b": np.array([-5, 300], np.int16), "c": np.array([1.5], np.float32)}
    content, back = read(block({"words": "a \u2013 b"}, arrays))
    assert content == {"words": "a \u2013 b"}
    for name, array in arrays.items():
        assert np.array_equal(back[name], array)


def test_an_array_that_the_page_cannot_read_is_refused():
    with pytest.raises(ValueError, match="float64"):
        block({}, {"x": np.zeros(3)})


def test_a_frame_holds_the_runs_own_field(review, pack):
    run = review.open("flood")
    frame = run.frame(4)
    content, arrays = read(pack.items["r0-f4"])
    low, step = content["scale"]["h"]
    assert np.abs(low + step * arrays["h"] - frame.depth).max() <= 0.51 * step
    assert np.abs(content["scale"]["qx"] * arrays["qx"] - frame.unit_discharge[:, 0]).max() <= 0.51 * content["scale"]["qx"]
    assert step < 1e-3  # m: far below the packed file's own step


def test_a_public_pack_names_no_person_no_query_and_no_path(review, pack):
    text = all_text(pack)
    assert not pack.team
    for left_out in (PERSON, "Examplesson", "Was the bay surveyed", "secret-folder-name", str(review.folder), "review.toml"):
        assert left_out not in text, left_out


def test_a_team_pack_holds_the_queries_and_still_no_path(review):
    team = gather(review.folder, team=True)
    content, _ = read(team.items["pack"])
    assert [q["text"] for q in content["queries"]] == [QUERY]
    assert "secret-folder-name" not in all_text(team)


def test_cautions_stand_in_the_page_before_any_script_runs(pack):
    for words in ("no vertical roller", "not for judging swimming, boating or rescue", "not a residence"):
        assert words in pack.places["cautions"]


def test_what_people_wrote_is_text_in_the_page(pack, tmp_path):
    write_folder(pack, tmp_path / "out")
    page = (tmp_path / "out" / "index.html").read_text("utf-8")
    assert TITLE not in page and RUN not in page
    assert "Two piers &lt;script&gt;" in page


def test_the_policy_allows_no_inline_script_and_no_eval(pack, tmp_path):
    write_folder(pack, tmp_path / "out")
    page = (tmp_path / "out" / "index.html").read_text("utf-8")
    policy = re.search(r'Content-Security-Policy" content="([^"]*)"', page)[1]
    scripts = re.search(r"script-src ([^;]*);", policy)[1]
    assert scripts == "'self'" and "default-src 'none'" in policy
    assert not re.search(r"<script(?![^>]*src=)", page) and not re.search(r"<[^>]*\son\w+=", page)


def test_a_frame_of_the_samples_flood_takes_less_than_its_part_of_15_megabytes(pack):
    """The sample's flood has 61 frames; these nine are of it, at its rise."""
    frames = [len(text) for name, text in pack.items.items() if "-f" in name]
    assert len(frames) == 9
    assert max(frames) * 61 + len(pack.items["r0"]) < 14e6  # the page, its fonts and scripts take under 1 MB


def test_the_same_review_gives_the_same_pack(review, pack):
    again = gather(review.folder)
    assert again.digest == pack.digest and again.items == pack.items


def test_an_older_pack_is_replaced_and_other_things_are_left(pack, tmp_path):
    out = tmp_path / "out"
    write_folder(pack, out)
    (out / "data" / "r7-f0.js").write_text("old")
    write_folder(pack, out)
    assert not (out / "data" / "r7-f0.js").exists()
    other = tmp_path / "other"
    other.mkdir()
    (other / "letter.txt").write_text("mine")
    with pytest.raises(ValueError, match="no pack"):
        write_folder(pack, other)
    assert [p.name for p in other.iterdir()] == ["letter.txt"]


def test_every_file_that_the_worker_stores_is_there(pack, tmp_path):
    write_folder(pack, tmp_path / "out")
    listed = json.loads(re.search(r"const FILES = (\[.*?\]);", (tmp_path / "out" / "sw.js").read_text("utf-8"))[1])
    assert {"index.html", "data/pack.js", "data/r0-f8.js"} <= set(listed)
    assert all((tmp_path / "out" / Path(name)).is_file() for name in listed)


def test_one_file_asks_for_no_other(pack, tmp_path):
    write_single(pack, tmp_path / "pack.html")
    page = (tmp_path / "pack.html").read_text("utf-8")
    assert not re.search(r'(?:src|href)="(?!#)', page)
    assert "'unsafe-inline'" not in re.search(r"script-src ([^;]*);", page)[1]


def test_an_unknown_run_lists_the_known_ones(review):
    with pytest.raises(ValueError, match="flood"):
        gather(review.folder, ["drought"])


def test_other_questions_of_the_review_are_answered_with_their_own_cautions(review, tmp_path):
    """A second run of the same event makes Change answer; its footnotes point to the list beside them."""
    folder = tmp_path / "review"
    shutil.copytree(review.folder, folder)
    document = (folder / "review.toml").read_text("utf-8")
    again = '[[runs]]\nid = "later"\nname = "Proposed one"\ndesign = "proposed"\nfile = "secret-folder-name.nc"\n'
    (folder / "review.toml").write_text(f"{document}\n{again}", "utf-8")
    answers = gather(folder, ["flood"]).places["also"]
    assert "Proposed one" in answers and "<table>" in answers
    assert "Where does floating wood go" not in answers  # the review lets no wood go
    for target in re.findall(r'href="#([^"]+)"', answers):
        assert f'id="{target}"' in answers
    assert "<button" not in answers and "data-do" not in answers
