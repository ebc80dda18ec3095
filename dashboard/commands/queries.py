"""leewater queries: the log of queries, out to the modeller and their answers back in."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from . import write_json

HELP = "the review's queries: list them, send them out, read the answers back"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("review", metavar="REVIEW", help="review folder")
    parser.add_argument("--out", metavar="FILE", help="write them to a .csv or .xlsx file to be answered")
    parser.add_argument("--answers", metavar="FILE", help="read answers from such a file, by the number of the query")
    parser.add_argument("--by", metavar="NAME", help="who reads the answers in, for the log")
    parser.add_argument("--json", metavar="FILE", help="write the log as JSON (- for standard output)")


def run(args: argparse.Namespace) -> int:
    from hydro.queries import queries, read_answers, table, to_csv, to_xlsx
    from hydro.review import open_review, write_whole

    folder = open_review(args.review).folder
    if args.answers:
        if not args.by:
            raise ValueError("answers are logged with a name; give --by NAME.")
        changed = read_answers(folder, Path(args.answers), who=args.by)
        print(f"{len(changed)} {'query has' if len(changed) == 1 else 'queries have'} new answers from {args.answers}.", file=sys.stderr)
    items = queries(folder)
    if args.out:
        out = Path(args.out)
        if out.suffix.lower() not in (".csv", ".xlsx"):
            raise ValueError(f"--out {args.out}: name a file that ends in .csv or .xlsx.")
        out.parent.mkdir(parents=True, exist_ok=True)
        if out.suffix.lower() == ".xlsx":
            to_xlsx(items, out)
        else:
            write_whole(out, to_csv(items))
    if not write_json(args.json, {"schema": "leewater/queries/1", "queries": table(items)}):
        for q in items:
            print(f"{q.number:>3}  {q.state:<12} {q.importance}: {q.text}")
            if q.answer:
                print(f"     Answer: {q.answer}")
        if not items:
            print("The review has no queries yet.")
    return 0
