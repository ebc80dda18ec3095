"""Two runs side by side: the second one's desk at the same moment, and its scene on the first one's scale."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from hydro.run import Run

from . import text
from .questions.base import Desk
from .views.scene import Scene

PAIRED = ("eddies", "sections")  # questions whose map can stand beside another run's


def other(desk: Desk) -> Desk | None:
    """The desk of the run that stands beside, at the same moment; None where none was chosen or the question has one map."""
    run_id = desk.choices.alongside
    known = [id_ for id_, _ in desk.reading.matter().runs]
    if not run_id or run_id == desk.run_id or run_id not in known or desk.choices.question not in PAIRED:
        return None
    seconds = same_moment(desk.run, desk.reading.run(run_id), desk.index)
    return replace(desk, choices=replace(desk.choices, run=run_id, seconds=seconds, subject="", parcel=None))



def same_moment(run: Run, beside: Run, index: int) -> float:
    """Seconds of the other run at a frame of the first: by date where both are dated, else counted from each one's start."""
    here, there = run.times.instants, beside.times.instants
    if here is None or there is None:
        return float(run.times.seconds[index])
    return float((here[index] - there[0]) / np.timedelta64(1, "s")) + float(beside.times.seconds[0])


def alike(scene: Scene, top: float) -> Scene:
    """A scene with the first run's shades, and without a subject: the sentence speaks of the first run."""
    water = replace(scene.water, top=top) if scene.water is not None else None
    lines = tuple(replace(line, subject=False) for line in scene.lines)
    return replace(scene, water=water, lines=lines, zones=tuple(replace(z, subject=False) for z in scene.zones))


def words(desk: Desk, tube_m3_s: float) -> str:
    """Which run a map shows, when, and in what tubes."""
    run = desk.run
    instants = run.times.instants
    when = text.moment(None if instants is None else instants[desk.index], float(run.times.seconds[desk.index]))
    tubes = f", tubes of {desk.units.quantity(tube_m3_s, 'm3/s')}" if tube_m3_s else ""
    return f"<b>{text.safe(desk.reading.label(desk.run_id))}</b>, {when}{tubes}"
