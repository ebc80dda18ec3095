"""A finding: what was met, its number and place, what it means, and what to ask. Never a verdict."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from ..balance import Gauges
from ..figure import Figure, Place
from ..ledger.frames import depth_rate, plan_for
from ..reach import CentreLine, Reach, automatic_sections, proposed_centre_line
from ..run import Run
from ..streamfunction import Plan, StreamFunction, stream_function

GRADES = ("note", "ask", "resolve before use")


@dataclass(frozen=True, slots=True)
class Finding:
    """One finding of the audit.

    Attributes
    ----------
    id : str
        Lasting name of the kind of finding, such as "undeclared source".
    grade : one of GRADES
    sentence : str
        What was met, with its number and unit.
    meaning, question : str
        What it means for the figures, and what to ask the modeller.
    figure : Figure or None
    at : (2,) local m or None
    frame : int or None
    """

    id: str
    grade: str
    sentence: str
    meaning: str
    question: str
    figure: Figure | None = None
    at: tuple[float, float] | None = None
    frame: int | None = None


@dataclass(frozen=True, eq=False)
class Material:
    """What the audit looks at: a run, its review's lines, and its frames read once and kept by index."""

    run: Run
    reach: Reach
    _known: dict[int, StreamFunction] = field(default_factory=dict)

    @cached_property
    def plan(self) -> Plan:
        """Open boundaries and walls, judged by the first frame that holds no maxima."""
        first = next((i for i, kind in enumerate(self.run.times.kinds) if kind != "maximum"), 0)
        return plan_for(self.run, self.run.frame(first), self.reach)

    def sf(self, index: int) -> StreamFunction:
        """Stream function of a frame, kept."""
        if index not in self._known:
            frame = self.run.frame(index)
            self._known[index] = stream_function(frame, plan=self.plan, depth_rate=depth_rate(self.run, index, frame))
        return self._known[index]

    @cached_property
    def gauges(self) -> Gauges:
        """The automatic sections along :attr:`axis`, ready to read the discharge of any frame."""
        return Gauges(self.run.frame(0), self.axis, self.spacing_m)

    def chosen(self) -> list[int]:
        """Frames that stand for the run: the first, the fullest, and the last."""
        return sorted({0, self.run.n_frames - 1, fullest(self.run)})

    @cached_property
    def axis(self) -> CentreLine:
        """The centre line, else a straight one along the mean flow of the first frame."""
        return self.reach.centre_line or proposed_centre_line(self.run.mesh.node_xy, self.run.frame(0).unit_discharge.mean(axis=0) + [1e-12, 0])

    def sections(self) -> list[tuple[float, np.ndarray]]:
        """Chainage and ends of the automatic sections along :attr:`axis`, left bank first."""
        return automatic_sections(self.axis, self.run.mesh.node_xy, self.spacing_m)

    @property
    def spacing_m(self) -> float:
        """Between automatic sections, m; no less than a metre."""
        return max(self.axis.length / self.run.settings["automatic_sections"], 1.0)

    def place(self, at: np.ndarray) -> Place:
        """World place of a local point with chainage and offset."""
        x, y = self.run.mesh.to_world(np.asarray(at, float))
        if self.reach.centre_line is None:
            return Place(float(x), float(y))
        s, n = self.reach.centre_line.locate(np.asarray(at, float)[None])
        return Place(float(x), float(y), float(s[0]), float(n[0]))

    def where(self, at: np.ndarray) -> str:
        """The place in words: chainage and side, or world coordinates."""
        p = self.place(at)
        if p.chainage_m is None or p.offset_m is None:
            return f"{p.x:.1f} E, {p.y:.1f} N"
        if abs(p.offset_m) < 0.5:
            return f"chainage {p.chainage_m:.0f} m, on the centre line"
        side = "left" if p.offset_m > 0 else "right"
        return f"chainage {p.chainage_m:.0f} m, {abs(p.offset_m):.0f} m {side} of the centre line"


def fullest(run: Run) -> int:
    """Index of the frame with the most water; looks at no more than 25 frames."""
    steps = np.unique(np.linspace(0, run.n_frames - 1, min(run.n_frames, 25)).astype(int))
    volumes = [float(run.frame(int(i)).face_depth @ run.mesh.face_area) for i in steps]
    return int(steps[int(np.argmax(volumes))])


def point(xy: np.ndarray) -> tuple[float, float]:
    """A local point as plain numbers."""
    return float(xy[0]), float(xy[1])


def first_of_each(found: list[Finding]) -> list[Finding]:
    """One finding of a kind: the gravest, then the first."""
    best: dict[str, Finding] = {}
    for f in found:
        if f.id not in best or GRADES.index(f.grade) > GRADES.index(best[f.id].grade):
            best[f.id] = f
    return list(best.values())
