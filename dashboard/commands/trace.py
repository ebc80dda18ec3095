"""leewater trace: the four flow lines."""

from __future__ import annotations

import argparse
from pathlib import Path

from . import write_json

HELP = "streamlines, pathlines, streaklines and timelines from points or lines"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("file", metavar="FILE", help="results file; one that a review lists is read with the review's lines")
    parser.add_argument("--kind", choices=("streamline", "pathline", "streakline", "timeline"), default="streamline")
    start = parser.add_mutually_exclusive_group(required=True)
    start.add_argument("--points", metavar='"X,Y X,Y ..."', help="world coordinates, m")
    start.add_argument("--line", metavar="NAME", help="a section or release line of the review")
    parser.add_argument("--spacing", type=float, metavar="M", help="along --line, m (default: one start a stream tube for streamlines, 1 m else)")
    which = parser.add_mutually_exclusive_group()
    which.add_argument("--frame", type=int, metavar="N", help="streamlines: frame N, counted from 0 (default: the last)")
    which.add_argument("--time", metavar="T", help="streamlines: the frame nearest to T")
    parser.add_argument("--from", dest="begin", type=float, metavar="S", help="start, s of the run (default: its first frame)")
    parser.add_argument("--to", dest="end", type=float, metavar="S", help="end, s of the run (default: its last frame, or 600 s of a steady one)")
    parser.add_argument("--every", type=float, default=1.0, metavar="S", help="spacing of points and releases, s (default 1)")
    parser.add_argument("--view", nargs=2, type=float, default=(0.0, 0.0), metavar=("U", "V"), help="velocity of the moving viewpoint, m/s (pathlines)")
    parser.add_argument("--json", metavar="FILE", help="write the lines as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write tracks.gpkg, points.csv and points.parquet here")


def run(args: argparse.Namespace) -> int:
    from hydro.cautions import OWED, told
    from hydro.ledger.report import source_of
    from hydro.review import open_results
    from hydro.tracks.export import write_tracks

    review, opened = open_results(args.file)
    reach = review.reach_for(opened) if review else None
    traced = _traced(args, opened, reach)
    if args.out:
        write_tracks(Path(args.out), opened, traced, reach.centre_line if reach else None)
    if not args.json or not write_json(args.json, {
        "schema": "leewater/tracks/1", "source": source_of(opened), "warnings": list(traced.warnings),
        "tracks": [_plain(opened, t) for t in traced.tracks], "cautions": told(OWED["tracks"]),
    }):
        _print(traced)
    return 0


def _traced(args, opened, reach):
    from hydro.ledger.frames import depth_rate, plan_for
    from hydro.streamfunction import stream_function
    from hydro.tracks import on_line, one_a_tube, pathlines, streaklines, streamlines, timelines

    from . import frame_index

    plan = plan_for(opened, opened.frame(0), reach)
    line = _line(args, reach)
    if args.kind == "streamline":
        frame = opened.frame(frame_index(opened, args))
        sf = stream_function(frame, plan=plan, depth_rate=depth_rate(opened, frame.index, frame))
        if line is None:
            starts = _points(args, opened)
        else:
            starts = on_line(line, args.spacing) if args.spacing else one_a_tube(sf, line, int(opened.settings["tubes"]))
        return streamlines(sf, starts)
    starts = _points(args, opened) if line is None else on_line(line, args.spacing or 1.0)
    s = opened.times.seconds
    begin = float(s[0]) if args.begin is None else args.begin
    end = (float(s[-1]) if opened.n_frames > 1 else begin + 600.0) if args.end is None else args.end
    if args.kind == "streakline":
        return streaklines(opened, starts, begin=begin, at=end, every=args.every, boundaries=plan.boundaries)
    if args.kind == "timeline":
        times = [begin + (i + 1) * args.every for i in range(int((end - begin) / args.every + 1e-9))]
        return timelines(opened, starts, begin=begin, times=times, boundaries=plan.boundaries)
    return pathlines(opened, starts, begin=begin, end=end, every=args.every, boundaries=plan.boundaries, viewpoint=tuple(args.view))


def _line(args, reach):
    import numpy as np

    if not args.line:
        return None
    if reach is None:
        raise ValueError(f"line {args.line!r}: the file stands in no review; give --points.")
    for layer in ("sections", "releases"):
        for item in reach.layer(layer):
            if args.line in (item.id, item.name):
                return np.asarray(item.geometry.coords)[:, :2]
    known = ", ".join(i.name for layer in ("sections", "releases") for i in reach.layer(layer))
    raise ValueError(f"the review has no section or release called {args.line!r}; it has {known}.")


def _points(args, opened):
    import numpy as np

    try:
        world = np.array([[float(v) for v in pair.split(",")] for pair in args.points.split()]).reshape(-1, 2)
    except (ValueError, AttributeError) as error:
        raise ValueError(f'--points {args.points!r} is no list of points; write it as "x1,y1 x2,y2".') from error
    return opened.mesh.to_local(world)


def _plain(opened, track):
    return {
        "kind": track.kind, "line": track.number, "ended": track.ended, "touches": track.touches, "psi_m3_s": track.psi,
        "error_m": track.error_m, "length_m": track.length_m, "points": opened.mesh.to_world(track.xy).tolist(),
        "seconds": [float(s) for s in track.seconds],
    }


def _print(traced) -> None:
    from hydro.cautions import OWED, caution

    print(f"{'line':>5} {'kind':<11} {'ended':<18} {'length m':>10} {'time s':>10} {'error m':>10}")
    for t in traced.tracks:
        error = "n/a" if t.error_m is None else f"{t.error_m:.2g}"
        time = float(t.seconds[-1] - t.seconds[0]) if len(t.seconds) else 0.0
        print(f"{t.number:>5} {t.kind:<11} {t.ended:<18} {t.length_m:>10.1f} {time:>10.1f} {error:>10}")
    for warning in traced.warnings:
        print(f"  {warning}")
    for id_ in OWED["tracks"]:
        print(f"  {caution(id_).text}")
