"""leewater eddies: the stream function and the recirculation zones of a run."""

from __future__ import annotations

import argparse
import json
import sys
from pathlib import Path

HELP = "stream function and recirculation zones of a run"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("file", metavar="FILE", help="results file; one that a review lists is read with the review's lines")
    which = parser.add_mutually_exclusive_group()
    which.add_argument("--frame", type=int, metavar="N", help="frame N, counted from 0 (default: the last)")
    which.add_argument("--time", metavar="T", help="the frame nearest to T: seconds from the start, or an ISO date and time")
    which.add_argument("--mean", nargs=2, type=float, metavar=("T1", "T2"), help="the mean flow between two times, s from the start")
    parser.add_argument("--small", action="store_true", help="list also what is under the floor")
    parser.add_argument("--json", metavar="FILE", help="write the ledger as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write eddies.gpkg and eddies.csv here")


def run(args: argparse.Namespace) -> int:
    from hydro.ledger import frame_ledger, ledger_json, mean_ledger, write_tables
    from hydro.review import open_any, write_whole

    review, run = open_any(args.file)
    if run is None:
        raise ValueError(f"{args.file} is a review; give one of its results files: {', '.join(_files(review))}.")
    reach = _reach(review, run)
    if args.mean:
        ledger = mean_ledger(run, *args.mean, reach=reach)
    else:
        ledger = frame_ledger(run, _index(run, args), reach=reach)
    if args.out:
        write_tables(Path(args.out), run, [ledger])
    text = json.dumps(ledger_json(run, [ledger]), indent=1, allow_nan=False) if args.json else ""
    if args.json == "-":
        print(text)
        return 0
    if args.json:
        write_whole(Path(args.json), text + "\n")
    _table(ledger, args.small, sys.stdout)
    return 0


def _files(review) -> list[str]:
    return [f for entry in review.runs for f in entry.files]


def _reach(review, run):
    """The review's lines for the design that this run belongs to."""
    if review is None:
        return None
    from dataclasses import replace

    designs = {e.design for e in review.runs if any(p in run.files for p in review.paths(e))}
    reach = review.reach
    return replace(reach, structures=reach.structures_of(next(iter(designs), None) or None))


def _index(run, args: argparse.Namespace) -> int:
    import numpy as np

    if args.time is None:
        return -1 if args.frame is None else args.frame
    try:
        return run.nearest(float(args.time))
    except ValueError:
        pass
    if run.times.instants is None:
        raise ValueError(f"{args.time!r} is no number of seconds, and this run has no dates; give seconds from its start.")
    try:
        asked = np.datetime64(args.time.removesuffix("Z"))
    except ValueError:
        raise ValueError(f"{args.time!r} is no time; write seconds, or a date such as 2031-03-02T06:00:00.") from None
    gap = (run.times.instants - asked) / np.timedelta64(1, "s")
    return int(np.abs(gap).argmin())


def _table(ledger, small: bool, out) -> None:
    from hydro.cautions import caution
    from hydro.figure import printed
    from hydro.ledger.report import time_text

    sf, frame = ledger.sf, ledger.frame
    when = time_text(frame.time) or f"{frame.seconds:g} s"
    print(f"{frame.kind} at {when}: {printed(sf.through_discharge_m3_s)} m3/s through, "
          f"misfit {100 * sf.misfit.total:.2g} %, unexplained {100 * sf.misfit.unexplained:.2g} %", file=out)
    for b in sf.open_boundaries:
        print(f"  {b.name}: {printed(b.discharge_m3_s)} m3/s in", file=out)
    for note in ledger.zones.notes:
        print(f"  {note}", file=out)
    print(f"{'id':4} {'zone':38} {'turns':13} {'area m2':>9} {'length m':>9} {'circulates m3/s':>15}  flags", file=out)
    for z in ledger.zones.zones:
        def show(name: str, z=z) -> str:
            return printed(getattr(z, name), *z.sensitivity.get(name, (None, None)))

        print(f"{z.id:4} {z.name[:38]:38} {z.rotation:13} {show('area_m2'):>9} {show('length_m'):>9} "
              f"{show('recirculating_discharge_m3_s'):>15}  {', '.join(z.flags)}", file=out)
    hidden, cut = ledger.zones.small, ledger.zones.open_to_boundary
    print(f"under the floor: {len(hidden)}; open to the boundary: {len(cut)}", file=out)
    if small:
        for s in (*hidden, *cut):
            x, y = frame.mesh.to_world(s.centre)
            print(f"  {x:.2f} E, {y:.2f} N  {s.rotation:13} {printed(s.recirculating_discharge_m3_s)} m3/s  {s.why}", file=out)
    used = dict.fromkeys(c for z in ledger.zones.zones for c in z.cautions)
    for id_ in used:
        print(f"  {caution(id_).text}", file=out)
