"""What a metre of water costs a swimming fish: fatigue and seconds, for a heading and a current.

A swimmer is a plain array, all in m, m/s and s:
[0] sustained speed, [1..4] prolonged a, b, lowest, highest, [5..8] sprint a, b, lowest, highest,
[9] weight of time in the choice, 1/s, [10] highest speed of all, [11] least fatigue a second in any
mode, [12] position factor on the current, [13] least depth, [14] wet depth, [15] body length.
A mode that is not given has a highest speed of -1.
"""

from __future__ import annotations

import math

from numba import njit

SUSTAINED, PROLONGED, SPRINT, TIME_WEIGHT, TOP, LEAST_RATE = 0, 1, 5, 9, 10, 11
POSITION, LEAST_DEPTH, WET_DEPTH, BODY = 12, 13, 14, 15
SWIMMER_SIZE = 16


@njit(cache=True, nogil=True)
def mode_metre(along, across, a, b, lowest, highest):
    """Least fatigue a metre in one mode, and the ground speed that gives it; (inf, 0) if there is none.

    ``along`` and ``across`` are the current along and across the heading, m/s. Minimises
    exp(-a - b s) / g with s = |g e - u|. The logarithm is convex in g, so its one stationary point,
    cut to the range of the mode, is the least. Of the two g that give one s the larger is the better.
    """
    if highest * highest <= across * across or highest <= 0.0:
        return math.inf, 0.0
    fastest = math.sqrt(highest * highest - across * across)  # greatest speed through the water along e
    if along + fastest <= 0.0:
        return math.inf, 0.0
    slowest = 0.0
    if lowest > abs(across):
        slowest = math.sqrt(lowest * lowest - across * across)
    ideal = -1.0 / b
    d = ideal - along
    w = 0.5 * (d + math.sqrt(d * d + 4.0 * ideal * abs(across)))
    if across != 0.0:
        for _ in range(2):  # Newton from the right of the root; two steps leave the least 6e-6 too high at most
            s = math.sqrt(w * w + across * across)
            w -= (w * (w + along) - ideal * s) / (2.0 * w + along - ideal * w / s)
    w = min(max(w, slowest), fastest)
    g = w + along
    if g <= 0.0:
        return math.inf, 0.0
    s = math.sqrt(w * w + across * across)
    return math.exp(-a - b * s) / g, g


@njit(cache=True, nogil=True)
def metre(along, across, swimmer):
    """(fatigue a metre, seconds a metre) of the best way to make ground; (inf, inf) if there is none.

    At or under the sustained speed no fatigue is added. The choice between ways weighs fatigue plus
    the time weight, so water that could be crept through for hours without fatigue is not.
    """
    weight = swimmer[TIME_WEIGHT]
    best = math.inf
    fatigue = math.inf
    seconds = math.inf
    free = swimmer[SUSTAINED]
    if free > abs(across):
        g = along + math.sqrt(free * free - across * across)
        if g > 0.0:
            fatigue = 0.0
            seconds = 1.0 / g
            best = weight * seconds
            if best * (along + swimmer[TOP]) <= swimmer[LEAST_RATE]:  # no way that tires can be better
                return fatigue, seconds
    for m in (PROLONGED, SPRINT):
        f, g = mode_metre(along, across, swimmer[m], swimmer[m + 1], swimmer[m + 2], swimmer[m + 3])
        if g > 0.0 and f + weight / g < best:
            best = f + weight / g
            fatigue = f
            seconds = 1.0 / g
    return fatigue, seconds


@njit(cache=True, nogil=True)
def floor_metre(along, swimmer):
    """A lower bound, quick to work out, of fatigue a metre plus weighted time where the current along the heading is at
    most ``along``: what either mode would cost without range and without current across (Castro-Santos 2005)."""
    if along > -swimmer[SUSTAINED]:
        return 0.0
    low = math.inf
    for m in (PROLONGED, SPRINT):
        if swimmer[m + 3] > 0.0:
            a, b = swimmer[m], swimmer[m + 1]
            low = min(low, -b * math.exp(1.0 - a + b * along))
    return low


@njit(cache=True, nogil=True)
def needed(along, across):
    """Least speed through the water, m/s, that keeps the heading without losing ground."""
    return abs(across) if along > 0.0 else math.sqrt(along * along + across * across)
