"""Queries keep their number and history, and answers find their way back whatever the order of rows."""

from __future__ import annotations

import csv
import io

import pytest

from hydro.queries import ask, change, queries, read_answers, to_csv, to_xlsx
from hydro.review import append_line, read_log


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
