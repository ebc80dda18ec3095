"""A structure's wake: width, approach flow, length over width, shallow-wake number, expected period."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..settings import Settings
from ..streamfunction import StreamFunction
from .outer import mean_flow


@dataclass(frozen=True, slots=True)
class Wake:
    """The flow that a structure meets and the wake that it leaves.

    Attributes
    ----------
    structure_width_m : float
        Extent normal to the mean unit discharge in a strip two widths upstream.
    approach_speed_m_s, approach_depth_m : float
        Means over that strip.
    length_m : float or None
        From the structure's rear to where the wake closes, along the approach flow.
    length_over_width : float or None
    expected_period_s : float
        Width over (Strouhal number times approach speed).
    shallow_number, shallow_number_doubled : float or None
        c_f W / h with tau = c_f rho U^2, and with tau = c_f rho U^2 / 2 (twice as large); both conventions are
        in use and classes differ between them, so no class is named. None without a roughness.
    """

    structure_width_m: float
    approach_speed_m_s: float
    approach_depth_m: float
    length_m: float | None
    length_over_width: float | None
    expected_period_s: float
    shallow_number: float | None
    shallow_number_doubled: float | None


def wake_of(
    sf: StreamFunction, outline: np.ndarray, along: np.ndarray, closing: np.ndarray | None, in_zones: np.ndarray,
    settings: Settings, roughness: np.ndarray | None = None,
) -> Wake | None:
    """The wake of a structure with the given outline points (k, 2), local m.

    Parameters
    ----------
    along : (2,) unit vector to start from: the zone's outer flow.
    closing : (2,) or None
        Where the wake closes.
    in_zones : (m,) bool
        Triangles of zones, left out of the approach flow.
    roughness : (f,) array or None
        Manning's n, s/m^(1/3).

    Returns
    -------
    Wake or None
        None where no water comes from upstream.

    References
    ----------
    .. [1] D. Chen, G. H. Jirka, Experimental study of plane turbulent wakes in a shallow water layer, Fluid
       Dyn. Res. 16 (1995) 11-41.
    """
    mesh = sf.frame.mesh
    width, strip = 0.0, np.zeros(0, bool)
    for _ in range(2):  # the width needs the direction, the direction a strip two widths long
        across = np.array([-along[1], along[0]])
        width = float(np.ptp(outline @ across))
        strip = _strip(sf, outline, along, across, width) & ~in_zones
        q, _ = mean_flow(sf, strip)
        if not np.hypot(*q) > 0:
            return None
        along = q / np.hypot(*q)
    across = np.array([-along[1], along[0]])
    width = float(np.ptp(outline @ across))
    faces = mesh.triangle_face[strip]
    area = mesh.triangle_area[strip]
    depth = float(area @ sf.frame.face_depth[faces] / area.sum())
    speed = float(np.hypot(*mean_flow(sf, strip)[0])) / depth
    length = None if closing is None else float(closing @ along - (outline @ along).max())
    number = None
    if roughness is not None:
        n = float(area @ roughness[faces] / area.sum())
        number = settings["gravity_m_s2"] * n * n / depth ** (1 / 3) * width / depth
    return Wake(
        width, speed, depth, length, None if length is None else length / width,
        width / (settings["strouhal"] * speed), number, None if number is None else 2 * number,
    )


def _strip(sf: StreamFunction, outline: np.ndarray, along: np.ndarray, across: np.ndarray, width: float) -> np.ndarray:
    """Triangles (m,) bool of the domain as wide as the structure, up to two widths upstream of it."""
    centre = sf.frame.mesh.triangle_centroid
    s, n = centre @ along, centre @ across
    front, middle = (outline @ along).min(), ((outline @ across).min() + (outline @ across).max()) / 2
    return sf.domain & (s < front) & (s > front - 2 * width) & (np.abs(n - middle) < width / 2)
