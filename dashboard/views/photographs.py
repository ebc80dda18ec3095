"""Site photographs on the page: a mark at each place that looks along its bearing, and the one that is open."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from hydro.photographs import Photograph

from ..text import safe

_WINDS = ("north", "north-east", "east", "south-east", "south", "south-west", "west", "north-west")


def marks(found: Sequence[Photograph], local: Sequence[np.ndarray], open_: int | None) -> str:
    """A button for each photograph at its local place, numbered; its wedge looks where the camera looked."""
    return "".join(
        f'<button type="button" class="photo" data-do="photograph" data-value="{k}" data-key="photograph-{k}" '
        f'data-at="{at[0]:.2f},{at[1]:.2f}" aria-expanded="{"true" if k == open_ else "false"}" '
        f'aria-label="Photograph {k + 1}: {safe(p.caption)}{_looking(p)}">{_mark(p, k + 1)}</button>'
        for k, (p, at) in enumerate(zip(found, local, strict=True))
    )


def shown(photograph: Photograph, number: int) -> str:
    """The open photograph with its caption."""
    caption = safe(photograph.caption)
    return (
        f'<figure class="photograph"><img src="/photograph/{number}" alt="{caption}"><figcaption><span><b>{number + 1}</b> {caption}'
        f'{_looking(photograph)}.</span><button type="button" class="word" data-do="photograph" data-value="" '
        'data-key="photograph-close">close</button></figcaption></figure>'
    )


def _looking(photograph: Photograph) -> str:
    bearing = photograph.bearing_deg
    if bearing is None:
        return ""
    return f", looking {_WINDS[round(bearing / 45) % 8]} ({round(bearing) % 360:03d}\u00b0)"


def _mark(photograph: Photograph, number: int) -> str:
    wedge = "" if photograph.bearing_deg is None else (
        f'<path class="wedge" transform="rotate({photograph.bearing_deg:.0f} 22 22)" d="M22 22 L14 4 L30 4 Z"/>'
    )
    return (
        f'<svg viewBox="0 0 44 44" aria-hidden="true">{wedge}<circle cx="22" cy="22" r="8.5"/>'
        f'<text x="22" y="26.5" class="mid">{number}</text></svg>'
    )
