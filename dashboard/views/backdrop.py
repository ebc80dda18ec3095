"""A backdrop in the theme's own greys: what is dark on it takes the ink, what is light the paper, thinly."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..text import safe
from ..theme import Palette


def colours(layers: Sequence[tuple[np.ndarray, float]], palette: Palette) -> np.ndarray | None:
    """uint32 RGBA (rows, columns), rows from the south, of layers of (grey, opacity), the lowest first; None where there are none.

    Ink on paper also at night: the ground then stays dark, and a photograph shows as its negative.
    """
    if not layers:
        return None
    dark, light = _rgb(palette.ink), _rgb(palette.paper)
    colour = np.zeros((*layers[0][0].shape, 3), np.float32)
    cover = np.zeros(layers[0][0].shape, np.float32)
    for grey, opacity in layers:
        there = np.isfinite(grey)
        own = np.where(there, opacity, 0.0).astype(np.float32)
        shade = dark + np.where(there, grey, 0.0)[..., None] * (light - dark)
        whole = own + cover * (1 - own)
        weight = np.divide(own, whole, out=np.zeros_like(whole), where=whole > 0)[..., None]
        colour = weight * shade + (1 - weight) * colour
        cover = whole
    # One pixel is four bytes in the order red, green, blue, opacity.
    out = np.dstack([np.round(colour), np.round(255 * cover)]).astype(np.uint8)
    return np.ascontiguousarray(out[::-1]).view("<u4")[..., 0]


def words(names: Sequence[str]) -> str:
    """The caption's part."""
    return f" Backdrop: {safe(', '.join(names))}." if names else ""


def _rgb(colour: str) -> np.ndarray:
    return np.array([int(colour[i : i + 2], 16) for i in (1, 3, 5)], np.float32)
