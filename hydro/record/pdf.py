"""The record as a tagged PDF (PDF/UA-1 and PDF/A-2a), set by Typst from a template the user may replace."""

from __future__ import annotations

import shutil
from pathlib import Path
from typing import Any

import typst

from .model import Record

TEMPLATES = Path(__file__).parent / "templates"
STANDARDS: list[Any] = ["ua-1", "a-2a"]


def template(name: str, review_folder: Path | None = None) -> Path:
    """The template ``name`` ("record" or "evening"): the review's own in templates/, else ours.

    Raises ``ValueError`` for an unknown one.
    """
    places = ([review_folder / "templates"] if review_folder else []) + [TEMPLATES]
    for place in places:
        if (place / f"{name}.typ").is_file():
            return place / f"{name}.typ"
    known = ", ".join(p.stem for p in TEMPLATES.glob("*.typ"))
    raise ValueError(f"there is no template {name!r}; the known ones are {known}.")


def write_plates(record: Record, folder: Path) -> list[Path]:
    """Every plate as an SVG file beside the record."""
    out = []
    for part in record.parts:
        for plate in part.plates:
            path = folder / f"{plate.id}.svg"
            path.write_text(plate.svg, encoding="utf-8")
            out.append(path)
    return out


def write_pdf(folder: Path, name: str, made: int, review_folder: Path | None = None) -> Path:
    """Typeset ``name``.pdf from record.json and the plates in ``folder``.

    Parameters
    ----------
    made : int
        Unix time of the record, so that the same record gives the same bytes.

    Raises
    ------
    ValueError
        If the template cannot be typeset; the message is Typst's own.
    """
    source = folder / f"{name}.typ"
    shutil.copyfile(template(name, review_folder), source)
    path = folder / f"{name}.pdf"
    try:
        typst.compile(
            str(source), output=str(path), root=str(folder), pdf_standards=STANDARDS,
            ignore_system_fonts=True, timestamp=made,
        )
    except typst.TypstError as error:
        raise ValueError(f"the template {name}.typ cannot be typeset: {error}; mend it or remove it.") from error
    finally:
        source.unlink(missing_ok=True)
    return path
