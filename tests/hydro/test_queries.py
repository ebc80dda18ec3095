"""Queries keep their number and history, and answers find their way back whatever the order of rows."""

from __future__ import annotations

import csv
import io
import json

import pytest

from hydro.queries import ask, change, find, queries, read_answers, read_written, to_csv, to_xlsx
from hydro.review_log import append_line, read_log


@pytest.fixture
def folder(tmp_path):
    ask(tmp_path, "Which equation does the weir use?", who="A", importance="could change the decision", x=1.0, y=2.0)
    ask(tmp_path, "=SUM(A1:A9) is this a typing error?", who="B")
    ask(tmp_path, "Roughness?", who="A")
    return tmp_path


def test_numbers_run_on_and_history_keeps_every_change(folder):
    change(folder, 1, who="C", answer="None", state="answered")
    change(folder, 1, who="A", state="accepted")
    first = queries(folder)[0]
    assert [q.number for q in queries(folder)] == [1, 2, 3]
    assert (first.answer, first.state, len(first.history)) == ("None", "accepted", 3)
    assert len(read_log(folder / "queries.jsonl")) == 5


@pytest.mark.parametrize("kind", ["csv", "xlsx"])
def test_answers_come_back_by_number_when_rows_are_turned_round(folder, tmp_path, kind):
    path = tmp_path / f"out.{kind}"
    if kind == "csv":
        rows = list(csv.DictReader(io.StringIO(to_csv(queries(folder)))))
        rows.reverse()
        next(r for r in rows if r["number"] == "3")["answer"] = "n = 0.03"
        out = io.StringIO()
        writer = csv.DictWriter(out, rows[0])
        writer.writeheader()
        writer.writerows(rows)
        path.write_text(out.getvalue())
    else:
        from openpyxl import load_workbook

        to_xlsx(queries(folder), path)
        book = load_workbook(path)
        sheet = book.active
        names = [c.value for c in sheet[1]]
        sheet.cell(4, names.index("answer") + 1).value = "n = 0.03"
        sheet.move_range("A4:Z4", rows=3)
        book.save(path)
        book.close()
    assert read_answers(folder, path, who="firm") == [3]
    third = queries(folder)[2]
    assert (third.answer, third.state, third.text) == ("n = 0.03", "answered", "Roughness?")
    assert [q.state for q in queries(folder)[:2]] == ["asked", "asked"]


def test_a_row_with_a_strange_number_changes_nothing(folder, tmp_path):
    path = tmp_path / "a.csv"
    path.write_text("number,answer\n1,yes\n99,no\n")
    with pytest.raises(ValueError, match="row 3: there is no query 99"):
        read_answers(folder, path, who="firm")
    assert queries(folder)[0].answer == ""


def test_text_that_looks_like_a_formula_is_sent_out_as_text(folder):
    row = list(csv.DictReader(io.StringIO(to_csv(queries(folder)))))[1]
    assert row["text"].startswith("'=SUM")


def test_two_people_asking_at_once_lose_nothing(folder):
    append_line(folder / "queries.jsonl", {"number": 3, "at": "2031-03-02T00:00:00Z", "who": "B", "set": {"text": "Mine", "date": "2031-03-02"}})
    assert [(q.number, q.text) for q in queries(folder)][2:] == [(3, "Roughness?"), (4, "Mine")]


@pytest.mark.parametrize(("details", "says"), [({"state": "done"}, "asked, answered"), ({"colour": "red"}, "has no 'colour'")])
def test_unknown_words_are_refused(folder, details, says):
    with pytest.raises(ValueError, match=says):
        change(folder, 1, who="A", **details)


def test_an_empty_query_and_an_unknown_number_are_refused(folder):
    with pytest.raises(ValueError, match="needs a text"):
        ask(folder, "  ", who="A")
    with pytest.raises(ValueError, match="no query 9"):
        change(folder, 9, who="A", state="accepted")


def _file(tmp_path, *entries, schema="leewater/pack-queries/1"):
    path = tmp_path / "queries.json"
    path.write_text(json.dumps({"schema": schema, "queries": list(entries)}))
    return path


def test_queries_written_in_a_pack_are_taken_once_with_their_place(tmp_path):
    ask(tmp_path, "Was the bed surveyed?", who="A")
    entry = {"text": "Does it silt up?", "importance": "clarify", "author": "R. Reader", "run": "flood", "x": 50000.5, "y": 3.0, "seconds": 20}
    path = _file(tmp_path, entry, {"text": "And here?", "importance": "editorial", "author": ""})
    assert read_written(tmp_path, path) == [2, 3]
    taken = find(tmp_path, 2)
    assert (taken.text, taken.author, taken.run, taken.x, taken.seconds) == ("Does it silt up?", "R. Reader", "flood", 50000.5, 20)
    assert read_written(tmp_path, path) == []
    assert len(queries(tmp_path)) == 3


@pytest.mark.parametrize(("bad", "words"), [
    ({"text": " ", "importance": "clarify"}, "no text"),
    ({"text": "x", "importance": "urgent"}, "urgent"),
    ({"text": "x", "importance": "clarify", "x": "12"}, "no number"),
    ({"text": "x" * 5000, "importance": "clarify"}, "2000 letters"),
    ("x", "no table"),
])
def test_one_bad_query_of_a_pack_and_none_is_taken(tmp_path, bad, words):
    path = _file(tmp_path, {"text": "good", "importance": "clarify"}, bad)
    with pytest.raises(ValueError, match=f"query 2.*{words}"):
        read_written(tmp_path, path)
    assert queries(tmp_path) == []


def test_a_file_that_no_pack_wrote_is_refused(tmp_path):
    with pytest.raises(ValueError, match="schema"):
        read_written(tmp_path, _file(tmp_path, schema="other/1"))
