"""Travelling eddies: coherent cores of swirl without a closed streamline, seen by an observer who moves with them.

References
----------
.. [1] Zhou, J., Adrian, R.J., Balachandar, S. and Kendall, T.M. 1999, Mechanisms for generating coherent packets of hairpin
   vortices in channel flow, J. Fluid Mech. 387, 353-396: swirling strength, the imaginary part of the velocity gradient's
   complex eigenvalues.
"""

from __future__ import annotations

import heapq
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import shapely
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.sparse.linalg import spsolve

from ..frame import Frame
from ..settings import Settings
from ..streamfunction import StreamFunction
from ..transfer import barycentric
from .regions import Region
from .shape import shape_of
from .zone import Zone

_HALF = 0.5  # share of the swirl's peak down to which a core reaches
_GOES_WITH = 0.5  # least speed of a core as a share of the water's round it
_TURNS = 0.1  # least speed round the core, as a share of the frame's own speed
_MOST_PEAKS = 60
_CLEAR = 2.0  # radius, in core radii, of the circle round a core that must lie in the water
_LEAST = 24  # triangles without which a window tells nothing
_WINDOW = 4.0  # radius of the window in core radii
_RING = np.linspace(0, 2 * np.pi, 64, endpoint=False)
_FAINT = 1e-4  # share of the through-discharge under which a region is not told from none
_CORE_ONLY = 0.5  # misfit of the moving view beyond which only the core is told


@dataclass(frozen=True, eq=False)
class Core:
    """A coherent core of swirl in one frame; local m.

    ``radius_m`` is that of the circle as large as the region where the swirl exceeds half its peak; ``drift`` (2,) m/s is
    the mean velocity on that circle, ``circulation_m2_s`` that round it (positive anticlockwise).
    """

    centre: np.ndarray
    swirl_1_s: float
    radius_m: float
    drift: np.ndarray
    circulation_m2_s: float
    nodes: np.ndarray

    @property
    def rotation(self) -> str:
        """"clockwise" or "anticlockwise", seen from above."""
        return "anticlockwise" if self.circulation_m2_s > 0 else "clockwise"


@dataclass(frozen=True, eq=False)
class Traveller:
    """A travelling eddy of one frame.

    Attributes
    ----------
    id : str
        T1, T2 ...; lasting once followed in time.
    core : Core
    speed : (2,) float64
        m/s; of the core between this frame and the next, or assumed.
    speed_from : "matched cores" or "assumed: the water's mean round the core"
    misfit : float
        Of psi in the view that moves with it, as a ratio of norms.
    area_m2, recirculating_discharge_m3_s : float or None
        Of its closed region in that view; None where only the core is told.
    contour : shapely Polygon or MultiPolygon or None
    """

    id: str
    core: Core
    speed: np.ndarray
    speed_from: str
    misfit: float
    area_m2: float | None
    recirculating_discharge_m3_s: float | None
    contour: shapely.Polygon | shapely.MultiPolygon | None

    @property
    def core_only(self) -> bool:
        """True where the moving view tells no closed region."""
        return self.contour is None


