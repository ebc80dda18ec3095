"""Which result files there are, what each says of itself, and making one of them."""

from __future__ import annotations

import time
from functools import partial
from pathlib import Path

import numpy as np

from . import runs
from .write import Story, write_run

HERE = Path(__file__).resolve().parent
RESULTS = HERE / "results"
NAMES = {
    "existing": ("bankfull", "bankfull_coarse", "low", "flood", "burst"),
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
        apart = np.diff(runs.FLOOD_FRAMES)[0]
        words = f"short gate-like flood, instants {apart:g} s apart: too far to follow eddies that shed every 10 to 20 s."
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
