"""leewater eddies: the stream function and the recirculation zones of a run."""

from __future__ import annotations

import argparse
import os
import sys
from pathlib import Path

from . import write_json

HELP = "stream function and recirculation zones of a run"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("file", metavar="FILE", help="results file; one that a review lists is read with the review's lines")
    which = parser.add_mutually_exclusive_group()
    which.add_argument("--frame", type=int, metavar="N", help="frame N, counted from 0 (default: the last)")
    which.add_argument("--time", metavar="T", help="the frame nearest to T: seconds from the start, or an ISO date and time")
    which.add_argument("--all", action="store_true", help="every frame, with the eddies followed in time; Ctrl-C keeps what is done")
    which.add_argument("--mean", nargs=2, type=float, metavar=("T1", "T2"), help="the mean flow between two times, s from the start")
    parser.add_argument("--small", action="store_true", help="list also what is under the floor")
    parser.add_argument("--residence", action="store_true", help="how long water stays in each zone of one frame or a mean, held steady")
    parser.add_argument("--mixing", type=float, metavar="K", help="horizontal mixing for --residence, m2/s (default 0: nothing leaves)")
    parser.add_argument("--workers", type=int, default=os.cpu_count() or 1, metavar="N", help="processes for --all and --mean (default: all cores)")
    parser.add_argument("--scheduler", metavar="ADDRESS", help="a Dask scheduler whose workers read the frames of --all and --mean")
    parser.add_argument("--json", metavar="FILE", help="write the ledger as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write eddies.gpkg, eddies.csv and eddies.html here")


def run(args: argparse.Namespace) -> int:
    from hydro.ledger import FrameReader
    from hydro.review import open_results

    from . import frame_index

    _check_residence(args)
    review, run = open_results(args.file)
    reach = review.reach_for(run) if review else None
    if args.all:
        return _all(args, run, reach)
    reader = FrameReader(run, reach=reach)
    if args.mean:
        return _mean(args, reader)
    entry = _with_residence(reader.frame(frame_index(run, args)), args)
    _write(args, run, [entry])
    _frame_table(run, entry, args)
    return 0


def _check_residence(args: argparse.Namespace) -> None:
    if args.mixing is not None and not args.residence:
        raise ValueError("--mixing is for --residence; give both.")
    if args.residence and args.all:
        raise ValueError("--residence holds a field steady, so it reads one frame or a mean; leave out --all.")
    if args.mixing is not None and not 0 <= args.mixing < float("inf"):
        raise ValueError(f"--mixing is {args.mixing:g} m2/s; give a coefficient of 0 or more.")


def _with_residence(entry, args: argparse.Namespace):
    """The entry with the stay of water in each zone, where it was asked for."""
    if not args.residence:
        return entry
    from dataclasses import replace

    from hydro.eddies.residence import residence

    zones = tuple(replace(z, residence=residence(entry.sf, z, args.mixing or 0.0)) for z in entry.zones.zones)
    return replace(entry, zones=replace(entry.zones, zones=zones))


def _all(args: argparse.Namespace, run, reach) -> int:
    from hydro.ledger import FrameReader, follow, follow_travelling, lumped_area
    from hydro.ledger.report import balance_words, frame_json

    done, stopped = _read(args, run, reach, range(run.n_frames), sensitivity=True)
    if not done:
        raise ValueError(f"{run.name} has no frame with a stream function: all hold maxima.")
    import numpy as np

    lives, zones = follow(
        [s.zones for s in done], np.array([s.seconds for s in done]), lumped_area(run.mesh), run.settings,
        [s.index for s in done],
    )
    moved = follow_travelling([s.travelling for s in done], np.array([s.seconds for s in done]))
    done = [s.with_zones(z).with_travelling(t) for s, z, t in zip(done, zones, moved, strict=True)]
    mean = None
    if not stopped and "instant" in run.times.kinds and run.n_frames > 1:
        mean = FrameReader(run, reach=reach, sensitivity=False).mean(0.0, float(run.times.seconds[-1]))
    _write(args, run, done, lives=lives, stopped_after=len(done) if stopped else None, mean=mean)
    _life_table(lives, done, args)
    if mean is not None:
        for words in balance_words(frame_json(run, mean)):
            print(f"  In the mean of the run: {words}.", file=_out(args))
    if stopped:
        print(f"leewater: stopped; {len(done)} of {run.n_frames} frames are written.", file=sys.stderr)
        return 2
    return 0


def _mean(args: argparse.Namespace, reader) -> int:
    from hydro.ledger import instants_of

    run = reader.run
    entry = _with_residence(reader.mean(*args.mean), args)
    window, _ = run.window(*args.mean)
    instants = None
    if len(window) > 1:
        done, stopped = _read(args, run, reader.reach, [int(i) for i in window], sensitivity=False)
        instants = None if stopped else instants_of(reader, entry, done)
    _write(args, run, [entry], instants=instants)
    _frame_table(run, entry, args)
    _instants_table(entry, instants, args)
    return 0


def _read(args: argparse.Namespace, run, reach, indices, *, sensitivity: bool):
    """Summaries of frames, and whether the user stopped the work before its end."""
    from hydro.ledger import Job, read_all

    job = Job(Path(args.file).resolve(), sensitivity=sensitivity)
    workers = args.workers if len(indices) > 4 else 1
    done, stopped = [], False
    try:
        for summary in read_all(
            run, indices, reach=reach, job=job, workers=workers, scheduler=args.scheduler, sensitivity=sensitivity,
            progress=_progress,
        ):
            done.append(summary)
    except KeyboardInterrupt:
        stopped = True
    return done, stopped


