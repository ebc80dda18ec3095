"""leewater pack: a review as a folder, or one file, that opens in any browser; and new queries read back from one."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from . import write_json

HELP = "write a pack: a folder that shows a review in any browser with no Python and no network"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("review", metavar="REVIEW", help="review folder, or one results file")
    parser.add_argument("--out", metavar="DIR", help="where to write it (default: REVIEW/pack, or pack beside the file)")
    parser.add_argument(
        "--run", action="append", dest="runs", default=[], metavar="ID",
        help="a run to show; may be repeated (default: those of the saved views, else the first that changes in time)",
    )
    parser.add_argument("--single", action="store_true", help="one file, DIR/pack.html, in place of the folder")
    parser.add_argument("--team", action="store_true", help="with the review's queries and names, and a place to write new queries")
    parser.add_argument("--json", metavar="FILE", help="write what the pack holds as JSON (- for standard output)")
    parser.add_argument("--take", metavar="FILE", help="read the queries that were written in a team's pack into the review")


def run(args: argparse.Namespace) -> int:
    from hydro.review import open_any

    review, _ = open_any(args.review)
    if args.take:
        return _take(review, Path(args.take))
    from dashboard.pack import gather, write_folder, write_single

    folder = Path(args.out or (review.folder if review else Path(args.review).resolve().parent) / "pack")
    pack = gather(args.review, args.runs, team=args.team, progress=_print)
    written = write_single(pack, folder / "pack.html") if args.single else write_folder(pack, folder)
    if write_json(args.json, _listed(pack, folder, written)):
        return 0
    size = sum(p.stat().st_size for p in written) / 1e6
    opening = written[0] if args.single else folder / "index.html"
    print(f"{len(written)} {'file' if len(written) == 1 else 'files'}, {size:.1f} MB. Open {opening} in a browser.")
    if not args.team:
        print("No query, person or path of the review is in it; --team puts the queries in.")
    return 0


def _print(label: str, done: int, whole: int) -> None:
    if done % 10 == 0 or done == whole:
        print(f"{label} ({100 * done // whole} %)", file=sys.stderr)


def _listed(pack, folder: Path, written: list[Path]) -> dict:
    files = [{"name": p.relative_to(folder).as_posix(), "size_bytes": p.stat().st_size} for p in written]
    return {"schema": "leewater/pack-files/1", "title": pack.title, "digest": pack.digest, "team": pack.team, "files": files}


def _take(review, file: Path) -> int:
    from hydro.queries import read_written

    if review is None:
        raise ValueError("queries are kept in a review; name the review folder.")
    numbers = read_written(review.folder, file)
    print(f"{len(numbers)} new {'query' if len(numbers) == 1 else 'queries'} read from {file.name}"
          + (f": numbers {', '.join(map(str, numbers))}." if numbers else "; all of them were in the review already."))
    return 0
