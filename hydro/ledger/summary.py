"""What is kept of a frame once its field is let go: plain values and zones."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

from ..eddies import Zone
from ..eddies.travelling import Traveller


@dataclass(frozen=True, eq=False)
class FrameSummary:
    """Plain values of a frame (one entry of the JSON's ``frames``) and its zones."""

    index: int
    seconds: float
    values: dict[str, Any]
    zones: tuple[Zone, ...]
    travelling: tuple[Traveller, ...] = ()

    def with_zones(self, zones: Sequence[Zone]) -> FrameSummary:
        """The same frame with the ids and flags that following in time gave its zones."""
        rows = [
            {**row, "id": zone.id, "flags": list(zone.flags)}
            for row, zone in zip(self.values["zones"], zones, strict=True)
        ]
        return replace(self, values={**self.values, "zones": rows}, zones=tuple(zones))

    def with_travelling(self, eddies: Sequence[Traveller]) -> FrameSummary:
        """The same frame with the ids that following in time gave its travelling eddies."""
        rows = [{**row, "id": eddy.id} for row, eddy in zip(self.values["travelling"], eddies, strict=True)]
        return replace(self, values={**self.values, "travelling": rows}, travelling=tuple(eddies))
