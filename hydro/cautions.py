"""Every caution's text, once: screens, tables and exports print from here."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Caution:
    """A caution with a lasting id, its full text and the short text for the projector."""

    id: str
    text: str
    short: str


_ALL = (
    Caution(
        "no-roller",
        "The model is depth-averaged: it has no vertical roller. That no recirculation shows below a weir, drop or "
        "sill is no evidence that the water there is without danger; the drowning hazard needs its own assessment by "
        "a qualified specialist under local guidance.",
        "Depth-averaged: cannot show the drowning hazard below a weir.",
    ),
    Caution(
        "no-secondary-currents",
        "Depth-averaged results hold no secondary currents: the cross-flow in bends and behind bluff bodies is missing.",
        "No secondary currents.",
    ),
    Caution(
        "near-bed",
        "The speed near the bed or a bank differs from the depth-averaged speed shown.",
        "Near-bed speed differs from the mean.",
    ),
    Caution(
        "wake-detail",
        "Length and strength of an eddy depend on the model's mesh, eddy viscosity and bed friction. A steady result "
        "can hide shedding; an eddy of the mean flow is not one of an instant.",
        "Wake detail depends on mesh and eddy viscosity.",
    ),
    Caution(
        "screening",
        "Screening figure from published general relations. It does not establish compliance. Local standards, the "
        "consenting authority and the judgement of licensed practitioners govern.",
        "Screening only; licensed judgement and local codes decide.",
    ),
    Caution(
        "sensitivity",
        "The range under a figure is a reading of this file only; the model's own error is not included.",
        "Ranges: this file only; the model's own error is not included.",
    ),
    Caution(
        "weir-formula",
        "Weir formulas apply to gauging-grade geometry. A row of model cells is not a rated structure; differences "
        "of 10 to 30 % are normal. Check which equation, if any, the model used at this line.",
        "A model's weir is not a rated structure.",
    ),
    Caution(
        "section-discharge",
        "Discharge found by integrating model output; compare it with the model's own flux output. At the waterline "
        "interpolation error is largest.",
        "Integrated from model output; compare with the model's own flux.",
    ),
    Caution(
        "rotation-time",
        "Rotation time is volume over recirculating discharge. It is not a residence or flushing time.",
        "Rotation time is no residence time.",
    ),
    Caution(
        "tracing",
        "Traces follow the saved output. Output spacing, interpolation and depth-averaging limit them; travel times "
        "are nominal, not forecasts.",
        "Traces follow the saved output; nominal times, not forecasts.",
    ),
    Caution(
        "drift",
        "Log paths show where the modelled flow would carry a floating object. They do not predict jams, breakage, "
        "loads, backwater or scour. Debris risk and freeboard follow local bridge and flood standards.",
        "Log paths are no forecast of jams or loads.",
    ),
    Caution(
        "passage",
        "Depth-averaged speed overstates what a fish near the bed or edge meets and understates jets, plunging flow "
        "and turbulence. A route found here is not excluded by depth and mean speed; species, size, temperature, "
        "season, behaviour and the regulator's criteria decide.",
        "Not excluded by depth and mean speed is all that a route here says.",
    ),
    Caution(
        "endurance",
        "Full recovery at rest is an assumption. The fish data shown are the user's; replace examples with local ones.",
        "Full recovery at rest is assumed; fish data are the user's.",
    ),
    Caution(
        "scour",
        "Screening figure only, not a scour assessment. Sediment, armouring, foundations, debris, degradation and "
        "pressure flow are not included. Scour design belongs to the owner's standard and a licensed engineer.",
        "Not a scour assessment.",
    ),
    Caution(
        "hazard-class",
        "Indicative class from depth and velocity alone, with the class edges shown. It leaves out warning time, "
        "debris, cold, rollers at weirs and rate of rise. Emergency and land-use decisions follow the competent "
        "authority's method.",
        "Indicative class from depth and speed alone.",
    ),
    Caution(
        "pressure-flow",
        "The water level is above the soffit: figures that assume a free surface are not assessed here.",
        "Level above soffit: free-surface figures not assessed.",
    ),
    Caution(
        "change",
        "A difference between two model runs holds both runs' errors. Below the noise of comparison it cannot be told "
        "from none.",
        "Differences hold both runs' errors.",
    ),
    Caution(
        "uniform-flow",
        "Uniform-flow and bend formulas are one-dimensional checks. Agreement is plausibility, not verification.",
        "One-dimensional check: plausibility only.",
    ),
    Caution(
        "public-water",
        "Shows this model's water only; not for judging swimming, boating or rescue.",
        "Not for judging swimming, boating or rescue.",
    ),
)

CAUTIONS: dict[str, Caution] = {c.id: c for c in _ALL}


# What each subject's figures owe, on screens, in tables and in every export. A figure may owe more of its own.
OWED: dict[str, tuple[str, ...]] = {
    "arrival": ("screening", "sensitivity", "section-discharge", "wake-detail", "no-roller"),
    "eddies": ("sensitivity", "wake-detail", "rotation-time", "no-secondary-currents", "no-roller"),
    "sections": ("section-discharge", "sensitivity", "uniform-flow", "no-secondary-currents", "no-roller"),
    "profiles": ("uniform-flow", "no-secondary-currents", "no-roller"),
    "weirs": ("weir-formula", "section-discharge", "no-roller"),
    "openings": ("section-discharge", "no-secondary-currents", "screening"),
    "places": ("screening", "hazard-class", "near-bed"),
    "envelope": ("screening", "hazard-class", "near-bed"),
    "observed": ("tracing", "screening"),
    "tracks": ("tracing", "no-secondary-currents"),
    "drift": ("drift", "tracing", "no-roller"),
    "passage": ("passage", "endurance", "near-bed", "screening"),
    "change": ("change", "sensitivity", "section-discharge", "wake-detail", "no-roller"),
}


def told(ids: Iterable[str]) -> list[dict[str, str]]:
    """Cautions with their texts, each once, as JSON exports carry them."""
    return [{"id": id_, "text": caution(id_).text} for id_ in dict.fromkeys(ids)]


def caution(id_: str) -> Caution:
    """The caution with this id; an unknown id lists the known ones."""
    if id_ not in CAUTIONS:
        raise KeyError(f"unknown caution {id_!r}; the known ones are {', '.join(CAUTIONS)}")
    return CAUTIONS[id_]
