"""Display units: SI or US customary, at the edge only. The two feet are kept apart by name."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from hydro.figure import printed

_FOOT = {"US survey feet": 1200 / 3937, "international feet": 0.3048}  # m
_SHORT = {"US survey feet": "US ft", "international feet": "ft"}
_POWERS = {"m": 1, "m2": 2, "m3": 3, "m/s": 1, "m2/s": 2, "m3/s": 3}
_SUPER = str.maketrans({"2": "\u00b2", "3": "\u00b3"})
NBSP = "\u00a0"
# Numbers and units as hydro prints them in sentences: "+0.30 m", "1,240 m2", "0.61 to 6.28 m".
_NUMBER = r"[+-]?\d[\d,]*(?:\.\d+)?"
_QUANTITY = re.compile(
    rf"(?<![\w.,-])(?:(?P<low>{_NUMBER}) to )?(?P<high>{_NUMBER}) (?P<unit>m3/s|m2/s|m/s|m2|m3|m)(?![\w/\u00b2\u00b3])"
)


@dataclass(frozen=True, slots=True)
class Units:
    """One system of display units, by its name in the choices."""

    name: str = "SI"

    def factor(self, unit: str) -> float:
        """What an SI value in ``unit`` is multiplied by to be shown; 1 for units both systems share."""
        if self.name == "SI" or unit not in _POWERS:
            return 1.0
        return _FOOT[self.name] ** -_POWERS[unit]

    def label(self, unit: str) -> str:
        """The unit as printed, such as m\u00b2 or US ft\u00b3/s."""
        if self.name != "SI" and unit in _POWERS:
            foot = _SHORT[self.name]
            return foot + unit[1:].translate(_SUPER)
        return unit.translate(_SUPER)

    def number(
        self, value: float | None, unit: str, low: float | None = None, high: float | None = None, digits: int = 3
    ) -> str:
        """An SI value as text in display units, rounded to its sensitivity, thousands set apart."""
        if value is None or not math.isfinite(value):
            return "n/a"
        f = self.factor(unit)
        text = printed(value * f, None if low is None else low * f, None if high is None else high * f, digits)
        return _set(text)

    def quantity(
        self, value: float | None, unit: str, low: float | None = None, high: float | None = None, digits: int = 3
    ) -> str:
        """Number and unit that never break apart."""
        text = self.number(value, unit, low, high, digits)
        return text if text == "n/a" else f"{text}{NBSP}{self.label(unit)}"

    def sentence(self, text: str) -> str:
        """Plain text with each quantity in it, such as "0.87 m3/s" or "0.6 to 6.3 m", in display units.

        A number keeps its own resolution: what was printed to the centimetre is printed to a hundredth of a foot.
        Numbers without one of the units of length, area, volume or flow stay as they are, and so do coordinates.
        """
        return _QUANTITY.sub(self._shown, text)

    def _shown(self, found: re.Match[str]) -> str:
        unit = found["unit"]
        ends = [self._same_resolution(found[name], unit) for name in ("low", "high") if found[name]]
        return f"{' to '.join(ends)}{NBSP}{self.label(unit)}"

    def _same_resolution(self, text: str, unit: str) -> str:
        factor, plain = self.factor(unit), text.replace(",", "")
        if factor != 1.0:
            keep = len(plain.partition(".")[2]) - math.floor(math.log10(factor))
            plus = "+" if plain[0] == "+" else ""
            plain = f"{round(float(plain) * factor, keep):{plus}.{max(keep, 0)}f}"
        return _set(plain)

    def span(self, low: float | None, high: float | None, unit: str) -> str:
        """A sensitivity as "440 to 474"; empty where there is none."""
        if low is None or high is None or not (math.isfinite(low) and math.isfinite(high)):
            return ""
        ends = [self.number(v, unit) for v in (low, high)]
        if ends[0] == ends[1]:
            ends = [self.number(v, unit, digits=4) for v in (low, high)]
        return " to ".join(ends)


def _set(text: str) -> str:
    """A plain number as it is set: a true minus, thousands of long ones apart."""
    whole, dot, rest = text.partition(".")
    sign, whole = ("", whole) if whole[0].isdigit() else (whole[0].replace("-", "\u2212"), whole[1:])
    if len(whole) > 4:
        whole = f"{int(whole):,}".replace(",", "\u202f")
    return sign + whole + dot + rest


def round_step(target: float) -> float:
    """The largest of 1, 2, 5 times a power of ten that is not above ``target``: for scales and ticks."""
    if not target > 0 or not math.isfinite(target):
        return 1.0
    power = 10.0 ** math.floor(math.log10(target) + 1e-12)
    return max(s for s in (1, 2, 5) if s * power <= target * (1 + 1e-9)) * power


def step_above(target: float) -> float:
    """The smallest of 1, 2.5, 5 times a power of ten that is not below ``target``: for few ticks on little room."""
    if not target > 0 or not math.isfinite(target):
        return 1.0
    power = 10.0 ** math.floor(math.log10(target) - 1e-12)
    return min(s for s in (1, 2.5, 5, 10) if s * power >= target * (1 - 1e-9)) * power
