"""One moment or the mean over a window: the words that choose, and the words that tell."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from hydro.eddies import Zone
from hydro.ledger import Instants, Life

from .. import text
from .base import Desk
from .common import chooser

_PERIODS = 10  # expected shedding periods in the window that the chooser offers
ONE, WHOLE, HALF, WAKE, OWN = "one", "whole", "half", "wake", "own"


def moment_words(desk: Desk, subject: Zone | None) -> str:
    """"At one moment." with its words as a control, and a form for a window of one's own; empty for a single frame."""
    if desk.run.n_frames == 1:
        return ""
    offered = {ONE: "one moment", WHOLE: "the mean of the whole run", HALF: "the mean of its second half"}
    if subject is not None and subject.wake is not None:
        offered[WAKE] = f"the mean of {_PERIODS} shedding periods round it"
    chosen = _chosen(desk)
    if chosen == OWN:
        offered[OWN] = f"the mean {window_words(desk)}"
    out = f" Shown: {chooser('moment', chosen, offered, 'one moment or a mean over time')}."
    if not desk.sizes.narrow:
        start, end = desk.choices.window or (0.0, float(desk.run.times.seconds[-1]))
        out += (
            ' <details class="inline"><summary class="word">other times</summary><form data-send="window">'
            f'<label for="window-from">From</label> <input type="text" name="from" id="window-from" value="{start:g}" size="7"> '
            f'<label for="window-to">to</label> <input type="text" name="to" id="window-to" value="{end:g}" size="7"> '
            'seconds from the start <button type="submit" class="plain">Show the mean</button></form></details>'
        )
    return out


def window_for(desk: Desk, word: str, subject: Zone | None) -> tuple[float, float] | None:
    """The window that a word of the chooser means, s from the first frame; None: one moment."""
    seconds = desk.run.times.seconds
    last = float(seconds[-1])
    if word == WHOLE:
        return 0.0, last
    if word == HALF:
        return round(last / 2, 3), last
    if word == WAKE and subject is not None and subject.wake is not None:
        half = _PERIODS * subject.wake.expected_period_s / 2
        at = float(np.clip(seconds[desk.index], half, max(half, last - half)))
        return round(max(at - half, 0.0), 3), round(min(at + half, last), 3)
    return desk.choices.window if word == OWN else None


def window_of(form: dict) -> tuple[float, float]:
    """The window typed into the form, s.

    Raises ``ValueError`` for what is no number, or a start that is not before the end.
    """
    try:
        start, end = float(form.get("from", "")), float(form.get("to", ""))
    except ValueError as error:
        raise ValueError("the window's times are not numbers; give seconds from the start of the run.") from error
    if not start < end:
        raise ValueError(f"the window goes from {start:g} s to {end:g} s; its start must come before its end.")
    return start, end


def window_words(desk: Desk) -> str:
    """"from 20:10 to 20:40"."""
    assert desk.choices.window is not None
    times = desk.run.times
    ends = []
    for seconds in desk.choices.window:
        instant = None if times.instants is None else times.instants[0] + np.timedelta64(round(seconds * 1000), "ms")
        ends.append(text.clock(instant, seconds))
    return f"from {ends[0]} to {ends[1]}"


def instants_words(found: Instants | None, desk: Desk) -> str:
    """What single moments say of an eddy of the mean flow, HTML; None: they are not read yet."""
    if found is None:
        return "Its single moments are still being read."
    if not found.seen:
        return f"None of the {found.frames} moments in it holds such an eddy: it is one of the mean only."
    low, high = found.ranges["area_m2"]
    u = desk.units
    least = desk.run.settings["least_periods"]
    return (
        f"Single moments hold it {text.percent(found.share_of_time)} of the time, with {u.span(low, high, 'm2')} "
        f"{u.label('m2')}.{_period_words(found, least)}"
    )


def life_words(life: Life, zones: Mapping[int, Sequence[Zone]], desk: Desk) -> str:
    """How an eddy fares through the run, HTML, with buttons that go to its first, largest and last moment."""
    times, u = desk.run.times, desk.units
    if not life.followed:
        return (
            f"<b>{text.safe(life.id)}</b> cannot be followed from frame to frame: {text.safe(life.why)}. "
            "What holds at one moment may not at the next; look at a mean."
        )
    areas = {i: z.area_m2 for i in life.frames for z in zones[i] if z.id == life.id}
    largest = max(areas, key=lambda i: areas[i])

    def go(index: int, word: str) -> str:
        when = text.clock(None if times.instants is None else times.instants[index], float(times.seconds[index]))
        return (
            f'<button type="button" class="word" data-do="seconds" data-value="{times.seconds[index]:.10g}" '
            f'data-key="seconds-{word}">{word} {when}</button>'
        )

    low, high = life.ranges["area_m2"]
    kin = f" It split from {text.safe(life.parent)}." if life.parent else ""
    kin += f" It merged into {text.safe(life.merged_into)}." if life.merged_into else ""
    kin += " Its flow swings by more than a tenth: it is unsteady." if life.unsteady else ""
    return (
        f"<b>{text.safe(life.id)}</b> through the run: {go(life.frames[0], 'first')}, {go(largest, 'largest')}, "
        f"{go(life.frames[-1], 'last')}; there {text.percent(life.share_of_time)} of the time, {u.span(low, high, 'm2')} "
        f"{u.label('m2')}.{kin}"
    )


def _period_words(found: Instants, least: float) -> str:
    if found.periods is None:
        return ""
    period = found.measured_period_s or found.expected_period_s
    how = "measured" if found.measured_period_s else "expected"
    few = "; too few for a mean to be relied on" if found.periods < least else ""
    return f" The window holds {found.periods:.1f} {how} shedding periods of {period:.3g} s{few}."


def _chosen(desk: Desk) -> str:
    window = desk.choices.window
    if window is None:
        return ONE
    last = float(desk.run.times.seconds[-1])
    return {(0.0, last): WHOLE, (round(last / 2, 3), last): HALF}.get(window, OWN)
