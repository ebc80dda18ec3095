"""leewater section: cross-sections and profiles of a run."""

from __future__ import annotations

import argparse
import json
from pathlib import Path

from . import write_json

HELP = "a cross-section or a profile: discharge three ways, area, levels, head"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("file", metavar="FILE", help="results file; one that a review lists is read with the review's lines")
    parser.add_argument(
        "--line", action="append", metavar='NAME|"X1,Y1 X2,Y2 ..."',
        help="a section of the review by name, or world coordinates in m; may be repeated (default: the review's sections)",
    )
    which = parser.add_mutually_exclusive_group()
    which.add_argument("--frame", type=int, metavar="N", help="frame N, counted from 0 (default: the last)")
    which.add_argument("--time", metavar="T", help="the frame nearest to T: seconds from the start, or an ISO date and time")
    which.add_argument("--all", action="store_true", help="every frame")
    what = parser.add_mutually_exclusive_group()
    what.add_argument("--profile", action="store_true", help="take the lines as profiles along the flow")
    what.add_argument("--thalweg", action="store_true", help="the profile along the deepest bed, from the review's centre line")
    what.add_argument("--streamline", metavar='"X,Y"', help="the profile along the streamline through a place, world coordinates in m")
    what.add_argument(
        "--weirs", metavar="RELATION", help="the review's weirs: section heads, and the discharge by broad-crested, rehbock or kindsvater-carter"
    )
    what.add_argument("--openings", action="store_true", help="the review's bridge openings: flow, approach, freeboard")
    what.add_argument(
        "--places", type=float, metavar="DEPTH", help="the review's named places over the whole run: peaks, time above this depth in m, arrival"
    )
    what.add_argument("--envelope", metavar="FILE.gpkg", help="the greatest depth, level and speed of every face over the run, as a GeoPackage")
    parser.add_argument("--json", metavar="FILE", help="write the figures as JSON (- for standard output)")
    parser.add_argument("--out", metavar="DIR", help="write the table as CSV here: sections, profile-NAME, weirs, openings or places")


def run(args: argparse.Namespace) -> int:
    from hydro.review import open_results

    from . import frame_index

    review, run_ = open_results(args.file)
    frames = range(run_.n_frames) if args.all else [frame_index(run_, args)]
    if args.envelope:
        return _envelope(args, run_)
    if args.places is not None and (args.line or args.frame is not None or args.time is not None):
        raise ValueError("--places reads the review's named places over the whole run; leave out --line, --frame and --time.")
    if args.weirs or args.openings or args.places is not None:
        return _works(args, review, run_, frames)
    if args.thalweg or args.streamline:
        return _profiles(args, run_, [_along(args, review, run_, frames[0])])
    lines = _lines(args.line, review, run_)
    if args.profile:
        return _profiles(args, run_, lines)
    return _sections(args, review, run_, lines, frames)


def _along(args, review, run_, index: int):
    """The thalweg or a streamline, as a name and its local points."""
    import numpy as np

    from hydro.section.profile import thalweg
    from hydro.tracks import streamlines

    if args.thalweg:
        centre = review.reach.centre_line if review else None
        if centre is None:
            raise ValueError("the thalweg is found beside a centre line; draw one in the review's lines.gpkg.")
        return "thalweg", thalweg(run_.frame(index), centre, max(centre.length / 200, 1.0))
    try:
        x, y = (float(v) for v in args.streamline.split(","))
    except ValueError as error:
        raise ValueError(f'--streamline {args.streamline!r} is no place; write it as "x,y".') from error
    psi = _psi_of(run_, review)
    if psi is None:
        raise ValueError(f"{run_.name} holds maxima, which have no streamlines; choose instants or means.")
    track = streamlines(psi(index), run_.mesh.to_local(np.array([[x, y]]))).tracks[0]
    if track.ended == "outside the water":
        raise ValueError(f"{x:.1f} E, {y:.1f} N lies outside the water; give a place in it.")
    return "streamline", track.xy


def _sections(args, review, run_, lines, frames) -> int:
    from hydro.section.table import section_table

    centre = review.reach.centre_line if review else None
    table = section_table(run_, lines, frames, centre_line=centre, psi_of=_psi_of(run_, review))
    if not _written(args, run_, "sections", table):
        _print(table, run_.mesh.stepped)
    return 0


