"""The numbered log of queries: remarks and questions pinned to a place, time and view, with answer and history.

The log is append-only: every change is a new line, so nothing that was written is lost and the whole
history can be read back.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterable, Mapping
from dataclasses import asdict, dataclass, field, fields
from pathlib import Path
from typing import Any
from zipfile import BadZipFile

from .review_log import append_line, now, read_log

STATES = ("asked", "answered", "accepted", "carried as a limitation", "withdrawn")
IMPORTANCE = ("could change the decision", "clarify", "editorial")
_LOG = "queries.jsonl"
_ANSWERS = ("answer", "file_received", "state")
_WRITTEN = "leewater/pack-queries/1"  # schema of the file that a team's pack lets its readers download
_LONGEST = 2000


@dataclass(frozen=True, slots=True)
class Query:
    """One query as it stands after all its changes.

    ``x``, ``y`` are world coordinates, m; ``seconds`` a time of run ``run``; ``view`` the desk's
    address for the view it was written in.
    """

    number: int
    text: str
    importance: str = "clarify"
    state: str = "asked"
    asked_of: str = ""
    date: str = ""
    due: str = ""
    answer: str = ""
    file_received: str = ""
    run: str = ""
    x: float | None = None
    y: float | None = None
    seconds: float | None = None
    view: str = ""
    author: str = ""
    history: tuple[str, ...] = field(default=())


def ask(folder: Path, text: str, *, who: str, **details: Any) -> Query:
    """Write a new query to the review's log; it gets the next number.

    Raises ``ValueError`` for an empty text or an unknown detail, importance or state.
    """
    if not text.strip():
        raise ValueError("a query needs a text; write what should be asked.")
    _checked(details)
    number = max((q.number for q in queries(folder)), default=0) + 1
    append_line(folder / _LOG, {
        "number": number, "at": now(), "who": who, "set": {"text": text, "author": who, "date": now()[:10], **details},
    })
    return find(folder, number)


def change(folder: Path, number: int, *, who: str, **details: Any) -> Query:
    """Change a query: its answer, state, due date or any other detail; the old values stay in the log."""
    find(folder, number)
    _checked(details)
    append_line(folder / _LOG, {"number": number, "at": now(), "who": who, "set": details})
    return find(folder, number)


def queries(folder: Path) -> list[Query]:
    """Every query as it stands, by number.

    Two people who asked at the same instant may have taken one number: the later keeps its place in
    the log and gets the next free number.
    """
    known = {f.name for f in fields(Query)}
    standing: dict[int, dict[str, Any]] = {}
    for entry in read_log(folder / _LOG):
        number = int(entry["number"])
        opens = "text" in entry["set"] and "date" in entry["set"]
        if opens and number in standing:
            number = max(standing) + 1
        values = standing.setdefault(number, {"number": number, "history": ()})
        said = ", ".join(f"{k}: {v}" for k, v in entry["set"].items() if k != "text" or not opens)
        values.update({k: v for k, v in entry["set"].items() if k in known})
        values["history"] = (*values["history"], f"{entry['at']} {entry['who']}: {'asked' if opens else said}")
    return [Query(**v) for _, v in sorted(standing.items())]


def find(folder: Path, number: int) -> Query:
    """The query with this number; ``ValueError`` names the numbers there are."""
    for query in queries(folder):
        if query.number == number:
            return query
    raise ValueError(f"there is no query {number}; the log holds {len(queries(folder))}.")


def table(items: Iterable[Query]) -> list[dict[str, Any]]:
    """Rows for CSV, XLSX and the record: one a query, history as lines of one cell."""
    return [{**asdict(q), "history": "\n".join(q.history)} for q in items]


def to_csv(items: Iterable[Query]) -> str:
    """The log as CSV; cells that a spreadsheet would run as a formula are kept as text."""
    out = io.StringIO()
    writer = csv.DictWriter(out, [f.name for f in fields(Query)], lineterminator="\n")
    writer.writeheader()
    writer.writerows({k: _inert(v) for k, v in row.items()} for row in table(items))
    return out.getvalue()


def to_xlsx(items: Iterable[Query], path: Path) -> None:
    """The log as a spreadsheet, to be answered in its columns answer, file_received and state."""
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.active
    sheet.title = "Queries"
    names = [f.name for f in fields(Query)]
    sheet.append(names)
    for row in table(items):
        sheet.append([_inert(row[n]) for n in names])
    sheet.freeze_panes = "A2"
    book.save(path)
    book.close()


def read_answers(folder: Path, path: Path, *, who: str) -> list[int]:
    """Take answers back from a CSV or XLSX by number; rows may be re-ordered or left out.

    Returns
    -------
    list of int
        Numbers of the queries that changed.

    Raises
    ------
    ValueError
        A file without a number column, or a row whose number the log does not hold: nothing is
        written then.
    """
    rows = _rows(path)
    by_number = {q.number: q for q in queries(folder)}
    changes: dict[int, dict[str, str]] = {}
    for i, row in enumerate(rows, 2):
        number = _number(row, i, path)
        if number not in by_number:
            raise ValueError(f"{path.name}, row {i}: there is no query {number} in this review; nothing was read.")
        old = by_number[number]
        new = {k: str(row[k]).lstrip("'") for k in _ANSWERS if row.get(k) not in (None, "") and str(row[k]).lstrip("'") != getattr(old, k)}
        if "answer" in new and "state" not in new and old.state == "asked":
            new["state"] = "answered"
        _checked(new)
        if new:
            changes[number] = new
    for number, new in changes.items():
        change(folder, number, who=who, **new)
    return list(changes)


def read_written(folder: Path, path: Path) -> list[int]:
    """Take queries that were written in a team's pack into the review's log; those it holds already are passed over.

    Returns
    -------
    list of int
        Numbers of the new queries.

    Raises
    ------
    ValueError
        A file that no pack wrote, or a query that cannot be read: nothing is written then.
    """
    try:
        content = json.loads(path.read_text(encoding="utf-8"))
    except (UnicodeDecodeError, json.JSONDecodeError) as error:
        raise ValueError(f"{path.name} cannot be read as JSON ({error}); download the queries from the pack again.") from error
    if not isinstance(content, dict) or content.get("schema") != _WRITTEN or not isinstance(content.get("queries"), list):
        raise ValueError(f"{path.name} holds no queries of a pack; it should say schema {_WRITTEN}.")
    written = [_written(entry, i, path) for i, entry in enumerate(content["queries"], 1)]
    held = {_same(asdict(q)) for q in queries(folder)}
    numbers = []
    for details in written:
        if _same(details) not in held:
            held.add(_same(details))
            query = ask(folder, details["text"], who=details["author"], **{k: details[k] for k in ("importance", "run", "x", "y", "seconds")})
            numbers.append(query.number)
    return numbers


def _written(entry: Any, i: int, path: Path) -> dict[str, Any]:
    """One query of a pack's file, checked: whoever held the file may have changed it."""
    def wrong(what: str) -> ValueError:
        return ValueError(f"{path.name}, query {i}: {what}; nothing was read.")

    if not isinstance(entry, dict):
        raise wrong("it is no table of text, importance and place")
    words = {k: entry.get(k, "") for k in ("text", "importance", "author", "run")}
    for name, value in words.items():
        if not isinstance(value, str) or len(value) > _LONGEST:
            raise wrong(f"its {name} is no text of up to {_LONGEST} letters")
    if not words["text"].strip():
        raise wrong("it has no text")
    if words["importance"] not in IMPORTANCE:
        raise wrong(f"importance {words['importance']!r} is not known; say one of: {', '.join(IMPORTANCE)}")
    numbers = {k: entry.get(k) for k in ("x", "y", "seconds")}
    for name, value in numbers.items():
        if value is not None and (isinstance(value, bool) or not isinstance(value, (int, float)) or not math.isfinite(value)):
            raise wrong(f"its {name} is {value!r}, which is no number")
    return {**words, "author": words["author"].strip() or "a reader of the pack", **numbers}


