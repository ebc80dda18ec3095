"""leewater settings: what a review's figures hang on, who changed it, and what Leewater chose by itself."""

from __future__ import annotations

import argparse
import json
from pathlib import Path

HELP = "settings of a review, its automatic choices, and the log of who changed what"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("review", metavar="REVIEW", help="review folder")
    which = parser.add_mutually_exclusive_group()
    which.add_argument(
        "--set", nargs=2, metavar=("NAME", "VALUE"),
        help="set a setting, represented_as.ID, boundaries.closed or boundaries.open.NAME; an automatic choice is overruled by that",
    )
    which.add_argument("--accept", metavar="CHOICE", help="log that an automatic choice is accepted as it stands")
    which.add_argument("--replay", action="store_true", help="replay the log from its first state and compare it with review.toml")
    parser.add_argument("--by", default="", metavar="WHO", help="who sets or accepts")
    parser.add_argument("--why", default="", metavar="TEXT", help="why it is set, for the log")
    parser.add_argument("--json", metavar="FILE", help="write settings, choices and log as JSON (- for standard output)")


def run(args: argparse.Namespace) -> int:
    from hydro.automatic import accept, automatic_choices, overrule
    from hydro.review import open_any, write_whole
    from hydro.review_log import check_replay, told

    review, _ = open_any(args.review)
    if review is None:
        raise ValueError(f"{args.review} is no review; settings and their log belong to a review folder.")
    if args.replay:
        print(f"The log of {check_replay(review.folder)} entries, replayed from its first state, gives review.toml to the byte.")
        return 0
    if args.accept:
        chosen = accept(review, args.accept, who=args.by)
        print(f"{chosen.id}: {chosen.standing}. {chosen.sentence}")
        return 0
    if args.set:
        review = overrule(review, *args.set, who=args.by, why=args.why)
        print(f"{review.folder / 'review.toml'}: {review.logged()[-1]['what']}")
        return 0
    choices, log = automatic_choices(review), told(review.logged())
    if args.json:
        content = {
            "schema": "leewater/settings/1", "settings": dict(review.settings),
            "choices": [{"id": c.id, "sentence": c.sentence, "how": c.how, "standing": c.standing} for c in choices],
            "log": review.logged(),
        }
        text = json.dumps(content, indent=1, allow_nan=False)
        if args.json == "-":
            print(text)
            return 0
        write_whole(Path(args.json), text + "\n")
    _print(review, choices, log)
    return 0


def _print(review, choices, log) -> None:
    from hydro.settings import REGISTRY

    print("Settings")
    for name, rule in REGISTRY.items():
        value = review.settings[name]
        state = "default" if value == rule.default else f"default {rule.default:g}"
        print(f"  {name:<26} {value:>10g} {rule.unit:<10} {state:<16} touches {rule.touches}")
    print("Automatic choices")
    for c in choices:
        print(f"  {c.id:<36} {c.sentence}")
        print(f"  {'':<36} {c.standing}; overruled by {c.how}")
    print("Log")
    for at, who, what, lines in log:
        print(f"  {at:<20} {who:<24} {what}{f' ({lines})' if lines else ''}")
    if not log:
        print("  no change yet")
