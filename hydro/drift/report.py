"""The drift of a review's runs: releases from review.toml, the range over the settings tried, JSON and files."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import asdict, dataclass
from functools import partial
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import pandas as pd
import shapely

from ..cautions import OWED, told
from ..ledger.export import csv_heading, write_package
from ..ledger.frames import plan_for
from ..ledger.report import source_of
from ..reach import Reach
from ..review import Review, RunEntry, write_whole
from ..run import Run
from .places import LOG_SOURCE, Gap, Held, gaps_of, held_by_eddies
from .share import Share
from .study import STATES, Drifted, Rules, drift, sentence, settings_tried
from .wood import logs

SCHEMA = "leewater/drift/1"


@dataclass(frozen=True, eq=False)
class DriftAnswer:
    """One run's drift: with the settings chosen, and with the others tried (by what differs)."""

    entry: RunEntry
    run: Run
    reach: Reach
    base: Drifted
    tried: Mapping[str, Drifted]
    held: tuple[Held, ...] = ()
    gaps: tuple[Gap, ...] = ()

    def sentences(self) -> list[str]:
        """One a pier."""
        return [sentence(self.base, i, list(self.tried.values())) for i in range(len(self.base.piers))]


def study(
    review: Review, entry: RunEntry, *, rules: Rules | None = None, numbers: float = 1.0, try_settings: bool = True,
    releases: Sequence[Mapping[str, Any]] | None = None, line: np.ndarray | None = None,
    stop: Callable[[], bool] = lambda: False, progress: Callable[[str, float], None] = lambda what, share: None,
) -> DriftAnswer:
    """Let the review's wood go in one run.

    Parameters
    ----------
    numbers : float
        Factor on the number of logs, for a quick look.
    releases : sequence of tables, optional
        In place of the review's own.
    line : (n, 2) local m, optional
        Where all of them let go, in place of their own lines.
    try_settings : bool
        Also run the settings of :func:`hydro.drift.settings_tried`, for the range.

    Raises
    ------
    ValueError
        No releases, no line for one, or a run of maxima.
    """
    tables = list(review.releases if releases is None else releases)
    if not tables:
        raise ValueError("the review has no [[releases]]; say what wood to let go, where, and how much.")
    run = review.open(entry.id)
    if "maximum" in run.times.kinds:
        raise ValueError(f"{entry.label} holds maxima; logs cannot be moved by maxima of different moments.")
    reach = review.reach_for(run)
    boundaries = plan_for(run, run.frame(0), reach).boundaries
    made = []
    for table in tables:
        at = _points(reach.find("releases", str(table.get("line", table.get("name")))).geometry) if line is None else line
        scaled = {**table, "number": max(1, int(round(int(table.get("number", 0)) * numbers)))}
        made.append((str(table["name"]), at, logs(scaled)))
    piers = [s for s in reach.structures if s.kind == "pier" and s.geometry.geom_type == "Polygon"]
    seed = int(tables[0].get("seed", 1))
    answers: dict[str, Drifted] = {}
    for name, chosen in settings_tried(rules or Rules()).items():
        if answers and (not try_settings or stop()):
            break
        answers[name] = drift(
            run, made, piers=piers, openings=reach.layer("openings"), boundaries=boundaries, rules=chosen, seed=seed, stop=stop,
            progress=partial(progress, name),
        )
    base = answers.pop("as chosen")
    return DriftAnswer(entry, run, reach, base, answers, tuple(held_by_eddies(run, reach, base)), tuple(gaps_of(run, reach)))


