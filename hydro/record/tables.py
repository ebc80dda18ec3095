"""The record's tables as CSV: the printed text and the full digits side by side, headed by the cautions they owe."""

from __future__ import annotations

import csv
from pathlib import Path

from ..cautions import told
from ..figure import Figure
from .model import Record, Table, cell_text


def write_csv(record: Record, folder: Path) -> list[Path]:
    """One CSV a table, named by the table's id, in ``folder``."""
    out = []
    for part in record.parts:
        for table in part.tables:
            path = folder / f"{table.id}.csv"
            with open(path, "w", newline="", encoding="utf-8") as stream:
                stream.writelines(f"# {c['text']}\n" for c in told([*part.cautions, *(i for _, f in table.figures() for i in f.cautions)]))
                csv.writer(stream).writerows(_rows(table))
            out.append(path)
    return out


def _rows(table: Table) -> list[list[str]]:
    """Heading and rows; a column that holds figures gets a second one with their full digits."""
    numeric = [any(j < len(r) and isinstance(r[j], Figure) for r in table.rows) for j in range(len(table.columns))]
    head = []
    for name, has in zip(table.columns, numeric, strict=True):
        head += [name, f"{name} (full digits)"] if has else [name]
    rows = [head]
    for row in table.rows:
        cells = []
        for j, has in enumerate(numeric):
            cell = row[j] if j < len(row) else ""
            cells.append(cell_text(cell))
            if has:
                cells.append(repr(cell.value) if isinstance(cell, Figure) and cell.value is not None else "")
        rows.append(cells)
    return rows
