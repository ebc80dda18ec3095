"""Unit discharge in, stream function out."""

from __future__ import annotations

import copy
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from .._kernels import p1
from ..frame import Frame
from ..reach import CentreLine, Structure
from ..settings import Settings
from . import misfit as parts
from .boundaries import OpenBoundary, open_boundaries, with_discharge
from .domain import Domain, domain_of
from .links import Link, LinkPath, corner_jumps, jump_gradient, link_paths
from .misfit import Misfit
from .solve import System
from .walls import Topology, Wall, topology_of


@dataclass(frozen=True, eq=False)
class StreamFunction:
    """The stream function of one frame.

    Attributes
    ----------
    frame : Frame
    psi : (n,) float64
        m3/s; NaN outside the domain. Facing downstream it rises towards the left bank.
    domain : (m,) bool
        Triangles that psi stands on.
    walls : tuple of Wall
    open_boundaries : tuple of OpenBoundary
        With this frame's discharge, positive in.
    inflow_m3_s, outflow_m3_s : float
        Sums over open boundaries, both positive.
    storage_m3_s : float or None
        Rate at which the stored volume grows; None where neighbouring frames are not given.
    through_discharge_m3_s : float
        Half the sum of |discharge| over open boundaries; 0 for a closed basin.
    misfit : Misfit
    triangle_misfit : (m,) float64
        Size of the unexplained unit discharge in each triangle, m2/s; 0 outside the domain.
    n_specks, thin_faces : int
        Small dry patches taken as water without flow; thin sheets kept because they carry flow.
    drawn : bool
        False where storage explains more than half of the flow, so that psi says little.
    shape : Topology
        The domain's edge, sorted.
    links : tuple of Link
        Culverts, pipes and single sources, across whose paths psi jumps; ``psi`` holds the value on the right of a
        path, :meth:`corners` the value that a triangle sees.
    links_left_out : tuple of str
        Declared links that find no water at an end in this frame, or have no discharge in it.
    """

    frame: Frame
    psi: np.ndarray
    domain: np.ndarray
    walls: tuple[Wall, ...]
    open_boundaries: tuple[OpenBoundary, ...]
    inflow_m3_s: float
    outflow_m3_s: float
    storage_m3_s: float | None
    through_discharge_m3_s: float
    misfit: Misfit
    triangle_misfit: np.ndarray
    n_specks: int
    thin_faces: int
    drawn: bool
    shape: Topology
    links: tuple[Link, ...] = ()
    links_left_out: tuple[str, ...] = ()

    @cached_property
    def seam(self) -> tuple[np.ndarray, np.ndarray]:
        """Triangles (t,) beside the links' paths, sorted, and what psi has there (t, 3) above its nodes' values, m3/s."""
        return corner_jumps(self.links)

    def corners(self, triangles: np.ndarray) -> np.ndarray:
        """psi (k, 3) at the corners of triangles (k,), as each of them sees it, m3/s."""
        beside, jump = self.seam
        values = self.psi[self.frame.mesh.triangles[triangles]]
        if beside.size:
            place = np.minimum(np.searchsorted(beside, triangles), len(beside) - 1)
            values = values + np.where((beside[place] == triangles)[:, None], jump[place], 0.0)
        return values

    def wall(self, id_: str) -> Wall:
        """The wall with this id; an unknown one lists the known ones."""
        for w in self.walls:
            if w.id == id_:
                return w
        raise ValueError(f"there is no wall {id_!r}; this frame has {', '.join(w.id for w in self.walls)}.")


class Plan:
    """What stays from frame to frame: the open boundaries, and the factors as long as the domain stays."""

    def __init__(
        self, frame: Frame, *, structures: Sequence[Structure] = (), settings: Settings | None = None,
        centre_line: CentreLine | None = None, boundary_sets: Mapping[str, np.ndarray] | None = None,
    ) -> None:
        self.settings = settings or Settings()
        self.structures, self.centre_line = tuple(structures), centre_line
        self.boundaries = open_boundaries(frame, self.settings, boundary_sets)
        self._key: bytes | None = None
        self.paths: tuple[LinkPath, ...] = ()
        self.lost: tuple[str, ...] = ()
        self.shape: Topology
        self._psi: System
        self._phi: System | None = None

    def fit(self, frame: Frame, domain: Domain, boundaries: Sequence[OpenBoundary]) -> None:
        """Sort the domain's edge anew, unless the domain is the one of the frame before."""
        key = np.packbits(domain.triangles).tobytes()
        if key == self._key:
            return
        self.shape = topology_of(frame.mesh, domain, boundaries, self.structures, self.centre_line)
        self.paths, self.lost = link_paths(frame.mesh, self.shape, self.structures)
        self._psi, self._phi, self._key = _psi_system(frame, self.shape), None, key

    def sibling(self) -> Plan:
        """A plan with the same choices and its own factors, for another reading of the same frames."""
        other = copy.copy(self)
        other._key = None
        return other

    @property
    def psi_system(self) -> System:
        return self._psi

    @property
    def phi_system(self) -> System:
        if self._phi is None:
            self._phi = parts.potential_system(self._psi.mesh, self.shape)
        return self._phi