def _works(args, review, run_, frames) -> int:
    from hydro.cautions import OWED, caution
    from hydro.section import works
    from hydro.section.crossings import WHY_THEY_DIFFER

    if review is None:
        raise ValueError(f"{run_.name} stands in no review; weirs, openings and places are drawn in a review's lines.gpkg.")
    reach = review.reach_for(run_)
    more: tuple[str, ...] = ()
    if args.weirs:
        name, table = "weirs", works.weir_table(run_, reach, frames, relation=args.weirs)
    elif args.openings:
        name, table = "openings", works.opening_table(run_, reach, frames)
        more = ("pressure-flow",) if (table["freeboard_m"] < 0).any() else ()
    else:
        name, table = "places", works.place_table(run_, reach.layer("receptors"), depth_m=args.places)
    if _written(args, run_, name, table, more):
        return 0
    for row in table.to_dict("records"):
        print(_described(row))
    if args.weirs:
        print(f"  {WHY_THEY_DIFFER}")
    for id_ in (*OWED[name], *more):
        print(f"  {caution(id_).text}")
    return 0


def _described(row: dict) -> str:
    """One row as "name, time: figure value unit; ..."."""
    from hydro.figure import printed

    name, *rest = row.items()
    parts = []
    for key, value in rest:
        if key in ("frame", "seconds", "kind", "source") or value is None or value == "" or value != value:
            continue
        text = value if isinstance(value, str) else f"{value:.3f}" if key.endswith("level_m") or key in ("soffit_m", "peak_level_mean_m", "crest_m") else printed(value)
        parts.append(f"{key.replace('_m3_s', ' m3/s').replace('_m2_s', ' m2/s').replace('_m_s', ' m/s').replace('_', ' ')} {text}")
    return f"{name[1]}: {'; '.join(parts)}"


def _envelope(args, run_) -> int:
    from hydro.cautions import OWED, caution, told
    from hydro.ledger.report import source_of
    from hydro.section.works import ENVELOPE, write_envelope

    path = Path(args.envelope)
    if path.suffix.lower() != ".gpkg":
        raise ValueError(f"--envelope {args.envelope}: name a file that ends in .gpkg.")
    path.parent.mkdir(parents=True, exist_ok=True)
    write_envelope(path, run_)
    if not write_json(args.json, {
        "schema": "leewater/envelope/1", "source": source_of(run_), "file": path.name, "kind": ENVELOPE, "cautions": told(OWED["envelope"]),
    }):
        print(f"{path}: {ENVELOPE}.")
        for id_ in OWED["envelope"]:
            print(f"  {caution(id_).text}")
    return 0


def _written(args, run_, name: str, table, more: tuple[str, ...] = ()) -> bool:
    """Write a table as ``--out`` and ``--json`` ask; True where it went to standard output."""
    from hydro.cautions import OWED, told
    from hydro.ledger.export import csv_text
    from hydro.ledger.report import source_of
    from hydro.review import write_whole

    source, ids = source_of(run_), (*OWED[name], *more)
    rows = [{k: None if v != v else v for k, v in row.items()} for row in json.loads(table.to_json(orient="records", double_precision=15))]
    if args.out:
        folder = Path(args.out)
        folder.mkdir(parents=True, exist_ok=True)
        write_whole(folder / f"{name}.csv", csv_text(rows, source, run_.settings, ids))
    return write_json(args.json, {
        "schema": f"leewater/{name}/1", "source": source, "settings": dict(run_.settings), name: rows, "cautions": told(ids),
    })


def _lines(given, review, run_):
    import numpy as np

    if not given:
        if review is None or not review.reach.layer("sections"):
            raise ValueError('no section was named; give --line "x1,y1 x2,y2" in world coordinates.')
        return [(s.name, np.asarray(s.geometry.coords)[:, :2]) for s in review.reach.layer("sections")]
    out = []
    for text in given:
        if "," in text:
            try:
                points = np.array([[float(v) for v in pair.split(",")] for pair in text.split()])
            except ValueError as error:
                raise ValueError(f'--line {text!r} is no list of points; write it as "x1,y1 x2,y2".') from error
            out.append((text, run_.mesh.to_local(points.reshape(-1, 2))))
        elif review is None:
            raise ValueError(f"section {text!r}: {run_.name} stands in no review; give coordinates.")
        else:
            out.append((text, np.asarray(review.reach.find("sections", text).geometry.coords)[:, :2]))
    return out