def swirl_cores(frame: Frame, domain: np.ndarray, settings: Settings | None = None) -> list[Core]:
    """Coherent cores of swirl in a frame, the strongest first.

    A core is a local peak of the swirling strength [1]_ with the region round it above half of the peak, of one sense,
    off the walls, at least ``zone_triangles_across`` wide, round which the water turns at a tenth of the frame's speed.

    Parameters
    ----------
    domain : (m,) bool
        Triangles that carry water.
    """
    settings = settings or Settings()
    mesh = frame.mesh
    swirl = _swirl(frame, domain)
    size = np.abs(swirl)
    wet = frame.wet_nodes & (size > 0)
    if not wet.any():
        return []
    flow = float(np.sqrt(np.mean(frame.speed[frame.wet_nodes] ** 2)))
    graph = mesh.node_graph
    peaks = wet & (size >= _neighbourhood_max(graph, size))
    order = np.flatnonzero(peaks)
    order = order[np.argsort(-size[order], kind="stable")][:_MOST_PEAKS]
    area = np.bincount(mesh.triangles[domain].ravel(), np.repeat(mesh.triangle_area[domain] / 3, 3), minlength=mesh.n_nodes)
    edge_nodes = np.zeros(mesh.n_nodes, bool)
    edge_nodes[np.unique(mesh.edge_nodes[mesh.boundary_edges])] = True
    taken = np.zeros(mesh.n_nodes, bool)
    found: list[Core] = []
    for peak in order:
        if taken[peak]:
            continue
        nodes = _round(graph, int(peak), (swirl * np.sign(swirl[peak]) >= _HALF * size[peak]) & wet)
        taken[nodes] = True
        radius = float(np.sqrt(area[nodes].sum() / np.pi))
        if edge_nodes[nodes].any() or not _wide(mesh, nodes, radius, settings["zone_triangles_across"]):
            continue
        core = _core(frame, domain, nodes, swirl, radius)
        if core is None or abs(core.circulation_m2_s) / (2 * np.pi * radius) < _TURNS * flow:
            continue
        if all(np.hypot(*(core.centre - c.centre)) > core.radius_m + c.radius_m for c in found):  # else part of a stronger one
            found.append(core)
    return found


def travelling_eddies(
    sf: StreamFunction, zones: Sequence[Zone], cores: Sequence[Core], *, later: Sequence[Core] = (), gap_s: float = 0.0,
) -> tuple[Traveller, ...]:
    """Cores that no zone of the fixed frame holds, in the view that moves with each.

    Parameters
    ----------
    cores : of this frame
    later : of a neighbouring frame, ``gap_s`` after this one (negative: before)
    """
    held = np.zeros(sf.frame.mesh.n_nodes, bool)
    for zone in zones:
        held[zone.region.nodes] = True
    made: list[Traveller] = []
    for core in cores:
        if held[core.nodes].any():
            continue
        other = matched(core, later, gap_s)
        speed = core.drift if other is None else (other.centre - core.centre) / gap_s
        if np.hypot(*speed) < _GOES_WITH * np.hypot(*core.drift):
            continue  # swirl that stands at a corner does not travel
        how = "matched cores" if other is not None else "assumed: the water's mean round the core"
        made.append(Traveller(f"T{len(made) + 1}", core, speed, how, *_in_its_view(sf, core, speed)))
    return tuple(made)


def matched(core: Core, later: Sequence[Core], gap_s: float) -> Core | None:
    """The core of another frame that this one has become: of the same sense, nearest to where the water takes it."""
    if not gap_s:
        return None
    expected = core.centre + core.drift * gap_s
    within = max(2 * core.radius_m, 0.5 * float(np.hypot(*core.drift)) * abs(gap_s))
    near = [(float(np.hypot(*(c.centre - expected))), k) for k, c in enumerate(later) if c.rotation == core.rotation]
    best = min(near, default=(np.inf, -1))
    return later[best[1]] if best[0] <= within else None


def _swirl(frame: Frame, domain: np.ndarray) -> np.ndarray:
    """Swirling strength (n,) at nodes, 1/s, with the sign of the vorticity."""
    mesh, use = frame.mesh, np.flatnonzero(domain)
    corners = mesh.triangles[use]
    a, b, c = (mesh.node_xy[corners[:, k]] for k in range(3))
    twice = 2 * mesh.triangle_area[use]
    along_x = np.stack([(b - c)[:, 1], (c - a)[:, 1], (a - b)[:, 1]], axis=1) / twice[:, None]
    along_y = np.stack([(c - b)[:, 0], (a - c)[:, 0], (b - a)[:, 0]], axis=1) / twice[:, None]
    u, v = (frame.velocity[corners][:, :, k] for k in range(2))
    ux, uy, vx, vy = ((w * g).sum(axis=1) for w, g in ((u, along_x), (u, along_y), (v, along_x), (v, along_y)))
    turning = -(((ux - vy) / 2) ** 2 + uy * vx)
    strength = np.sqrt(np.maximum(turning, 0.0)) * np.sign(vx - uy)
    weight = np.repeat(twice / 6, 3)
    total = np.bincount(corners.ravel(), weight, minlength=mesh.n_nodes)
    summed = np.bincount(corners.ravel(), weight * np.repeat(strength, 3), minlength=mesh.n_nodes)
    return np.divide(summed, total, out=np.zeros(mesh.n_nodes), where=total > 0)


