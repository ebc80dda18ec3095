"""The handbook: every one-dimensional and screening relation by name, with its arguments, unit, source and cautions.

Side calculations beside a model's figures. They are plausibility and screening, never truth for a 2D field.
"""

from __future__ import annotations

import inspect
import re
from collections.abc import Callable, Mapping
from dataclasses import asdict, dataclass, is_dataclass
from typing import Any

from . import screening
from .drift.wood import design_log_length
from .section import relations, weir

_PLAUSIBILITY, _SCREENING = ("uniform-flow",), ("screening",)


@dataclass(frozen=True, slots=True)
class Relation:
    """One relation: its function, the unit of its result, its source and the cautions that it owes."""

    name: str
    function: Callable[..., Any]
    unit: str
    source: str
    cautions: tuple[str, ...]

    @property
    def arguments(self) -> dict[str, Any]:
        """Argument and default; ``inspect.Parameter.empty`` where one must be given."""
        return {p.name: p.default for p in inspect.signature(self.function).parameters.values()}

    @property
    def says(self) -> str:
        """What it gives, in a line."""
        first = " ".join((inspect.getdoc(self.function) or "").split("\n\n")[0].split())
        return re.sub(r" \[\d\]_|``", "", first)


_CHOW, _HENDERSON = "Chow 1959", "Henderson 1966"
_ALL = (
    Relation("manning-velocity", relations.manning_velocity, "m/s", _CHOW, _PLAUSIBILITY),
    Relation("normal-depth", relations.normal_depth, "m", _CHOW, _PLAUSIBILITY),
    Relation("critical-depth", relations.critical_depth, "m", _CHOW, _PLAUSIBILITY),
    Relation("specific-energy", relations.specific_energy, "m", _HENDERSON, _PLAUSIBILITY),
    Relation("conjugate-depth", relations.conjugate_depth, "m", "Belanger, in Chow 1959", _PLAUSIBILITY),
    Relation("jump-loss", relations.jump_loss, "m", _CHOW, _PLAUSIBILITY),
    Relation("bend-rise", relations.bend_rise, "m", _CHOW, (*_PLAUSIBILITY, "no-secondary-currents")),
    Relation("free-vortex-rise", relations.free_vortex_rise, "m", _HENDERSON, (*_PLAUSIBILITY, "no-secondary-currents")),
    Relation("bed-shear", relations.bed_shear, "Pa", _CHOW, _PLAUSIBILITY),
    Relation("submergence", relations.submergence, "", _HENDERSON, (*_PLAUSIBILITY, "no-roller")),
    Relation("drop-toe-depth", relations.drop_toe_depth, "m", _HENDERSON, (*_PLAUSIBILITY, "no-roller")),
    Relation("weir", weir.weir_discharge, "m3/s", "ISO 3846, ISO 1438, Villemonte 1947; from memory", ("weir-formula", "no-roller")),
    Relation("pier-scour", screening.pier_scour, "m", "HEC-18, 5th ed. 2012; from memory", ("scour", "screening")),
    Relation("projected-width", screening.projected_width, "m", "geometry", _SCREENING),
    Relation("hazard-rating", screening.hazard_rating, "", "FD2320, FD2321 and note of 2008; from memory", ("hazard-class", "no-roller")),
    Relation("people-class", screening.people_class, "", "AIDR Guideline 7-3, 2017; from memory", ("hazard-class", "no-roller")),
    Relation("bed-mobility", screening.critical_shields_speed, "m/s", "Shields with Strickler; from memory", ("screening", "near-bed")),
    Relation("design-log-length", design_log_length, "m", "Diehl 1997; from memory", ("drift",)),
)
RELATIONS: dict[str, Relation] = {r.name: r for r in _ALL}


def relation(name: str) -> Relation:
    """A relation by name; an unknown one lists the known ones."""
    if name not in RELATIONS:
        raise ValueError(f"there is no relation {name!r}; known are {', '.join(RELATIONS)}.")
    return RELATIONS[name]


def reckon(found: Relation, given: Mapping[str, str]) -> dict[str, Any]:
    """The result of a relation as plain values, by name; arguments are text as typed, SI units.

    Raises
    ------
    ValueError
        An argument that is unknown, missing or no number, naming the known ones.
    """
    wanted = found.arguments
    if unknown := set(given) - set(wanted):
        raise ValueError(f"{found.name} has no argument {sorted(unknown)[0]!r}; it takes {', '.join(wanted)}.")
    missing = [n for n, default in wanted.items() if default is inspect.Parameter.empty and n not in given]
    if missing:
        raise ValueError(f"{found.name} needs {', '.join(missing)}; give each as NAME=VALUE, such as {missing[0]}=1.5.")
    values = {n: _typed(found.name, n, text, wanted[n]) for n, text in given.items()}
    try:
        result = found.function(**values)
    except (ZeroDivisionError, OverflowError, TypeError) as error:
        raise ValueError(f"{found.name} has no answer for these values; check for zeros and signs.") from error
    if is_dataclass(result):
        return asdict(result)  # type: ignore[arg-type]
    if isinstance(result, tuple):
        return {f"value {i + 1}": v for i, v in enumerate(result)}
    return {f"{found.name} {found.unit}".strip(): result}


def _typed(relation_name: str, name: str, text: str, default: Any) -> Any:
    if isinstance(default, str) or name == "relation":
        return text
    try:
        return float(text)
    except ValueError as error:
        raise ValueError(f"{relation_name}: {name} is {text!r}, which is no number.") from error