def stream_function(
    frame: Frame,
    *,
    structures: Sequence[Structure] = (),
    settings: Settings | None = None,
    plan: Plan | None = None,
    centre_line: CentreLine | None = None,
    boundary_sets: Mapping[str, np.ndarray] | None = None,
    depth_rate: np.ndarray | None = None,
    split: bool = True,
) -> StreamFunction:
    """The stream function that fits a frame's unit discharge best.

    psi is linear in each triangle, constant on each wall, free on open boundaries, and minimises
    the sum over triangles of area * |grad psi - (-q_y, q_x)|^2; it is zero on the right bank.

    Parameters
    ----------
    frame : Frame
        An instant or a mean.
    structures : sequence of Structure
        Outlines that make a dry patch a wall however small, and that name walls.
    settings : Settings
    plan : Plan, optional
        Kept between frames of one run: fixes the open boundaries, reuses factors. The four arguments
        around it are then taken from it.
    centre_line : CentreLine, optional
        Decides which bank is the right one; else the greatest inflow does.
    boundary_sets : mapping of name to mesh edges, optional
        Open boundaries by name; else they are found from the flow.
    depth_rate : (f,) array, optional
        Rise of depth in each face, m/s, from neighbouring frames; without it the storage part of the
        misfit is not available.
    split : bool
        Split the misfit; False saves a second solution where only psi is wanted.

    Raises
    ------
    ValueError
        For maxima, and for a frame without water.

    References
    ----------
    .. [1] M. B. van Gijzen, C. B. Vreugdenhil, H. Oksuzoglu, The finite element discretization for
       stream-function problems on multiply connected domains, J. Comput. Phys. 140 (1998) 30-46.
    """
    if frame.kind == "maximum":
        raise ValueError(
            f"the frame at {frame.seconds:g} s holds maxima, which belong to different moments; they have no stream "
            "function. Choose an instant or a mean."
        )
    if plan is None:
        plan = Plan(
            frame, structures=structures, settings=settings, centre_line=centre_line, boundary_sets=boundary_sets
        )
    first = with_discharge(frame, plan.boundaries, np.ones(frame.mesh.n_triangles, bool))
    domain = domain_of(frame, _through(first), plan.settings, plan.structures)
    boundaries = with_discharge(frame, plan.boundaries, domain.triangles)
    plan.fit(frame, domain, boundaries)
    flow = _flow(frame, domain)
    links = tuple(Link(p, frame.series[p.series]) for p in plan.paths if p.series in frame.series)
    jump = _of_links(frame, links)
    psi = _solved(frame, plan, flow - jump)
    parted, rest = _split(frame, plan, flow, flow - jump, psi, depth_rate, split)
    stored = None
    if depth_rate is not None:
        held = domain.triangles[frame.mesh.face_first_triangle[:-1]]
        stored = float(np.sum((depth_rate * frame.mesh.face_area)[held]))
    discharges = np.array([b.discharge_m3_s for b in boundaries])
    walls = tuple(replace(w, psi_m3_s=float(psi[w.nodes[0]])) for w in plan.shape.walls)
    for array in (psi, rest):
        array.setflags(write=False)
    return StreamFunction(
        frame, psi, domain.triangles, walls, boundaries,
        float(discharges[discharges > 0].sum()), float(-discharges[discharges < 0].sum()), stored,
        _through(boundaries), parted, rest, domain.n_specks, domain.thin_faces,
        parted.storage is None or parted.storage <= 0.5, plan.shape, links,
        (*plan.lost, *(p.name for p in plan.paths if p.series not in frame.series)),
    )


