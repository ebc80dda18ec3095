"""leewater pack from the command line."""

from __future__ import annotations

import json

from dashboard.cli import main
from hydro.queries import queries

from .reviews import small_review


def test_it_writes_a_pack_and_says_what_it_holds(tmp_path, capsys):
    review = small_review(tmp_path / "review")
    assert main(["pack", str(review.folder), "--out", str(tmp_path / "out"), "--json", "-"]) == 0
    listed = json.loads(capsys.readouterr().out)
    assert listed["schema"] == "leewater/pack-files/1" and not listed["team"]
    assert all((tmp_path / "out" / f["name"]).stat().st_size == f["size_bytes"] for f in listed["files"])
    assert {"index.html", "README.txt", "data/r0-f8.js"} <= {f["name"] for f in listed["files"]}
    taken = tmp_path / "queries.json"
    taken.write_text(json.dumps({"schema": "leewater/pack-queries/1", "queries": [{"text": "Why?", "importance": "clarify"}]}))
    before = len(queries(review.folder))
    assert main(["pack", str(review.folder), "--take", str(taken)]) == 0
    assert len(queries(review.folder)) == before + 1


def test_a_run_that_is_not_there_and_a_file_that_no_pack_wrote_are_bad_input(tmp_path, capsys):
    review = small_review(tmp_path / "review")
    assert main(["pack", str(review.folder), "--run", "drought"]) == 2
    assert "flood" in capsys.readouterr().err
    (tmp_path / "other.json").write_text("[]")
    assert main(["pack", str(review.folder), "--take", str(tmp_path / "other.json")]) == 2
    assert "holds no queries of a pack" in capsys.readouterr().err
