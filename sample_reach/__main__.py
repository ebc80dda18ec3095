"""``python -m sample_reach``: make the demonstration data, two designs side by side, going on where it was stopped."""

from __future__ import annotations

import argparse
import multiprocessing
import time
from functools import partial
from pathlib import Path

import numpy as np

from . import geometry as geo
from . import runs
from .lines import write_lines
from .review import fill_hashes
from .write import Story, write_run

HERE = Path(__file__).resolve().parent
RESULTS = HERE / "results"
NAMES = {
    "existing": ("bankfull_coarse", "bankfull", "low", "flood", "burst"),
    "proposed": ("bankfull", "low", "flood"),
}


def _say(design: str, words: str) -> None:
    print(f"{time.strftime('%H:%M:%S')} {design}: {words}", flush=True)


def _story(design: str, name: str, steps: int) -> Story:
    event = name.split("_")[0]
    which = "coarse" if name.endswith("coarse") else "fine"
    river, side = {"low": runs.LOW, "bankfull": runs.BANKFULL}.get(event, (0, 0))
    flows = f"{river:g} m3/s down the river and {side:g} m3/s from the tributary"
    if event in ("low", "bankfull"):
        words = (
            f"steady inflow of {flows}; time mean of depth and of edge discharge over {runs.MEAN[event]:g} s "
            f"({steps} steps) after {runs.SETTLE[event]:g} s on this mesh, from a spin-up of {runs.SPIN_UP[event]:g} s on the "
            "coarse mesh. Piers shed, so the mean, not one instant, is given."
        )
        title = f"{design.capitalize()} bridge and weir, {event} flow, time mean, {which} mesh"
    elif event == "flood":
        words = "short gate-like flood, instants 12 s apart: too far apart to follow eddies that shed every 10 to 20 s."
        title = f"{design.capitalize()} bridge and weir, short flood"
    else:
        words = f"instants {np.diff(runs.BURST_FRAMES)[0]:g} s apart at the peak of the flood, to follow shedding eddies."
        title = f"{design.capitalize()} bridge and weir, burst at the peak of the flood"
    return Story(title, design, event, which, "Demonstration data of an invented place: " + words, event in runs.MEAN)


def make_run(design: str, name: str, work: Path) -> None:
    """Make one result file, or leave it if it is there already."""
    path = RESULTS / f"{design}_{name}.nc"
    if path.exists():
        return
    chain = runs.Chain(design, work, partial(_say, design))
    event, which = name.split("_")[0], "coarse" if name.endswith("coarse") else "fine"
    if event in runs.MEAN:
        model, fields = chain.mean(event, which)
        frames = [fields]
    else:
        # One march serves flood and burst, so every time of either is visited in order.
        model, visited = chain.model("fine"), [runs.FLOOD_FRAMES]
        if design == "existing":
            visited.append(runs.BURST_FRAMES)
        wanted = runs.FLOOD_FRAMES if event == "flood" else runs.BURST_FRAMES
        frames = [f for f in chain.flood(model, np.unique(np.concatenate(visited))) if f.seconds in wanted]
    xy = chain.mesh(which).xy
    write_run(path, model, chain.place.bed(xy), frames, _story(design, name, int(model.state[5])))
    _say(design, f"{path.name} written, {path.stat().st_size / 1e6:.2f} MB")


def make_design(design: str, work: Path) -> None:
    """Every result file of one design."""
    for name in NAMES[design]:
        make_run(design, name, work)


def main() -> None:
    parser = argparse.ArgumentParser(prog="python -m sample_reach", description=__doc__)
    parser.add_argument("--work", type=Path, default=HERE.parent / "build" / "sample_reach", help="folder for unfinished runs")
    parser.add_argument("--lines-only", action="store_true", help="write lines.gpkg and the hashes in review.toml only")
    args = parser.parse_args()
    write_lines(HERE / "lines.gpkg")
    if not args.lines_only:
        with multiprocessing.get_context("spawn").Pool(2) as pool:
            pool.starmap(make_design, [(d, args.work) for d in geo.DESIGNS], chunksize=1)
    fill_hashes(HERE / "review.toml")


if __name__ == "__main__":
    main()
