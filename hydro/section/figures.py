"""What a section measures: discharge three ways, area, levels, head, and how the flow is spread.

References
----------
.. [1] ISO 748:2021, Hydrometry: measurement of liquid flow in open channels, velocity area methods.
.. [2] Chow, V.T. 1959, Open-Channel Hydraulics: alpha and beta (ch. 2), Froude number (ch. 3).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..settings import Settings
from ..streamfunction import StreamFunction
from ..transfer import barycentric
from .cut import Section
from .error import reading_error

# Three-point Gauss rule on [0, 1]: exact for the cubes of linear depth and flow.
_AT = 0.5 + np.array([-np.sqrt(0.6), 0.0, np.sqrt(0.6)]) / 2
_WEIGHT = np.array([5.0, 8.0, 5.0]) / 18

FORMULAS = {
    "discharge_m3_s": "sum of the frame's own unit discharge across the line times the length of each piece",
    "discharge_error_m3_s": "two readings of the file compared over each face, doubled; with stepped banks a cell of flow at each",
    "discharge_psi_m3_s": "psi at the left end minus psi at the right end",
    "discharge_mid_section_m3_s": "sum of v d (b[i+1] - b[i-1]) / 2 (ISO 748)",
    "discharge_mean_section_m3_s": "sum of (v[i] + v[i+1])/2 (d[i] + d[i+1])/2 (b[i+1] - b[i]) (ISO 748)",
    "width_m": "length of the wet part of the line, T",
    "area_m2": "integral of depth over the width, A",
    "wetted_perimeter_m": "length of the bed under water, with the upright faces at its ends left out, P",
    "hydraulic_radius_m": "A / P",
    "mean_depth_m": "A / T",
    "mean_velocity_m_s": "Q / A",
    "froude": "Q/A sqrt(alpha T / (g A))",
    "alpha": "A^2 / Q^3 times the integral of v^3 over the area (depth-averaged distribution only)",
    "beta": "A / Q^2 times the integral of v^2 over the area (depth-averaged distribution only)",
    "head_m": "integral of (level + |u|^2 / 2g) q over the width, divided by Q",
    "mean_level_m": "level averaged over the wet width",
    "discharge_weighted_level_m": "integral of level times q over the width, divided by Q",
}


@dataclass(frozen=True, slots=True)
class SectionFigures:
    """Figures of one section at one time; lengths m, levels above the run's datum.

    None where the figure does not exist: no water, no flow, or no psi. Formulas in ``FORMULAS``.
    """

    discharge_m3_s: float
    discharge_error_m3_s: float
    discharge_psi_m3_s: float | None
    discharge_mid_section_m3_s: float
    discharge_mean_section_m3_s: float
    width_m: float
    area_m2: float
    wetted_perimeter_m: float
    hydraulic_radius_m: float | None
    mean_depth_m: float | None
    max_depth_m: float
    mean_velocity_m_s: float | None
    max_velocity_m_s: float
    froude: float | None
    alpha: float | None
    beta: float | None
    head_m: float | None
    mean_level_m: float | None
    discharge_weighted_level_m: float | None
    flags: tuple[str, ...]


def section_figures(section: Section, *, sf: StreamFunction | None = None, settings: Settings | None = None) -> SectionFigures:
    """Every figure of a section.

    Parameters
    ----------
    sf : StreamFunction, optional
        Of the section's frame, for the discharge by psi.
    """
    g = (settings or Settings())["gravity_m_s2"]
    s, wet = section, section.wet & (section.depth.max(axis=1) > 0)
    width, depth = s.widths[wet], s.depth[wet]
    discharge = float(s.face_flow @ s.widths)
    mid, mean = velocity_area(*verticals(section))
    top, area = float(width.sum()), float(width @ depth.mean(axis=1))
    perimeter = float(np.hypot(width, np.diff(s.bed[wet], axis=1)[:, 0]).sum())
    h, q, z, speed2 = _inside(section, wet)
    weight = width[:, None] * _WEIGHT
    v = np.where(h > 0, q / np.where(h > 0, h, 1.0), 0.0)
    across = float((weight * q).sum())
    flows = abs(across) > 1e-12
    alpha = area**2 * float((weight * h * v**3).sum()) / across**3 if flows else None
    beta = area * float((weight * h * v**2).sum()) / across**2 if flows else None
    froude = None
    if area > 0 and alpha is not None and alpha > 0:
        froude = abs(discharge) / area * float(np.sqrt(alpha * top / (g * area)))
    return SectionFigures(
        discharge, reading_error(section).total_m3_s, psi_discharge(section, sf), mid, mean, top, area, perimeter,
        area / perimeter if perimeter > 0 else None, area / top if top > 0 else None,
        float(depth.max(initial=0.0)), discharge / area if area > 0 else None, float(np.abs(v).max(initial=0.0)),
        froude, alpha, beta,
        float((weight * (z + speed2 / (2 * g)) * q).sum()) / across if flows else None,
        float((weight * z).sum()) / top if top > 0 else None,
        float((weight * z * q).sum()) / across if flows else None,
        _flags(section, q, weight),
    )


def psi_discharge(section: Section, sf: StreamFunction | None) -> float | None:
    """Discharge between the line's outermost stations on psi's domain, m3/s; None without psi there.

    psi is one value along a wall, so a line that crosses an island or a pier still gets the whole. What a link carries
    past the line is not in it: where the line crosses the link's path, the jump of psi is left out.
    """
    if sf is None or not sf.drawn:
        return None
    inside = sf.domain[section.triangle]
    if not inside.any():
        return None
    mesh, ends = sf.frame.mesh, np.flatnonzero(inside)[[0, -1]]
    corners = mesh.triangles[section.triangle[ends]]
    points = np.array([section.xy[ends[0], 0], section.xy[ends[1], 1]])
    left, right = (barycentric(mesh.node_xy, corners, points) * sf.psi[corners]).sum(axis=1)
    return float(left - right) + _past_links(section, sf)


def _past_links(section: Section, sf: StreamFunction) -> float:
    """What the corners' own jumps add along the line, m3/s."""
    triangles, jump = sf.seam
    pieces = np.flatnonzero(np.isin(section.triangle, triangles))
    if not pieces.size:
        return 0.0
    mesh, t = sf.frame.mesh, section.triangle[pieces]
    own = jump[np.searchsorted(triangles, t)]
    start, end = ((barycentric(mesh.node_xy, mesh.triangles[t], section.xy[pieces, k]) * own).sum(axis=1) for k in (0, 1))
    return float((start - end).sum())


