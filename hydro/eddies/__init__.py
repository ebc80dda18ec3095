"""Recirculation zones of a stream function."""

from .find import find_zones
from .zone import Zone, ZoneSet

__all__ = ["Zone", "ZoneSet", "find_zones"]
