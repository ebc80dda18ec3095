"""Passage as files: a GeoPackage with routes, barriers and resting water, and CSV tables; all name their sources."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import geopandas
import shapely

from ..cautions import OWED, told
from ..ledger.export import write_package
from ..provenance import command_line, versions
from ..review import write_whole
from .areas import outline
from .report import answer_json, barrier_json, flow_json, passage_json, profile_rows
from .study import RunAnswer, Study

_NESTED = ("legs", "barriers", "entrances", "cautions", "flags", "without_recovery", "corridor", "sampled")


def write_tables(folder: Path, study: Study) -> list[Path]:
    """Write passage.gpkg, passage.csv (answers), passage-routes.csv and passage-flows.csv, each whole or not at all.

    Layers of the package: legs, barriers, resting_areas; with the CRS of the review's first run.
    """
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    about = {k: v for k, v in passage_json(study).items() if k in ("schema", "review", "sources", "settings", "fish")}
    package = folder / "passage.gpkg"
    write_package(package, _layers(study), study.answers[0].run.crs, about, OWED["passage"])
    reach = study.review.reach
    tables = {
        "passage.csv": [_flat(answer_json(a, reach)) for a in study.answers],
        "passage-routes.csv": [row for a in study.answers for row in profile_rows(a, reach)],
        "passage-flows.csv": [row for f in study.flows for row in _flow_rows(flow_json(f))],
    }
    for name, rows in tables.items():
        write_whole(folder / name, csv_text(rows, study))
    return [package, *(folder / name for name in tables)]


def csv_text(rows: Sequence[dict[str, Any]], study: Study) -> str:
    """Rows as CSV, headed by comment lines that say where they come from and which cautions they owe."""
    out = io.StringIO()
    for entry, run in {a.entry.id: (a.entry, a.run) for a in study.answers}.values():
        out.write(f"# run {entry.id}: {run.name}; SHA-256: {run.hash if run.files else 'no file'}\n")
    out.write(f"# settings: {study.review.settings.digest()}; made by leewater {versions()['leewater']}: {command_line()}\n")
    out.writelines(f"# {c['text']}\n" for c in told(OWED["passage"]))
    names = list(dict.fromkeys(name for row in rows for name in row))
    writer = csv.DictWriter(out, names, restval="", lineterminator="\n")
    writer.writeheader()
    writer.writerows({k: ("" if v is None else v) for k, v in row.items()} for row in rows)
    return out.getvalue()


def _flat(answer: dict[str, Any]) -> dict[str, Any]:
    """An answer as one row: nested figures by a prefix, lists counted or joined."""
    row = {k: v for k, v in answer.items() if k not in _NESTED}
    for name in ("without_recovery", "corridor", "sampled"):
        row |= {f"{name}_{k}": v for k, v in (answer[name] or {}).items()}
    row["barriers"] = "; ".join(f"{b['kind']} by {b['beyond']:.3g} {b['unit']} in leg {b['leg']}" for b in answer["barriers"])
    for e in answer["entrances"]:
        row[f"share_of_{e['name']}"] = e["share"]
    return row | {"flags": "; ".join(answer["flags"]), "cautions": "; ".join(answer["cautions"])}


def _flow_rows(flow: dict[str, Any]) -> list[dict[str, Any]]:
    common = {"fish": flow["fish"], "design": flow["design"]}
    ranges = [common | {"what": "range of discharge"} | r for r in flow["ranges"]]
    shares = [common | {"what": "share of time"} | s for s in flow["shares_of_time"]]
    runs = []
    for r in flow["runs"]:
        spell = r["longest_excluded_spell"] or {}
        runs.append(common | {
            "what": "run", "label": r["run"], "not_excluded": r["not_excluded"], "excluded": r["excluded"],
            "longest_excluded_spell_s": spell.get("seconds"), "spell_at_least": spell.get("at_least"),
        })
    return ranges + shares + runs


def _layers(study: Study) -> dict[str, geopandas.GeoDataFrame]:
    legs, barred, rests = [], [], []
    for one in study.answers:
        legs += _legs(one)
        barred += [
            (shapely.Point(b.xy), _of(one) | barrier_json(b, one.answer, study.review.reach)) for b in one.answer.barriers
        ]
        if one.answer.search is not None:
            rests += [
                (outline(one.answer.mesh, a), _of(one) | {"name": a.name, "kind": a.kind, "area_m2": a.area_m2})
                for a in one.answer.search.areas.items if a.triangles.size
            ]

    def table(rows: list) -> geopandas.GeoDataFrame:
        mesh = study.answers[0].answer.mesh
        world = [shapely.transform(g, mesh.to_world) for g, _ in rows]
        return geopandas.GeoDataFrame([r for _, r in rows], geometry=world)

    return {"legs": table(legs), "barriers": table(barred), "resting_areas": table(rests)}


def _of(one: RunAnswer) -> dict[str, Any]:
    return {
        "run": one.entry.id, "fish": one.answer.fish.name, "frame": one.answer.stamp.index,
        "seconds": one.answer.stamp.seconds, "status": one.answer.status,
    }


def _legs(one: RunAnswer) -> list[tuple]:
    if one.answer.chain is None:
        return []
    out = []
    for leg, own in zip(one.answer.chain.legs, one.answer.legs):
        if len(leg.path) < 2:
            continue
        row = {
            "leg": own.number, "from_area": own.from_area, "to_area": own.to_area, "length_m": own.length_m,
            "fatigue": own.fatigue, "swimming_time_s": own.seconds, "greatest_speed_m_s": own.greatest_speed_m_s,
            "least_depth_m": own.least_depth_m,
        }
        out.append((shapely.LineString(leg.path), _of(one) | row))
    return out
