"""leewater change: what differs between two runs, on one mesh or two."""

from __future__ import annotations

import argparse
from pathlib import Path

from . import write_json

HELP = "what changes from one run to another: levels, eddies, openings, wet ground"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("run_a", metavar="RUN_A", help="results file of the first run (before)")
    parser.add_argument("run_b", metavar="RUN_B", help="results file of the second run (after)")
    parser.add_argument("--pair", choices=("time", "discharge", "order"), default="time", help="which frames stand beside each other")
    parser.add_argument("--frame", type=int, metavar="N", help="compare frame N of RUN_A with its partner (default: the last pair)")
    parser.add_argument("--spacing", type=float, default=20.0, metavar="M", help="distance between level sections, m (default 20)")
    parser.add_argument("--above", type=float, default=0.01, metavar="M", help="report how far a rise above this value reaches, m (default 0.01)")
    parser.add_argument("--quiet", nargs=2, type=float, metavar=("S1", "S2"), help="chainages between which no change is expected, for the noise")
    parser.add_argument("--json", metavar="FILE", help="write the comparison as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write levels.csv, answers.csv and change.gpkg here")
    parser.add_argument("--studies", action="store_true", help="let wood go and look for a way upstream in both runs too (minutes)")


def run(args: argparse.Namespace) -> int:
    from hydro.change import compare, pair_frames
    from hydro.change.export import change_json, write_change

    (a, reach_a, review), (b, reach_b, other) = _opened(args.run_a), _opened(args.run_b)
    pairs = pair_frames(a, b, args.pair, **(_inflows(a, b, reach_a, reach_b) if args.pair == "discharge" else {}))
    chosen = [p for p in pairs if args.frame is None or p.a == args.frame]
    if not chosen:
        raise ValueError(f"frame {args.frame} of {a.name} has no partner; paired are {', '.join(str(p.a) for p in pairs)}.")
    change = compare(
        a, b, chosen[-1], reach_a=reach_a, reach_b=reach_b, spacing_m=args.spacing, above_m=args.above,
        quiet=tuple(args.quiet) if args.quiet else None,
    )
    one_review = review is not None and other is not None and review.folder == other.folder
    if args.studies and not one_review:
        raise ValueError("wood and fish stand in a review; give two runs that one review lists.")
    answers = _answers(change, review, (reach_a, reach_b), args.studies) if one_review else []
    if args.out:
        write_change(Path(args.out), change, answers)
    if not args.json or not write_json(args.json, change_json(change, answers)):
        _print(change, answers)
    return 0


def _opened(path: str):
    from hydro.reach import Reach
    from hydro.review import open_any

    review, run = open_any(path)
    if run is None:
        raise ValueError(f"{path} is a review; give the results files of two runs.")
    if review is None:
        return run, Reach(run.mesh.origin), None
    return run, review.reach_for(run), review


def _answers(change, review, reaches, studies: bool):
    """Receptors and checks side by side; with ``studies`` also wood and fish."""
    from hydro.change.answers import passage, side_by_side, wood
    from hydro.checks import read_checks
    from hydro.drift.report import study as drift_study
    from hydro.passage import study as passage_study

    entries = [review.entry_of(run) for run in (change.a, change.b)]
    out = side_by_side(change, reaches, read_checks(review.checks), entries[0].event)
    if studies and review.releases:
        out += wood(*(drift_study(review, e, try_settings=False) for e in entries))
    if studies and review.fish:
        out += passage(*([one.answer for one in passage_study(review, runs=[e.id]).answers] for e in entries))
    return out


def _inflows(a, b, reach_a, reach_b):
    import numpy as np

    from hydro.ledger import frame_ledger

    def of(run, reach):
        return np.array([frame_ledger(run, i, reach=reach).sf.through_discharge_m3_s for i in range(run.n_frames)])

    return {"inflow_a": of(a, reach_a), "inflow_b": of(b, reach_b)}


def _print(change, answers) -> None:
    from hydro.cautions import caution
    from hydro.change.export import owed

    print("Outside the works these differ before the water is looked at:" if change.setup else "Outside the works nothing differs.")
    for difference in change.setup:
        print(f"  {difference.sentence}")
    print("What changes:")
    for finding in change.findings:
        print(f"  {finding.sentence}")
    if answers:
        print("Answers side by side, before and after:")
    for row in answers:
        print(f"  {row.sentence}")
    for id_ in owed(change, answers):
        print(f"  {caution(id_).text}")
