"""The water balance along a reach: discharge at automatic sections against what is due, and compact sources."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array

from .frame import Frame
from .mesh import Mesh
from .reach import CentreLine, automatic_sections
from .section import cut
from .streamfunction import StreamFunction

_STANDS_OUT = 8.0  # times the typical size of the scatter that a compact peak must reach
_RINGS = 3.0  # radius of the disc that a peak is summed over, edge lengths
_MOST = 10  # compact sources that are listed


@dataclass(frozen=True, slots=True)
class Step:
    """The largest difference between adjacent sections that nothing declared explains.

    ``difference_m3_s`` is positive where water appears, going downstream; ``share`` of the through-discharge.
    """

    difference_m3_s: float
    share: float
    chainage_m: float


@dataclass(frozen=True, slots=True)
class CompactSource:
    """A compact peak of the divergence that no storage, link or boundary explains; ``at`` local m, m3/s into the field."""

    at: tuple[float, float]
    discharge_m3_s: float
    chainage_m: float | None
    offset_m: float | None


@dataclass(frozen=True, eq=False)
class Balance:
    """One frame's balance: the largest step along the chainage, and the compact sources, greatest first.

    ``sources`` is None at single moments of an unsteady run: storage is known between frames only, and what an eddy
    does between them looks like sources. The mean flow tells.
    """

    step: Step | None
    sources: tuple[CompactSource, ...] | None


class Gauges:
    """Automatic sections of one mesh, ready to read the discharge of any of its frames."""

    def __init__(self, frame: Frame, centre_line: CentreLine, spacing_m: float) -> None:
        self.centre_line = centre_line
        chainage: list[float] = []
        rows: list[int] = []
        columns: list[int] = []
        weights: list[float] = []
        for at, line in automatic_sections(centre_line, frame.mesh.node_xy, spacing_m):
            try:
                section = cut(frame, line)
            except ValueError:  # the line falls between two arms of the mesh
                continue
            across = section.normal * section.widths[:, None]
            rows += [len(chainage)] * (2 * len(section.triangle))
            columns += [*(2 * section.triangle), *(2 * section.triangle + 1)]
            weights += [*across[:, 0], *across[:, 1]]
            chainage.append(at)
        self.chainage = np.array(chainage)
        self._across = coo_array((weights, (rows, columns)), shape=(len(chainage), 2 * frame.mesh.n_triangles)).tocsr()
        self._face_chainage = centre_line.locate(frame.mesh.face_centroid)[0]

    def discharge(self, frame: Frame) -> np.ndarray:
        """Discharge (k,) of the frame's own field at each section, m3/s, positive downstream."""
        return self._across @ np.ascontiguousarray(frame.triangle_unit_discharge).ravel()

    def surplus(self, sf: StreamFunction, depth_rate: np.ndarray | None) -> np.ndarray:
        """Discharge (k,) beyond what open boundaries and links bring in upstream and storage takes up there, m3/s."""
        mesh = sf.frame.mesh
        inlets = [(mesh.node_xy[mesh.edge_nodes[b.edges]].mean(axis=(0, 1)), b.discharge_m3_s) for b in sf.open_boundaries]
        for link in sf.links:
            inlets += [(at, q) for at, q in _link_ends(sf.frame.mesh, link)]
        chainage = self.centre_line.locate(np.array([at for at, _ in inlets]))[0] if inlets else np.zeros(0)
        flow = np.array([q for _, q in inlets])
        due = ((chainage[None] < self.chainage[:, None]) * flow[None]).sum(axis=1)
        if depth_rate is not None:
            order = np.argsort(self._face_chainage)
            taken = np.concatenate([[0.0], np.cumsum((depth_rate * mesh.face_area)[order])])
            due = due - taken[np.searchsorted(self._face_chainage[order], self.chainage)]
        return self.discharge(sf.frame) - due


def balance_of(sf: StreamFunction, gauges: Gauges | None, depth_rate: np.ndarray | None, *, moment: bool = False) -> Balance:
    """The balance of a frame; without a centre line there are no sections. ``moment``: one of an unsteady run's."""
    centre = gauges.centre_line if gauges else None
    step = _step(sf, gauges, depth_rate) if gauges else None
    return Balance(step, None if moment else compact_sources(sf, depth_rate, centre))


