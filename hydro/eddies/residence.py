"""How long water stays in a zone of a steady field, by a random walk with the mixing that the user states."""

from __future__ import annotations

import numpy as np

from .._kernels import stay as kernel
from ..streamfunction import StreamFunction
from .shape import triangles_round
from .survival import Residence, Stay, stay_of
from .zone import Zone

PARCELS = 1000
_SHARE = 0.02  # a step walks, and is carried, this share of the zone's radius: an absorbing edge seems 1.2 % further off


def residence(sf: StreamFunction, zone: Zone, mixing_m2_s: float, *, parcels: int = PARCELS, seed: int = 1) -> Residence:
    """Stay of water that starts spread through a zone's volume.

    Parameters
    ----------
    mixing_m2_s : float
        Coefficient K of horizontal mixing, the same everywhere; 0: closed streamlines let nothing out.

    Raises
    ------
    ValueError
        A coefficient below 0.
    """
    if mixing_m2_s == 0:
        return Residence(0.0, None)
    triangles = triangles_round(sf, zone.region.nodes)
    return Residence(
        mixing_m2_s,
        stay_inside(sf, triangles, zone.psi_edge_m3_s, zone.region.sign, zone.area_m2, mixing_m2_s, parcels=parcels, seed=seed),
    )


def stay_inside(
    sf: StreamFunction, triangles: np.ndarray, edge: float, sign: int, area_m2: float, mixing_m2_s: float, *,
    parcels: int = PARCELS, seed: int = 1,
) -> Stay:
    """Stay in the part of triangles (t,) where psi is beyond ``edge`` (above where sign is +1).

    Parcels are watched for R^2/K, R the radius of a disc of the same area; those still there are censored.
    """
    if not (np.isfinite(mixing_m2_s) and mixing_m2_s > 0):
        raise ValueError(f"mixing of {mixing_m2_s:g} m2/s lets nothing out of a steady zone; give a coefficient above 0 m2/s.")
    frame, mesh = sf.frame, sf.frame.mesh
    psi = np.full((len(mesh.triangles), 3), np.nan)
    domain = np.flatnonzero(sf.domain)
    psi[domain] = sf.corners(domain)
    inside = np.zeros(len(mesh.triangles), bool)
    inside[triangles] = True
    xy, t = _spread(sf, triangles, psi, edge, sign, parcels, seed)
    radius = float(np.sqrt(area_m2 / np.pi))
    speed = float(frame.speed[mesh.triangles[triangles]].max())
    dt = min((_SHARE * radius) ** 2 / (2 * mixing_m2_s), 2.5 * _SHARE * radius / max(speed, 1e-12))
    steps = int(np.ceil(radius**2 / mixing_m2_s / dt))
    seconds, left = np.full(parcels, steps * dt), np.zeros(parcels, bool)
    kernel.stay(
        mesh.node_xy, mesh.triangles, mesh.neighbours, psi, frame.depth, frame.wet_depth_m, inside, edge, float(sign),
        mixing_m2_s, dt, steps, seed, xy[:, 0].copy(), xy[:, 1].copy(), t, seconds, left,
    )
    return stay_of(seconds, left)


def _spread(sf: StreamFunction, triangles, psi, edge: float, sign: int, parcels: int, seed: int):
    """Points (k, 2) and their triangles, as many to every cubic metre inside the edge."""
    mesh = sf.frame.mesh
    p, h = mesh.node_xy[mesh.triangles[triangles]], sf.frame.depth[mesh.triangles[triangles]]
    one, two = p[:, 1] - p[:, 0], p[:, 2] - p[:, 0]
    weight = np.abs(one[:, 0] * two[:, 1] - one[:, 1] * two[:, 0]) * np.maximum(h.mean(axis=1), 0.0)
    beyond = (sign * (psi[triangles] - edge) > 0).any(axis=1)
    weight = np.where(beyond, weight, 0.0)
    if not weight.sum() > 0:
        raise ValueError("the zone holds no water to follow; leave it out or check its dividing level.")
    random, points, found = np.random.default_rng(seed), np.zeros((0, 2)), np.zeros(0, np.int64)
    while len(found) < parcels:
        chosen = random.choice(len(triangles), parcels, p=weight / weight.sum())
        w = random.dirichlet((1.0, 1.0, 1.0), parcels)
        keep = sign * ((w * psi[triangles[chosen]]).sum(axis=1) - edge) > 0
        points = np.vstack([points, np.einsum("ki,kij->kj", w, p[chosen])[keep]])
        found = np.concatenate([found, triangles[chosen][keep].astype(np.int64)])
    return points[:parcels], found[:parcels]