def _neighbourhood_max(graph, values: np.ndarray) -> np.ndarray:
    """Greatest value (n,) of each node and its neighbours."""
    return np.maximum.reduceat(values[graph.indices], graph.indptr[:-1])


def _round(graph, start: int, allowed: np.ndarray) -> np.ndarray:
    """Allowed nodes connected with ``start``, sorted."""
    seen, waiting = {int(start)}, [int(start)]
    while waiting:
        node = waiting.pop()
        for other in graph.indices[graph.indptr[node] : graph.indptr[node + 1]]:
            if allowed[other] and int(other) not in seen:
                seen.add(int(other))
                waiting.append(int(other))
    return np.array(sorted(seen), np.int32)


def _wide(mesh, nodes: np.ndarray, radius: float, across: float) -> bool:
    """Whether a region is so many triangles wide, by its area and its count of nodes (each stands for half a triangle's)."""
    spacing = radius * np.sqrt(np.pi / max(len(nodes), 1))
    return 2 * radius >= across * spacing


def _core(frame: Frame, domain: np.ndarray, nodes: np.ndarray, swirl: np.ndarray, radius: float) -> Core | None:
    """The core of a region; None where the circle round it leaves the water."""
    mesh, weight = frame.mesh, np.abs(swirl[nodes])
    centre = weight @ mesh.node_xy[nodes] / weight.sum()
    out = np.column_stack([np.cos(_RING), np.sin(_RING)])
    clear = mesh.find(centre + _CLEAR * radius * out)
    if (clear < 0).any() or not domain[clear].all():
        return None
    ring = centre + radius * out
    t = mesh.find(ring)
    corners = mesh.triangles[t]
    u = np.einsum("kc,kcd->kd", barycentric(mesh.node_xy, corners, ring), frame.velocity[corners])
    tangent = np.column_stack([-out[:, 1], out[:, 0]])
    circulation = 2 * np.pi * radius * float((u * tangent).sum(axis=1).mean())
    return Core(centre, float(weight.max()), radius, u.mean(axis=0), circulation, nodes)


def _in_its_view(sf: StreamFunction, core: Core, speed: np.ndarray):
    """Misfit of psi in the moving view, and area, recirculating discharge and contour of the closed region there."""
    mesh = sf.frame.mesh
    near = np.hypot(*(mesh.node_xy - core.centre).T) < _WINDOW * core.radius_m
    window = _connected(mesh, np.flatnonzero(sf.domain & near[mesh.triangles].all(axis=1)), core)
    flow = sf.frame.triangle_unit_discharge[window] - sf.frame.face_depth[mesh.triangle_face[window]][:, None] * speed
    if len(window) < _LEAST:
        return 1.0, None, None, None
    psi, misfit = _fitted(sf, window, flow)
    nothing = misfit, None, None, None
    if misfit > _CORE_ONLY:
        return nothing
    region = _closed(sf, window, psi, core)
    if region is None or abs(psi[region.peak] - region.level) < _FAINT * sf.through_discharge_m3_s:
        return nothing
    inside = np.zeros(mesh.n_triangles, bool)
    inside[window] = True
    shape = shape_of(replace(sf, psi=psi, domain=inside, links=()), region)
    if not shape.area_m2 > 0:
        return nothing
    return misfit, shape.area_m2, float(abs(psi[region.peak] - region.level)), shape.polygon