def verticals(section: Section) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Distance from the left end (m), depth (m) and velocity across the line (m/s) at every station."""
    b = np.concatenate([section.distance[:, 0], section.distance[-1:, 1]])
    d = np.concatenate([section.depth[:, 0], section.depth[-1:, 1]])
    q = np.concatenate([section.flow[:, 0], section.flow[-1:, 1]])
    return b, d, np.where(d > 0, q / np.where(d > 0, d, 1.0), 0.0)


def velocity_area(distance: np.ndarray, depth: np.ndarray, velocity: np.ndarray) -> tuple[float, float]:
    """Discharge by the mid-section and the mean-section rule of ISO 748 [1]_, m3/s.

    Parameters
    ----------
    distance : (n,) m, growing from the left bank
    depth : (n,) m, 0 at dry verticals
    velocity : (n,) m/s, depth-averaged, across the line

    Examples
    --------
    Two panels of a canal 2 m deep flowing at 0.5 m/s over 10 m:

    >>> velocity_area(np.array([0, 5, 10.]), np.array([2, 2, 2.]), np.array([.5, .5, .5]))
    (10.0, 10.0)
    """
    b, d, v = (np.asarray(a, float) for a in (distance, depth, velocity))
    half = np.diff(b) / 2
    panel = np.concatenate([half, [0.0]]) + np.concatenate([[0.0], half])
    mid = float((v * d * panel).sum())
    mean = float(((v[:-1] + v[1:]) / 2 * (d[:-1] + d[1:]) / 2 * np.diff(b)).sum())
    return mid, mean


def shares(section: Section, cuts: np.ndarray) -> np.ndarray:
    """Share of the discharge between successive distances ``cuts`` (k + 1,) m from the left end: (k,)."""
    total = np.concatenate([[0.0], np.cumsum(section.face_flow * section.widths)])
    # Gaps (piers, islands) carry nothing: the running sum is flat across them.
    x, y = section.distance.ravel(), np.column_stack([total[:-1], total[1:]]).ravel()
    inside = np.interp(np.asarray(cuts, float), x, y, left=0.0, right=total[-1])
    return np.diff(inside) / total[-1] if total[-1] else np.full(len(cuts) - 1, np.nan)


def _inside(section: Section, wet: np.ndarray):
    """Depth, flow, level and speed squared at the Gauss points of the wet pieces, (k, 3) each."""
    frame, corners = section.frame, section.frame.mesh.triangles[section.triangle[wet]]
    share = _AT[None, :, None]
    xy = section.xy[wet][:, :1] * (1 - share) + section.xy[wet][:, 1:] * share
    w = barycentric(frame.mesh.node_xy, np.repeat(corners, 3, axis=0), xy.reshape(-1, 2)).reshape(-1, 3, 3)
    depth = np.maximum(np.einsum("kgc,kc->kg", w, frame.depth[corners]), 0.0)
    q = np.einsum("kgc,kcj->kgj", w, frame.unit_discharge[corners])
    bed = np.einsum("kgc,kc->kg", w, frame.bed[corners])
    across = np.einsum("kgj,kj->kg", q, section.normal[wet])
    carries = depth > frame.wet_depth_m
    speed2 = np.where(carries, (q**2).sum(axis=2) / np.where(carries, depth, 1.0) ** 2, 0.0)
    return depth, across, bed + depth, speed2


def _flags(section: Section, q: np.ndarray, weight: np.ndarray) -> tuple[str, ...]:
    flags = []
    forward, back = float((weight * np.maximum(q, 0)).sum()), float(-(weight * np.minimum(q, 0)).sum())
    if min(forward, back) > 0.01 * max(forward, back, 1e-300):
        flags.append("flows both ways")
    if np.count_nonzero(section.wet) < 22:
        flags.append("fewer than 22 verticals")
    return tuple(flags)
