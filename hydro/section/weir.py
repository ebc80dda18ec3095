"""Weir relations with their ranges: a check of plausibility beside a model's weir, never truth for it.

References
----------
.. [1] ISO 3846:2008, Rectangular broad-crested weirs (coefficients from memory).
.. [2] ISO 1438:2017, Thin-plate weirs; Rehbock and Kindsvater-Carter (coefficients from memory).
.. [3] Villemonte, J.R. 1947, Submerged-weir discharge studies, Engineering News-Record.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

G = 9.81
_KC = {  # width ratio b/B: (alpha, alpha', k_b in m)
    1.0: (0.602, 0.075, -0.0009), 0.9: (0.599, 0.064, 0.0037), 0.8: (0.597, 0.045, 0.0043), 0.7: (0.595, 0.030, 0.0041),
    0.6: (0.593, 0.018, 0.0037), 0.5: (0.592, 0.011, 0.0030),
}


@dataclass(frozen=True, slots=True)
class WeirReading:
    """A weir relation's discharge with what it was computed from and where it is outside its range."""

    relation: str
    discharge_m3_s: float
    drowned_factor: float
    outside: tuple[str, ...]
    source: str


def broad_crested(head_m: float, width_m: float, *, coefficient: float = 0.864) -> float:
    """Q = (2/3)^(3/2) sqrt(g) C b h^(3/2), m3/s [1]_.

    >>> round(broad_crested(0.60, 10.0, coefficient=1.0), 4)
    7.9236
    """
    return (2 / 3) ** 1.5 * math.sqrt(G) * coefficient * width_m * head_m**1.5


def rehbock(head_m: float, width_m: float, crest_height_m: float) -> float:
    """Full-width thin plate: Q = (2/3) C sqrt(2g) b (h + 0.0012)^(3/2), C = 0.602 + 0.083 h/p, m3/s [2]_.

    >>> round(rehbock(0.30, 2.0, 0.8), 6)
    0.618102
    """
    c = 0.602 + 0.083 * head_m / crest_height_m
    return 2 / 3 * c * math.sqrt(2 * G) * width_m * (head_m + 0.0012) ** 1.5


def kindsvater_carter(head_m: float, width_m: float, crest_height_m: float, *, width_ratio: float = 1.0) -> float:
    """Thin plate, width ratio b/B from 0.5 to 1, m3/s [2]_; coefficients between table rows are interpolated.

    >>> round(kindsvater_carter(0.30, 2.0, 0.8), 6)
    0.614284
    """
    if not 0.5 <= width_ratio <= 1.0:
        raise ValueError(f"width ratio b/B is {width_ratio:g}; the relation is given from 0.5 to 1.")
    ratios = sorted(_KC)
    alpha, slope, k_b = (float(np.interp(width_ratio, ratios, [_KC[r][i] for r in ratios])) for i in range(3))
    c = alpha + slope * head_m / crest_height_m
    return 2 / 3 * c * math.sqrt(2 * G) * (width_m + k_b) * (head_m + 0.001) ** 1.5


def villemonte(ratio: float, power: float = 1.5) -> float:
    """Share of the free discharge left when drowned: (1 - (h2/h1)^n)^0.385; 1 at 0 and below, 0 at 1 [3]_.

    >>> round(villemonte(0.5), 6)
    0.845386
    """
    if ratio <= 0:
        return 1.0
    return 0.0 if ratio >= 1 else float((1 - ratio**power) ** 0.385)


_RELATIONS: dict[str, tuple[Callable[..., float], str]] = {
    "broad-crested": (lambda h, b, p, length, ratio: broad_crested(h, b), "ISO 3846:2008, C = 0.864, from memory"),
    "rehbock": (lambda h, b, p, length, ratio: rehbock(h, b, p), "ISO 1438, Rehbock, from memory"),
    "kindsvater-carter": (
        lambda h, b, p, length, ratio: kindsvater_carter(h, b, p, width_ratio=ratio),
        "ISO 1438:2017, Kindsvater-Carter, from memory",
    ),
}


def weir_discharge(
    relation: str, *, upstream_head_m: float, downstream_head_m: float, width_m: float, crest_height_m: float,
    crest_length_m: float = 0.0, width_ratio: float = 1.0,
) -> WeirReading:
    """Discharge by a named relation, drowned by Villemonte, with its departures from the relation's range.

    Parameters
    ----------
    upstream_head_m, downstream_head_m : float
        Section heads above the crest, m.
    crest_height_m : float
        Crest above the bed upstream, p, m.
    crest_length_m : float
        Along the flow, m; for the broad-crested range only.

    Raises
    ------
    ValueError
        Unknown relation (the known ones are listed), or a head or height of nothing.
    """
    if relation not in _RELATIONS:
        raise ValueError(f"weir relation {relation!r} is not known; say one of {', '.join(_RELATIONS)}.")
    if not (upstream_head_m > 0 and width_m > 0 and crest_height_m > 0):
        raise ValueError(
            f"a weir needs a head, width and crest height above 0; they are {upstream_head_m:.3f}, {width_m:.2f} and "
            f"{crest_height_m:.3f} m: check the crest level and the section upstream."
        )
    rule, source = _RELATIONS[relation]
    drowned = villemonte(downstream_head_m / upstream_head_m)
    free = rule(upstream_head_m, width_m, crest_height_m, crest_length_m, width_ratio)
    outside = _outside(relation, upstream_head_m, downstream_head_m, width_m, crest_height_m, crest_length_m)
    return WeirReading(relation, float(free * drowned), drowned, tuple(outside), source)


def _outside(relation, h, h2, b, p, length) -> list[str]:
    """Sentences on limits that are not kept; limits are from memory of the standards named above."""
    limits = []
    if relation == "broad-crested":
        limits += [(h < 0.06, "head below 0.06 m"), (b < 0.3, "width below 0.3 m"), (p < 0.15, "crest height below 0.15 m")]
        limits += [(h / (h + p) > 0.35, "h/(h+p) above 0.35"), (h2 / h > 0.66, "drowned: H2/H1 above 0.66")]
        if length > 0:
            limits += [(not 0.1 <= h / length <= 0.33, "h/L outside 0.1 to 0.33")]
    elif relation == "rehbock":
        limits += [(not 0.03 <= h <= 0.75, "head outside 0.03 to 0.75 m"), (h / p > 1.0, "h/p above 1")]
    else:
        limits += [(h < 0.03, "head below 0.03 m"), (h / p > 2.5, "h/p above 2.5"), (p < 0.10, "crest height below 0.10 m")]
    return [text for broken, text in limits if broken]
