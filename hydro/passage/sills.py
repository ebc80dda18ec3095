"""Declared sills that a fish meets as a drop, and the ramps and passes that lead over or round them."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import shapely

from ..reach import NamedLine, Reach, Structure
from .areas import LAYER

SILLS = ("weir", "sill", "drop")
WAYS = ("ramp", "pass")


def sills_of(reach: Reach | None, design: str | None = None) -> tuple[np.ndarray, ...]:
    """Lines (k, 2), local m, of the sills that stand in a design, less what lies in the outline of a ramp or pass.

    A ramp is the declared way up: there only the drop within three body lengths counts.
    """
    if reach is None:
        return ()
    ways = shapely.union_all([w.geometry for w in _ways(reach, design)])
    return tuple(np.asarray(part.coords)[:, :2] for s in _sills(reach, design) for part in _lines(shapely.difference(s.geometry, ways)))


def entrances_of(reach: Reach | None, design: str | None = None) -> tuple[NamedLine, ...]:
    """Lines across passes: those drawn with role "entrance", and the parts of sills within a ramp or pass."""
    if reach is None:
        return ()
    drawn = [item for item in reach.layer(LAYER) if item.attributes.get("role") == "entrance"]
    for way in _ways(reach, design):
        for sill in _sills(reach, design):
            drawn += [NamedLine(way.id, way.name, part) for part in _lines(shapely.intersection(sill.geometry, way.geometry))]
    return tuple(drawn)


def _sills(reach: Reach, design: str | None) -> Iterator[Structure]:
    return (s for s in reach.structures_of(design) if s.kind in SILLS and s.geometry.geom_type == "LineString")


def _ways(reach: Reach, design: str | None) -> Iterator[Structure]:
    return (s for s in reach.structures_of(design) if s.kind in WAYS and s.geometry.area > 0)


def _lines(geometry) -> list[shapely.LineString]:
    return [part for part in shapely.get_parts(geometry) if part.geom_type == "LineString" and part.length > 0]
