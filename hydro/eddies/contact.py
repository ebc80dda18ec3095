"""Where a zone touches a wall: the wall, the length of contact, separation and reattachment."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely

from .._kernels import regions as kernel
from ..streamfunction import StreamFunction
from .regions import Region
from .shape import Shape

_LEAD_BACK = 3.5  # triangles off the wall within which a dividing streamline counts as straight


@dataclass(frozen=True, eq=False)
class Contact:
    """A zone's contact with the wall that it leans on most.

    ``start`` and ``end`` are the outermost ends of the contact, followed with the water on the left;
    the dividing streamline leaves the wall at one and comes back at the other.
    """

    wall: int
    length_m: float
    start: np.ndarray
    end: np.ndarray
    waterline: bool


def contact_of(sf: StreamFunction, region: Region, shape: Shape, noise: float) -> Contact | None:
    """The contact of an attached zone; None for one that touches no wall.

    A zone whose dividing level differs from the wall's value by less than ``noise`` (m3/s) counts as
    attached: no flow that could be told from none passes between.
    """
    s = sf.shape
    touching = _wall_sides(sf, region, shape, noise)
    if not touching.size:
        return None
    length = _lengths(sf, touching)
    per_wall = np.bincount(s.wall_of_node[s.a[touching]], length, minlength=len(sf.walls))
    wall = int(per_wall.argmax())
    sides = np.flatnonzero((s.opening < 0) & (s.wall_of_node[s.a] == wall))
    start, end = _ends(sf, region, shape, sides, np.isin(sides, touching))
    own = touching[s.wall_of_node[s.a[touching]] == wall]
    shore = sf.frame.mesh.neighbours[s.tri[own], s.side[own]] >= 0
    return Contact(wall, float(per_wall[wall]), start, end, bool(shore.any()))


def _wall_sides(sf: StreamFunction, region: Region, shape: Shape, noise: float) -> np.ndarray:
    """Boundary sides at the zone's dividing level whose triangle reaches into the zone."""
    s, mesh = sf.shape, sf.frame.mesh
    place = np.searchsorted(shape.triangles, s.tri)
    place[place == len(shape.triangles)] = 0
    beside = np.flatnonzero((shape.triangles[place] == s.tri) & (s.opening < 0))
    far = mesh.triangles[s.tri[beside], (s.side[beside] + 2) % 3]
    at_level = np.abs(sf.psi[s.a[beside]] - region.level) <= noise
    return beside[at_level & np.isin(far, region.nodes)]


def _lengths(sf: StreamFunction, sides: np.ndarray) -> np.ndarray:
    xy, s = sf.frame.mesh.node_xy, sf.shape
    return np.hypot(*(xy[s.b[sides]] - xy[s.a[sides]]).T)


def _ends(sf: StreamFunction, region: Region, shape: Shape, sides: np.ndarray, touching: np.ndarray):
    """Both ends of the contact on one wall.

    First between the middles of sides where the shear changes sign; then led back to the wall along the
    dividing streamline, because one triangle off the wall that line has already moved along it.
    """
    xy, s = sf.frame.mesh.node_xy, sf.shape
    a, b = s.a[sides], s.b[sides]
    leaving = np.full(sf.frame.mesh.n_nodes, -1, np.int32)
    leaving[a[::-1]] = np.arange(len(sides), dtype=np.int32)[::-1]
    order, first = kernel.ordered(a, b, leaving, sf.frame.mesh.n_nodes)
    length = _lengths(sf, sides)
    # The chain that holds most of the contact; a wall that pinches may have several.
    held = np.add.reduceat((length * touching)[order], first[:-1])
    k = int(held.argmax())
    chain = order[first[k] : first[k + 1]]
    ring = a[chain[0]] == b[chain[-1]]
    chain = _opened(chain, touching[chain], length[chain]) if ring else chain
    shear = _shear(sf, region, sides)[chain]
    hit = np.flatnonzero(touching[chain])
    p, q = xy[a[chain]], xy[b[chain]]
    start, end = _turn(p, q, shear, hit[0] - 1, hit[0], ring), _turn(p, q, shear, hit[-1], hit[-1] + 1, ring)
    wall = shapely.LineString(np.vstack([p, q[-1:]]))
    outline = _outline(shape)
    own = sf.frame.mesh.triangle_area[s.tri[sides[chain[hit]]]]
    size = float(np.sqrt(own[[0, -1]].mean() * 4 / np.sqrt(3)))
    return _led_back(wall, outline[::-1], start, size), _led_back(wall, outline, end, size)


