"""The coordinate system of a file: projected metres, local metres, or refused."""

from __future__ import annotations

import copy
import re
from dataclasses import dataclass
from typing import Any

import numpy as np
import pyproj
from pyproj.exceptions import CRSError, ProjError

from ..run import Note
from .mapping import Said
from .store import Store, Stored
from .units import METRES_A_FOOT, METRES_A_US_SURVEY_FOOT, factor_to_si, is_degrees


@dataclass(frozen=True, slots=True)
class Ground:
    """Where a mesh lies: ``crs`` as WKT in metres (None: local metres), metres a stored unit, datum."""

    crs: str | None
    factor: float
    datum: str
    notes: tuple[Note, ...] = ()


def ground_of(store: Store, x: Stored, y: Stored, using: list[Stored], said: Said) -> Ground:
    """The ground that a file's mesh stands on.

    ``using`` are the variables whose ``grid_mapping`` counts, coordinates first.

    Raises ``ValueError`` for coordinates in degrees, a system that cannot be read, coordinates
    without unit, and units that contradict the system.
    """
    for c in (x, y):
        if is_degrees(c.text("units")) or c.text("standard_name") in ("longitude", "latitude"):
            raise ValueError(
                f"{c} is in degrees of longitude or latitude; lengths and areas need metres: project the mesh (to the "
                "national grid or a UTM zone) and export again."
            )
    variable = _grid_mapping(store, [x, y, *using])
    system = _system(store, variable, said)
    if system is not None:
        _refuse_degrees(system, store.path.name)
    units = [said.unit(axis) or c.text("units") for axis, c in (("x", x), ("y", y))]
    factor = _factor(units, x, system)
    return ground(system, factor, _datum(variable, using, said), x.name, store.path.name)


def ground(system: pyproj.CRS | None, factor: float, datum: str, variable: str, file: str) -> Ground:
    """A ground from a system and the metres in a stored unit of length.

    Raises ``ValueError`` for a system that is not projected.
    """
    if system is None:
        text = "the file names no coordinate system: its coordinates are taken as local metres, and exports carry none"
        return Ground(None, factor, datum, (Note(text, variable), *_converted(factor, variable)))
    _refuse_degrees(system, file)
    flat, vertical = _parts(system)
    notes = _converted(factor, variable)
    if factor != 1.0:
        flat = _in_metres(flat)
    return Ground(flat.to_wkt("WKT2_2019"), factor, datum or vertical, notes)


def _refuse_degrees(system: pyproj.CRS, file: str) -> None:
    flat, _ = _parts(system)
    if not flat.is_projected and not flat.is_engineering:
        raise ValueError(
            f"{file}: its coordinate system {flat.name!r} is in degrees, not metres; project the mesh (to the national "
            "grid or a UTM zone) and export again."
        )


def read_system(text: str, where: str) -> pyproj.CRS:
    """A coordinate system from WKT or an authority code; ``ValueError`` when it cannot be read."""
    try:
        return pyproj.CRS.from_user_input(text)
    except (CRSError, UnicodeError):
        raise ValueError(f"{where}: the coordinate system cannot be read ({text[:60]!r}); correct it.") from None


def system_factor(system: pyproj.CRS) -> float:
    """Metres in the unit of a system's axes."""
    flat, _ = _parts(system)
    return float(flat.axis_info[0].unit_conversion_factor) if flat.axis_info else 1.0


def convergence_deg(crs: str, x: float, y: float) -> float:
    """Angle from grid north to true north at a place, degrees, clockwise; 0 where it cannot be had."""
    system = pyproj.CRS.from_wkt(crs)
    try:
        to_degrees = pyproj.Transformer.from_crs(system, system.geodetic_crs, always_xy=True)
        return -float(pyproj.Proj(system).get_factors(*to_degrees.transform(x, y)).meridian_convergence)
    except (ProjError, AttributeError):
        return 0.0


