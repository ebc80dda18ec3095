"""A record written to a folder, whole or not at all: record.pdf, evening.pdf, record.json, tables, GeoPackage."""

from __future__ import annotations

import json
import shutil
import tempfile
from collections.abc import Sequence
from datetime import datetime
from pathlib import Path

from ..ledger import write_tables
from ..review import Review
from .eddies import Reading
from .model import Record, as_json
from .pdf import write_pdf, write_plates
from .tables import write_csv


def write_record(
    record: Record, folder: Path, *, review: Review | None = None, readings: Sequence[Reading] = (), evening: bool = True
) -> list[Path]:
    """Every export of a record, from the same figures.

    Parameters
    ----------
    folder : Path
        Made if need be; files of an older record in it are replaced, others stay.
    readings : sequence of Reading
        Their zones go to ``gis/RUN/`` as GeoPackage and CSV.
    evening : bool
        Write the shorter sheet for a public evening too.

    Returns
    -------
    list of Path
        The files written.
    """
    folder.mkdir(parents=True, exist_ok=True)
    made = int(datetime.fromisoformat(record.made.replace("Z", "+00:00")).timestamp())
    templates = review.folder if review else None
    with tempfile.TemporaryDirectory(dir=folder, prefix=".making-") as name:
        work = Path(name)
        (work / "record.json").write_text(json.dumps(as_json(record), indent=1, allow_nan=False), encoding="utf-8")
        write_plates(record, work)
        write_pdf(work, "record", made, templates)
        if evening:
            write_pdf(work, "evening", made, templates)
        (work / "tables").mkdir()
        write_csv(record, work / "tables")
        for r in readings:
            write_tables(work / "gis" / r.entry.id, r.run, [r.ledger])
        return _moved(work, folder)


def _moved(work: Path, folder: Path) -> list[Path]:
    out = []
    for path in sorted(work.rglob("*")):
        if path.is_file():
            target = folder / path.relative_to(work)
            target.parent.mkdir(parents=True, exist_ok=True)
            shutil.move(str(path), target)
            out.append(target)
    return out
