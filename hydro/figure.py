"""The figure record: everything printed anywhere is made of these."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field

from . import __version__


@dataclass(frozen=True, slots=True)
class Source:
    """Where a figure was read: the run, the frame, the field and the settings.

    ``seconds`` counts from the start of the run; ``time`` is an ISO 8601 UTC instant or None where
    the file has no dates. ``field`` names what was read, such as "faces' own unit discharge".
    """

    run: str
    run_hash: str
    frame_kind: str
    seconds: float | None
    time: str | None
    field: str
    settings_hash: str
    version: str = __version__


@dataclass(frozen=True, slots=True)
class Place:
    """World coordinates, m, with chainage (m, downstream) and offset (m, positive to the left)."""

    x: float
    y: float
    chainage_m: float | None = None
    offset_m: float | None = None


@dataclass(frozen=True, slots=True)
class Figure:
    """One number with what a reader needs to derive it again.

    ``value`` is SI (NaN or None: not available). ``low`` and ``high`` bound its sensitivity: a
    reading of this file only, not the model's error. ``flags`` are short words ("under-resolved");
    ``cautions`` are ids of :mod:`hydro.cautions`. ``decimals`` is for levels, chainages and counts, whose zero
    says nothing of their precision: they are printed to so many places, not to so many digits.
    """

    quantity: str
    value: float | None
    unit: str
    low: float | None = None
    high: float | None = None
    flags: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    place: Place | None = None
    source: Source | None = None
    note: str = ""
    extra: Mapping[str, object] = field(default_factory=dict)
    decimals: int | None = None

    def as_dict(self) -> dict[str, object]:
        """Plain values for JSON, full digits; what is not a number is None."""
        plain = asdict(self)
        for name in ("value", "low", "high"):
            number = plain[name]
            plain[name] = float(number) if number is not None and math.isfinite(number) else None
        return plain


def significant_step(value: float, low: float | None, high: float | None, digits: int = 3) -> float:
    """The power of ten that a printed value is rounded to.

    With a sensitivity, the half-range decides (rounded to one digit); without, ``digits``
    significant digits are kept.
    """
    if not math.isfinite(value) or value == 0:
        return 1.0
    keep = 10.0 ** (math.floor(math.log10(abs(value))) - digits + 1)
    if low is None or high is None or not high > low:
        return keep
    spread = 10.0 ** math.floor(math.log10((high - low) / 2))
    return min(max(keep, spread), 10.0 ** math.floor(math.log10(abs(value))))


def printed(value: float | None, low: float | None = None, high: float | None = None, digits: int = 3) -> str:
    """A value as text, rounded to its sensitivity; "n/a" where there is none.

    >>> printed(456.31, 440.2, 474.9)
    '460'
    >>> printed(0.0123456)
    '0.0123'
    """
    if value is None or not math.isfinite(value):
        return "n/a"
    step = significant_step(value, low, high, digits)
    decimals = max(0, -int(math.floor(math.log10(step) + 1e-9)))
    rounded = round(value / step) * step
    return f"{rounded:.{decimals}f}"


def shown(figure: Figure) -> str:
    """A figure's value as printed: to its decimals where it has them, else rounded to its sensitivity.

    >>> shown(Figure("level", 103.20449, "m", decimals=3)), shown(Figure("area", 456.31, "m2", 440.2, 474.9))
    ('103.204', '460')
    """
    if figure.value is None or not math.isfinite(figure.value) or figure.decimals is None:
        return printed(figure.value, figure.low, figure.high)
    return f"{figure.value:z.{figure.decimals}f}"


def signed(value: float, decimals: int) -> str:
    """A difference as text, its sign always shown, but none where it rounds to zero.

    >>> signed(0.304, 2), signed(-0.304, 2), signed(-0.001, 2)
    ('+0.30', '-0.30', '0.00')
    """
    text = f"{value:+.{decimals}f}"
    return text[1:] if not float(text) else text


def percent(share: float, decimals: int = 0) -> str:
    """A share as a percentage in a sentence.

    >>> percent(0.1234, 1), percent(-0.00001)
    ('12.3 %', '0 %')
    """
    return f"{100 * share:z.{decimals}f} %"
