"""How long things stay when some are still there at the end: Kaplan-Meier median and restricted mean."""

from __future__ import annotations

import warnings
from dataclasses import dataclass

import numpy as np
from scipy.stats import CensoredData, ecdf

from ..figure import printed

_Z95 = 1.959963984540054


@dataclass(frozen=True)
class Stay:
    """Time until leaving, s. Intervals are 95 %, from Greenwood's variance; they hold sampling alone.

    ``median_s`` is None where fewer than half leave; an end of its interval is None where the interval
    has no end within the time watched. ``mean_s`` is restricted to ``watched_s``.
    """

    parcels: int
    left: int
    watched_s: float
    median_s: float | None
    median_95_s: tuple[float | None, float | None]
    mean_s: float
    mean_95_s: tuple[float, float]


@dataclass(frozen=True)
class Residence:
    """Stay of water in a zone of a field held steady; ``stay`` is None without mixing: nothing leaves then."""

    mixing_m2_s: float
    stay: Stay | None

    @property
    def words(self) -> str:
        """The finding in one sentence without a full stop."""
        if self.stay is None:
            return "no exchange in this steady field"
        s, text = self.stay, lambda v: "not reached" if v is None else printed(v)
        return (
            f"stays {text(s.median_s)} s in the median ({text(s.median_95_s[0])} to {text(s.median_95_s[1])}), "
            f"{printed(s.mean_s)} s in the mean up to {printed(s.watched_s)} s ({printed(s.mean_95_s[0])} to {printed(s.mean_95_s[1])}), "
            f"with mixing of {self.mixing_m2_s:g} m2/s as stated and the field held steady; {s.left} of {s.parcels} parcels left; "
            "intervals: 95 %, sampling alone"
        )


def stay_of(seconds: np.ndarray, left: np.ndarray) -> Stay:
    """Stay of parcels watched for ``seconds`` (k,), of which those with ``left`` (k,) bool left then.

    The mean is restricted to the longest time watched. Source: Kaplan and Meier 1958, J. Am. Stat. Assoc.
    53, 457-481; the intervals of the median follow Brookmeyer and Crowley 1982, Biometrics 38, 29-41.

    Raises ``ValueError`` where nothing was watched.
    """
    seconds, left = np.asarray(seconds, float), np.asarray(left, bool)
    if not seconds.size:
        raise ValueError("no parcel was watched; release at least one inside the zone.")
    watched = float(seconds.max())
    if not left.any():
        return Stay(len(seconds), 0, watched, None, (None, None), watched, (watched, watched))
    curve = ecdf(CensoredData(uncensored=seconds[left], right=seconds[~left])).sf
    with warnings.catch_warnings():
        # Where none stay the interval has no value (NaN), which is below no share.
        warnings.filterwarnings("ignore", "The confidence interval is undefined", RuntimeWarning)
        band = curve.confidence_interval(method="log-log")
    ends = _half(curve.quantiles, band.low.probabilities), _half(curve.quantiles, band.high.probabilities)
    mean, error = _restricted(seconds, left, curve.quantiles, curve.probabilities)
    return Stay(
        len(seconds), int(left.sum()), watched, _half(curve.quantiles, curve.probabilities), ends, mean,
        (max(mean - _Z95 * error, 0.0), min(mean + _Z95 * error, watched)),
    )


def _half(times: np.ndarray, share: np.ndarray) -> float | None:
    """First time at which at most half stay."""
    below = np.flatnonzero(share <= 0.5)
    return float(times[below[0]]) if below.size else None


def _restricted(seconds, left, times, share) -> tuple[float, float]:
    """Area under the curve to the longest time, and its standard error by Greenwood's sum."""
    steps = np.diff(times, prepend=0.0) * np.concatenate([[1.0], share[:-1]])
    beyond = steps.sum() - np.cumsum(steps)
    ordered = np.sort(seconds)
    risk = len(seconds) - np.searchsorted(ordered, times, side="left")
    ended = np.sort(seconds[left])
    gone = np.searchsorted(ended, times, side="right") - np.searchsorted(ended, times, side="left")
    some = (gone > 0) & (risk > gone)
    return float(steps.sum()), float(np.sqrt((beyond[some] ** 2 * gone[some] / (risk[some] * (risk[some] - gone[some]))).sum()))

