"""leewater passage: is the way upstream excluded for the review's fish?"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from . import write_json

HELP = "whether a way upstream is excluded for the fish of a review"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("review", metavar="REVIEW", help="folder with a review.toml")
    parser.add_argument("--run", dest="runs", action="append", default=[], metavar="ID", help="only this run (may be given again)")
    parser.add_argument("--fish", action="append", default=[], metavar="NAME", help="only this fish (may be given again)")
    parser.add_argument("--every", type=int, default=0, metavar="N", help="in runs of many frames, assess every N-th (default: the last)")
    parser.add_argument("--swimmers", type=int, default=0, metavar="N", help="sample N swimmers in each run's last frame")
    parser.add_argument("--seed", type=int, default=1, metavar="N", help="seed of the sample (default 1)")
    parser.add_argument("--json", metavar="FILE", help="write the answers as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write passage.gpkg and CSV tables here")


def run(args: argparse.Namespace) -> int:
    from hydro.passage import passage_json, study, write_tables
    from hydro.review import open_any

    review, _ = open_any(args.review)
    if review is None:
        raise ValueError(f"{args.review} is a results file of no review; passage needs a review with fish, a start and a goal.")
    found = study(
        review, runs=args.runs, fish=args.fish, every=args.every, swimmers=args.swimmers, seed=args.seed, progress=_progress()
    )
    if args.out:
        write_tables(Path(args.out), found)
    if not args.json or not write_json(args.json, passage_json(found)):
        _table(found, sys.stdout)
    return 0


def _progress():
    """Progress on standard error, in place on a terminal; Ctrl-C stops between two searches."""
    if not sys.stderr.isatty():
        return None

    def tell(share: float, what: str) -> None:
        print(f"\r{100 * share:3.0f} %  {what[:90]:90}", end="\n" if share >= 1.0 else "", file=sys.stderr, flush=True)

    return tell


def _table(found, out) -> None:
    from hydro.cautions import OWED, caution
    from hydro.figure import printed

    for one in found.answers:
        answer = one.answer
        print(f"{one.entry.label}, frame {answer.stamp.index}: {answer.sentence}", file=out)
        for e in one.entrances:
            print(f"  {e.name}: {printed(e.discharge_m3_s)} m3/s, {printed(100 * e.share)} % of the flow", file=out)
        if one.sampled is not None:
            s = one.sampled
            print(f"  of {s.swimmers} sampled swimmers {s.not_excluded} not excluded "
                  f"({100 * s.low:.0f} to {100 * s.high:.0f} %, from their number alone; seed {s.seed})", file=out)
        for flag in answer.flags:
            print(f"  {flag}", file=out)
    for flow in found.flows:
        print(f"{flow.fish.name}, {flow.design or 'all runs'}:", file=out)
        for band in flow.bands:
            print(f"  {printed(band.low_m3_s)} to {printed(band.high_m3_s)} m3/s: {band.status}", file=out)
        for label, h in flow.runs:
            spell = h.longest_excluded
            longest = "" if spell is None else f"; longest excluded spell {'at least ' if spell.at_least else ''}{printed(spell.seconds)} s"
            print(f"  {label}: not excluded for {100 * h.shares.not_excluded:.0f} % of its time{longest}", file=out)
        for s in flow.months:
            print(f"  {s.label}: not excluded {100 * s.not_excluded:.0f} %, excluded {100 * s.excluded:.0f} %, undecided "
                  f"{100 * s.undecided:.0f} %, outside the flows looked at {100 * s.outside:.0f} %", file=out)
    for id_ in OWED["passage"]:
        print(f"  {caution(id_).text}", file=out)
