"""leewater record: the review record, and whether one can be derived again."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from . import write_json

HELP = "write the review record of a review, or derive one again and compare"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("review", metavar="REVIEW", help="review folder")
    parser.add_argument("--out", metavar="DIR", help="where to write it (default: REVIEW/record)")
    parser.add_argument("--verify", metavar="DIR", help="derive the record in DIR again and say what differs")
    parser.add_argument("--json", metavar="FILE", help="write the record as JSON only (- for standard output)")


def run(args: argparse.Namespace) -> int:
    from hydro.record.build import Material, build_record
    from hydro.record.model import as_json
    from hydro.record.write import write_record
    from hydro.review import open_review

    review = open_review(args.review)
    if args.verify:
        return _verify(Path(args.verify), review)
    material = Material(review, _say)
    record = build_record(material)
    if args.json:
        write_json(args.json, as_json(record))
        return 0
    written = write_record(record, Path(args.out or review.folder / "record"), review=review, readings=material.readings)
    print(f"{len(record.figures())} figures in {len(record.parts)} parts, {len(record.cautions())} cautions.")
    for path in written:
        print(f"  {path}")
    return 0


def _verify(folder: Path, review) -> int:
    from hydro.record.build import Material, build_record
    from hydro.record.model import as_json
    from hydro.record.verify import verify

    verdict = verify(folder, review, lambda r: as_json(build_record(Material(r, _say))))
    for sentence in (*verdict.inputs, *verdict.figures):
        print(sentence)
    if verdict.same:
        print(f"All {verdict.compared} figures come out with the same printed digits, from the same inputs.")
        return 0
    print(f"{len(verdict.inputs)} inputs changed and {len(verdict.figures)} of {verdict.compared} figures differ.")
    return 2


def _say(text: str) -> None:
    print(text, file=sys.stderr)
