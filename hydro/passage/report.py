"""Passage as plain values: the JSON of schema leewater/passage/1, and the figures that screens and records print."""

from __future__ import annotations

import math
from typing import Any

from ..cautions import OWED, told
from ..figure import Figure, Source
from ..ledger.report import source_of, time_text
from ..reach import Reach
from .answer import Answer, place_of
from .fish import EnduranceLine, Fish
from .flows import Hydrograph
from .profile import Barrier, Profile
from .study import FlowAnswer, RunAnswer, Study

SCHEMA = "leewater/passage/1"


def passage_json(study: Study) -> dict[str, Any]:
    """A study as a dict of schema leewater/passage/1.

    Places are world coordinates, m; keys carry their unit; what is not available or infinite is None.
    """
    runs = {a.entry.id: a for a in study.answers}
    kinds = {a.answer.fish.name: a.answer.fish for a in study.answers}
    reach = study.review.reach
    return {
        "schema": SCHEMA,
        "review": study.review.title,
        "sources": {id_: source_of(a.run) for id_, a in runs.items()},
        "settings": dict(study.review.settings),
        "fish": [fish_json(f) for f in kinds.values()],
        "answers": [answer_json(a, reach) for a in study.answers],
        "flows": [flow_json(f) for f in study.flows],
        "cautions": told(OWED["passage"]),
    }


def fish_json(fish: Fish) -> dict[str, Any]:
    """A fish as it was used, in SI."""

    def line(own: EnduranceLine | None) -> dict[str, Any] | None:
        if own is None:
            return None
        return {
            "ln_seconds": own.a, "ln_seconds_per_m_s": own.b, "lowest_m_s": own.lowest, "highest_m_s": own.highest,
            "source": own.source,
        }

    return {
        "name": fish.name, "length_m": fish.length_m, "sustained_m_s": fish.sustained_m_s,
        "prolonged": line(fish.prolonged), "sprint": line(fish.sprint), "least_depth_m": fish.least_depth_m,
        "greatest_drop_m": fish.greatest_drop_m, "position_factor": fish.position_factor,
        "rest_speed_m_s": fish.rest_speed_m_s, "rest_depth_m": fish.rest_depth_m, "length_sd_m": fish.length_sd_m,
        "endurance_sd_ln": fish.endurance_sd, "migration_months": list(fish.migration), "source": fish.source,
    }


def answer_json(one: RunAnswer, reach: Reach | None) -> dict[str, Any]:
    """One entry of ``answers``."""
    answer, entry = one.answer, one.entry
    stamp = answer.stamp
    return {
        "run": entry.id, "design": entry.design, "event": entry.event, "variant": entry.variant, "fish": answer.fish.name,
        "frame": stamp.index, "time": time_text(stamp.time), "seconds": stamp.seconds, "frame_kind": stamp.kind,
        "field": stamp.field, "discharge_m3_s": answer.discharge_m3_s, "status": answer.status, "sentence": answer.sentence,
        "worst_leg": answer.worst_leg.number if answer.worst_leg else None, "legs": [_leg(leg) for leg in answer.legs],
        "barriers": [barrier_json(b, answer, reach) for b in answer.barriers],
        "swimming_time_s": _number(answer.transit_s),
        "without_recovery": {"status": answer.alone_status, "fatigue": _number(answer.alone_fatigue)},
        "corridor": _corridor(answer, reach),
        "direction_error": None if answer.chain is None else answer.chain.moved,
        "entrances": [
            {"name": e.name, "discharge_m3_s": e.discharge_m3_s, "competing_m3_s": e.competing_m3_s, "share": _number(e.share)}
            for e in one.entrances
        ],
        "sampled": None if one.sampled is None else {
            "swimmers": one.sampled.swimmers, "not_excluded": one.sampled.not_excluded, "share": one.sampled.share,
            "low": one.sampled.low, "high": one.sampled.high, "seed": one.sampled.seed,
        },
        "flags": list(answer.flags), "cautions": list(OWED["passage"]),
    }


def barrier_json(b: Barrier, answer: Answer, reach: Reach | None) -> dict[str, Any]:
    """One barrier with its place; ``value``, ``limit`` and ``beyond`` are in ``unit``."""
    place = place_of(answer.mesh, reach, b.xy)
    return {
        "kind": b.kind, "leg": b.leg, "x_m": place.x, "y_m": place.y, "chainage_m": place.chainage_m,
        "offset_m": place.offset_m, "value": b.value, "limit": b.limit, "beyond": b.beyond, "unit": b.unit,
        "length_m": b.length_m, "depth_m": b.depth_m, "speed_m_s": b.speed_m_s,
    }


def flow_json(one: FlowAnswer) -> dict[str, Any]:
    """One entry of ``flows``: ranges of discharge, months, and runs of many frames."""
    return {
        "fish": one.fish.name, "design": one.design, "migration_months": list(one.fish.migration),
        "ranges": [{"low_m3_s": b.low_m3_s, "high_m3_s": b.high_m3_s, "status": b.status} for b in one.bands],
        "shares_of_time": [
            {"label": s.label, "not_excluded": s.not_excluded, "excluded": s.excluded, "undecided": s.undecided, "outside": s.outside}
            for s in one.months
        ],
        "runs": [{"run": label, **_hydrograph(h)} for label, h in one.runs],
    }


