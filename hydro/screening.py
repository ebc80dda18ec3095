"""Screening relations for piers, fall hazards and people: the limits are printed, never comfort.

References
----------
.. [1] Arneson et al. 2012, FHWA HEC-18, 5th ed. (coefficients from memory).
.. [2] Defra/Environment Agency FD2320, FD2321 and supplementary note 2008 (edges from memory).
.. [3] AIDR Guideline 7-3, 2017, after Smith, Davey and Cox 2014 (edges from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

G = 9.81
_NOSE = {"square": 1.1, "round": 1.0, "cylinder": 1.0, "group": 1.0, "sharp": 0.9}
HAZARD_EDGES = (("low", 0.75), ("danger for some", 1.25), ("danger for most", 2.0), ("danger for all", math.inf))
# class: limits of depth times speed (m2/s), depth (m), speed (m/s)
PEOPLE_CLASSES = (
    ("H1", 0.3, 0.3, 2.0), ("H2", 0.6, 0.5, 2.0), ("H3", 0.6, 1.2, 2.0), ("H4", 1.0, 2.0, 2.0), ("H5", 4.0, 4.0, 4.0),
)


@dataclass(frozen=True, slots=True)
class Scour:
    """Pier scour depth by HEC-18, m, with its Froude number and whether the aligned-pier cap was applied."""

    depth_m: float
    uncapped_m: float
    froude: float
    k2: float
    capped: bool
    notes: tuple[str, ...]
    cautions: tuple[str, ...] = ("scour", "screening")


def pier_scour(
    depth_m: float, speed_m_s: float, width_m: float, *, length_m: float = 0.0, angle_deg: float = 0.0, nose: str = "round",
    k3: float = 1.1,
) -> Scour:
    """y_s / y_1 = 2.0 K1 K2 K3 (a / y_1)^0.65 Fr^0.43 [1]_.

    Parameters
    ----------
    depth_m, speed_m_s : float
        Just upstream, clear of the pier's own disturbance.
    length_m : float
        Of the pier along its axis, m; matters with an angle only.
    angle_deg : float
        Between flow and pier axis.

    Raises
    ------
    ValueError
        An unknown nose shape, or a depth or width of nothing.
    """
    if nose not in _NOSE:
        raise ValueError(f"pier nose {nose!r} is not known; say one of {', '.join(_NOSE)}.")
    if not (depth_m > 0 and width_m > 0):
        raise ValueError(f"pier scour needs a depth and a width above 0; they are {depth_m:g} and {width_m:g} m.")
    notes = []
    ratio = length_m / width_m
    if ratio > 12:
        ratio = 12.0
        notes.append("length over width cut to 12")
    turn = math.radians(abs(angle_deg))
    k2 = (math.cos(turn) + ratio * math.sin(turn)) ** 0.65
    k1 = 1.0 if abs(angle_deg) > 5 else _NOSE[nose]
    froude = speed_m_s / math.sqrt(G * depth_m)
    free = 2.0 * k1 * k2 * k3 * (width_m / depth_m) ** 0.65 * froude**0.43 * depth_m
    limit = (2.4 if froude <= 0.8 else 3.0) * width_m
    capped = nose in ("round", "cylinder") and angle_deg == 0 and free > limit
    if capped:
        notes.append("capped at the limit for a round nose aligned with the flow")
    return Scour(min(free, limit) if capped else free, free, froude, k2, capped, tuple(notes))


def projected_width(width_m: float, length_m: float, angle_deg: float) -> float:
    """Width of a rectangular pier normal to the approach flow, a cos + L sin, m."""
    turn = math.radians(abs(angle_deg))
    return width_m * math.cos(turn) + length_m * math.sin(turn)


def blockage(projected_widths_m: list[float], channel_width_m: float) -> tuple[float, float]:
    """Share of the channel width that piers take, and the factor on the mean speed, 1 / (1 - share)."""
    share = sum(projected_widths_m) / channel_width_m
    return share, 1 / (1 - share)


def hazard_rating(depth_m: float, speed_m_s: float, debris: float | None = None) -> tuple[float, str]:
    """HR = d (v + 0.5) + DF and its class with the 2008 edges [2]_.

    ``debris`` None takes the conservative factor, 0.5 up to 0.25 m and 1.0 above.
    """
    factor = (0.5 if depth_m <= 0.25 else 1.0) if debris is None else debris
    rating = depth_m * (speed_m_s + 0.5) + factor
    return rating, next(name for name, edge in HAZARD_EDGES if rating < edge or (name != "low" and rating <= edge))


def people_class(depth_m: float, speed_m_s: float) -> str:
    """Lowest class whose three limits all hold, H1 to H6 [3]_; depth and speed at one spot and one time."""
    slack = 1e-9
    for name, product, depth, speed in PEOPLE_CLASSES:
        if depth_m * speed_m_s <= product + slack and depth_m <= depth + slack and speed_m_s <= speed + slack:
            return name
    return "H6"


def critical_shields_speed(depth_m: float, grain_m: float, *, shields: float = 0.047, submerged: float = 1.65) -> float:
    """Depth-averaged speed at which grains of this size begin to move, m/s; Shields with Manning-Strickler.

    u*^2 = theta (s - 1) g d and V = u* h^(1/6) / (sqrt(g) n), n = d^(1/6) / 21.1 (Strickler; from memory).
    A relation for uniform grains and h well above d.

    Raises ``ValueError`` below h/d = 5, where the relation says nothing.
    """
    if not (grain_m > 0 and depth_m > 5 * grain_m):
        raise ValueError(f"depth is {depth_m:g} m over grains of {grain_m:g} m; the relation says nothing below five grains of depth.")
    shear = math.sqrt(shields * submerged * G * grain_m)
    return shear * depth_m ** (1 / 6) * 21.1 / (math.sqrt(G) * grain_m ** (1 / 6))
