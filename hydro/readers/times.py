"""The time axis of a file: dated UTC instants or undated seconds, kinds of frames and their intervals."""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import timedelta

import cftime
import numpy as np

from ..run import Note
from .mapping import Said
from .store import Store, Stored
from .units import factor_to_si

_SINCE = re.compile(r"^\s*(?P<unit>[A-Za-z_]+)\s+since\s+(?P<reference>.+?)\s*$", re.IGNORECASE)
_REFERENCE = re.compile(
    r"^(?P<date>[+-]?\d{1,6}-\d{1,2}-\d{1,2})(?:[T\s]+(?P<clock>\d{1,2}(?::\d{1,2}(?::\d{1,2}(?:\.\d*)?)?)?))?"
    r"\s*(?P<zone>[A-Za-z]+)?\s*(?P<offset>[+-]?\d{1,2}:\d{2}|[+-]\d{1,4}|\d{3,4})?$"
)
_UNDATED = ("none", "tai")
_COMMON = ("standard", "gregorian", "proleptic_gregorian")
_METHOD = re.compile(r"((?:\w+\s*:\s*)+)(point|mean|maximum|max)\b", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Reference:
    """What times are counted from: a CF unit without zone, minutes east of UTC, and the calendar."""

    unit: str
    offset_minutes: int
    calendar: str


@dataclass(frozen=True, eq=False)
class FileTimes:
    """Times of one file's frames.

    ``seconds`` count from the file's own zero, which ``zero`` names; ``instants`` are None where the file
    has no dates. ``intervals_s`` are NaN where the file has no bounds.
    """

    dimension: str | None
    seconds: np.ndarray
    instants: np.ndarray | None
    intervals_s: np.ndarray
    zero: str
    notes: tuple[Note, ...] = ()

    def __len__(self) -> int:
        return len(self.seconds)


def time_dimension(variables: list[Stored], store: Store, mesh_dimensions: set[str], said: Said) -> str | None:
    """The dimension along which the flow's variables change in time; None where they do not.

    Raises ``ValueError`` for a further dimension (layers, say) of more than one step.
    """
    found: str | None = None
    for variable in variables:
        for name, size in zip(variable.dimensions, variable.shape, strict=True):
            if name in mesh_dimensions or name == found:
                continue
            if found is None and _is_time(store, name, said):
                found = name
            elif size > 1:
                raise ValueError(
                    f"{variable} has a dimension {name!r} of {size} steps that is neither time nor mesh; export "
                    "depth-averaged results with one value a place and time, or name its times with "
                    "mapping.time.variable."
                )
    return found


def read_times(store: Store, dimension: str | None, said: Said) -> FileTimes:
    """Times along a dimension, or the one time of results that have none.

    Raises ``ValueError`` for a missing time variable, a missing or unknown unit, and times that are
    missing, repeated or run backwards.
    """
    variable = _time_variable(store, dimension, said)
    if variable is None:
        steps = _length(store, dimension)
        if steps > 1:
            raise ValueError(
                f"{store.path.name}: dimension {dimension!r} has {steps} steps but no time variable; export it, or "
                "name "
                "it with mapping.time.variable."
            )
        note = Note("the file gives its frame no time; it stands at 0 s", "")
        return FileTimes(dimension, np.zeros(1), None, np.full(1, np.nan), "", (note,))
    values = np.atleast_1d(variable.values()).astype(float)
    _check_order(variable, values)
    unit = said.unit("time") or variable.text("units")
    if not unit:
        raise ValueError(f'{variable} has no units; add the attribute, or say mapping.time.unit = "s" if that is so.')
    factor, reference, notes = _unit_and_reference(variable, unit)
    seconds = values * factor
    intervals = _intervals(store, variable, len(values), factor)
    instants = None
    if reference is not None:
        instants, more = _instants(variable, values, seconds, reference)
        notes += more
    return FileTimes(dimension, seconds, instants, intervals, "" if reference is None else str(reference), tuple(notes))


def kind_of(variable: Stored, dimension: str | None) -> str | None:
    """Kind of frame that a variable's cell_methods name for time: instant, mean, maximum; None if not said."""
    method = _method(variable, {"time", dimension or "time"})
    return "instant" if method == "point" else method


def depth_is(variable: Stored, dimensions: tuple[str, ...]) -> str | None:
    """What a depth is within a face by its cell_methods: point, mean, maximum; None if not said."""
    return _method(variable, {"area", *dimensions})


def _method(variable: Stored, over: set[str]) -> str | None:
    """The first of point, mean and maximum that cell_methods give for any of these names."""
    for method in _METHOD.finditer(variable.text("cell_methods")):
        if over & {name.strip() for name in method[1].split(":")}:
            return {"max": "maximum"}.get(method[2].lower(), method[2].lower())
    return None


def _is_time(store: Store, dimension: str, said: Said) -> bool:
    variable = store.variables.get(dimension)
    named = said.variable("time")
    if named is not None and named in store.variables:
        return dimension in store.variables[named].dimensions
    if variable is None:
        return dimension.lower() == "time" or _coordinate_on(store, dimension) is not None
    return _looks_like_time(variable) or dimension.lower() == "time"


def _looks_like_time(variable: Stored) -> bool:
    return (
        bool(_SINCE.match(variable.text("units")))
        or variable.text("standard_name") == "time"
        or variable.text("axis").upper() == "T"
    )


def _coordinate_on(store: Store, dimension: str) -> Stored | None:
    """A time variable along a dimension of another name."""
    for variable in store.variables.values():
        if variable.dimensions == (dimension,) and _looks_like_time(variable):
            return variable
    return None


def _time_variable(store: Store, dimension: str | None, said: Said) -> Stored | None:
    named = said.variable("time")
    if named is not None:
        if named not in store.variables:
            raise ValueError(f"{store.path.name}: mapping names time variable {named!r}, which is not in the file.")
        return store.variables[named]
    if dimension is not None:
        own = store.variables.get(dimension)
        if own is not None and own.dimensions == (dimension,):
            return own
        return _coordinate_on(store, dimension)
    scalars = [v for v in store.variables.values() if v.shape in ((), (1,)) and _looks_like_time(v)]
    return scalars[0] if len(scalars) == 1 else None


def _length(store: Store, dimension: str | None) -> int:
    for variable in store.variables.values():
        if dimension in variable.dimensions:
            return variable.shape[variable.dimensions.index(dimension)]
    return 1


def _check_order(variable: Stored, values: np.ndarray) -> None:
    missing = np.flatnonzero(~np.isfinite(values))
    if missing.size:
        raise ValueError(
            f"{variable} has no time for frame {missing[0]} (and {missing.size - 1} more); export it again."
        )
    if not values.size:
        raise ValueError(f"{variable} holds no times: the file has no frames; export at least one.")
    back = np.flatnonzero(np.diff(values) <= 0)
    if back.size:
        i = int(back[0])
        how = "stands still" if values[i + 1] == values[i] else "runs backwards"
        raise ValueError(
            f"{variable}: time {how} from frame {i} ({values[i]:g}) to frame {i + 1} ({values[i + 1]:g}); "
            "put the frames in order and export again."
        )


def _unit_and_reference(variable: Stored, unit: str) -> tuple[float, Reference | None, list[Note]]:
    since = _SINCE.match(unit)
    name = since["unit"] if since else unit
    try:
        factor = factor_to_si(name, "time")
    except ValueError as error:
        raise ValueError(
            f"{variable}: {error}; give times in seconds, minutes, hours or days (months and years have no fixed "
            "length)."
        ) from None
    if since is None:
        return factor, None, [Note("times are undated: seconds from the start of the run", variable.name)]
    calendar = variable.text("calendar").lower() or "standard"
    if calendar in _UNDATED:
        return factor, None, [Note(f"calendar {calendar!r} gives no UTC instants; times are undated", variable.name)]
    part = _REFERENCE.match(since["reference"])
    if part is None:
        text = f"{since['reference']!r} is no date that can be read; times are undated seconds"
        return factor, None, [Note(text, variable.name)]
    notes = []
    if part["zone"] and part["zone"].upper() != "Z":
        text = f"zone name {part['zone']!r} in the time's unit is not of the standard; it is read as UTC"
        notes.append(Note(text, variable.name))
    clean = f"{name} since {part['date']} {part['clock'] or '00:00:00'}"
    calendar = "proleptic_gregorian" if calendar == "utc" else calendar
    return factor, Reference(clean, _offset_minutes(part["offset"]), calendar), notes


def _instants(
    variable: Stored, values: np.ndarray, seconds: np.ndarray, reference: Reference
) -> tuple[np.ndarray | None, list[Note]]:
    """Dated UTC instants (datetime64), and notes; undated where the calendar has other days."""
    calendar = reference.calendar
    shift = np.timedelta64(60 * reference.offset_minutes, "s")
    try:
        zero = cftime.num2date(0, reference.unit, calendar, only_use_cftime_datetimes=True)
        earliest = min(zero, zero + timedelta(seconds=float(seconds[0])))
        if calendar in _COMMON and earliest.year > 1582:
            # Days are those of datetime64: one sum for all.
            steps = np.round(seconds * 1e6).astype("timedelta64[us]")
            return np.datetime64(_iso(zero), "us") + steps - shift, []
        dates = cftime.num2date(values, reference.unit, calendar, only_use_cftime_datetimes=True)
    except (ValueError, OverflowError) as error:
        raise ValueError(f"{variable}: its times cannot be read ({error}); correct units or calendar.") from None
    try:
        local = np.array([np.datetime64(_iso(d), "us") for d in np.atleast_1d(dates)])
    except ValueError:
        return None, [Note(f"calendar {calendar!r} has days that UTC lacks; times are undated", variable.name)]
    notes = [] if calendar in _COMMON else [Note(f"dates are of the calendar {calendar!r}", variable.name)]
    return local - shift, notes


def _iso(date) -> str:
    return (
        f"{date.year:04d}-{date.month:02d}-{date.day:02d}T"
        f"{date.hour:02d}:{date.minute:02d}:{date.second:02d}.{date.microsecond:06d}"
    )


def _offset_minutes(text: str | None) -> int:
    """Minutes east of UTC of a CF offset: H, H:M, HHMM or HMM, signed."""
    if not text:
        return 0
    sign = -1 if text.startswith("-") else 1
    digits = text.lstrip("+-")
    if ":" in digits:
        hours, minutes = digits.split(":")
    elif len(digits) > 2:
        hours, minutes = digits[:-2], digits[-2:]
    else:
        hours, minutes = digits, "0"
    return sign * (60 * int(hours) + int(minutes))


def _intervals(store: Store, variable: Stored, count: int, factor: float) -> np.ndarray:
    bounds = store.variables.get(variable.text("bounds") or variable.text("climatology"))
    if bounds is None or bounds.shape != (count, 2):
        return np.full(count, np.nan)
    pairs = bounds.values()
    return np.abs(pairs[:, 1] - pairs[:, 0]) * factor
