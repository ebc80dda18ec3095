"""The mapping: what a person says about a file that its metadata does not.

A mapping is a table (in ``review.toml`` under ``[mapping]`` or ``[runs.mapping]``) with one entry a
quantity. What it names is taken before anything that the file's metadata suggests::

    [mapping]
    depth = {variable = "h", unit = "m", is = "mean"}   # is: point, mean or maximum
    level = {variable = "wl", unit = "m"}
    bed = {variable = "zb", unit = "m", positive = "up"}  # positive: up or down
    velocity_x = {variable = "u", unit = "m s-1"}        # and velocity_y
    unit_discharge_x = {variable = "p", unit = "m2 s-1"} # and unit_discharge_y
    edge_discharge = {variable = "flux", unit = "m3 s-1", positive = "left to right"}
    roughness = {variable = "n", unit = "s m-1/3"}
    time = {variable = "t", unit = "s"}
    datum = "Invented Datum 2031"                        # name of the vertical datum
    crs = "EPSG:CODE"                                    # or WKT, where the file names none

``unit`` is needed where the file gives none, and overrules the one it gives. ``positive`` of edge
discharge is "left to right" of the edge, walking from its first node to its second (the default), or
"right to left". A plain text ``depth = "h"`` is short for ``{variable = "h"}``.

Tables also take ``x``, ``y`` (columns of the coordinates), ``node`` (column with a node's number) and
``nodes`` (columns of a face's nodes). Raster sets take ``pattern``: the file names with ``{quantity}``
and ``{time}`` in place, as in ``"{quantity}_{time}.tif"``; there ``variable`` is the word in the name.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

FIELDS = (
    "depth", "level", "bed", "velocity_x", "velocity_y", "unit_discharge_x", "unit_discharge_y", "edge_discharge",
    "roughness",
)
COLUMNS = ("x", "y", "node", "nodes")
PLAIN = ("datum", "crs", "pattern")
DEPTH_IS = ("point", "mean", "maximum")
_KEYS = {
    "depth": ("variable", "unit", "is"),
    "bed": ("variable", "unit", "positive"),
    "edge_discharge": ("variable", "unit", "positive"),
    "nodes": ("variable",),
    "node": ("variable",),
}
_WORDS = {
    ("depth", "is"): DEPTH_IS,
    ("bed", "positive"): ("up", "down"),
    ("edge_discharge", "positive"): ("left to right", "right to left"),
}


@dataclass(frozen=True)
class Said:
    """A checked mapping: entries by quantity, and the plain words."""

    entries: dict[str, dict[str, Any]] = field(default_factory=dict)
    plain: dict[str, str] = field(default_factory=dict)

    def get(self, quantity: str, key: str, default: Any = None) -> Any:
        """One key of one quantity's entry."""
        return self.entries.get(quantity, {}).get(key, default)

    def variable(self, quantity: str) -> Any:
        """The variable that the mapping names for a quantity, or None."""
        return self.get(quantity, "variable")

    def unit(self, quantity: str) -> str | None:
        """The unit that the mapping states for a quantity, or None."""
        return self.get(quantity, "unit")


def check_mapping(mapping: Mapping[str, Any] | None) -> Said:
    """A mapping from ``review.toml``, checked.

    Raises ``ValueError`` for an unknown quantity or key (listing the known ones) or a wrong word.
    """
    entries: dict[str, dict[str, Any]] = {}
    plain: dict[str, str] = {}
    known = (*FIELDS, "time", *COLUMNS, *PLAIN)
    for name, given in (mapping or {}).items():
        if name not in known:
            raise ValueError(f"mapping: unknown entry {name!r}; the known ones are {', '.join(known)}.")
        if name in PLAIN:
            if not isinstance(given, str):
                raise ValueError(f"mapping: {name} is {given!r}; give it as text.")
            plain[name] = given
            continue
        entries[name] = _entry(name, given)
    return Said(entries, plain)


def _entry(name: str, given: Any) -> dict[str, Any]:
    entry = dict(given) if isinstance(given, Mapping) else {"variable": given}
    keys = _KEYS.get(name, ("variable", "unit"))
    for key, value in entry.items():
        if key not in keys:
            raise ValueError(f"mapping: {name} has an unknown key {key!r}; the known ones are {', '.join(keys)}.")
        words = _WORDS.get((name, key))
        if words and value not in words:
            raise ValueError(f"mapping: {name}.{key} is {value!r}; say one of {', '.join(map(repr, words))}.")
        listed = name == "nodes" and isinstance(value, list) and all(isinstance(v, str) for v in value)
        if not words and not isinstance(value, str) and not listed:
            raise ValueError(f"mapping: {name}.{key} is {value!r}; give it as text.")
    return entry
