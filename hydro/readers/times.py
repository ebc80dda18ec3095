"""The time axis of a file: dated UTC instants or undated seconds, kinds of frames and their intervals."""

from __future__ import annotations

import re
from dataclasses import dataclass

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
_METHOD = re.compile(r"\b(\w+)(?:\s*:\s*\w+)*\s*:\s*(point|mean|maximum|max)\b", re.IGNORECASE)


@dataclass(frozen=True, eq=False)
class FileTimes:
    """Times of one file's frames.

    ``seconds`` count from the file's own zero; ``reference`` is the UTC instant of that zero (None:
    undated). ``intervals_s`` are NaN where the file has no bounds.
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
                    "depth-averaged results with one value a place and time."
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
                f"{store.path.name}: dimension {dimension!r} has {steps} steps but no time variable; export it, or name "
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
    instants, zero = None, ""
    if reference is not None:
        instants, zero, more = _instants(variable, values, unit, reference)
        notes += more
    return FileTimes(dimension, seconds, instants, intervals, zero, tuple(notes))


def kind_of(variable: Stored, dimension: str | None) -> str | None:
    """Kind of frame that a variable's cell_methods name for time: instant, mean, maximum; None if not said."""
    for method in re.finditer(r"((?:\w+\s*:\s*)+)(point|mean|maximum|max)\b", variable.text("cell_methods"), re.I):
        names = {n.strip() for n in method[1].split(":")}
        if names & {"time", dimension or "time"}:
            return {"point": "instant", "mean": "mean"}.get(method[2].lower(), "maximum")
    return None


def depth_is(variable: Stored) -> str | None:
    """What a depth is within a face by its cell_methods: point, mean, maximum; None if not said."""
    found = re.search(r"\barea\s*:\s*(point|mean|maximum|max)\b", variable.text("cell_methods"), re.I)
    return None if found is None else found[1].lower().replace("max", "maximum").replace("imumimum", "imum")


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
        raise ValueError(f"{variable} has no time for frame {missing[0]} (and {missing.size - 1} more); export it again.")
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


def _unit_and_reference(variable: Stored, unit: str) -> tuple[float, str | None, list[Note]]:
    since = _SINCE.match(unit)
    try:
        factor = factor_to_si(since["unit"] if since else unit, "time")
    except ValueError as error:
        raise ValueError(
            f"{variable}: {error}; give times in seconds, minutes, hours or days (months and years have no fixed length)."
        ) from None
    if since is None:
        return factor, None, [Note("times are undated: seconds from the start of the run", variable.name)]
    if variable.text("calendar").lower() in _UNDATED:
        calendar = variable.text("calendar")
        return factor, None, [Note(f"calendar {calendar!r} gives no UTC instants; times are undated", variable.name)]
    if not _REFERENCE.match(since["reference"]):
        return factor, None, [
            Note(f"{since['reference']!r} is no date that can be read; times are undated seconds", variable.name)
        ]
    return factor, since["reference"], []


def _instants(variable: Stored, values: np.ndarray, unit: str, reference: str):
    """Dated UTC instants (datetime64), the zero in words, and notes; undated where the calendar has other days."""
    part = _REFERENCE.match(reference)
    notes = []
    if part["zone"] and part["zone"].upper() != "Z":
        notes.append(
            Note(f"zone name {part['zone']!r} in the time's unit is not of the standard; it is read as UTC", variable.name)
        )
    shift = np.timedelta64(_offset_minutes(part["offset"]), "m")
    calendar = variable.text("calendar").lower() or "standard"
    calendar = "proleptic_gregorian" if calendar == "utc" else calendar
    clean = f"{_SINCE.match(unit)['unit']} since {part['date']} {part['clock'] or '00:00:00'}"
    try:
        dates = cftime.num2date(values, clean, calendar, only_use_cftime_datetimes=True)
    except (ValueError, OverflowError) as error:
        raise ValueError(f"{variable}: its times cannot be read ({error}); correct units or calendar.") from None
    try:
        instants = np.array([np.datetime64(_iso(d), "us") for d in np.atleast_1d(dates)]) - shift
    except ValueError:
        return None, "", [*notes, Note(f"calendar {calendar!r} has days that UTC lacks; times are undated", variable.name)]
    if calendar not in ("standard", "gregorian", "proleptic_gregorian"):
        notes.append(Note(f"dates are of the calendar {calendar!r}", variable.name))
    return instants.astype("datetime64[ns]"), f"{part['date']} {part['clock'] or ''} {part['offset'] or ''} {calendar}", notes


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
