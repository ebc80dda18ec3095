"""Connectivity tables of UGRID as files really hold them: any start, padding, number type and order of dimensions."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..run import Note
from .store import Stored, as_stored

MOST_CORNERS = 8
# Values that netCDF libraries and common practice leave in unused places when no _FillValue is declared.
_USUAL_PADS = (
    -1, -999, -9999, -999999, 999999, 2147483647, -2147483648, -2147483647, 4294967295, 9969209968386869046,
    -9223372036854775808, -9223372036854775806, 9223372036854775807,
)


@dataclass(frozen=True, eq=False)
class Table:
    """A connectivity table counted from 0, (rows, k) int32, padded with -1 at the end of rows."""

    rows: np.ndarray
    notes: tuple[Note, ...]


def read_table(variable: Stored, row_dimension: str, n_targets: int, *, what: str, width: int | None = None) -> Table:
    """A table of node numbers.

    Parameters
    ----------
    variable : Stored
        Two-dimensional.
    row_dimension : str
        The dimension that counts faces or edges.
    n_targets : int
        Number of nodes.
    what : "face" or "edge"
        For messages.
    width : int, optional
        Exact number of nodes in a row, without padding.

    Raises
    ------
    ValueError
        Numbers out of range, gaps, too few or too many nodes, or a start_index other than 0 or 1.
    """
    raw = variable.raw()
    if variable.dimensions.index(row_dimension) == 1:
        raw = raw.T
    if not raw.size:
        raise ValueError(f"{variable} lists no {what}s; export the complete mesh.")
    if raw.dtype.kind not in "iuf":
        raise ValueError(f"{variable} holds no numbers; export the connectivity as integers.")
    notes: list[Note] = []
    pads = _pads(variable, raw, notes)
    if width is not None and pads.any():
        row = int(np.flatnonzero(pads.any(axis=1))[0])
        raise ValueError(f"{variable}: {what} {row} lacks a node; every {what} needs {width}.")
    numbers = np.where(pads, 0, raw).astype(np.int64)
    start = _start(variable, numbers, pads, n_targets, notes)
    numbers -= start
    pads |= _zero_pads(variable, numbers, pads, start, n_targets, notes)
    _check_range(variable, numbers, pads, n_targets, start, what)
    numbers[pads] = -1
    numbers = _closed_up(variable, numbers, what, notes) if width is None else numbers
    return Table(np.ascontiguousarray(numbers, dtype=np.int32), tuple(notes))


def _pads(variable: Stored, raw: np.ndarray, notes: list[Note]) -> np.ndarray:
    """Unused places: declared fill values, NaN, and undeclared ones that cannot be numbers of nodes."""
    pads = np.zeros(raw.shape, bool)
    for attribute in ("_FillValue", "missing_value"):
        for value in variable.numbers(attribute):
            if np.isfinite(value):
                pads |= raw == as_stored(value, raw.dtype)
    if raw.dtype.kind == "f":
        pads |= ~np.isfinite(raw)
    undeclared = np.zeros(raw.shape, bool)
    for value in _USUAL_PADS:
        if raw.dtype.kind == "f" or np.iinfo(raw.dtype).min <= value <= np.iinfo(raw.dtype).max:
            undeclared |= raw == value
    undeclared &= ~pads & (np.arange(raw.shape[1]) >= 3)
    if undeclared.any():
        count = int(np.count_nonzero(undeclared.any(axis=1)))
        value = raw[undeclared][0]
        text = f"{variable.name} is padded with {value:g} without declaring it as _FillValue; taken as padding"
        notes.append(Note(text, variable.name, count))
    return pads | undeclared


def _start(variable: Stored, numbers: np.ndarray, pads: np.ndarray, n: int, notes: list[Note]) -> int:
    """The number of the first node: as declared, unless the numbers show that the declaration is wrong."""
    start = stated_start(variable)
    used = numbers[~pads]
    if not used.size:
        return start
    first_columns = numbers[:, :3][~pads[:, :3]]
    if start == 1 and first_columns.min() == 0 and used.max() < n:
        text = f"{variable.name} declares start_index 1 but counts from 0 (it names node 0); read as counted from 0"
        notes.append(Note(text, variable.name))
        return 0
    if start == 0 and used.min() >= 1 and used.max() == n:
        said = "declares start_index 0" if "start_index" in variable.attributes else "declares no start_index"
        text = f"{variable.name} {said} but counts from 1 (it names node {n} of {n}); read as counted from 1"
        notes.append(Note(text, variable.name))
        return 1
    return start


def stated_start(variable: Stored) -> int:
    """The number of the first place as a table declares it, 0 where it does not; ``ValueError`` when it is neither 0 nor 1."""
    stated = variable.attributes.get("start_index", 0)
    try:
        start = int(float(stated))
    except (TypeError, ValueError, OverflowError):
        start = -1
    if start not in (0, 1):
        raise ValueError(f"{variable}: start_index is {stated}; it must be 0 or 1: correct it and export again.")
    return start


def _zero_pads(variable, numbers, pads, start, n, notes) -> np.ndarray:
    """Zeros at the ends of rows of a table that counts from 1: undeclared padding."""
    zeros = (numbers == -1) & ~pads & (np.arange(numbers.shape[1]) >= 3)
    if start == 1 and zeros.any():
        text = f"{variable.name} is padded with 0 without declaring it as _FillValue; taken as padding"
        notes.append(Note(text, variable.name, int(np.count_nonzero(zeros.any(axis=1)))))
        return zeros
    return np.zeros(numbers.shape, bool)


def _check_range(variable, numbers, pads, n, start, what) -> None:
    wrong = ~pads & ((numbers < 0) | (numbers >= n))
    if wrong.any():
        row, column = (int(a[0]) for a in np.nonzero(wrong))
        more = int(np.count_nonzero(wrong.any(axis=1))) - 1
        raise ValueError(
            f"{variable}: {what} {row} names node {numbers[row, column] + start}, but nodes are numbered {start} to "
            f"{n - 1 + start} (and {more} more {what}s do so); correct the table or its start_index."
        )


def _closed_up(variable: Stored, numbers: np.ndarray, what: str, notes: list[Note]) -> np.ndarray:
    """Rows with repeated corners closed up; gaps, short and long rows are refused."""
    used = numbers >= 0
    gap = np.flatnonzero((used[:, 1:] & ~used[:, :-1]).any(axis=1))
    if gap.size:
        raise ValueError(
            f"{variable}: {what} {gap[0]} has an unused place before its last node (and {gap.size - 1} more); padding "
            "belongs at the end."
        )
    count = used.sum(axis=1)
    last = numbers[np.arange(len(numbers)), np.maximum(count - 1, 0)]
    previous = np.column_stack([last, numbers[:, :-1]])
    repeated = used & (numbers == previous)
    if repeated.any():
        rows = np.flatnonzero(repeated.any(axis=1))
        for row in rows:
            kept = numbers[row][used[row] & ~repeated[row]]
            numbers[row] = -1
            numbers[row, : len(kept)] = kept
        notes.append(Note(f"{what}s that name a node twice running were closed up", variable.name, len(rows)))
        count = (numbers >= 0).sum(axis=1)
    few = np.flatnonzero(count < 3)
    if few.size:
        raise ValueError(
            f"{variable}: {what} {few[0]} has {count[few[0]]} different nodes (and {few.size - 1} more); a {what} "
            "needs at "
            "least 3: remove it or mend it."
        )
    many = np.flatnonzero(count > MOST_CORNERS)
    if many.size:
        raise ValueError(
            f"{variable}: {what} {many[0]} has {count[many[0]]} nodes; faces of 3 to {MOST_CORNERS} are read: split it."
        )
    return numbers[:, : int(count.max())]