def _psi_of(run_, review):
    from hydro.ledger.frames import depth_rate, plan_for
    from hydro.streamfunction import stream_function

    plans: list = []

    def psi(index):
        frame = run_.frame(index)
        if not plans:
            plans.append(plan_for(run_, frame, review.reach if review else None))
        return stream_function(frame, plan=plans[0], depth_rate=depth_rate(run_, frame.index, frame))

    return None if "maximum" in run_.times.kinds else psi


def _profiles(args, run_, lines) -> int:
    from hydro.cautions import OWED, caution, told
    from hydro.ledger.export import csv_heading
    from hydro.ledger.report import source_of
    from hydro.review import write_whole
    from hydro.section.profile import profile

    from . import frame_index

    made = []
    frame = run_.frame(frame_index(run_, args))
    for name, points in lines:
        p = profile(frame, points, settings=run_.settings)
        table, loss = _stations(p), p.loss()
        made.append({"line": name, "head_lost_m": loss, "jumps_m": list(p.jumps), "stations": json.loads(table.to_json(orient="records", double_precision=15))})
        if args.json != "-":
            jumps = f"; jumps at {', '.join(f'{j:.1f}' for j in p.jumps)} m" if p.jumps else "; no jump"
            print(f"{name}: {p.distance[-1]:.1f} m, head lost {'n/a' if loss is None else f'{loss:.3f} m'}{jumps}")
        if args.out:
            folder = Path(args.out)
            folder.mkdir(parents=True, exist_ok=True)
            heading = csv_heading(source_of(run_), run_.settings, OWED["profiles"])
            write_whole(folder / f"profile-{name.replace(' ', '-')}.csv", heading + table.to_csv(index=False))
    if args.json != "-":
        for id_ in OWED["profiles"]:
            print(f"  {caution(id_).text}")
    if args.json:
        content = {
            "schema": "leewater/profiles/1", "source": source_of(run_), "settings": dict(run_.settings), "profiles": made,
            "cautions": told(OWED["profiles"]),
        }
        text = json.dumps(content, indent=1, allow_nan=False)
        print(text) if args.json == "-" else write_whole(Path(args.json), text + "\n")
    return 0


def _stations(p):
    """The stations of a profile as a table, each column with its unit."""
    import pandas as pd

    units = {
        "distance": "_m", "bed": "_m", "depth": "_m", "level": "_m", "critical_level": "_m", "head": "_m", "speed": "_m_s",
        "froude": "",
    }
    return pd.DataFrame({f"{name}{unit}": getattr(p, name) for name, unit in units.items()})


def _print(table, stepped: bool) -> None:
    from hydro.cautions import OWED, caution
    from hydro.figure import printed

    shown = {
        "discharge_m3_s": "Q m3/s", "discharge_error_m3_s": "read within", "discharge_psi_m3_s": "by psi", "discharge_mid_section_m3_s": "mid-section", "area_m2": "area m2",
        "width_m": "width m", "mean_velocity_m_s": "mean m/s", "froude": "Froude", "mean_level_m": "level m", "head_m": "head m",
    }
    print("".join(f"{h:>14}" for h in ("section", "time", *shown.values())))
    for row in table.to_dict("records"):
        when = (row["time"] or f"{row['seconds']:g} s")[-9:]
        levels = {k: f"{row[k]:z.3f}" if row[k] == row[k] and row[k] is not None else "n/a" for k in ("mean_level_m", "head_m")}
        print("".join(f"{v:>14}" for v in (str(row["section"])[:13], when, *(levels.get(k) or printed(row[k]) for k in shown))))
    banks = " and for banks that are stair steps or joined points, which may miss a cell's width at each" if stepped else ""
    print(f"  Read within: error of reading Q from this file, by two readings compared{banks}.")
    for id_ in OWED["sections"]:
        print(f"  {caution(id_).text}")
