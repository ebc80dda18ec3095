"""leewater begin: a new review round results files."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "a new review folder for results files, with a centre line proposed from the flow"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("folder", metavar="FOLDER", help="the review's folder; made if it is not there")
    parser.add_argument("files", nargs="+", metavar="FILE", help="results files; they stay where they are")
    parser.add_argument("--title", default="", help="what is reviewed (default: the folder's name)")
    parser.add_argument("--by", default="", metavar="NAME", help="who begins it, for the log")


def run(args: argparse.Namespace) -> int:
    from hydro.beginning import begin_review

    folder = Path(args.folder)
    review = begin_review(folder, args.title or folder.name, [Path(f) for f in args.files], who=args.by or "not named")
    print(f"{review.folder}: {len(review.runs)} {'run' if len(review.runs) == 1 else 'runs'} listed in review.toml.")
    print("lines.gpkg holds a centre line proposed from the flow: look at it, and add piers, weirs, sections and openings to it.")
    print(f"Open it with: leewater open {args.folder}")
    return 0