def _progress(done: int, whole: int) -> None:
    if sys.stderr.isatty() or done in (0, whole) or done % max(1, whole // 10) == 0:
        end = "\n" if done == whole or not sys.stderr.isatty() else "\r"
        print(f"leewater: frame {done} of {whole}", end=end, file=sys.stderr, flush=True)


def _write(args: argparse.Namespace, run, frames, **more) -> None:
    from hydro.ledger import ledger_json, write_tables

    if args.out:
        write_tables(Path(args.out), run, frames, lives=more.get("lives", ()), instants=more.get("instants"))
    if args.json:
        write_json(args.json, ledger_json(run, frames, **more))


def _out(args: argparse.Namespace):
    """Tables for people go to the error stream where the JSON has the other."""
    return sys.stderr if args.json == "-" else sys.stdout


def _frame_table(run, entry, args: argparse.Namespace) -> None:
    from hydro.figure import printed
    from hydro.ledger.report import balance_words, frame_json, time_text

    out, sf, frame = _out(args), entry.sf, entry.frame
    when = time_text(frame.time) or f"{frame.seconds:g} s"
    print(f"{frame.kind} at {when}: {printed(sf.through_discharge_m3_s)} m3/s through, "
          f"misfit {100 * sf.misfit.total:.2g} %, unexplained {100 * sf.misfit.unexplained:.2g} %", file=out)
    for b in sf.open_boundaries:
        print(f"  {b.name}: {printed(b.discharge_m3_s)} m3/s in", file=out)
    for words in balance_words(frame_json(run, entry)):
        print(f"  {words}.", file=out)
    for note in entry.zones.notes:
        print(f"  {note}", file=out)
    _zone_rows(entry.zones.zones, out)
    for t in entry.zones.travelling:
        x, y = frame.mesh.to_world(t.core.centre)
        size = "core only" if t.core_only else f"{printed(t.area_m2)} m2, circulates {printed(t.recirculating_discharge_m3_s)} m3/s"
        print(
            f"{t.id:4} travelling, seen moving with it     {t.core.rotation:13} {x:.1f} E, {y:.1f} N at {printed(float(abs(complex(*t.speed))))} m/s "
            f"({t.speed_from}); {size}; misfit of that view {100 * t.misfit:.0f} %", file=out,
        )
    hidden, cut = entry.zones.small, entry.zones.open_to_boundary
    print(f"under the floor: {len(hidden)}; open to the boundary: {len(cut)}", file=out)
    for s in (*hidden, *cut) if args.small else ():
        x, y = frame.mesh.to_world(s.centre)
        print(f"  {x:.2f} E, {y:.2f} N  {s.rotation:13} {printed(s.recirculating_discharge_m3_s)} m3/s  {s.why}", file=out)
    _cautions(out)


def _zone_rows(zones, out) -> None:
    from hydro.figure import printed

    print(f"{'id':4} {'zone':38} {'turns':13} {'area m2':>9} {'length m':>9} {'circulates m3/s':>15}  flags", file=out)
    for z in zones:
        cells = [
            printed(getattr(z, name), *z.sensitivity.get(name, (None, None)))
            for name in ("area_m2", "length_m", "recirculating_discharge_m3_s")
        ]
        print(f"{z.id:4} {z.name[:38]:38} {z.rotation:13} {cells[0]:>9} {cells[1]:>9} {cells[2]:>15}  {', '.join(z.flags)}", file=out)
        if z.residence is not None:
            print(f"     {z.residence.words}.", file=out)


def _life_table(lives, done, args: argparse.Namespace) -> None:
    from hydro.figure import printed

    out = _out(args)
    print(f"{len(done)} frames, {done[0].seconds:g} to {done[-1].seconds:g} s; {len(lives)} eddies", file=out)
    print(f"{'id':5} {'eddy':38} {'from s':>8} {'to s':>8} {'time':>5} {'area m2':>15} {'circulates m3/s':>17}  remarks", file=out)
    for life in sorted(lives, key=lambda v: -v.share_of_time):
        area = " to ".join(printed(v) for v in life.ranges["area_m2"])
        flow = " to ".join(printed(v) for v in life.ranges["recirculating_discharge_m3_s"])
        remarks = [] if life.followed else [f"not followed: {life.why}"]
        remarks += ["unsteady"] if life.unsteady else []
        remarks += [f"split from {life.parent}"] if life.parent else []
        remarks += [f"merged into {life.merged_into}"] if life.merged_into else []
        print(f"{life.id:5} {life.name[:38]:38} {life.first_s:8g} {life.last_s:8g} {100 * life.share_of_time:4.0f}% "
              f"{area:>15} {flow:>17}  {', '.join(remarks)}", file=out)
    _cautions(out)


def _instants_table(entry, instants, args: argparse.Namespace) -> None:
    from hydro.figure import printed

    out = _out(args)
    for zone in entry.zones.zones if instants else ():
        i = instants[zone.id]
        text = f"{zone.id}: in {i.seen} of {i.frames} instants ({100 * i.share_of_time:.0f} % of the time)"
        if i.ranges:
            text += ", area " + " to ".join(printed(v) for v in i.ranges["area_m2"]) + " m2"
        if i.periods is not None:
            how = "measured" if i.measured_period_s else "expected"
            text += f"; {i.periods:.1f} periods of {printed(i.measured_period_s or i.expected_period_s)} s ({how})"
        print(text, file=out)


def _cautions(out) -> None:
    """All of them, also where no eddy was found: that is no evidence of harmless water."""
    from hydro.cautions import OWED, caution

    for id_ in OWED["eddies"]:
        print(f"  {caution(id_).text}", file=out)
