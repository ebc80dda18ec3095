"""Passage over a review: every fish in every run, what that says of flows and time, and of many swimmers."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..review import Review, RunEntry
from ..run import Run
from .answer import Answer, assess, unsteady_flag
from .areas import places_of
from .entrance import EntranceShare, entrance_share
from .fish import Fish, read_fish
from .flows import Band, Hydrograph, Shares, bands, hydrograph, monthly_shares, read_flow_duration
from .sampled import SampledShare, sampled_share
from .sills import entrances_of, sills_of
from .water import Routes, make_routes

Progress = Callable[[float, str], None]


@dataclass(frozen=True, eq=False)
class RunAnswer:
    """An answer with the run that it was read from."""

    entry: RunEntry
    run: Run
    answer: Answer
    entrances: tuple[EntranceShare, ...] = ()
    sampled: SampledShare | None = None


@dataclass(frozen=True, eq=False)
class FlowAnswer:
    """For one fish and design: the answer by ranges of discharge, by month, and by run of many frames.

    ``runs`` holds, by the run's label, what a run of many frames says of its own time.
    """

    fish: Fish
    design: str
    bands: tuple[Band, ...]
    months: tuple[Shares, ...]
    runs: tuple[tuple[str, Hydrograph], ...]


@dataclass(frozen=True, eq=False)
class Study:
    """All answers of a review, in the order of its runs, their frames and its fish."""

    review: Review
    answers: tuple[RunAnswer, ...]
    flows: tuple[FlowAnswer, ...]


def study(
    review: Review, *, runs: Sequence[str] = (), fish: Sequence[str] = (), every: int = 0, swimmers: int = 0, seed: int = 1,
    progress: Progress | None = None,
) -> Study:
    """Assess fish in the runs of a review.

    Parameters
    ----------
    review : Review
        With [[fish]] tables, and a layer ``fish`` with a start and a goal.
    runs, fish : sequences of str
        Ids or labels of runs, names of fish; empty: all, but for runs that hold maxima.
    every : int
        In a run of many frames assess every so many-th frame; 0: only its last.
    swimmers, seed : int
        How many sampled swimmers each run's last frame gets; 0: none.
    progress : callable, optional
        Called with the share done (0 to 1) and what is being done; it may raise to stop.

    Raises
    ------
    ValueError
        Nothing to assess, an unknown run or fish, or what :func:`hydro.passage.answer.assess` raises.
    """
    kinds = _fish_of(review, fish)
    tell = progress or (lambda share, what: None)
    jobs = [(entry, i) for entry in _entries(review, runs) for i in _frames(review.open(entry.id), every)]
    if not jobs:
        raise ValueError("no run of the review holds an instant or a mean; passage cannot be read from maxima.")
    answers: list[RunAnswer] = []
    nets: dict[str, Routes] = {}
    total = len(jobs) * len(kinds)
    for entry, index in jobs:
        run = review.open(entry.id)
        last = index == run.n_frames - 1
        net = nets.setdefault(entry.id, make_routes(run.mesh, int(review.settings["passage_points_per_side"])))
        for kind in kinds:
            tell(len(answers) / total, f"{kind.name}, {entry.label}, frame {index}")
            found = _one(review, entry, run, index, kind, net)
            if swimmers and last:
                found = replace(found, sampled=_sampled(review, entry, found, swimmers, seed, len(answers) / total, total, tell))
            answers.append(found if last else replace(found, answer=found.answer.light()))
        nets = {entry.id: net}
    answers = _with_unsteady_flags(answers)
    tell(1.0, "done")
    return Study(review, tuple(answers), tuple(_flow_answers(review, answers, kinds)))


def _fish_of(review: Review, wanted: Sequence[str]) -> list[Fish]:
    kinds = [read_fish(table) for table in review.fish]
    if not kinds:
        raise ValueError(f"{review.folder / 'review.toml'} has no [[fish]]; describe at least one with its sources.")
    known = {k.name: k for k in kinds}
    for name in wanted:
        if name not in known:
            raise ValueError(f"the review has no fish {name!r}; it has {', '.join(known)}.")
    return [known[name] for name in wanted] if wanted else kinds


def _entries(review: Review, wanted: Sequence[str]) -> list[RunEntry]:
    if wanted:
        return [review.entry(name) for name in wanted]
    return review.runs


def _frames(run: Run, every: int) -> list[int]:
    """Frames to assess; those of maxima are left out."""
    good = [i for i in range(run.n_frames) if run.times.kinds[i] != "maximum"]
    if not good:
        return []
    return sorted({*good[::every], good[-1]}) if every else good[-1:]


def _one(review: Review, entry: RunEntry, run: Run, index: int, kind: Fish, net: Routes) -> RunAnswer:
    frame = run.frame(index)
    answer = assess(
        frame, kind, review.reach, review.settings, design=entry.design or None, boundary_sets=run.boundary_sets, routes=net
    )
    lines = entrances_of(review.reach, entry.design or None)
    shares = tuple(entrance_share(frame, line, answer.discharge_m3_s) for line in lines)
    return RunAnswer(entry, run, answer, shares)


def _sampled(review, entry, found: RunAnswer, swimmers, seed, before, total, tell) -> SampledShare | None:
    search = found.answer.search
    if search is None or found.answer.chain is None or not (search.fish.length_sd_m or search.fish.endurance_sd):
        return None

    def progress(done: int, of: int) -> None:
        tell(before + done / of / total, f"{search.fish.name}, {entry.label}: length {done} of {of}")

    return sampled_share(
        search, places_of(review.reach), sills_of(review.reach, entry.design or None), swimmers, seed, progress=progress
    )


def _with_unsteady_flags(answers: list[RunAnswer]) -> list[RunAnswer]:
    """Flag answers whose flow changes during the swim, judged by the assessed frames of the same run."""
    out = []
    for one in answers:
        series = [a.answer for a in answers if a.entry is one.entry and a.answer.fish is one.answer.fish]
        flag = unsteady_flag(one.answer, np.array([a.stamp.seconds for a in series]), np.array([a.discharge_m3_s for a in series]))
        if flag:
            one = replace(one, answer=replace(one.answer, flags=(*one.answer.flags, flag)))
        out.append(one)
    return out


def _flow_answers(review: Review, answers: list[RunAnswer], kinds: list[Fish]):
    table = read_flow_duration(review.contents.flows)
    for kind in kinds:
        for design in dict.fromkeys(a.entry.design for a in answers):
            own = [a for a in answers if a.entry.design == design and a.answer.fish.name == kind.name]
            found = bands([a.answer.discharge_m3_s for a in own], [a.answer.status for a in own])
            months = monthly_shares(found, table, kind.migration) if table and found else ()
            by_run = []
            for label in dict.fromkeys(a.entry.label for a in own):
                series = [a.answer for a in own if a.entry.label == label]
                if len(series) > 1:
                    by_run.append((label, hydrograph(
                        [a.stamp.seconds for a in series], [a.discharge_m3_s for a in series], [a.status for a in series]
                    )))
            yield FlowAnswer(kind, design, found, months, tuple(by_run))
