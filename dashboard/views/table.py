"""Plain HTML tables: figures with their sensitivity under them, and a row that takes the map there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from ..text import safe


@dataclass(frozen=True, slots=True)
class Column:
    """A heading with its unit under it; ``figure`` columns stand at the right. HTML."""

    title: str
    unit: str = ""
    figure: bool = True
    secondary: bool = False  # left out where room is short


@dataclass(frozen=True, slots=True)
class Line:
    """One row. ``cells`` are (HTML, HTML under it); ``go`` is what the row's button sends, if it has one."""

    cells: tuple[tuple[str, str], ...]
    subject: bool = False
    go: tuple[str, str] | None = None
    label: str = ""


@dataclass(frozen=True, slots=True)
class Table:
    """A table with its title, the words beside it and its caption for the ear."""

    title: str
    beside: str
    caption: str
    columns: tuple[Column, ...]
    lines: Sequence[Line] = field(default=())
    empty: str = "None."
    aside: str = ""  # HTML under the table


def html(table: Table) -> str:
    """The table as HTML; titles, units and cells are HTML already, the caption is plain text."""
    head = "".join(
        f'<th scope="col" class="{_kind(c)}">{c.title}{f"<br><span>{c.unit}</span>" if c.unit else ""}</th>'
        for c in table.columns
    )
    body = "".join(_line(line, table.columns) for line in table.lines)
    if not table.lines:
        body = f'<tr><td colspan="{len(table.columns)}">{table.empty}</td></tr>'
    return (
        f'<h2>{table.title} <span class="beside">{table.beside}</span></h2>'
        f'<table><caption class="unseen">{safe(table.caption)}</caption><thead><tr>{head}</tr></thead>'
        f"<tbody>{body}</tbody></table>" + (f'<p class="aside">{table.aside}</p>' if table.aside else "")
    )


def _kind(column: Column) -> str:
    return f"{'figure' if column.figure else 'name'}{' secondary' if column.secondary else ''}"


def _line(line: Line, columns: tuple[Column, ...]) -> str:
    cells = []
    for i, ((top, under), column) in enumerate(zip(line.cells, columns, strict=True)):
        under = f'<span class="under">{under}</span>' if under else ""
        if i == 0:
            inner = top
            if line.go:
                name, value = line.go
                pressed = "true" if line.subject else "false"
                inner = (
                    f'<button type="button" class="row" data-do="{safe(name)}" data-value="{safe(value)}" '
                    f'data-key="{safe(name)}-{safe(value)}" aria-pressed="{pressed}" aria-label="{safe(line.label)}">{top}</button>'
                )
            cells.append(f'<th scope="row" class="{_kind(column)}">{inner}{under}</th>')
        else:
            cells.append(f'<td class="{_kind(column)}">{top}{under}</td>')
    go = f' data-do="{safe(line.go[0])}" data-value="{safe(line.go[1])}"' if line.go else ""
    return f'<tr{" class=subject" if line.subject else ""}{go}>{"".join(cells)}</tr>'