def _outline(shape: Shape) -> np.ndarray:
    """Corners of the zone's outer ring, anticlockwise, without the repeated one."""
    parts = shapely.get_parts(shape.polygon)
    greatest = parts[int(shapely.area(parts).argmax())]
    return np.asarray(shapely.geometry.polygon.orient(greatest).exterior.coords)[:-1]


def _led_back(wall: shapely.LineString, outline: np.ndarray, rough: np.ndarray, size: float) -> np.ndarray:
    """Where the free part of an outline meets the wall, by a straight line through its first points off it.

    ``outline`` runs along the wall first and then off it; ``rough`` is where it leaves, to a triangle's
    ``size``. Falls back on ``rough`` where the line is too short or would move it by more than two triangles.
    """
    off = shapely.distance(wall, shapely.points(outline))
    on_wall = np.flatnonzero(off < 1e-9 * size)
    if not on_wall.size:
        return rough
    at = on_wall[np.hypot(*(outline[on_wall] - rough).T).argmin()]
    free = np.roll(outline, -at, axis=0)[1:40]
    off = np.roll(off, -at)[1:40]
    far = np.flatnonzero(off > _LEAD_BACK * size)
    free, off = free[: far[0] if far.size else None], off[: far[0] if far.size else None]
    used = off > 0.2 * size
    if np.count_nonzero(used) < 2 or np.ptp(off[used]) < 0.5 * size:
        return rough
    along = shapely.line_locate_point(wall, shapely.points(free[used]))
    slope, foot = np.polyfit(off[used], along, 1)
    if abs(foot - shapely.line_locate_point(wall, shapely.Point(rough))) > 2 * size:
        return rough
    return np.asarray(wall.interpolate(foot).coords)[0]


def _opened(chain: np.ndarray, touching: np.ndarray, length: np.ndarray) -> np.ndarray:
    """A ring cut open in the middle of its longest stretch without contact."""
    n = len(chain)
    hit = np.flatnonzero(touching)
    if len(hit) == n:
        return chain
    travelled = np.concatenate([[0.0], np.cumsum(length)])
    after = np.roll(hit, -1)
    gap = travelled[after] - travelled[hit + 1]
    gap[-1] += travelled[-1]
    k = int(gap.argmax())
    free = (hit[k] + 1 + (after[k] - hit[k] - 1) % n // 2) % n
    return np.roll(chain, -free)


def _shear(sf: StreamFunction, region: Region, sides: np.ndarray) -> np.ndarray:
    """Rise of psi away from the wall beside each side, times the zone's sign; positive in the zone."""
    mesh, s = sf.frame.mesh, sf.shape
    far = mesh.triangles[s.tri[sides], (s.side[sides] + 2) % 3]
    height = 2 * mesh.triangle_area[s.tri[sides]] / _lengths(sf, sides)
    return region.sign * (sf.psi[far] - sf.psi[s.a[sides]]) / height


def _turn(p: np.ndarray, q: np.ndarray, shear: np.ndarray, i: int, j: int, ring: bool) -> np.ndarray:
    """Where the shear passes through zero between the middles of the sides i and j = i + 1 of a chain."""
    n = len(p)
    if i < 0 or j >= n:
        if not ring:
            return p[0] if i < 0 else q[-1]
        i, j = i % n, j % n
    if shear[i] * shear[j] >= 0:
        return q[i]
    middle_i, middle_j = (p[i] + q[i]) / 2, (p[j] + q[j]) / 2
    before, after = np.hypot(*(q[i] - middle_i)), np.hypot(*(middle_j - q[i]))
    along = (before + after) * shear[i] / (shear[i] - shear[j])
    if along <= before:
        return middle_i + (q[i] - middle_i) * along / before
    return q[i] + (middle_j - q[i]) * (along - before) / after
