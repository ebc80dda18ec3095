"""leewater observed: what was measured in the field beside what the model says."""

from __future__ import annotations

import argparse
from pathlib import Path

from . import write_json

HELP = "the review's observed levels, velocities, drogues and dye beside a run"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("review", metavar="REVIEW", help="review folder with [[observations]]")
    parser.add_argument("--run", dest="runs", action="append", metavar="ID", help="run to use; may be repeated (default: all that have observations)")
    parser.add_argument("--json", metavar="FILE", help="write the comparison as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write RUN-observed.csv here: a row an observation")


def run(args: argparse.Namespace) -> int:
    from hydro.cautions import OWED, caution, told
    from hydro.ledger.report import source_of
    from hydro.observations import compare_observations
    from hydro.review import open_review

    review = open_review(args.review)
    wanted = args.runs or list(dict.fromkeys(str(o.get("run", "")) for o in review.contents.observations))
    if not wanted:
        raise ValueError(f"{review.folder.name} declares no [[observations]]; add them to its review.toml.")
    answers = []
    for id_ in wanted:
        entry = review.entry(id_)
        opened = review.open(entry.id)
        found = compare_observations(review, opened, entry.id)
        answers.append({"run": entry.label, "source": source_of(opened), "observations": [_plain(o) for o in found]})
        if args.out:
            _write(Path(args.out), entry.id, opened, found)
        if args.json != "-":
            _print(entry.label, found)
    content = {
        "schema": "leewater/observed/1", "runs": answers, "cautions": told(OWED["observed"]),
    }
    if not write_json(args.json, content):
        for id_ in OWED["observed"]:
            print(f"  {caution(id_).text}")
    return 0


def _plain(o) -> dict:
    return {"kind": o.kind, "name": o.name, "source": o.source, "unit": o.unit, **o.figures, "difference": [None if v != v else float(v) for v in o.difference]}


def _print(label: str, found) -> None:
    from hydro.figure import printed

    print(f"{label}: {len(found)} observed")
    for o in found:
        apart = o.kind in ("drogue", "dye")
        parts = [f"{int(o.figures['count'])} compared" + (f", {int(o.figures['left_out'])} where the model has no water" if o.figures["left_out"] else "")]
        for name, unit in (("bias", o.unit), ("rmse", o.unit), ("worst", o.unit), ("within_accuracy", ""), ("skill", ""), ("travel_time_error_s", "s")):
            value = o.figures.get(name)
            if value is not None:
                word = "mean" if apart and name == "bias" else name.removesuffix("_s").replace("_", " ")
                source = " (Liu and Weisberg 2011)" if name == "skill" else ""
                parts.append(f"{word} {printed(value)} {unit}".rstrip() + source)
        what = "separation" if apart else "model minus observed"
        print(f"  {o.name} ({o.kind}, {what}): {'; '.join(parts)}. Source: {o.source}")


def _write(folder: Path, id_: str, opened, found) -> None:
    from hydro.cautions import OWED
    from hydro.ledger.export import csv_text
    from hydro.ledger.report import source_of
    from hydro.review import write_whole

    folder.mkdir(parents=True, exist_ok=True)
    rows = []
    for o in found:
        for i, value in enumerate(o.difference):
            x, y = opened.mesh.to_world(o.xy[i]) if o.xy is not None and i < len(o.xy) else (None, None)
            rows.append({"observation": o.name, "kind": o.kind, "number": i + 1, "x": x, "y": y, "difference": None if value != value else float(value), "unit": o.unit})
    write_whole(folder / f"{id_}-observed.csv", csv_text(rows, source_of(opened), opened.settings, OWED["observed"]))
