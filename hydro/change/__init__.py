"""One run against another: what differs before, levels, maps, zones, openings, and what it says in plain words."""

from .levels import LevelChange, level_change
from .maps import MapChange, map_change
from .pairing import Pair, pair_frames
from .report import Change, Finding, compare
from .setup import Difference, setup_differences

__all__ = [
    "Change", "Difference", "Finding", "LevelChange", "MapChange", "Pair", "compare", "level_change", "map_change",
    "pair_frames", "setup_differences",
]
