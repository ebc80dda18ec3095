"""Words on the screen: safe HTML from plain text, times, counts and lists as an engineer writes them."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape as _escape

import numpy as np

from .units import NBSP

_COUNTS = ("No", "One", "Two", "Three", "Four", "Five", "Six", "Seven", "Eight", "Nine", "Ten", "Eleven", "Twelve")
_MONTHS = ("January", "February", "March", "April", "May", "June", "July", "August", "September", "October",
           "November", "December")


def safe(text: object) -> str:
    """Text that a user or a file wrote, made harmless in HTML; every such text passes through here."""
    return _escape(str(text), quote=True)


def count(n: int, noun: str, plural: str = "") -> str:
    """"Six eddies": words up to twelve, figures above."""
    word = _COUNTS[n] if 0 <= n < len(_COUNTS) else str(n)
    return f"{word} {noun if n == 1 else plural or noun + 's'}"


def clock(time: np.datetime64 | None, seconds: float) -> str:
    """A moment for a flag: "20:30" where dated, else the time from the start of the run."""
    if time is None:
        return elapsed(seconds)
    return _shown(time)[1]


def moment(time: np.datetime64 | None, seconds: float) -> str:
    """A moment in words: "20:30, 2 March", or "1 min 35 s from the start"."""
    if time is None:
        return f"{elapsed(seconds)} from the start"
    day, hour = _shown(time)
    return f"{hour}, {day}"


def day(time: np.datetime64) -> str:
    """"2 March"."""
    return _shown(time)[0]


def elapsed(seconds: float) -> str:
    """A length of time: "1 h 5 min", "1 min 35 s", "12.4 s"."""
    s = abs(float(seconds))
    sign = "\u2212" if seconds < 0 else ""
    if s >= 3600:
        hours, minutes = divmod(round(s / 60), 60)
        return f"{sign}{hours}{NBSP}h" + (f" {minutes}{NBSP}min" if minutes else "")
    if s >= 60:
        minutes, rest = divmod(round(s), 60)
        return f"{sign}{minutes}{NBSP}min" + (f" {rest}{NBSP}s" if rest else "")
    return f"{sign}{s:.3g}{NBSP}s"


def listed(items: Iterable[str]) -> str:
    """"a, b and c"."""
    items = list(items)
    return items[0] if len(items) == 1 else f"{', '.join(items[:-1])} and {items[-1]}" if items else ""


def percent(share: float | None) -> str:
    """A share as a percentage with two significant digits: "6.1 %"."""
    if share is None or not np.isfinite(share):
        return "n/a"
    value = share * 100
    if abs(value) < 0.0005:
        return f"0{NBSP}%"
    digits = 0 if abs(value) >= 10 else 1 if abs(value) >= 1 else 2 if abs(value) >= 0.1 else 3
    return f"{value:.{digits}f}{NBSP}%"


def _shown(time: np.datetime64) -> tuple[str, str]:
    stamp = str(time.astype("datetime64[s]"))
    date, hour = stamp.split("T")
    _, month, of_month = date.split("-")
    shown = hour if hour[6:] != "00" else hour[:5]
    return f"{int(of_month)} {_MONTHS[int(month) - 1]}", shown