def answer_json(answer: DriftAnswer) -> dict[str, Any]:
    """One run's drift as plain values; shares with their interval and their range."""
    base = answer.base
    soffits = {s.name: s.levels["soffit_m"] for s in answer.reach.structures if s.kind == "deck" and "soffit_m" in s.levels}
    return {
        "run": answer.entry.label, "source": source_of(answer.run), "rules": asdict(base.rules),
        "logs": len(base.state), "stopped_early": base.stopped_early,
        "ended": {word: int((base.state == code).sum()) for code, word in STATES.items()},
        "piers": [
            {
                "name": p.name, "represented_as": p.represented_as, "touch": _share(base.touches(i)), "lodge": _share(base.lodges(i)),
                "touch_range": [min(v), max(v)], "fed_by": base.fed(i), "first_touch_s": _least(base.first_touch[:, i]),
                "sentence": sentence(base, i, list(answer.tried.values())),
            }
            for i, p in enumerate(base.piers)
            for v in [[d.touches(i).value for d in (base, *answer.tried.values())]]
        ],
        "openings": [
            {"name": o.name, "pass": _share(base.passes(i)), "first_passage_s": _least(base.pass_time[base.passed == i])}
            for i, o in enumerate(base.openings)
        ],
        "deck_contact": {name: _share(base.deck_contacts(level)) for name, level in soffits.items()},
        "in_eddies": [asdict(h) for h in answer.held],
        "openings_to_a_design_log": [{**asdict(g), "narrower": g.narrower} for g in answer.gaps],
        "design_log_source": LOG_SOURCE,
        "settings_tried": list(answer.tried),
        "cautions": told(OWED["drift"]),
    }


def write_drift(folder: Path, answer: DriftAnswer, cell_m: float = 2.0) -> list[Path]:
    """logs.csv (one row a log) and drift.gpkg (paths, corridor cells) in ``folder``."""
    folder.mkdir(parents=True, exist_ok=True)
    base, mesh = answer.base, answer.run.mesh
    table = pd.DataFrame({
        "log": np.arange(len(base.state)), "release": [base.release_names[i] for i in base.release], "length_m": base.wood.length,
        "diameter_m": base.wood.diameter, "density_ratio": base.wood.density_ratio, "draft_m": base.wood.draft,
        "released_s": base.wood.released, "ended": [STATES[int(s)] for s in base.state],
        "passed": ["" if o < 0 else base.openings[o].name for o in base.passed], "passed_s": base.pass_time,
        "lodged_on": ["" if p < 0 else base.piers[p].name for p in base.lodged_at],
        **{f"touches {p.name}": base.touched[:, i] for i, p in enumerate(base.piers)},
    })
    heading = csv_heading(source_of(answer.run), answer.run.settings, OWED["drift"])
    write_whole(folder / "logs.csv", heading + table.to_csv(index=False))
    grid, corner = base.corridor(cell_m)
    rows, columns = np.nonzero(grid)
    cells = [shapely.box(corner[0] + c * cell_m, corner[1] + r * cell_m, corner[0] + (c + 1) * cell_m, corner[1] + (r + 1) * cell_m)
             for r, c in zip(rows, columns, strict=True)]
    world = [shapely.transform(g, mesh.to_world) for g in cells]
    lines, kept = [], []
    for i, path in enumerate(base.paths):
        known = np.isfinite(path[:, 0])
        if known.sum() > 1:
            lines.append(shapely.LineString(mesh.to_world(path[known, :2].astype(float))))
            kept.append(i)
    layers = {
        "corridor": geopandas.GeoDataFrame({"logs": grid[rows, columns]}, geometry=world),
        "paths": geopandas.GeoDataFrame({"log": kept, "ended": [STATES[int(base.state[i])] for i in kept]}, geometry=lines),
    }
    write_package(folder / "drift.gpkg", layers, answer.run.crs, answer_json(answer), OWED["drift"])
    return [folder / "logs.csv", folder / "drift.gpkg"]


def _points(geometry) -> np.ndarray:
    return np.asarray(geometry.coords)[:, :2]


def _share(share: Share) -> dict[str, float | int | None]:
    return {"count": share.count, "of": share.whole, "share": share.value, "low": share.low, "high": share.high}


def _least(values: np.ndarray) -> float | None:
    known = values[np.isfinite(values)]
    return float(known.min()) if known.size else None