def _through(boundaries: Sequence[OpenBoundary]) -> float:
    return 0.5 * float(sum(abs(b.discharge_m3_s) for b in boundaries))


def _flow(frame: Frame, domain: Domain) -> np.ndarray:
    """Unit discharge (m, 2) that psi is fitted to; zero in dry specks."""
    mesh = frame.mesh
    if frame.edge_discharge is not None:
        q = p1.triangle_flow_from_edges(
            mesh.node_xy, mesh.triangles, mesh.triangle_edges, mesh.triangle_face, mesh.face_first_triangle,
            mesh.edge_nodes, np.ascontiguousarray(frame.edge_discharge, dtype=np.float64),
        )
    else:
        q = frame.triangle_unit_discharge
    return np.where((domain.triangles & ~domain.specks)[:, None], q, 0.0)


def _of_links(frame: Frame, links: Sequence[Link]) -> np.ndarray:
    """Unit discharge (m, 2) that the jumps along the links' paths stand for."""
    out = np.zeros((frame.mesh.n_triangles, 2))
    triangles, jump = corner_jumps(links)
    if triangles.size:
        gradient = jump_gradient(frame.mesh, triangles, jump)
        out[triangles] = np.column_stack([gradient[:, 1], -gradient[:, 0]])
    return out


def _psi_system(frame: Frame, shape: Topology) -> System:
    """Unknowns: free nodes in mesh order, then walls; the fixed walls and nodes are zero."""
    mesh = frame.mesh
    free = (shape.part >= 0) & (shape.wall_of_node < 0)
    free[shape.fixed_nodes] = False
    n_nodes = int(np.count_nonzero(free))
    unknown = np.full(mesh.n_nodes, -1, np.int32)
    unknown[free] = np.arange(n_nodes, dtype=np.int32)
    moving = np.ones(len(shape.walls), bool)
    moving[shape.fixed_walls] = False
    number = np.where(moving, n_nodes + np.cumsum(moving) - 1, -1).astype(np.int32)
    on_wall = shape.wall_of_node >= 0
    unknown[on_wall] = number[shape.wall_of_node[on_wall]]
    return System(mesh, shape.triangles, unknown, n_nodes, n_nodes + int(np.count_nonzero(moving)))


def _solved(frame: Frame, plan: Plan, flow: np.ndarray) -> np.ndarray:
    system = plan.psi_system
    rotated = np.column_stack([-flow[:, 1], flow[:, 0]])
    psi = system.on_nodes(system.solve(system.load(rotated)))
    return np.where(plan.shape.part >= 0, psi, np.nan)


def _split(
    frame: Frame, plan: Plan, flow: np.ndarray, continuous: np.ndarray, psi: np.ndarray, depth_rate: np.ndarray | None, wanted: bool
) -> tuple[Misfit, np.ndarray]:
    """The misfit and the size of the unexplained unit discharge (m,) in each triangle.

    ``continuous`` (m, 2) is the flow without what the links' jumps stand for: what psi at the nodes is fitted to.
    """
    mesh, shape = frame.mesh, plan.shape
    gradient = p1.gradients(mesh.node_xy, mesh.triangles, shape.triangles, psi)
    rest = continuous - np.column_stack([gradient[:, 1], -gradient[:, 0]])
    rest[~shape.triangles] = 0.0
    whole = parts.norm(mesh, shape.triangles, flow)
    if whole == 0.0:
        return Misfit(0.0, None if depth_rate is None else 0.0, 0.0, 0.0), np.zeros(mesh.n_triangles)
    total = parts.norm(mesh, shape.triangles, rest) / whole
    if not wanted:
        return Misfit(total, None, 0.0, total), np.hypot(*rest.T)
    phi = plan.phi_system

    def part(load: np.ndarray) -> np.ndarray:
        return p1.gradients(mesh.node_xy, mesh.triangles, shape.triangles, phi.on_nodes(phi.solve(load)))

    stored = None
    if depth_rate is not None:
        field = part(parts.storage_load(mesh, shape, depth_rate[mesh.triangle_face], phi))
        stored = parts.norm(mesh, shape.triangles, field) / whole
        rest = rest - field
    field = part(parts.wall_load(frame, shape, phi))
    rest = rest - field
    through_walls = parts.norm(mesh, shape.triangles, field) / whole
    unexplained = parts.norm(mesh, shape.triangles, rest) / whole
    return Misfit(total, stored, through_walls, unexplained), np.hypot(*rest.T)
