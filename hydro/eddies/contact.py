"""Where a zone touches a wall: the wall, the length of contact, separation and reattachment."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .._kernels import regions as kernel
from ..streamfunction import StreamFunction
from .regions import Region
from .shape import Shape


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


def contact_of(sf: StreamFunction, region: Region, shape: Shape) -> Contact | None:
    """The contact of an attached zone; None for one that touches no wall at its dividing level."""
    s = sf.shape
    touching = _wall_sides(sf, region, shape)
    if not touching.size:
        return None
    length = _lengths(sf, touching)
    per_wall = np.bincount(s.wall_of_node[s.a[touching]], length, minlength=len(sf.walls))
    wall = int(per_wall.argmax())
    sides = np.flatnonzero((s.opening < 0) & (s.wall_of_node[s.a] == wall))
    start, end = _ends(sf, region, sides, np.isin(sides, touching))
    own = touching[s.wall_of_node[s.a[touching]] == wall]
    shore = sf.frame.mesh.neighbours[s.tri[own], s.side[own]] >= 0
    return Contact(wall, float(per_wall[wall]), start, end, bool(shore.any()))


def _wall_sides(sf: StreamFunction, region: Region, shape: Shape) -> np.ndarray:
    """Boundary sides whose triangle lies in the zone and whose wall has the zone's dividing level."""
    s = sf.shape
    place = np.searchsorted(shape.triangles, s.tri)
    place[place == len(shape.triangles)] = 0
    held = (shape.triangles[place] == s.tri) & (s.opening < 0)
    return np.flatnonzero(held & (sf.psi[s.a] == region.level) & (sf.psi[s.b] == region.level))


def _lengths(sf: StreamFunction, sides: np.ndarray) -> np.ndarray:
    xy, s = sf.frame.mesh.node_xy, sf.shape
    return np.hypot(*(xy[s.b[sides]] - xy[s.a[sides]]).T)


def _ends(sf: StreamFunction, region: Region, sides: np.ndarray, touching: np.ndarray):
    """Both ends of the contact on one wall, between the middles of sides where the shear changes sign."""
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
    return _turn(p, q, shear, hit[0] - 1, hit[0], ring), _turn(p, q, shear, hit[-1], hit[-1] + 1, ring)


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
    return region.sign * (sf.psi[far] - region.level) / height


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