def _grid_mapping(store: Store, variables: list[Stored]) -> Stored | None:
    names: dict[str, Stored] = {}
    for variable in variables:
        text = variable.text("grid_mapping")
        if text:
            # The extended form is "crs: x y other: ..."; the plain one is the name alone.
            first = re.match(r"(\w+)\s*:", text)
            names.setdefault(first[1] if first else text, variable)
    if not names:
        return None
    name, variable = next(iter(names.items()))
    if name not in store.variables:
        raise ValueError(
            f"{variable} names grid mapping {name!r}, which is not in the file; add it or say mapping.crs."
        )
    return store.variables[name]


def _system(store: Store, variable: Stored | None, said: Said) -> pyproj.CRS | None:
    if "crs" in said.plain:
        return read_system(said.plain["crs"], "mapping.crs")
    if variable is None:
        return None
    for attribute in ("crs_wkt", "spatial_ref", "epsg_code"):
        if variable.text(attribute):
            return read_system(variable.text(attribute), str(variable))
    if not variable.text("grid_mapping_name"):
        raise ValueError(f"{variable} has neither crs_wkt nor grid_mapping_name; add one or say mapping.crs.")
    try:
        return pyproj.CRS.from_cf(_plain(variable.attributes))
    except (CRSError, KeyError, TypeError, ValueError):
        raise ValueError(f"{variable}: its grid mapping cannot be read; add crs_wkt or say mapping.crs.") from None


def _plain(attributes: dict[str, Any]) -> dict[str, Any]:
    out = {}
    for name, value in attributes.items():
        out[name] = value.tolist() if isinstance(value, (np.ndarray, np.generic)) else value
    return out


def _factor(units: list[str], x: Stored, system: pyproj.CRS | None) -> float:
    try:
        stated = {factor_to_si(u, "x") for u in units if u}
    except ValueError as error:
        raise ValueError(f"{x} or y: {error}; correct the attribute or say mapping.x.unit and mapping.y.unit.") from None
    if len(stated) > 1:
        raise ValueError(f"{x} and y are in different units ({units[0]} and {units[1]}); export both in metres.")
    of_system = system_factor(system) if system is not None and system.is_projected else None
    if not stated:
        if of_system is None:
            raise ValueError(
                f'{x} has no units and the file no coordinate system; say mapping.x.unit = "m" if it is in metres.'
            )
        return of_system
    factor = stated.pop()
    if of_system is not None and abs(factor / of_system - 1) > 1e-9:
        raise ValueError(
            f"{x} is in {units[0]}, but its coordinate system counts {_named(of_system)}; correct the one that is "
            "wrong."
        )
    return factor


def _named(factor: float) -> str:
    return {1.0: "metres", METRES_A_FOOT: "international feet", METRES_A_US_SURVEY_FOOT: "US survey feet"}.get(
        factor, f"units of {factor:g} m"
    )


def _converted(factor: float, variable: str) -> tuple[Note, ...]:
    if factor == 1.0:
        return ()
    return (Note(f"coordinates converted from {_named(factor)} to metres; exports are in metres", variable),)


def _parts(system: pyproj.CRS) -> tuple[pyproj.CRS, str]:
    """The horizontal part of a system and the name of its vertical datum."""
    if system.is_bound and system.source_crs is not None:
        system = system.source_crs
    if not system.is_compound:
        return system, ""
    flat, vertical = system.sub_crs_list[:2]
    return flat, vertical.datum.name if vertical.datum is not None else vertical.name


def _in_metres(system: pyproj.CRS) -> pyproj.CRS:
    """The same projection with its axes in metres."""
    described = copy.deepcopy(system.to_json_dict())
    for axis in described["coordinate_system"]["axis"]:
        axis["unit"] = "metre"
    described["name"] += " (in metres)"
    described.pop("id", None)
    return pyproj.CRS.from_json_dict(described)


def _datum(variable: Stored | None, using: list[Stored], said: Said) -> str:
    if "datum" in said.plain:
        return said.plain["datum"]
    if variable is not None:
        for attribute in ("geopotential_datum_name", "geoid_name", "vertical_datum"):
            if variable.text(attribute):
                return variable.text(attribute)
    for one in using:
        if one.text("vertical_datum") or one.text("datum"):
            return one.text("vertical_datum") or one.text("datum")
    return ""
