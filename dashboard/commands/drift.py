"""leewater drift: floating wood against piers and openings."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from . import write_json

HELP = "where floating wood goes, and what it meets"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("review", metavar="REVIEW", help="review folder with [[releases]]")
    parser.add_argument("--run", dest="runs", action="append", metavar="ID", help="run to use; may be repeated (default: the bankfull means)")
    parser.add_argument("--quick", type=float, default=1.0, metavar="F", help="factor on the number of logs, for a quick look")
    parser.add_argument("--json", metavar="FILE", help="write the answer as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write RUN/logs.csv and RUN/drift.gpkg here")


def run(args: argparse.Namespace) -> int:
    from hydro.drift.report import SCHEMA, answer_json, study, write_drift
    from hydro.review import open_any

    review, _ = open_any(args.review)
    if review is None:
        raise ValueError(f"{args.review} is no review; drift needs releases and outlines: give a review folder.")
    answers = []
    for entry in _entries(review, args.runs):
        answer = study(review, entry, numbers=args.quick, progress=_progress(entry.label))
        answers.append(answer_json(answer))
        if args.json != "-":
            _print(answer)
        if args.out:
            write_drift(Path(args.out) / entry.id, answer)
    if args.json != "-":
        from hydro.cautions import OWED, caution

        for id_ in OWED["drift"]:
            print(f"  {caution(id_).text}")
    write_json(args.json, {"schema": SCHEMA, "runs": answers})
    return 0


def _entries(review, wanted):
    if wanted:
        return [review.entry(w) for w in wanted]
    still = [e for e in review.runs if e.kind != "instant" and "coarse" not in e.variant and e.event == "bankfull"]
    return still or review.runs[:1]


def _progress(label: str):
    last: dict[str, int] = {}

    def say(what: str, share: float) -> None:
        tenth = int(10 * share)
        if last.get(what) != tenth:
            last[what] = tenth
            print(f"leewater: {label}, {what}: {tenth * 10} %", file=sys.stderr)

    return say


def _print(answer) -> None:
    base = answer.base
    print(f"{answer.entry.label}: {len(base.state):,} logs")
    for text in answer.sentences():
        print(f"  {text}")
    for i, opening in enumerate(base.openings):
        share = base.passes(i)
        print(f"  {opening.name}: {100 * share.value:.0f} % pass ({100 * share.low:.0f} to {100 * share.high:.0f} % from their number alone)")
    for gap in answer.gaps:
        word = "longer than" if gap.narrower else "no longer than"
        print(f"  {gap.opening}: {gap.effective_width_m:.1f} m wide to the flow; a design log of {gap.design_log_m:.1f} m is {word} that")
    for held in answer.held:
        if held.logs:
            print(f"  {held.logs} logs come into the eddy {held.eddy}, half of them for {held.median_s:.0f} s or more")
    for i, pier in enumerate(base.piers):
        print(f"  {pier.name}: {100 * base.lodges(i).value:.1f} % lodge by the rule chosen; fed by {base.fed(i)}")