def _same(details: Mapping[str, Any]) -> tuple[Any, ...]:
    """What makes two queries one: read a second time, a file adds nothing."""
    return tuple(details[k] for k in ("text", "author", "run", "x", "y", "seconds"))


def _number(row: Mapping[str, Any], i: int, path: Path) -> int:
    try:
        return int(float(str(row.get("number"))))
    except ValueError as error:
        raise ValueError(f"{path.name}, row {i}: {row.get('number')!r} is no query number; nothing was read.") from error


def _rows(path: Path) -> list[dict[str, Any]]:
    if path.suffix.lower() == ".xlsx":
        from openpyxl import load_workbook
        from openpyxl.utils.exceptions import InvalidFileException

        try:
            book = load_workbook(path, read_only=True)
        except (BadZipFile, InvalidFileException, KeyError) as error:
            raise ValueError(f"{path.name} cannot be read as a workbook ({error}); send back the file that was sent out.") from error
        values = [list(r) for r in book.active.iter_rows(values_only=True)]
        book.close()
        rows = [dict(zip(values[0], r, strict=False)) for r in values[1:] if any(v is not None for v in r)] if values else []
    else:
        rows = list(csv.DictReader(io.StringIO(path.read_text(encoding="utf-8-sig"))))
    if not rows or "number" not in rows[0]:
        raise ValueError(f"{path.name} has no column called number; send back the table that was sent out.")
    return rows


def _checked(details: Mapping[str, Any]) -> None:
    known = {f.name for f in fields(Query)} - {"number", "history"}
    if unknown := set(details) - known:
        raise ValueError(f"a query has no {sorted(unknown)[0]!r}; it has {', '.join(sorted(known))}.")
    for name, words in (("state", STATES), ("importance", IMPORTANCE)):
        if name in details and details[name] not in words:
            raise ValueError(f"{name} {details[name]!r} is not known; say one of: {', '.join(words)}.")


def _inert(value: Any) -> Any:
    """Text that begins like a formula gets an apostrophe, as spreadsheets take for plain text."""
    return f"'{value}" if isinstance(value, str) and value[:1] in "=+-@" and value else value
