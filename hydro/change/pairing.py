"""Which frame of one run stands beside which frame of another."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..run import Run

RULES = ("time", "discharge", "order")


@dataclass(frozen=True, slots=True)
class Pair:
    """Frames compared with each other, and by how much they miss the rule that paired them."""

    a: int
    b: int
    rule: str
    miss: float  # s for "time", m3/s for "discharge", 0 for "order"


def pair_frames(
    a: Run, b: Run, rule: str = "time", *, inflow_a: np.ndarray | None = None, inflow_b: np.ndarray | None = None
) -> list[Pair]:
    """Pairs of frames, one for each frame of ``a`` that has a partner.

    Parameters
    ----------
    rule : "time", "discharge" or "order"
        Nearest time (dated instants where both runs have them, else seconds from the start, and no
        further than half of b's spacing); nearest through-discharge on the same limb of the
        hydrograph; or first with first.
    inflow_a, inflow_b : (frames,), m3/s
        Through-discharges, for "discharge".

    Raises
    ------
    ValueError
        Unknown rule, missing discharges, or no pair at all.
    """
    if rule not in RULES:
        raise ValueError(f"pairing by {rule!r} is not known; say one of {', '.join(RULES)}.")
    if a.n_frames == 1 and b.n_frames == 1:
        return [Pair(0, 0, "order", 0.0)]
    if rule == "order":
        return [Pair(i, i, rule, 0.0) for i in range(min(a.n_frames, b.n_frames))]
    if rule == "time":
        pairs = _by_time(a, b)
    else:
        if inflow_a is None or inflow_b is None:
            raise ValueError("pairing by discharge needs the through-discharge of every frame of both runs.")
        pairs = _by_discharge(np.asarray(inflow_a, float), np.asarray(inflow_b, float))
    if not pairs:
        raise ValueError(f"no frame of {b.name} is near enough to one of {a.name}; pair by discharge or by order.")
    return pairs


def _by_time(a: Run, b: Run) -> list[Pair]:
    ta, tb = a.times.seconds, b.times.seconds
    if a.times.instants is not None and b.times.instants is not None:
        start = a.times.instants[0]
        ta = (a.times.instants - start) / np.timedelta64(1, "s")
        tb = (b.times.instants - start) / np.timedelta64(1, "s")
    reach = np.median(np.diff(tb)) / 2 if len(tb) > 1 else np.inf
    pairs = []
    for i, t in enumerate(ta):
        j = int(np.abs(tb - t).argmin())
        if abs(tb[j] - t) <= reach + 1e-9:
            pairs.append(Pair(i, j, "time", float(abs(tb[j] - t))))
    return pairs


def _by_discharge(qa: np.ndarray, qb: np.ndarray) -> list[Pair]:
    """Rising frames with rising ones, falling with falling: a loop has two frames of each discharge."""
    rising_a, rising_b = np.arange(qa.size) <= qa.argmax(), np.arange(qb.size) <= qb.argmax()
    pairs = []
    for i, q in enumerate(qa):
        limb = np.flatnonzero(rising_b == rising_a[i])
        if limb.size:
            j = int(limb[np.abs(qb[limb] - q).argmin()])
            pairs.append(Pair(i, j, "discharge", float(abs(qb[j] - q))))
    return pairs
