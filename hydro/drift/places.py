"""What stands in the wood's way: eddies that hold it, and openings against the length of a design log."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..eddies import Zone
from ..ledger import frame_ledger, mean_ledger
from ..reach import Reach
from ..run import Run
from ..section import section_figures
from ..section.crossings import bridge_openings
from ..section.cut import cut
from .study import Drifted
from .wood import design_log_length

LOG_SOURCE = "Diehl 1997, FHWA-RD-97-028 (from memory): least of the channel's width, the longest sturdy log, 9 m + W/4"


@dataclass(frozen=True, slots=True)
class Held:
    """Logs that an eddy holds for a while: how many come into it, and the median time that those spend in it, s."""

    eddy: str
    logs: int
    median_s: float | None


@dataclass(frozen=True, slots=True)
class Gap:
    """One opening against a design log: its width square to the approach flow, m, and the design length there, m."""

    opening: str
    width_m: float
    effective_width_m: float
    approach_deg: float | None
    channel_width_m: float
    design_log_m: float

    @property
    def narrower(self) -> bool:
        """The design log is longer than the opening is wide to the flow: it could span it."""
        return self.design_log_m > self.effective_width_m


def held_by_eddies(run: Run, reach: Reach, base: Drifted) -> list[Held]:
    """Time that logs spend in each eddy of the frame, or of the mean over the whole run, longest first."""
    out = []
    for zone in _zones(run, reach):
        seconds = base.time_inside(zone.contour)
        own = seconds[seconds > 0]
        out.append(Held(zone.name, len(own), float(np.median(own)) if len(own) else None))
    return sorted(out, key=lambda h: -(h.median_s or 0.0))


def gaps_of(run: Run, reach: Reach, sturdy_m: float = 24.0) -> list[Gap]:
    """Every opening with its width square to the approach flow of the fullest frame, and the design log's length.

    The channel's width is that of the water at the openings together. ``sturdy_m`` is the longest log that does not
    break, a choice of the user.
    """
    openings = reach.layer("openings")
    if reach.centre_line is None or not openings:
        return []
    frame = run.frame(int(np.argmax([run.frame(i).face_depth @ run.mesh.face_area for i in range(run.n_frames)])))
    found = bridge_openings(frame, openings, reach.centre_line)
    lines = [np.asarray(o.geometry.coords)[:, :2] for o in openings]
    wet = [section_figures(cut(frame, line, centre_line=reach.centre_line)).width_m for line in lines]
    channel = float(sum(wet))
    gaps = []
    for opening, line in zip(found, lines, strict=True):
        width = float(np.hypot(*np.diff(line[[0, -1]], axis=0)[0]))
        turned = np.radians(opening.approach_deg or 0.0)
        gaps.append(Gap(
            opening.name, width, width * abs(float(np.cos(turned))), opening.approach_deg, channel, design_log_length(channel, sturdy_m),
        ))
    return gaps


def _zones(run: Run, reach: Reach) -> tuple[Zone, ...]:
    if run.n_frames == 1:
        return frame_ledger(run, 0, reach=reach, sensitivity=False).zones.zones
    return mean_ledger(run, 0.0, float(run.times.seconds[-1]), reach=reach, sensitivity=False).zones.zones
