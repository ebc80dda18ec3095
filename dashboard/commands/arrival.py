"""leewater arrival: the audit of what has arrived."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from . import write_json

HELP = "what has arrived, and what must be asked before relying on it"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("file", nargs="+", metavar="FILE", help="results file or review; several files are audited one by one")
    parser.add_argument("--ask", metavar="DIR", help="write the request sheet for the modelling firm here")
    parser.add_argument("--json", metavar="FILE", help="write the findings as JSON (- for standard output)")


def run(args: argparse.Namespace) -> int:
    from hydro.arrival import audit
    from hydro.arrival.ask import request_sheet, write_sheet

    reports: list = []
    last: tuple = (None, None, [])
    for name, opened, reach in _runs(args.file):
        print(f"leewater: reading {name}", file=sys.stderr)
        found = audit(opened, reach)
        reports.append(_report(name, opened, found))
        last = (opened, reach, [*last[2], *found])
        if args.json != "-":
            _print(name, found)
    if args.ask:
        for path in write_sheet(Path(args.ask), request_sheet(*last)):
            print(path, file=sys.stderr)
    write_json(args.json, {"schema": "leewater/arrival/1", "runs": reports})
    return 0


def _runs(paths):
    from hydro.reach import Reach
    from hydro.review import open_any

    for path in paths:
        review, opened = open_any(path)
        if opened is not None:
            yield opened.name, opened, review.reach_for(opened) if review else Reach(opened.mesh.origin)
        for entry in review.runs if review is not None and opened is None else ():
            yield entry.label, *_of(review, entry)


def _of(review, entry):
    run = review.open(entry.id)
    return run, review.reach_for(run)


def _report(name, opened, found):
    from hydro.cautions import told
    from hydro.ledger.report import source_of

    return {
        "run": name, "source": source_of(opened), "settings": dict(opened.settings),
        "findings": [
            {
                "id": f.id, "grade": f.grade, "sentence": f.sentence, "meaning": f.meaning, "question": f.question,
                "frame": f.frame, "figure": f.figure.as_dict() if f.figure else None,
            }
            for f in found
        ],
        "cautions": told(_owed(found)),
    }


def _owed(found):
    """Cautions of the audit and of its findings' figures."""
    from hydro.cautions import OWED

    return dict.fromkeys([*OWED["arrival"], *(c for f in found if f.figure for c in f.figure.cautions)])


def _print(name, found) -> None:
    from hydro.cautions import caution

    print(f"{name}: {len(found)} findings")
    for f in found:
        print(f"  {f.grade:<18} {f.sentence}")
        if f.grade != "note":
            print(f"  {'':<18} {f.meaning} Ask: {f.question}")
    for id_ in _owed(found):
        print(f"  {caution(id_).text}")
