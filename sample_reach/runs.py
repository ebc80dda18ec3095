"""The runs of the sample: spin-up on a coarse mesh, means at low flow and bankfull, flood and burst.

Every step leaves its state in a work folder, so a run that was stopped goes on where it was.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import shapely
from numpy.typing import ArrayLike

from . import geometry as geo
from .flow import INTERIOR, OUTFLOW, PIER, RIVER, TRIBUTARY, WALL
from .mesher import SIZES, Triangles, make_mesh
from .solver import Drive, Model, Topology, carry, cell_flow, topology

ALPHA = 0.15  # eddy viscosity nu = ALPHA h u*
LOW, BANKFULL, FLOOD_START = (6.0, 0.6), (104.0, 8.0), (38.0, 3.5)  # river and tributary, m3/s
# Short and gate-like: seconds, river, tributary. The pond above the weir spreads it: the bridge has its peak at 420 s.
FLOOD = np.array([[0, 38, 3.5], [30, 38, 3.5], [170, 124, 9.5], [300, 124, 9.5], [450, 62, 6.0], [600, 38, 3.5]], float)
FLOOD_FRAMES = np.arange(0.0, 600.1, 10.0)
BURST_FRAMES = np.arange(370.0, 460.01, 1.0)  # the discharge at the bridge peaks at 420 s, when the pond has filled
SETTLE, MEAN = {"low": 320.0, "bankfull": 240.0}, {"low": 120.0, "bankfull": 90.0}
# The fine weir passes low flow at a slightly lower level than the coarse one; taken off the pond at the carry,
# this saves half an hour of settling.
POND_DROP = 0.022  # m
SPIN_UP = {"low": 1200.0, "bankfull": 600.0, "flood": 400.0}


@dataclass(frozen=True)
class Fields:
    """One frame: depth (m) and unit discharge (m2/s) of cells, discharge of edges and culvert (m3/s)."""

    seconds: float
    depth: np.ndarray
    flow: np.ndarray
    edge_discharge: np.ndarray
    culvert: float
    interval: float  # s; 0 for an instant


class Chain:
    """All runs of one design on its meshes, with the states between them kept in ``folder``."""

    def __init__(self, design: str, folder: Path, say: Callable[[str], None]) -> None:
        self.place, self.folder, self.say = geo.Place(design), folder, say
        folder.mkdir(parents=True, exist_ok=True)

    def mesh(self, which: str) -> Triangles:
        """The fine or the coarse mesh, made once."""
        path = self.folder / f"{self.place.design}_{which}_mesh.npz"
        if not path.exists():
            self.say(f"mesh, {which}")
            made = make_mesh(self.place, SIZES[self.place.design, which])
            _save(path, xy=made.xy, cells=made.cells)
        with np.load(path) as f:
            return Triangles(f["xy"], f["cells"])

    def model(self, which: str) -> Model:
        """A dry model on one of the meshes."""
        mesh = self.mesh(which)
        t = topology(mesh.xy, mesh.cells)
        bed = self.place.bed(mesh.xy)[mesh.cells].mean(axis=1)
        inlet, outlet = (holder(mesh, geo.course().at(s, n)[0]) for s, n in geo.CULVERT)
        area = np.pi * geo.CULVERT_DIAMETER**2 / 4
        return Model(
            t, bed, self.place.roughness(t.centre), edge_kinds(self.place, t), ALPHA, link=(inlet, outlet), link_area=area,
            link_loss=geo.CULVERT_LOSS,
        )

    @cached_property
    def rating(self) -> tuple[np.ndarray, np.ndarray]:
        """Discharge against level at the outlet: uniform flow at the reach's slope, by strips (Manning)."""
        n = np.linspace(-1, 1, 401) * float(geo.half_bottom(geo.LENGTH) + geo.BANK_WIDTH)
        xy = geo.course().at(np.full(len(n), geo.LENGTH), n)
        bed, rough = self.place.bed(xy), self.place.roughness(xy)
        level = np.linspace(bed.min() + 0.02, bed.min() + 3.2, 120)
        depth = np.maximum(level[:, None] - bed, 0)
        return np.sum(depth ** (5 / 3) / rough, axis=1) * np.sqrt(geo.SLOPE) * (n[1] - n[0]), level

    def drive(self, river: ArrayLike, tributary: ArrayLike, times: ArrayLike = (0.0,)) -> Drive:
        t, main, side = (np.atleast_1d(np.asarray(a, float)) for a in (times, river, tributary))
        return Drive(t, main, side, *self.rating)

    def spun_up(self, event: str) -> Model:
        """The coarse model after its spin-up at low flow, bankfull, or the flow that the flood begins with."""
        model = self.model("coarse")
        flows = {"low": LOW, "bankfull": BANKFULL, "flood": FLOOD_START}[event]
        path = self.folder / f"{self.place.design}_{event}_spin_up.npz"
        if not _restore(path, model):
            self._simple_start(model, sum(flows))
            end = SPIN_UP[event]
            for until in np.arange(100.0, end + 1, 100.0):
                model.clear_sums()
                model.state[2:4] = 0
                model.advance(until, self.drive(*flows))
                self.say(f"spin-up {event}: {until:.0f} of {end:.0f} s, outflow {model.state[3] / 100:.2f} m3/s")
            _keep(path, model)
        return model

    def _simple_start(self, model: Model, discharge: float) -> None:
        """Uniform depth below the weir; above it at least the weir's head over the crest."""
        s, _ = geo.course().locate(model.topology.centre)
        uniform = np.interp(discharge, *self.rating) - float(geo.mean_bed(geo.LENGTH))
        head = (discharge / (1.7 * 34)) ** (2 / 3) + float(geo.mean_bed(geo.WEIR)) + 0.88
        level = geo.mean_bed(s) + uniform
        level = np.where(s < geo.WEIR, np.maximum(level, head), level)
        model.h[:] = np.maximum(level - model.bed, 0)
        area = 34 * (uniform + np.where(s < geo.WEIR, 1.0, 0.2))
        speed = np.where(np.abs(geo.course().locate(model.topology.centre)[1]) < 18, 0.5 * discharge / area, 0)
        along = geo.course().direction(s)
        model.hu[:], model.hv[:] = model.h * speed * along[:, 0], model.h * speed * along[:, 1]
        model.state[:2] = 0, discharge

    def mean(self, event: str, which: str = "fine") -> tuple[Model, Fields]:
        """The mean over :data:`MEAN` seconds after settling: depth, and the discharge of every edge."""
        model = self.model(which)
        path = self.folder / f"{self.place.design}_{event}_{which}_mean.npz"
        flows = {"low": LOW, "bankfull": BANKFULL}[event]
        if not path.exists():
            carry(self.spun_up(event), model)
            model.state[0] = 0.0
            if event == "low" and which == "fine":
                pond = geo.course().locate(model.topology.centre)[0] < geo.WEIR - 2
                model.h[pond] = np.maximum(model.h[pond] - POND_DROP, 0)
            settled = self.folder / f"{self.place.design}_{event}_{which}_settled.npz"
            _restore(settled, model)
            self._stretch(model, SETTLE[event], self.drive(*flows), f"{event}, {which}, settling")
            _keep(settled, model)
            model.clear_sums()
            model.state[2:6] = 0
            begin = model.volume
            self._stretch(model, SETTLE[event] + MEAN[event], self.drive(*flows), f"{event}, {which}, mean")
            span = MEAN[event]
            storage = (model.volume - begin) / span
            flows_said = f"in {model.state[2] / span:.3f}, out {model.state[3] / span:.3f}, storage {storage:.3f} m3/s"
            self.say(f"{event}, {which}: {flows_said}, added {model.state[4]:.2g} m3, {model.state[5]:.0f} steps")
            sums = model.sums
            _save(path, depth=sums[0] / span, edge=sums[1] / span, culvert=model.state[8] / span, steps=model.state[5])
        with np.load(path) as f:
            flow = cell_flow(model.topology, f["edge"])
            fields = Fields(SETTLE[event] + MEAN[event] / 2, f["depth"], flow, f["edge"], float(f["culvert"]), MEAN[event])
            model.state[5] = float(f["steps"])
        return model, fields

    def _stretch(self, model: Model, until: float, drive: Drive, words: str) -> None:
        """Advance with a line of progress every twenty seconds of model time."""
        while model.time < until - 1e-6:
            clock, steps = time.time(), model.state[5]
            model.advance(min(model.time + 20, until), drive)
            rate = (model.state[5] - steps) * len(model.h) / (time.time() - clock) / 1e6
            self.say(f"{words}: {model.time:.0f} of {until:.0f} s, {rate:.1f} million cell steps a second")

    def flood(self, model: Model, frames: np.ndarray) -> Iterator[Fields]:
        """Instants of the flood at the times given, in order; those already in the folder are read back."""
        design, started = self.place.design, False
        times, river, side = FLOOD.T
        for t in frames:
            path = self.folder / f"{design}_flood_{t:08.3f}.npz"
            if not path.exists():
                if not started:
                    self._flood_start(model, t)
                    started = True
                self._stretch(model, t, self.drive(river, side, times), "flood")
                _keep(path, model, edge=model.sums[2].astype(np.float32), culvert=model.state[7])
            with np.load(path) as f:
                edge = f["edge"].astype(float)
                yield Fields(t, f["h"], cell_flow(model.topology, edge), edge, float(f["culvert"]), 0.0)

    def _flood_start(self, model: Model, until: float) -> None:
        """The state of the latest frame kept before ``until``, or the settled start of the flood."""
        done = sorted(self.folder.glob(f"{self.place.design}_flood_*.npz"))
        done = [p for p in done if "spin" not in p.name and float(p.stem.rsplit("_", 1)[1]) < until]
        if done:
            _restore(done[-1], model)
            return
        carry(self.spun_up("flood"), model)
        model.state[0] = -20.0
        times, river, side = FLOOD.T
        self._stretch(model, 0.0, self.drive(river, side, times), "flood, settling")


