"""Fish and places for the tests of passage; the fish are made up."""

from __future__ import annotations

import shapely

from hydro.passage.areas import Places
from hydro.passage.fish import Fish, read_fish
from hydro.reach import NamedLine

PROLONGED = {"a": 8.5, "b": -1.2, "lowest": 1.0, "highest": 8.0, "source": "made up"}
SPRINT = {"a": 5.0, "b": -0.45, "lowest": 1.0, "highest": 12.0, "source": "made up"}


def fish_table(**changed) -> dict:
    """A [[fish]] table: 0.40 m long, the two lines of the worked example, with some entries changed."""
    table = {
        "name": "Made-up fish", "length_m": 0.40, "speeds": "BL/s", "prolonged": PROLONGED, "sprint": SPRINT,
        "least_depth_m": 0.20, "greatest_drop_m": 0.25, "rest": {"speed_m_s": 0.1, "depth_m": 0.3}, "source": "made up",
    }
    table.update(changed)
    return {k: v for k, v in table.items() if v is not None}


def fish(**changed) -> Fish:
    """A fish from :func:`fish_table`."""
    return read_fish(fish_table(**changed))


def place(name: str, *box: float) -> NamedLine:
    """A rectangle (west, south, east, north) as a feature."""
    return NamedLine(name, name, shapely.box(*box))


def ends(length: float, width: float, *, start: float, goal: float) -> Places:
    """Fish start in a channel's last part, from x = ``start``, and go for x < ``goal``, against a flow along x."""
    return Places(place("start", start, 0, length, width), place("goal", 0, 0, goal, width))
