"""One time of a run: depth, level, unit discharge, velocity and wet mask, each by one rule.

Whatever the file stores (nodes, faces or edges), a frame holds both views of it: values on faces,
which psi and sections use as they are, and values at nodes, which drawing and tracks use.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any

import numpy as np

from ._kernels import nodal
from .mesh import Mesh

KINDS = ("instant", "mean", "maximum")
_THIN_M = 1e-6  # below this depth a velocity from unit discharge means nothing and is zero


@dataclass(frozen=True, eq=False)
class Frame:
    """Depth and unit discharge at one time.

    Attributes
    ----------
    mesh : Mesh
    index : int
        Place in the run's time axis; never a key.
    seconds : float
        From the start of the run's time axis.
    time : numpy.datetime64 or None
        UTC instant; None where the file has no dates.
    kind : "instant", "mean" or "maximum"
    interval_s : float or None
        Length of the interval that a mean or maximum covers, s.
    stored_on : "face", "node" or "edge"
        Where the file holds the flow.
    bed : (n,) float64
        Node bed level, m above the run's datum.
    depth : (n,) float64
        Node depth, m, 0 where dry.
    unit_discharge : (n, 2) float64
        Node unit discharge (east, north), m2/s; linear between nodes.
    face_bed, face_depth : (f,) float64
        m; the face means.
    face_unit_discharge : (f, 2) float64
        m2/s; the field that psi and sections use.
    edge_discharge : (e,) float64 or None
        m3/s, positive from the left to the right of the directed edge; the truth where stored.
    wet_depth_m : float
        Depth above which water counts as wet.
    series : mapping of name to m3/s
        Discharges that the file holds beside the field, such as a culvert's.
    """

    mesh: Mesh
    index: int
    seconds: float
    time: np.datetime64 | None
    kind: str
    interval_s: float | None
    stored_on: str
    bed: np.ndarray
    depth: np.ndarray
    unit_discharge: np.ndarray
    face_bed: np.ndarray
    face_depth: np.ndarray
    face_unit_discharge: np.ndarray
    edge_discharge: np.ndarray | None
    wet_depth_m: float
    series: Mapping[str, float] = field(default_factory=dict)

    @cached_property
    def level(self) -> np.ndarray:
        """(n,) water level at nodes, m above datum; NaN where dry."""
        return np.where(self.depth > self.wet_depth_m, self.bed + self.depth, np.nan)

    @cached_property
    def velocity(self) -> np.ndarray:
        """(n, 2) node velocity, m/s; zero where dry."""
        return _velocity(self.depth, self.unit_discharge, self.wet_depth_m)

    @cached_property
    def face_velocity(self) -> np.ndarray:
        """(f, 2) face velocity, m/s; zero where dry."""
        return _velocity(self.face_depth, self.face_unit_discharge, self.wet_depth_m)

    @cached_property
    def speed(self) -> np.ndarray:
        """(n,) node speed, m/s."""
        return np.hypot(*self.velocity.T)

    @cached_property
    def wet_nodes(self) -> np.ndarray:
        """(n,) bool."""
        return self.depth > self.wet_depth_m

    @cached_property
    def wet_faces(self) -> np.ndarray:
        """(f,) bool."""
        return self.face_depth > self.wet_depth_m

    @cached_property
    def wet_triangles(self) -> np.ndarray:
        """(m,) bool: triangles of wet faces."""
        return self.wet_faces[self.mesh.triangle_face]

    @cached_property
    def triangle_unit_discharge(self) -> np.ndarray:
        """(m, 2) m2/s, constant in each triangle: the faces' own, or the mean of a triangle's nodes."""
        if self.stored_on == "node":
            return of_corners(self.mesh, self.unit_discharge)
        return self.face_unit_discharge[self.mesh.triangle_face]

    @property
    def field_name(self) -> str:
        """Which field the figures of psi and sections are read from, in words."""
        words = {
            "face": "faces' own unit discharge",
            "node": "unit discharge linear between nodes",
            "edge": "edge discharges",
        }
        return words["edge"] if self.edge_discharge is not None else words[self.stored_on]


@dataclass(frozen=True, eq=False)
class RawFrame:
    """What a reader found at one time, in SI and in the mesh's own numbering.

    ``depth`` (m) and ``unit_discharge`` (m2/s, (k, 2)) stand on nodes or faces as ``stored_on``
    says; NaN means no value and is taken as dry. ``bed`` may be on nodes, faces, or both.
    ``unit_discharge`` may be None if ``edge_discharge`` is given.
    """

    stored_on: str
    depth: np.ndarray
    unit_discharge: np.ndarray | None
    edge_discharge: np.ndarray | None = None


def of_corners(mesh: Mesh, values: np.ndarray) -> np.ndarray:
    """Mean (m, ...) over the corners of each triangle of node values (n, ...): the mean of a linear field."""
    a, b, c = (values[mesh.triangles[:, k]] for k in range(3))
    return (a + b + c) / 3


def face_bed_and_node_bed(mesh: Mesh, node_bed: np.ndarray | None, face_bed: np.ndarray | None):
    """Both views of the bed, m: what is missing is made from the other; NaN-free.

    Node values give faces their area mean; face values give nodes by the linear-exact rule.
    """
    if face_bed is None:
        if node_bed is None:
            raise ValueError("the run has no bed level; map a variable to bed in the review, or export it.")
        face_bed = mesh.triangle_to_face(of_corners(mesh, node_bed))
    if node_bed is None:
        node_bed = to_nodes(mesh, face_bed[:, None], np.ones(mesh.n_faces, bool))[:, 0]
    return np.asarray(node_bed, float), np.asarray(face_bed, float)


def make_frame(
    mesh: Mesh,
    raw: RawFrame,
    node_bed: np.ndarray,
    face_bed: np.ndarray,
    *,
    index: int,
    seconds: float,
    time: np.datetime64 | None,
    kind: str,
    interval_s: float | None = None,
    wet_depth_m: float,
    series: Mapping[str, float] | None = None,
) -> Frame:
    """A frame from what a reader found: the one rule for every derived field.

    Raises ``ValueError`` for an unknown ``kind`` or a raw frame with no flow.
    """
    if kind not in KINDS:
        raise ValueError(f"kind of frame is {kind!r}; say one of {', '.join(KINDS)}.")
    if raw.stored_on == "node" and raw.unit_discharge is not None:
        depth = np.maximum(np.nan_to_num(raw.depth), 0.0)
        q = np.nan_to_num(raw.unit_discharge)
        face_depth = mesh.triangle_to_face(of_corners(mesh, depth))
        face_q = mesh.triangle_to_face(of_corners(mesh, q))
    else:
        face_depth = np.maximum(np.nan_to_num(raw.depth), 0.0)
        face_q = _face_flow(mesh, raw)
        depth, q = _nodes_from_faces(mesh, node_bed, face_bed, face_depth, face_q, wet_depth_m)
    for a in (node_bed, depth, q, face_bed, face_depth, face_q, raw.edge_discharge):
        if a is not None:
            a.setflags(write=False)
    return Frame(
        mesh, index, seconds, time, kind, interval_s, raw.stored_on, node_bed, depth, q, face_bed, face_depth, face_q,
        raw.edge_discharge, wet_depth_m, series or {},
    )


def mean_frame(frames: Iterable[tuple[Frame, float]]) -> Frame:
    """Weighted mean of depth and of unit discharge over frames of one mesh.

    Parameters
    ----------
    frames : iterable of (Frame, weight)
        Weights in seconds of time that each stands for; they are taken one at a time.

    Raises
    ------
    ValueError
        No frames, a maximum among them, or no positive weight.
    """
    sums: list[np.ndarray | None] | None = None
    total, first, last = 0.0, None, None
    series: dict[str, float] = {}
    for frame, weight in frames:
        if frame.kind == "maximum":
            raise ValueError(f"frame at {frame.seconds:g} s holds maxima; maxima of different moments have no mean.")
        fields = [getattr(frame, name) for name in _MEAN_OF]
        if sums is None:
            first, sums = frame, [np.zeros_like(f) if f is not None else None for f in fields]
        for s, f in zip(sums, fields, strict=True):
            if s is not None and f is not None:
                s += weight * f
        for name, value in frame.series.items():
            series[name] = series.get(name, 0.0) + weight * value
        total, last = total + weight, frame
    if sums is None or first is None or last is None or not total > 0:
        raise ValueError("there is no frame to average in this window; widen it.")
    means: dict[str, Any] = {n: (None if s is None else s / total) for n, s in zip(_MEAN_OF, sums, strict=True)}
    held = {name: value / total for name, value in series.items()}
    return replace(
        first, kind="mean", interval_s=total, seconds=last.seconds, time=last.time, index=last.index, series=held, **means,
    )


_MEAN_OF = ("depth", "unit_discharge", "face_depth", "face_unit_discharge", "edge_discharge")


def _velocity(depth: np.ndarray, q: np.ndarray, wet: float) -> np.ndarray:
    carries = depth > max(wet, _THIN_M)
    return np.where(carries[:, None], q / np.where(carries, depth, 1.0)[:, None], 0.0)


def _face_flow(mesh: Mesh, raw: RawFrame) -> np.ndarray:
    if raw.unit_discharge is not None:
        return np.nan_to_num(raw.unit_discharge)
    if raw.edge_discharge is None:
        raise ValueError("the frame has no velocity, unit discharge or edge discharge; export one of them.")
    return flow_from_edges(mesh, raw.edge_discharge)


def flow_from_edges(mesh: Mesh, edge_discharge: np.ndarray) -> np.ndarray:
    """Unit discharge (f, 2) of faces from the discharges (e,) of their edges, m2/s.

    Sum of outward discharge times (edge middle - face centre) over the area: exact for a uniform
    field (divergence theorem).
    """
    middle = mesh.node_xy[mesh.edge_nodes].mean(axis=1)
    out = np.zeros((mesh.n_faces, 2))
    for side, sign in ((0, 1.0), (1, -1.0)):
        face = mesh.edge_faces[:, side]
        has = face >= 0
        part = sign * edge_discharge[has, None] * (middle[has] - mesh.face_centroid[face[has]])
        np.add.at(out, face[has], part)
    return out / mesh.face_area[:, None]


def to_nodes(mesh: Mesh, values: np.ndarray, wet: np.ndarray) -> np.ndarray:
    """Node values (n, v) of face values (f, v) over wet faces (f,) bool; NaN at nodes without one.

    Exact for linear fields wherever a face has wet neighbours in two directions.
    """
    start, around = mesh.node_faces
    values = np.ascontiguousarray(values, dtype=np.float64)
    wet = np.ascontiguousarray(wet)
    slope = nodal.face_gradients(mesh.face_centroid, mesh.face_nodes, mesh.face_count, start, around, wet, values)
    return nodal.node_means(mesh.node_xy, mesh.face_centroid, start, around, wet, values, slope)


def _nodes_from_faces(mesh, node_bed, face_bed, face_depth, face_q, wet_depth_m):
    """Node depth through the level (which is smooth where the bed is not) and node unit discharge."""
    wet = face_depth > wet_depth_m
    values = np.column_stack([face_bed + face_depth, face_q])
    at_nodes = to_nodes(mesh, values, wet)
    dry = np.isnan(at_nodes[:, 0])
    depth = np.where(dry, 0.0, np.maximum(at_nodes[:, 0] - node_bed, 0.0))
    q = np.where(dry[:, None], 0.0, at_nodes[:, 1:])
    return depth, _calmed(mesh, depth, q, face_depth, face_q, wet_depth_m)


def _calmed(mesh, depth, q, face_depth, face_q, wet_depth_m):
    """Node unit discharge whose speed in shallow water is no more than that of the wet faces round it.

    Depth and flow are extrapolated to the waterline apart from each other, so their ratio may run wild
    there. Water deeper than four wet depths is left as it is.
    """
    start, around = mesh.node_faces
    speed = np.hypot(*_velocity(face_depth, face_q, wet_depth_m).T)
    fastest = np.maximum.reduceat(speed[around], start[:-1])
    flow = np.hypot(*q.T)
    shallow = (depth < 4 * wet_depth_m) & (flow > fastest * depth)
    factor = np.where(shallow, fastest * depth / np.where(flow > 0, flow, 1.0), 1.0)
    return q * factor[:, None]
