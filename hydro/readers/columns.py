"""Tables of places with one column a quantity: which column is what, its unit, and the frames of its times."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd

from ..run import Note, TimeAxis
from .assemble import Field
from .mapping import FIELDS, Said
from .units import DIMENSIONS, factor_to_si, fits

_HEADING = re.compile(r"^\s*(?P<name>.*?)\s*[\[(](?P<unit>[^\[\]()]*(?:\([^()]*\))?[^\[\]()]*)[\])]\s*$")


@dataclass(frozen=True, slots=True)
class Column:
    """A column that holds a quantity: ``factor`` turns its values into SI, positive up."""

    heading: str
    factor: float


def split_heading(heading: str) -> tuple[str, str]:
    """Name and unit of a heading like ``depth [m]`` or ``velocity_x (m/s)``; the unit is empty where there is none."""
    found = _HEADING.match(heading)
    return (found["name"], found["unit"].strip()) if found else (heading.strip(), "")


def column_of(file: str, table: pd.DataFrame, quantity: str, said: Said) -> Column:
    """The column of a quantity that a table must have; ``ValueError`` where it lacks it."""
    found = find_column(file, table, quantity, said)
    if found is None:
        raise ValueError(
            f"{file} has no column {quantity!r}; head it '{quantity} [{DIMENSIONS[quantity][2]}]' or name it with "
            f"mapping.{quantity}.variable."
        )
    return found


def find_column(file: str, table: pd.DataFrame, quantity: str, said: Said) -> Column | None:
    """The column of a quantity: as mapped, else the one headed by the quantity's own name; None if there is none.

    Raises ``ValueError`` for a mapped column that is not there and a missing or wrong unit.
    """
    units = table.attrs.get("units", {})
    name = said.variable(quantity)
    named = [h for h in table.columns if name in (h, split_heading(h)[0])] if name is not None else []
    if name is not None and not named:
        raise ValueError(
            f"{file}: mapping names column {name!r} for {quantity}; the columns are {', '.join(table.columns)}."
        )
    if name is None:
        named = [h for h in table.columns if split_heading(h)[0].lower().replace(" ", "_") == quantity]
    if not named:
        return None
    if len(named) > 1:
        raise ValueError(f"{file}: columns {' and '.join(named)} are both {quantity}; keep one.")
    heading = named[0]
    unit = said.unit(quantity) or split_heading(heading)[1] or units.get(heading, "")
    if not unit:
        raise ValueError(
            f"{file}: column {heading!r} has no unit; head it '{heading} [{DIMENSIONS[quantity][2]}]' or say "
            f"mapping.{quantity}.unit."
        )
    try:
        factor = factor_to_si(unit, quantity)
    except ValueError as error:
        raise ValueError(f"{file}: column {heading!r}: {error}; correct it or say mapping.{quantity}.unit.") from None
    if quantity == "bed" and said.get("bed", "positive") == "down":
        factor = -factor
    return Column(heading, factor)


def values_of(file: str, table: pd.DataFrame, column: Column) -> np.ndarray:
    """A column's values in SI; ``ValueError`` names the first row that holds no number."""
    given = table[column.heading]
    values = pd.to_numeric(given, errors="coerce").to_numpy(float)
    filled = given.notna().to_numpy() & (given.astype(str).str.strip() != "").to_numpy()
    wrong = np.flatnonzero(np.isnan(values) & filled)
    if wrong.size:
        raise ValueError(
            f"{file}: column {column.heading!r} holds {given.iloc[wrong[0]]!r} in row {wrong[0] + 1}, which is no "
            "number; "
            "correct it."
        )
    return values * column.factor


def time_axis(file: str, table: pd.DataFrame, said: Said, kind: str | None) -> tuple[TimeAxis, np.ndarray, list[Note]]:
    """Times of a table and the frame of each row: from its time column, numbers with a unit or ISO 8601 dates.

    Without a time column all rows are one frame.
    """
    notes = [Note("a table does not say whether frames are instants, means or maxima; taken as instants: ask", "")]
    notes = [] if kind else notes
    headings = [h for h in table.columns if split_heading(h)[0].lower() == "time" or h == said.variable("time")]
    if not headings:
        axis = TimeAxis(np.zeros(1), None, (kind or "instant",), np.full(1, np.nan))
        return axis, np.zeros(len(table), int), notes
    heading = said.variable("time") or headings[0]
    unit = said.unit("time") or split_heading(heading)[1]
    dates = None
    if unit and fits(unit, "time"):
        times = values_of(file, table, Column(heading, factor_to_si(unit, "time")))
    elif unit or pd.api.types.is_numeric_dtype(table[heading]):
        raise ValueError(
            f"{file}: column {heading!r} needs a unit of time; head it 'time [s]', or give dates like "
            "2031-03-02T06:00:00Z."
        )
    else:
        dates = _dates(file, table[heading])
        times = dates.astype("int64") / 1e6
    if not np.isfinite(times).all():
        raise ValueError(
            f"{file}: column {heading!r} is empty in row {np.flatnonzero(~np.isfinite(times))[0] + 1}; fill it."
        )
    kept, first, frame = np.unique(times, return_index=True, return_inverse=True)
    instants = None if dates is None else dates[first]
    if instants is None:
        notes.append(Note("times are undated: seconds from the start of the run", heading))
    axis = TimeAxis(kept - kept[0], instants, (kind or "instant",) * len(kept), np.full(len(kept), np.nan))
    return axis, frame.ravel(), notes


def _dates(file: str, column: pd.Series) -> np.ndarray:
    try:
        dates = pd.to_datetime(column, utc=True, format="ISO8601")
        return dates.dt.tz_localize(None).to_numpy().astype("datetime64[us]")
    except (ValueError, TypeError) as error:
        raise ValueError(
            f"{file}: column {column.name!r} holds times that cannot be read ({str(error).splitlines()[0][:80]}); give "
            "dates "
            "like 2031-03-02T06:00:00Z or seconds headed 'time [s]'."
        ) from None


def fields_of(
    file: str, table: pd.DataFrame, said: Said, location: str, place: np.ndarray, frame: np.ndarray, n_places: int
) -> dict[str, Field]:
    """A field for each quantity that has a column; ``place`` (rows,) and ``frame`` (rows,) say where each row belongs.

    Raises ``ValueError`` when a place is missing from a frame or stands in it twice.
    """
    n_frames = int(frame.max()) + 1
    cell = frame * n_places + place
    count = np.bincount(cell, minlength=n_frames * n_places)
    if (count != 1).any():
        i = int(np.flatnonzero(count != 1)[0])
        row = int(np.flatnonzero(place == i % n_places)[0]) + 1
        how = "is missing from" if count[i] == 0 else "stands twice in"
        raise ValueError(
            f"{file}: the place of row {row} {how} frame {i // n_places}; give every place once at every time."
        )
    order = np.argsort(cell)
    out = {}
    for quantity in FIELDS:
        column = find_column(file, table, quantity, said) if quantity != "edge_discharge" else None
        if column is not None:
            values = values_of(file, table, column)[order].reshape(n_frames, n_places)
            key = f"{location} bed" if quantity == "bed" else quantity
            out[key] = Field(column.heading, location, _reading(values))
    return out


def _reading(values: np.ndarray) -> Callable[[int, np.ndarray], np.ndarray]:
    return lambda index, places: values[index][places]
