"""The record as data: parts made of sentences, tables of figures and plates. Every export is made from it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

from ..cautions import CAUTIONS
from ..figure import Figure, printed, shown
from ..provenance import command_line, versions

SCHEMA = "leewater/record/1"


@dataclass(frozen=True, slots=True)
class Table:
    """A table with a lasting id. Cells are text or figures; a row may end short.

    ``columns`` are headings with their unit, such as "Area, m2".
    """

    id: str
    title: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str | Figure, ...], ...]

    def figures(self) -> Iterator[tuple[str, Figure]]:
        """Each figure with its key: table, row and column."""
        for i, row in enumerate(self.rows):
            for j, cell in enumerate(row):
                if isinstance(cell, Figure):
                    yield f"{self.id}[{i}][{j}]", cell


@dataclass(frozen=True, slots=True)
class Plate:
    """A drawing to a true scale: SVG text with its size in mm, caption and text alternative."""

    id: str
    title: str
    svg: str
    width_mm: float
    height_mm: float
    alt: str
    caption: str
    scale: int | None = None  # 500 for 1:500


@dataclass(frozen=True, slots=True)
class Part:
    """A chapter of the record."""

    id: str
    title: str
    paragraphs: tuple[str, ...] = ()
    tables: tuple[Table, ...] = ()
    plates: tuple[Plate, ...] = ()
    cautions: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Record:
    """A review record: front page, parts, and what is needed to derive it again."""

    title: str
    front: dict[str, str]
    parts: tuple[Part, ...]
    inputs: tuple[dict[str, Any], ...]  # run id, file name, sha256
    settings: dict[str, float]
    made: str
    command: str = field(default_factory=command_line)
    versions: dict[str, str] = field(default_factory=versions)

    def figures(self) -> dict[str, Figure]:
        """Every figure in the record by its key."""
        return {key: f for part in self.parts for table in part.tables for key, f in table.figures()}

    def cautions(self) -> tuple[str, ...]:
        """Ids of every caution owed by a figure or a part, in the order of the registry."""
        owed = {c for f in self.figures().values() for c in f.cautions} | {c for p in self.parts for c in p.cautions}
        return tuple(c for c in CAUTIONS if c in owed)


def cell_text(cell: str | Figure) -> str:
    """A cell as printed: text as it is, a figure rounded to its sensitivity with its range."""
    if isinstance(cell, str):
        return cell
    if cell.value is None or cell.value != cell.value:
        return cell.note or "n/a"
    text = shown(cell)
    if cell.decimals is None and cell.low is not None and cell.high is not None and cell.high > cell.low:
        text += f" ({printed(cell.low, cell.low, cell.high)} to {printed(cell.high, cell.low, cell.high)})"
    return text


def as_json(record: Record) -> dict[str, Any]:
    """The record as plain values: full digits beside the printed ones."""
    return {
        "schema": SCHEMA,
        "title": record.title,
        "front": record.front,
        "made": record.made,
        "command": record.command,
        "versions": record.versions,
        "inputs": list(record.inputs),
        "settings": record.settings,
        "parts": [_part(p) for p in record.parts],
        "cautions": [{"id": c, "text": CAUTIONS[c].text} for c in record.cautions()],
        "figures": {
            key: {**f.as_dict(), "printed": cell_text(f)} for key, f in record.figures().items()
        },
    }


def _part(part: Part) -> dict[str, Any]:
    return {
        "id": part.id,
        "title": part.title,
        "paragraphs": list(part.paragraphs),
        "cautions": list(part.cautions),
        "tables": [
            {
                "id": t.id, "title": t.title, "columns": list(t.columns),
                "rows": [[cell_text(c) for c in row] for row in t.rows],
            }
            for t in part.tables
        ],
        "plates": [
            {
                "id": p.id, "title": p.title, "file": f"{p.id}.svg", "width_mm": p.width_mm,
                "height_mm": p.height_mm, "alt": p.alt, "caption": p.caption, "scale": p.scale,
            }
            for p in part.plates
        ],
    }
