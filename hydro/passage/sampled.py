"""Many swimmers of one kind: the share of them for which the way is not excluded, sampled with a seed."""

from __future__ import annotations

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace

import numpy as np
from scipy.stats import binomtest

from .areas import Places, find_areas
from .fish import Fish
from .legs import Search
from .water import find_drops

_LENGTH_STEP = 0.001  # m; lengths are sampled to the millimetre


@dataclass(frozen=True, slots=True)
class Swimmers:
    """Sampled fish: length (k,) m, to the millimetre, and how far ln T lies above the given lines (k,)."""

    length_m: np.ndarray
    log_endurance: np.ndarray


@dataclass(frozen=True, slots=True)
class SampledShare:
    """Of ``swimmers`` sampled fish, for ``not_excluded`` the way is not excluded.

    ``low`` and ``high`` are Wilson's 95 % interval (Wilson 1927): what the number of swimmers leaves open, not the
    error of the model or of the endurance lines.
    """

    swimmers: int
    not_excluded: int
    low: float
    high: float
    seed: int

    @property
    def share(self) -> float:
        return self.not_excluded / self.swimmers


def sample(fish: Fish, swimmers: int, seed: int) -> Swimmers:
    """Lengths (lognormal about the fish's, with its scatter) and endurance (normal in ln T, one shift for both lines).

    Random numbers are counter-based (Philox; Salmon et al. 2011), keyed by seed and swimmer: swimmer 7 is the same
    however many are asked for.

    Raises ``ValueError`` for fewer than one swimmer or a fish without scatter.
    """
    if swimmers < 1:
        raise ValueError(f"{swimmers} swimmers were asked for; ask for at least one.")
    if fish.length_sd_m == 0 and fish.endurance_sd == 0:
        raise ValueError(f"fish {fish.name} has no scatter; give length_sd_m or endurance_sd in review.toml, or ask for no sample.")
    z = np.array([
        np.random.Generator(np.random.Philox(key=seed, counter=[0, i, 0, 0])).standard_normal(2) for i in range(swimmers)
    ])
    length = fish.length_m * np.exp(fish.length_sd_m / fish.length_m * z[:, 0])
    length = np.maximum(np.round(length / _LENGTH_STEP), 1) * _LENGTH_STEP
    return Swimmers(length, fish.endurance_sd * z[:, 1])


def sampled_share(
    search: Search, places: Places, sills: tuple[np.ndarray, ...], swimmers: int, seed: int, *,
    progress: Callable[[int, int], None] | None = None, workers: int = 2,
) -> SampledShare:
    """Share of sampled swimmers for which the way is not excluded in one frame.

    Parameters
    ----------
    search : Search
        Of the frame with the fish that is sampled.
    places, sills
        As the search was made with.
    swimmers, seed : int
    progress : callable, optional
        Called with how many lengths are done and how many there are; may raise to stop.
    workers : int
        Threads; the answer does not depend on them.

    Notes
    -----
    A shift of ln T divides all fatigue by one factor and leaves every choice as it is, so one search serves all
    swimmers of one length. Headings are those of the first net; see the direction error of the answer.
    """
    drawn = sample(search.fish, swimmers, seed)
    lengths, of = np.unique(drawn.length_m, return_inverse=True)
    strongest = np.full(len(lengths), -np.inf)
    np.maximum.at(strongest, of, drawn.log_endurance)
    worst = np.empty(len(lengths))

    def one(i: int) -> None:
        own = _resized(search, places, sills, float(lengths[i]))
        worst[i] = own.least_worst(bound=math.exp(strongest[i]))

    pool = ThreadPoolExecutor(workers)
    try:
        for done, _ in enumerate(pool.map(one, range(len(lengths))), 1):
            if progress is not None:
                progress(done, len(lengths))
    finally:
        pool.shutdown(cancel_futures=True)
    ok = int(np.count_nonzero(worst[of] < np.exp(drawn.log_endurance)))
    interval = binomtest(ok, swimmers).proportion_ci(0.95, method="wilson")
    return SampledShare(swimmers, ok, float(interval.low), float(interval.high), seed)


def _resized(search: Search, places: Places, sills: tuple[np.ndarray, ...], length_m: float) -> Search:
    """The same search for a fish of another length; areas are found anew only where its drops differ."""
    fish, frame = search.fish.resized(length_m), search.water.frame
    drops = find_drops(frame, fish.greatest_drop_m, 3 * length_m, sills)
    same = np.array_equal(drops.barred, search.drops.barred)
    areas = search.areas if same else find_areas(frame, search.water.flow, fish, places, drops)
    water = replace(search.water, drops=drops.of(search.water.routes))
    return Search(water, fish, areas, drops, search.settings)
