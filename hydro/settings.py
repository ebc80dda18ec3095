"""The one registry of settings: name, default, unit, source and what each one touches."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Setting:
    """One number that a user may change.

    ``touches`` names the figures that move with it; ``source`` says where the default comes from.
    """

    name: str
    default: float
    unit: str
    source: str
    touches: str
    lowest: float = 0.0
    highest: float = float("inf")


_COMMON = "common practice, no source"

REGISTRY: dict[str, Setting] = {
    s.name: s
    for s in (
        Setting("wet_depth_m", 0.05, "m", _COMMON, "drawing, depth figures, grounding"),
        Setting(
            "carrying_share", 0.001, "-", "Leewater's own: a thin crest must not cut the river in two",
            "domain of psi: faces that carry more than this share of the through-discharge belong to it", 0.0, 1.0,
        ),
        Setting(
            "hole_faces", 10, "faces", "Leewater's own",
            "a dry patch wider than this many faces is a wall with its own level of psi", 1,
        ),
        Setting(
            "open_boundary_share", 0.01, "-", "Leewater's own",
            "a run of boundary edges is open when it carries this share of the largest", 0.0, 1.0,
        ),
        Setting("zone_share", 0.0001, "-", "Leewater's own", "least recirculating discharge of a listed zone", 0.0, 1.0),
        Setting("zone_triangles_across", 4, "triangles", _COMMON, "least width of a listed zone", 1),
        Setting(
            "strouhal", 0.2, "-", "about 0.20 for cylinders at 3e2 < Re < 2e5 (Roshko 1961, J. Fluid Mech. 10, 345-356)",
            "expected shedding period: structure's width over this and the approach speed", 0.05, 0.5,
        ),
        Setting(
            "core_share", 0.5, "-", "Leewater's own",
            "the core by which a zone is followed: where psi is at least this share of the way to its extremum", 0.05, 0.95,
        ),
        Setting(
            "follow_gap_frames", 2, "frames", "Leewater's own", "an eddy not seen for more frames than this has ended", 0
        ),
        Setting("least_periods", 5, "periods", _COMMON, "a mean over fewer shedding periods than this is flagged", 1, 100),
        Setting(
            "automatic_sections", 45, "sections", "Leewater's own",
            "how many sections square to the centre line the audit reads along the river", 5, 1000,
        ),
        Setting("gravity_m_s2", 9.81, "m/s2", "conventional value", "heads, Froude numbers, weirs", 9.7, 9.9),
        Setting("density_kg_m3", 1000.0, "kg/m3", "fresh water, rounded", "shear, power, drift", 900.0, 1100.0),
        Setting(
            "passage_time_weight", 1e-6, "1/s", "Leewater's own: an hour counts as 0.0036 of a leg's endurance",
            "which of two fish routes of nearly equal fatigue is taken", 1e-12, 1e-3,
        ),
        Setting(
            "passage_points_per_side", 2, "points", "Leewater's own", "headings that a fish route can take, at first", 0, 20
        ),
        Setting(
            "passage_direction_error", 0.01, "-", "Leewater's own",
            "headings are refined until the worst leg's fatigue moves by less than this share", 1e-4, 0.5,
        ),
        Setting(
            "passage_corridor_faces", 3, "faces", _COMMON, "a fish route through fewer faces side by side is not resolved", 1
        ),
        Setting("tubes", 22, "tubes", "Leewater's own", "stream tubes in a drawing", 2, 200),
    )
}


class Settings(Mapping[str, float]):
    """Every setting with its value; only differences from the registry are stored.

    Raises ``ValueError`` for an unknown name (listing the known ones) or a value out of range.
    """

    def __init__(self, changed: Mapping[str, float] | None = None) -> None:
        checked = {}
        for name, value in (changed or {}).items():
            if name not in REGISTRY:
                raise ValueError(f"unknown setting {name!r}; the known ones are {', '.join(sorted(REGISTRY))}.")
            rule = REGISTRY[name]
            if not rule.lowest <= float(value) <= rule.highest:
                raise ValueError(
                    f"setting {name} is {value} {rule.unit}; give a value from {rule.lowest:g} to {rule.highest:g}."
                )
            checked[name] = float(value)
        self._changed = checked

    def __getitem__(self, name: str) -> float:
        return self._changed[name] if name in self._changed else REGISTRY[name].default

    def __iter__(self) -> Iterator[str]:
        return iter(REGISTRY)

    def __len__(self) -> int:
        return len(REGISTRY)

    def with_(self, **changed: float) -> Settings:
        """The same settings with some values changed."""
        return Settings({**self._changed, **changed})

    def digest(self) -> str:
        """Short SHA-256 of all values, printed beside every figure made with them."""
        text = json.dumps({name: float(self[name]) for name in sorted(self)})
        return hashlib.sha256(text.encode()).hexdigest()[:16]