def holder(mesh: Triangles, point: np.ndarray) -> int:
    """The triangle that holds a point."""
    p = mesh.xy[mesh.cells] - point
    q = np.roll(p, -1, axis=1)
    inside = np.all(p[..., 0] * q[..., 1] - p[..., 1] * q[..., 0] >= 0, axis=1)
    return int(np.flatnonzero(inside)[0])


def edge_kinds(place: geo.Place, t: Topology) -> np.ndarray:
    """Code of every edge: interior, wall, river, tributary, outflow, or wall of a pier."""
    kind = np.where(t.right < 0, WALL, INTERIOR).astype(np.int32)
    outside = np.flatnonzero(t.right < 0)
    middle = t.middle[outside]
    s, _ = geo.course().locate(middle)
    kind[outside[np.abs(s) < 0.05]] = RIVER
    kind[outside[np.abs(s - geo.LENGTH) < 0.05]] = OUTFLOW
    points = shapely.points(middle)
    kind[outside[shapely.distance(points, geo.tributary_mouth()) < 0.05]] = TRIBUTARY
    for pier in place.piers:
        if pier.hole:
            kind[outside[shapely.distance(points, pier.outline) < 0.3]] = PIER
    return kind


def _save(path: Path, **arrays: Any) -> None:
    """Whole or not at all: written beside, then renamed."""
    beside = path.with_suffix(".part.npz")
    np.savez(beside, **arrays)
    beside.replace(path)


def _keep(path: Path, model: Model, **more: Any) -> None:
    _save(path, h=model.h, hu=model.hu, hv=model.hv, state=model.state, **more)


def _restore(path: Path, model: Model) -> bool:
    """Set a model to a kept state; False where there is none."""
    if not path.exists():
        return False
    with np.load(path) as f:
        model.h[:], model.hu[:], model.hv[:], model.state[:] = f["h"], f["hu"], f["hv"], f["state"]
    return True
