"""Units of files to SI, by their unit attribute; what an attribute does not say is never guessed."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction

METRES_A_FOOT = 0.3048
METRES_A_US_SURVEY_FOOT = 1200 / 3937

# Name: (factor to SI, power of metre, power of second). Sources: SI brochure, 9th edition; the two
# feet by NIST SP 811, appendix B.6 (both from memory).
_BASE: dict[str, tuple[float, int, int]] = {
    **dict.fromkeys(("m", "metre", "metres", "meter", "meters"), (1.0, 1, 0)),
    **dict.fromkeys(("km", "kilometre", "kilometres", "kilometer", "kilometers"), (1e3, 1, 0)),
    **dict.fromkeys(("dm", "decimetre", "decimeter"), (0.1, 1, 0)),
    **dict.fromkeys(("cm", "centimetre", "centimetres", "centimeter", "centimeters"), (1e-2, 1, 0)),
    **dict.fromkeys(("mm", "millimetre", "millimetres", "millimeter", "millimeters"), (1e-3, 1, 0)),
    **dict.fromkeys(("ft", "foot", "feet", "international_foot", "international_feet"), (METRES_A_FOOT, 1, 0)),
    **dict.fromkeys(
        ("us_survey_foot", "us_survey_feet", "us_ft", "us-ft", "ftus", "survey_foot", "survey_feet"),
        (METRES_A_US_SURVEY_FOOT, 1, 0),
    ),
    **dict.fromkeys(("s", "sec", "secs", "second", "seconds"), (1.0, 0, 1)),
    **dict.fromkeys(("ms", "msec", "millisecond", "milliseconds"), (1e-3, 0, 1)),
    **dict.fromkeys(("min", "minute", "minutes"), (60.0, 0, 1)),
    **dict.fromkeys(("h", "hr", "hrs", "hour", "hours"), (3600.0, 0, 1)),
    **dict.fromkeys(("d", "day", "days"), (86400.0, 0, 1)),
    **dict.fromkeys(("week", "weeks"), (604800.0, 0, 1)),
    **dict.fromkeys(("cfs", "cusec", "cusecs"), (METRES_A_FOOT**3, 3, -1)),
    **dict.fromkeys(("cumec", "cumecs"), (1.0, 3, -1)),
    **dict.fromkeys(("l", "litre", "litres", "liter", "liters"), (1e-3, 3, 0)),
    "mps": (1.0, 1, -1),
    "fps": (METRES_A_FOOT, 1, -1),
    "1": (1.0, 0, 0),
}
_DEGREES = re.compile(r"deg(ree)?s?[_ ]?(north|south|east|west|[nsew])?$", re.IGNORECASE)
_TOKEN = re.compile(
    r"\s*(?:(?P<operator>\*(?!\*)|·|\.(?!\d)|/|\bper\b)|(?P<open>\()|(?P<close>\))"
    r"|(?P<name>[A-Za-z_]+(?:-ft)?|1(?![\d.]))"
    r"(?:(?:\^|\*\*)?(?P<power>[+-]?\d+(?:/\d+)?)|(?:\^|\*\*)\(?(?P<broken>[+-]?\d+(?:/\d+)?)\)?)?)",
    re.IGNORECASE,
)

# What each quantity is measured in: (power of metre, power of second), and how to say it.
DIMENSIONS: dict[str, tuple[Fraction, Fraction, str]] = {
    name: (Fraction(length), Fraction(time), example)
    for names, length, time, example in (
        (("depth", "level", "bed", "x", "y"), 1, 0, "m"),
        (("velocity_x", "velocity_y"), 1, -1, "m s-1"),
        (("unit_discharge_x", "unit_discharge_y"), 2, -1, "m2 s-1"),
        (("edge_discharge",), 3, -1, "m3 s-1"),
        (("edge_unit_discharge",), 2, -1, "m2 s-1"),
        (("roughness",), Fraction(-1, 3), 1, "s m-1/3"),
        (("time",), 0, 1, "s"),
    )
    for name in names
}


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit of length and time: its factor to SI and its powers of metre and second."""

    factor: float
    length: Fraction
    time: Fraction

    def measures(self, quantity: str) -> bool:
        """Whether the quantity can be given in this unit."""
        length, time, _ = DIMENSIONS[quantity]
        return (self.length, self.time) == (length, time)


def is_degrees(text: str) -> bool:
    """Whether a unit attribute says degrees of longitude or latitude."""
    return bool(_DEGREES.match(text.strip()))


def parse_unit(text: str) -> Unit:
    """The unit that an attribute names.

    Understands powers (``m2 s-1``, ``m**2/s``, ``m^(1/3)``), products with space, dot or star, and
    everything after a slash, up to the next product in brackets, as divided by.

    Raises ``ValueError`` for what it does not know.

    Examples
    --------
    >>> parse_unit("m3 s-1") == parse_unit("m^3/s") == parse_unit("cumec")
    True
    >>> parse_unit("ft").factor
    0.3048
    """
    factor, length, time = 1.0, Fraction(0), Fraction(0)
    for name, power in _powers(text):
        base, of_length, of_time = _BASE[name]
        factor *= base ** float(power)
        length += of_length * power
        time += of_time * power
    return Unit(factor, length, time)


def _powers(text: str) -> list[tuple[str, Fraction]]:
    """The names in a unit with their powers; what stands after a slash has its power turned."""
    strange = ValueError(f"the unit {text!r} is not understood" if text.strip() else "the unit is empty")
    out: list[tuple[str, Fraction]] = []
    at, sign, signs, expecting = 0, 1, [1], True
    text = text.strip()
    while at < len(text):
        found = _TOKEN.match(text, at)
        if not found or found.end() == at or (found["operator"] and expecting):
            raise strange
        at, expecting = found.end(), bool(found["operator"] or found["open"])
        if found["operator"]:
            sign = -1 if found["operator"].lower() in ("/", "per") else 1
        elif found["open"]:
            signs.append(signs[-1] * sign)
            sign = 1
        elif found["close"]:
            signs.pop()
            sign = 1
        else:
            power = Fraction(found["power"] or found["broken"] or 1)
            out.append((found["name"].lower(), power * sign * signs[-1]))
            sign = 1
        if not signs or (found["name"] and found["name"].lower() not in _BASE):
            raise strange
    if expecting or len(signs) > 1:
        raise strange
    return out


def factor_to_si(text: str, quantity: str) -> float:
    """Factor that turns values in the unit ``text`` into SI values of ``quantity``.

    Raises ``ValueError`` when the unit is unknown or measures something else.
    """
    unit = parse_unit(text)
    if not unit.measures(quantity):
        example = DIMENSIONS[quantity][2]
        raise ValueError(f"the unit {text!r} does not measure {quantity.replace('_', ' ')} (as {example!r} does)")
    return unit.factor


def fits(text: str, quantity: str) -> bool:
    """Whether the unit text is understood and measures the quantity."""
    try:
        return parse_unit(text).measures(quantity)
    except ValueError:
        return False