def _connected(mesh, window: np.ndarray, core: Core) -> np.ndarray:
    """The triangles of a window that hang together with the core: a far bank's water in it is another."""
    nodes, corners = np.unique(mesh.triangles[window], return_inverse=True)
    corners = corners.reshape(-1, 3)
    links = coo_array((np.ones(2 * len(corners)), (np.tile(corners[:, 0], 2), corners[:, 1:].T.ravel())), shape=(len(nodes),) * 2)
    _, part = connected_components(links, directed=False)
    own = part[np.searchsorted(nodes, np.intersect1d(nodes, core.nodes)[:1])]
    return window[part[corners[:, 0]] == own] if own.size else window[:0]


def _fitted(sf: StreamFunction, window: np.ndarray, flow: np.ndarray) -> tuple[np.ndarray, float]:
    """psi (n,) of the moving view, free on the window's edge, NaN outside; and its misfit."""
    mesh = sf.frame.mesh
    nodes, corners = np.unique(mesh.triangles[window], return_inverse=True)
    corners = corners.reshape(-1, 3)
    a, b, c = (mesh.node_xy[mesh.triangles[window, k]] for k in range(3))
    area = mesh.triangle_area[window]
    gx = np.stack([(b - c)[:, 1], (c - a)[:, 1], (a - b)[:, 1]], axis=1) / (2 * area[:, None])
    gy = np.stack([(c - b)[:, 0], (a - c)[:, 0], (b - a)[:, 0]], axis=1) / (2 * area[:, None])
    stiff = area[:, None, None] * (gx[:, :, None] * gx[:, None, :] + gy[:, :, None] * gy[:, None, :])
    rows, columns = np.repeat(corners, 3, axis=1).ravel(), np.tile(corners, (1, 3)).ravel()
    matrix = coo_array((stiff.ravel(), (rows, columns)), shape=(len(nodes),) * 2).tocsr()
    load = area[:, None] * (-flow[:, 1:] * gx + flow[:, :1] * gy)
    right = np.bincount(corners.ravel(), load.ravel(), minlength=len(nodes))
    own = np.zeros(len(nodes))
    own[1:] = spsolve(matrix[1:, 1:].tocsc(), right[1:])
    psi = np.full(mesh.n_nodes, np.nan)
    psi[nodes] = own
    rest = flow - np.column_stack([(own[corners] * gy).sum(axis=1), -(own[corners] * gx).sum(axis=1)])
    whole = float(area @ (flow**2).sum(axis=1))
    return psi, float(np.sqrt(area @ (rest**2).sum(axis=1) / whole)) if whole > 0 else 0.0


def _closed(sf: StreamFunction, window: np.ndarray, psi: np.ndarray, core: Core) -> Region | None:
    """The region round the core's extremum up to the level at which it meets the window's edge; None where it has none."""
    mesh, sign = sf.frame.mesh, 1 if core.circulation_m2_s > 0 else -1
    inside = np.zeros(mesh.n_triangles, bool)
    inside[window] = True
    beside = mesh.neighbours[window]
    tri, side = np.nonzero((beside < 0) | ~inside[np.maximum(beside, 0)])
    rim = np.zeros(mesh.n_nodes, bool)
    rim[mesh.triangles[window[tri], side]] = rim[mesh.triangles[window[tri], (side + 1) % 3]] = True
    known = np.isfinite(psi)
    own = core.nodes[known[core.nodes] & ~rim[core.nodes]]
    if not own.size:
        return None
    peak = int(own[np.argmax(sign * psi[own])])
    graph, level = mesh.node_graph, sign * psi[peak]
    waiting, seen, kept = [(-level, peak)], {peak}, []
    while waiting:
        low, node = heapq.heappop(waiting)
        level = min(level, -low)
        if rim[node]:
            break
        kept.append(node)
        for other in graph.indices[graph.indptr[node] : graph.indptr[node + 1]]:
            if known[other] and int(other) not in seen:
                seen.add(int(other))
                heapq.heappush(waiting, (-sign * psi[other], int(other)))
    nodes = np.array(sorted(n for n in kept if sign * psi[n] > level), np.int32)
    if len(nodes) < 3:
        return None
    return Region(sign, peak, sign * level, node, nodes, np.array([peak], np.int32))
