"""Which variable of a file holds which quantity: by mapping, else by CF standard name, else by long name and units."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from ..run import Note
from .mapping import FIELDS, Said
from .store import Stored
from .units import DIMENSIONS, factor_to_si, fits

# CF standard name table, version 93. Names for the sea stand for inland water too, where no other exists.
STANDARD_NAMES: dict[str, tuple[str, ...]] = {
    "depth": ("flood_water_thickness", "sea_floor_depth_below_sea_surface"),
    "level": (
        "water_surface_height_above_reference_datum", "sea_surface_height_above_geopotential_datum",
        "sea_surface_height_above_geoid", "sea_surface_height_above_mean_sea_level", "sea_surface_height",
        "sea_surface_elevation",
    ),
    "bed": (
        "ground_level_altitude", "bedrock_altitude", "altitude", "sea_floor_depth_below_geopotential_datum",
        "sea_floor_depth_below_geoid", "sea_floor_depth_below_mean_sea_level", "sea_floor_depth",
    ),
    "velocity_x": (
        "barotropic_sea_water_x_velocity", "sea_water_x_velocity", "x_sea_water_velocity",
        "barotropic_eastward_sea_water_velocity", "eastward_sea_water_velocity", "eastward_flood_water_velocity",
    ),
    "velocity_y": (
        "barotropic_sea_water_y_velocity", "sea_water_y_velocity", "y_sea_water_velocity",
        "barotropic_northward_sea_water_velocity", "northward_sea_water_velocity", "northward_flood_water_velocity",
    ),
    "edge_discharge": ("water_volume_transport_in_river_channel",),
}
_EAST = re.compile(r"\b(x|east|eastward|easting)\b", re.IGNORECASE)
_NORTH = re.compile(r"\b(y|north|northward|northing)\b", re.IGNORECASE)
_LONG_NAMES: dict[str, tuple[re.Pattern[str], re.Pattern[str] | None]] = {
    "depth": (re.compile(r"\bdepth\b(?!.*\b(velocity|discharge|below|averaged)\b)|\bwater thickness\b", re.I), None),
    "level": (re.compile(r"\b(water|free|surface)[ -](surface[ -])?(level|elevation|surface)\b|\bstage\b", re.I), None),
    "bed": (re.compile(r"\b(bed|bottom|ground|terrain)\b(?!.*\b(shear|stress|slope|roughness)\b)", re.I), None),
    "velocity_x": (re.compile(r"\bvelocity\b", re.I), _EAST),
    "velocity_y": (re.compile(r"\bvelocity\b", re.I), _NORTH),
    "unit_discharge_x": (re.compile(r"\bdischarge\b|\bflux\b", re.I), _EAST),
    "unit_discharge_y": (re.compile(r"\bdischarge\b|\bflux\b", re.I), _NORTH),
    "edge_discharge": (re.compile(r"\bdischarge\b|\bflux\b|\bflow\b", re.I), None),
    "roughness": (re.compile(r"\bmanning|\broughness\b", re.I), None),
}
_ALLOWED = {"edge_discharge": ("edge",), "bed": ("face", "node"), "roughness": ("face", "node")}


@dataclass(frozen=True, eq=False)
class Placed:
    """A variable and the mesh location it stands on.

    ``dimensions`` are those of the mesh, in the order that numbers the places. ``subset`` lists the
    file's numbers of the places it covers, where it does not cover all ``size`` of them.
    """

    variable: Stored
    location: str
    dimensions: tuple[str, ...]
    size: int
    subset: np.ndarray | None = None


@dataclass(frozen=True, eq=False)
class Choice:
    """The variable that holds a quantity: ``factor`` turns its values into SI, positive up, left to right.

    ``per_length``: an edge discharge given per metre of edge.
    """

    quantity: str
    placed: Placed
    factor: float
    per_length: bool = False

    @property
    def variable(self) -> Stored:
        return self.placed.variable

    @property
    def location(self) -> str:
        return self.placed.location


def choose(placed: Iterable[Placed], said: Said, timed: Iterable[str] = ()) -> tuple[dict[str, Choice], list[Note]]:
    """The variable for each quantity, and what should be known about the choice.

    Keys are quantities; bed appears as ``node bed`` and ``face bed``. ``timed`` are the time
    dimensions.

    Raises ``ValueError`` for a variable without unit or with one that measures something else, for
    a mapped variable that is not there, and where two variables claim the same quantity.
    """
    everything, times = list(placed), set(timed)
    found: dict[str, Choice] = {}
    notes: list[Note] = []
    for quantity in FIELDS:
        candidates = _candidates(quantity, everything, said)
        if quantity == "bed" and said.variable("bed") is None:
            for location in ("node", "face"):
                here = [p for p in candidates if p.location == location]
                if here:
                    found[f"{location} bed"] = _choice(quantity, _one(quantity, here, times, notes), said, notes)
        elif candidates:
            one = _one(quantity, candidates, times, notes)
            found[f"{one.location} bed" if quantity == "bed" else quantity] = _choice(quantity, one, said, notes)
    return found, notes


def _candidates(quantity: str, placed: list[Placed], said: Said) -> list[Placed]:
    """Variables that may hold the quantity, by the first rule that finds any."""
    allowed = _ALLOWED.get(quantity, ("face", "node", "edge"))
    name = said.variable(quantity)
    if name is not None:
        mapped = [p for p in placed if p.variable.name == name]
        if not mapped:
            known = ", ".join(sorted(p.variable.name for p in placed)) or "none"
            raise ValueError(
                f"mapping: {quantity} names variable {name!r}, which does not stand on the mesh; those that do: "
                f"{known}."
            )
        if mapped[0].location not in allowed:
            raise ValueError(
                f"{mapped[0].variable} stands on {mapped[0].location}s; {quantity} is read on {allowed[0]}s."
            )
        return mapped
    here = [p for p in placed if p.location in allowed]
    for standard in STANDARD_NAMES.get(quantity, ()):
        named = [p for p in here if p.variable.text("standard_name") == standard]
        if named:
            return named
    return [p for p in here if _by_long_name(quantity, p.variable)]


def _by_long_name(quantity: str, variable: Stored) -> bool:
    subject, axis = _LONG_NAMES[quantity]
    words = variable.text("long_name").replace("_", " ")
    if variable.text("standard_name") or not subject.search(words) or (axis and not axis.search(words)):
        return False
    unit = variable.text("units")
    # Without a unit it may be the one meant: taken here, so that the missing unit is what gets reported.
    return not unit or fits(unit, quantity) or (quantity == "edge_discharge" and fits(unit, "edge_unit_discharge"))


def _one(quantity: str, candidates: list[Placed], times: set[str], notes: list[Note]) -> Placed:
    """The one to take: on faces before nodes, in time before constant, not a maximum."""

    def rank(p: Placed) -> tuple:
        return (
            ("face", "node", "edge").index(p.location) if quantity != "edge_discharge" else 0,
            "maximum" in p.variable.text("cell_methods"),
            not times & set(p.variable.dimensions),
        )

    ranked = sorted(candidates, key=rank)
    if len(ranked) > 1:
        if rank(ranked[0]) == rank(ranked[1]):
            names = " and ".join(p.variable.name for p in ranked if rank(p) == rank(ranked[0]))
            raise ValueError(
                f"{ranked[0].variable.file}: variables {names} both claim to be {quantity.replace('_', ' ')}; "
                f"say which with mapping.{quantity}.variable."
            )
        others = ", ".join(p.variable.name for p in ranked[1:])
        text = f"{_words(quantity)} is read from {ranked[0].variable.name}; not from {others}"
        notes.append(Note(text, ranked[0].variable.name))
    return ranked[0]


def _choice(quantity: str, placed: Placed, said: Said, notes: list[Note]) -> Choice:
    variable = placed.variable
    stated, own = said.unit(quantity), variable.text("units")
    unit = stated or own
    if not unit:
        raise ValueError(
            f"{variable} has no units; add the attribute, or say mapping.{quantity}.unit = "
            f'"{DIMENSIONS[quantity][2]}" if that is what it is in.'
        )
    if stated and own and stated != own:
        text = f"unit of {variable.name} taken as {stated} from the mapping, against {own} in the file"
        notes.append(Note(text, variable.name))
    measured = quantity
    if quantity == "edge_discharge" and fits(unit, "edge_unit_discharge"):
        measured = "edge_unit_discharge"
    try:
        factor = factor_to_si(unit, measured)
    except ValueError as error:
        raise ValueError(f"{variable}: {error}; correct the attribute or say mapping.{quantity}.unit.") from None
    if factor != 1.0:
        notes.append(Note(f"{_words(quantity)} converted from {unit} to SI", variable.name))
    if _turned(quantity, variable, said):
        factor = -factor
        notes.append(Note(f"{_words(quantity)} turned in sign: the file counts it the other way", variable.name))
    return Choice(quantity, placed, factor, measured == "edge_unit_discharge")


def _turned(quantity: str, variable: Stored, said: Said) -> bool:
    if quantity == "edge_discharge":
        return said.get(quantity, "positive") == "right to left"
    if quantity != "bed":
        return False
    stated = said.get("bed", "positive") or variable.text("positive")
    return stated == "down" or (not stated and variable.text("standard_name").startswith("sea_floor_depth"))


def _words(quantity: str) -> str:
    return quantity.replace("_", " ")