def profile_rows(one: RunAnswer, reach: Reach | None) -> list[dict[str, Any]]:
    """The route of an answer, one row a point, for CSV."""
    route = one.answer.route
    if route is None:
        return []
    world = one.answer.mesh.to_world(route.xy)
    line = reach.centre_line.locate(route.xy) if reach is not None and reach.centre_line is not None else None
    rows = []
    for i in range(len(route.xy)):
        row = {
            "run": one.entry.id, "fish": one.answer.fish.name, "frame": one.answer.stamp.index, "leg": int(route.leg[i]),
            "x_m": float(world[i, 0]), "y_m": float(world[i, 1]),
            "chainage_m": None if line is None else float(line[0][i]), "offset_m": None if line is None else float(line[1][i]),
        }
        row |= {name: float(getattr(route, name)[i]) for name in _PROFILE}
        row |= {"resting": bool(route.resting[i]), "barred_by": barred_words(route, i)}
        rows.append(row)
    return rows


_PROFILE = (
    "distance_m", "depth_m", "bed_m", "level_m", "head_m", "speed_m_s", "against_m_s", "swim_speed_m_s", "ground_speed_m_s",
    "fatigue", "seconds",
)


def barred_words(route: Profile, i: int) -> str:
    """What bars the stretch to point i; empty where nothing does."""
    return "; ".join(word for word, by in zip(("too fast", "too shallow", "drop"), route.beyond[i]) if by > 0)


def figures(one: RunAnswer, reach: Reach | None) -> tuple[Figure, ...]:
    """The figures of an answer as records, for screens, tables and the review record."""
    answer, run = one.answer, one.run
    stamp = answer.stamp
    source = Source(
        run.name, run.hash if run.files else "", stamp.kind, stamp.seconds, time_text(stamp.time), stamp.field, run.settings.digest()
    )

    def figure(quantity: str, value: float | None, unit: str, place=None, note: str = "") -> Figure:
        return Figure(
            quantity, _number(value), unit, flags=answer.flags, cautions=OWED["passage"], place=place, source=source, note=note,
            extra={"fish": answer.fish.name, "status": answer.status},
        )

    out = [figure("discharge", answer.discharge_m3_s, "m3/s", note=answer.sentence)]
    worst = answer.worst_leg
    if worst is not None:
        out += [
            figure("fatigue of the worst leg", worst.fatigue, "-", worst.place, f"leg {worst.number} of {len(answer.legs)}"),
            figure("length of the worst leg", worst.length_m, "m", worst.place),
            figure("greatest speed in the worst leg", worst.greatest_speed_m_s, "m/s", worst.place),
            figure("least depth in the worst leg", worst.least_depth_m, "m", worst.place),
            figure("fatigue without recovery", answer.alone_fatigue, "-", note=answer.alone_status),
            figure("swimming time", answer.transit_s, "s"),
        ]
    if answer.corridor is not None:
        place = place_of(answer.mesh, reach, answer.corridor.xy)
        out.append(figure("narrowest corridor", answer.corridor.width_m, "m", place, f"{answer.corridor.faces} faces"))
    out += [
        figure(f"{b.kind}: beyond the limit", b.beyond, b.unit, place_of(answer.mesh, reach, b.xy), f"leg {b.leg}")
        for b in answer.barriers
    ]
    return tuple(out)


def _leg(leg) -> dict[str, Any]:
    return {
        "number": leg.number, "from": leg.from_area, "to": leg.to_area, "length_m": leg.length_m, "barred_m": leg.barred_m,
        "fatigue": leg.fatigue, "swimming_time_s": leg.seconds, "greatest_speed_m_s": leg.greatest_speed_m_s,
        "least_depth_m": leg.least_depth_m, "x_m": leg.place.x, "y_m": leg.place.y, "chainage_m": leg.place.chainage_m,
        "offset_m": leg.place.offset_m,
    }


def _corridor(answer: Answer, reach: Reach | None) -> dict[str, Any] | None:
    corridor = answer.corridor
    if corridor is None:
        return None
    place = place_of(answer.mesh, reach, corridor.xy)
    return {
        "width_m": corridor.width_m, "at_least": corridor.at_least, "faces": corridor.faces, "resolved": corridor.resolved,
        "x_m": place.x, "y_m": place.y, "chainage_m": place.chainage_m, "offset_m": place.offset_m,
    }


def _hydrograph(h: Hydrograph) -> dict[str, Any]:
    spell = h.longest_excluded
    return {
        "not_excluded": h.shares.not_excluded, "excluded": h.shares.excluded, "not_assessed": h.shares.undecided,
        "longest_excluded_spell": None if spell is None else {
            "from_s": spell.from_s, "to_s": spell.to_s, "seconds": spell.seconds, "at_least": spell.at_least
        },
        "not_excluded_m3_s": h.not_excluded_m3_s, "excluded_m3_s": h.excluded_m3_s,
    }


def _number(value: float | None) -> float | None:
    return float(value) if value is not None and math.isfinite(value) else None

