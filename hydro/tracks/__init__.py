"""The four flow lines: streamlines, pathlines, streaklines and timelines, in their textbook meaning."""

from .lines import Along, Traced, Track, along, open_sides
from .release import in_polygon, on_line, one_a_tube
from .steady import streamlines
from .unsteady import pathlines, streaklines, timelines

__all__ = [
    "Along", "Traced", "Track", "along", "in_polygon", "on_line", "one_a_tube", "open_sides", "pathlines", "streaklines",
    "streamlines", "timelines",
]
