"""Where labels go: each as near to its place as it can be without covering what matters."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

_DIRECTIONS = np.radians(np.arange(0, 360, 30))
_DISTANCES = (1.0, 1.7, 2.6)


@dataclass(frozen=True, slots=True)
class Placed:
    """A label's middle, m; ``leader`` says whether a line ties it to its place. ``shown`` False: no room."""

    x: float
    y: float
    leader: bool
    shown: bool = True


def place(
    anchors: np.ndarray, sizes: np.ndarray, avoid: np.ndarray, extent: tuple[float, float, float, float], *,
    inside: Sequence[float] = (), leaders: Sequence[bool] = (), own: Sequence[int] = (),
    limit: float = 0.35,
) -> list[Placed]:
    """Places for labels, most important first.

    Parameters
    ----------
    anchors : (k, 2)
        What each label belongs to, m.
    sizes : (k, 2)
        Width and height of each label, m.
    avoid : (b, 4)
        Boxes (west, south, east, north) that should stay clear, m.
    extent : tuple
        The map; labels stay inside it.
    inside : sequence of float, optional
        Room round each anchor, m; where it is larger than the label, it stands there without a leader.
    leaders : sequence of bool, optional
        Whether a label may stand away from its anchor on a leader; others stay close.
    own : sequence of int, optional
        Which box of ``avoid`` is the label's own thing (-1: none); it may stand inside that one.
    limit : float
        Share of a label that may lie on something; above, it is not shown.
    """
    taken = [tuple(b) for b in np.asarray(avoid, float).reshape(-1, 4)]
    out = []
    for i, (anchor, size) in enumerate(zip(anchors, sizes)):
        room = inside[i] if len(inside) else 0.0
        distances = _DISTANCES if not len(leaders) or leaders[i] else _DISTANCES[:1]
        clear = np.array(taken).reshape(-1, 4)
        if len(own) and own[i] >= 0:
            clear[own[i]] = np.nan
        best = _best(anchor, size, clear, extent, room, distances)
        cost, x, y, leader = best
        shown = cost <= limit
        if shown:
            taken.append(_box(x, y, size))
        out.append(Placed(x, y, leader, shown))
    return out


def _best(anchor, size, taken, extent, room, distances) -> tuple[float, float, float, bool]:
    gap = 0.5 * np.hypot(*size) + 0.6 * size[1]
    aside, above = 0.5 * size[0] + 0.7 * size[1], 1.3 * size[1]
    near = [(anchor[0] + dx, anchor[1] + dy, False) for dx, dy in ((aside, 0), (-aside, 0), (0, above), (0, -above))]
    near = near if room > 0.8 * size[0] + size[1] else []
    far = [
        (anchor[0] + d * gap * np.cos(a), anchor[1] + d * gap * np.sin(a), True) for d in distances for a in _DIRECTIONS
    ]
    best = (np.inf, float(anchor[0]), float(anchor[1]), True)
    for rank, (x, y, leader) in enumerate([*near, *far]):
        cost = _overlap(_box(x, y, size), taken) / (size[0] * size[1]) + _outside(_box(x, y, size), extent)
        cost += 0.002 * rank
        if cost < best[0]:
            best = (cost, float(x), float(y), leader)
        if not leader and cost < 0.05:
            break
    return best


def _box(x: float, y: float, size: np.ndarray) -> tuple[float, float, float, float]:
    return x - size[0] / 2, y - size[1] / 2, x + size[0] / 2, y + size[1] / 2


def _overlap(box, taken: np.ndarray) -> float:
    if not len(taken):
        return 0.0
    wide = np.minimum(box[2], taken[:, 2]) - np.maximum(box[0], taken[:, 0])
    high = np.minimum(box[3], taken[:, 3]) - np.maximum(box[1], taken[:, 1])
    return float(np.nansum(np.maximum(wide, 0) * np.maximum(high, 0)))


def _outside(box, extent) -> float:
    out = box[0] < extent[0] or box[1] < extent[1] or box[2] > extent[2] or box[3] > extent[3]
    return 1.0 if out else 0.0
