"""The log of queries as HTML: its table, the form that writes a new one, and the form that answers one."""

from __future__ import annotations

from collections.abc import Sequence

from hydro.queries import IMPORTANCE, STATES, Query

from ..text import safe
from . import table


def html(items: Sequence[Query]) -> str:
    """The log with its forms."""
    columns = (
        table.Column("No.", figure=False), table.Column("Query", figure=False), table.Column("State", figure=False),
        table.Column("By", figure=False),
    )
    lines = [_line(q) for q in items]
    log = table.html(table.Table("Queries", f"{len(items)} in the log", "Queries of the review", columns, lines, "No query yet."))
    return log + (_answer(items) if items else "") + _new()


def _line(q: Query) -> table.Line:
    place = f"{q.x:.1f} E, {q.y:.1f} N" if q.x is not None and q.y is not None else ""
    answer = f"Answer: {q.answer}" if q.answer else place
    asked = "; ".join(p for p in (q.importance, f"asked of {q.asked_of}" if q.asked_of else "", f"due {q.due}" if q.due else "") if p)
    return table.Line(
        ((str(q.number), ""), (safe(q.text), safe(answer)), (safe(q.state), safe(q.date)), (safe(q.author), safe(asked))),
        go=("follow", q.view) if q.view else None, label=f"Open the view of query {q.number}",
    )


def _new() -> str:
    return (
        '<h3>Write a query</h3><form data-send="ask" class="ask">'
        f'{_field("ask", "who", "Your name", required=True, keep=True)}{_field("ask", "text", "Query", required=True)}'
        f'{_list("ask", "importance", "Importance", IMPORTANCE, "clarify")}{_field("ask", "asked_of", "Asked of")}'
        f'{_field("ask", "due", "Due (2031-03-31)")}<button type="submit" class="plain first">Write the query</button></form>'
    )


def _answer(items: Sequence[Query]) -> str:
    waiting = next((q for q in items if q.state == "asked"), items[-1])
    history = "".join(f"<li>{q.number}: {safe(line)}</li>" for q in items for line in q.history)
    return (
        '<h3>Answer or change a query</h3><form data-send="answer" class="ask">'
        f'{_list("answer", "number", "Query", [str(q.number) for q in items], str(waiting.number))}{_field("answer", "who", "Your name", required=True, keep=True)}'
        f'{_list("answer", "state", "State", STATES, "answered")}{_field("answer", "answer", "Answer")}'
        f'{_field("answer", "file_received", "File received")}<button type="submit" class="plain">Write it down</button></form>'
        f'<details><summary class="word">History of the queries</summary><ul>{history}</ul></details>'
    )


def _field(form: str, name: str, label: str, *, required: bool = False, keep: bool = False) -> str:
    once = "" if keep else " data-once"
    return (
        f'<label>{label} <input type="text" name="{name}" id="{form}-{name}"{once}'
        f'{" required" if required else ""}{" autocomplete=name" if keep else ""}></label>'
    )


def _list(form: str, name: str, label: str, offered: Sequence[str], chosen: str) -> str:
    options = "".join(f'<option{" selected" if o == chosen else ""}>{safe(o)}</option>' for o in offered)
    return f'<label>{label} <select name="{name}" id="{form}-{name}">{options}</select></label>'