def _step(sf: StreamFunction, gauges: Gauges, depth_rate: np.ndarray | None) -> Step | None:
    if len(gauges.chainage) < 2 or not sf.through_discharge_m3_s > 0:
        return None
    difference = np.diff(gauges.surplus(sf, depth_rate))
    k = int(np.abs(difference).argmax())
    return Step(
        float(difference[k]), float(abs(difference[k]) / sf.through_discharge_m3_s),
        float(gauges.chainage[k : k + 2].mean()),
    )


def compact_sources(
    sf: StreamFunction, depth_rate: np.ndarray | None = None, centre_line: CentreLine | None = None, *, least_share: float = 0.005,
) -> tuple[CompactSource, ...]:
    """Compact peaks of the divergence of the unit discharge that nothing declared explains, greatest first.

    The divergence is summed over discs of three edges' radius about the nodes inside the domain, storage and links
    taken off. A peak is listed where it exceeds ``least_share`` of the through-discharge and eight times the scatter
    of the discs about it.
    """
    mesh, inside = sf.frame.mesh, (sf.shape.part >= 0) & (sf.shape.wall_of_node < 0) & ~sf.shape.open_node
    source = _divergence(sf, depth_rate)
    source[~inside] = 0.0
    for link in sf.links:  # what it takes and gives is spread over the nodes about its ends
        for at, q in _link_ends(mesh, link):
            near = inside & (np.hypot(*(mesh.node_xy - at).T) < _RINGS * _edge(mesh))
            source[near] -= q * near[near] / max(near.sum(), 1)
    ring = mesh.node_graph @ source
    scatter = 1.4826 * float(np.median(np.abs(ring[inside]))) if inside.any() else 0.0
    least = max(least_share * sf.through_discharge_m3_s, _STANDS_OUT * scatter, 1e-12)
    found: list[CompactSource] = []
    taken = np.zeros(mesh.n_nodes, bool)
    for link in sf.links:  # its own ends are declared, wherever in the disc the model lets the water in and out
        for at, _ in _link_ends(mesh, link):
            taken |= np.hypot(*(mesh.node_xy - at).T) < 3 * _RINGS * _edge(mesh)
    for node in np.argsort(-np.abs(ring), kind="stable")[: 20 * _MOST]:
        if taken[node] or not inside[node] or abs(ring[node]) < least / 3 or len(found) == _MOST:
            continue
        away = np.hypot(*(mesh.node_xy - mesh.node_xy[node]).T)
        disc, round_it = away < _RINGS * _edge(mesh), away < 2 * _RINGS * _edge(mesh)
        taken |= round_it
        total = float(source[disc].sum())
        # Where velocities are interpolated, gains and losses lie side by side: their sum over the wider disc tells.
        if abs(total) < least or abs(float(source[round_it].sum())) < 0.5 * abs(total):
            continue
        chainage = offset = None
        if centre_line is not None:
            s, n = centre_line.locate(mesh.node_xy[node][None])
            chainage, offset = float(s[0]), float(n[0])
        x, y = mesh.node_xy[node]
        found.append(CompactSource((float(x), float(y)), total, chainage, offset))
    return tuple(sorted(found, key=lambda s: -abs(s.discharge_m3_s)))


def _divergence(sf: StreamFunction, depth_rate: np.ndarray | None) -> np.ndarray:
    """Outflow (n,) from the part of the domain that each node stands for, plus what it stores, m3/s."""
    mesh, use = sf.frame.mesh, np.flatnonzero(sf.domain)
    corners, xy = mesh.triangles[use], mesh.node_xy
    q = sf.frame.triangle_unit_discharge[use]
    out = np.zeros(mesh.n_nodes)
    for k in range(3):
        side = xy[corners[:, (k + 2) % 3]] - xy[corners[:, (k + 1) % 3]]
        # Twice the area times the gradient of the corner's shape function is the facing side, turned inwards.
        np.add.at(out, corners[:, k], -(q[:, 1] * side[:, 0] - q[:, 0] * side[:, 1]) / 2)
    if depth_rate is not None:
        part = depth_rate[mesh.triangle_face[use]] * mesh.triangle_area[use] / 3
        np.add.at(out, corners.ravel(), np.repeat(part, 3))
    return out


def _link_ends(mesh: Mesh, link) -> Sequence[tuple[np.ndarray, float]]:
    """Places of a link's ends with what each gives to the field, m3/s."""
    first, last = mesh.node_xy[link.path.nodes[[0, -1]]]
    return (first, -link.discharge_m3_s), (last, link.discharge_m3_s)


def _edge(mesh: Mesh) -> float:
    return float(np.median(mesh.edge_length))
