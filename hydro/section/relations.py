"""One-dimensional open-channel relations, printed beside a model's figures as plausibility.

References
----------
.. [1] Chow, V.T. 1959, Open-Channel Hydraulics.
.. [2] Henderson, F.M. 1966, Open Channel Flow.
"""

from __future__ import annotations

import math

from scipy.optimize import brentq

G = 9.81
RHO = 1000.0


def manning_velocity(radius_m: float, slope: float, n: float) -> float:
    """V = R^(2/3) S^(1/2) / n, m/s [1]_.

    >>> round(manning_velocity(20 * 2 / 24, 0.001, 0.030), 5)
    1.48176
    """
    return radius_m ** (2 / 3) * math.sqrt(slope) / n


def normal_depth(discharge_m3_s: float, bottom_m: float, side_slope: float, slope: float, n: float) -> float:
    """Depth of uniform flow in a trapezoid, m; ``side_slope`` horizontal to 1 vertical [1]_."""

    def short(y: float) -> float:
        area = (bottom_m + side_slope * y) * y
        perimeter = bottom_m + 2 * y * math.sqrt(1 + side_slope**2)
        return area * manning_velocity(area / perimeter, slope, n) - discharge_m3_s

    return float(brentq(short, 1e-6, 1e3))


def critical_depth(discharge_m3_s: float, bottom_m: float, side_slope: float = 0.0, g: float = G) -> float:
    """Depth at which Q^2 T = g A^3 in a trapezoid, m [1]_."""

    def short(y: float) -> float:
        area = (bottom_m + side_slope * y) * y
        return g * area**3 - discharge_m3_s**2 * (bottom_m + 2 * side_slope * y)

    return float(brentq(short, 1e-6, 1e3))


def specific_energy(depth_m: float, unit_discharge_m2_s: float) -> float:
    """E = h + q^2 / (2 g h^2), m [2]_."""
    return depth_m + unit_discharge_m2_s**2 / (2 * G * depth_m**2)


def conjugate_depth(depth_m: float, unit_discharge_m2_s: float) -> float:
    """Depth after a hydraulic jump on a level bed, m (Belanger).

    >>> round(conjugate_depth(0.4, 2.4), 5)
    1.52504
    """
    froude = unit_discharge_m2_s / math.sqrt(G * depth_m**3)
    return depth_m * (math.sqrt(1 + 8 * froude**2) - 1) / 2


def jump_loss(before_m: float, after_m: float) -> float:
    """(h2 - h1)^3 / (4 h1 h2), m."""
    return (after_m - before_m) ** 3 / (4 * before_m * after_m)


def bend_rise(velocity_m_s: float, width_m: float, radius_m: float) -> float:
    """Rise of the surface over the whole width of a bend, V^2 W / (g R), m; subcritical flow only [1]_."""
    return velocity_m_s**2 * width_m / (G * radius_m)


def free_vortex_rise(constant_m2_s: float, inner_m: float, outer_m: float) -> float:
    """C^2/(2g) (1/ri^2 - 1/ro^2), m: the upper comparison for a bend [2]_."""
    return constant_m2_s**2 / (2 * G) * (1 / inner_m**2 - 1 / outer_m**2)


def bed_shear(velocity_m_s: float, depth_m: float, n: float) -> float:
    """tau = rho g n^2 V^2 / h^(1/3), Pa."""
    return RHO * G * n**2 * velocity_m_s**2 / depth_m ** (1 / 3)


def submergence(tailwater_m: float, conjugate_m: float) -> float:
    """(y_t - y_2) / y_2: above 0 a roller is possible below a drop. A side calculation, not read from the model."""
    return (tailwater_m - conjugate_m) / conjugate_m


def drop_toe_depth(unit_discharge_m2_s: float, drop_m: float) -> float:
    """Depth of the sheet at the toe of a drop without losses, m: h + q^2/(2 g h^2) = P + 1.5 h_c."""
    energy = drop_m + 1.5 * (unit_discharge_m2_s**2 / G) ** (1 / 3)
    critical = (unit_discharge_m2_s**2 / G) ** (1 / 3)
    return float(brentq(lambda h: specific_energy(h, unit_discharge_m2_s) - energy, 1e-6, critical))
