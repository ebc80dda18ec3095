"""Side calculations for a pass, from numbers that the user enters: not from the model."""

from __future__ import annotations

import math

from ..figure import Figure
from ..settings import Settings

NOT_FROM_MODEL = "not from the model"


def pool_power(discharge_m3_s: float, drop_m: float, volume_m3: float, settings: Settings | None = None) -> Figure:
    """Power dissipated in a pool by volume, W/m3: rho g Q dh / V (Larinier 2002).

    Raises ``ValueError`` for a negative discharge or drop, or a volume that is not positive.

    Examples
    --------
    A pool of 3.0 x 2.0 x 1.3 m that takes 0.25 m3/s over a drop of 0.25 m:

    >>> round(pool_power(0.25, 0.25, 3.0 * 2.0 * 1.3).value, 4)
    78.6058
    """
    _refuse(discharge=discharge_m3_s, drop=drop_m)
    if not volume_m3 > 0:
        raise ValueError(f"the pool's volume is {volume_m3:g} m3; give one above 0.")
    return _side("pool power density", _power(discharge_m3_s, drop_m, settings) / volume_m3, "W/m3")


def pool_volume(discharge_m3_s: float, drop_m: float, power_w_m3: float, settings: Settings | None = None) -> Figure:
    """Volume, m3, in which the power density stays at a value that the user enters from a local standard.

    Raises ``ValueError`` for a negative discharge or drop, or a power density that is not positive.
    """
    _refuse(discharge=discharge_m3_s, drop=drop_m)
    if not power_w_m3 > 0:
        raise ValueError(f"the power density is {power_w_m3:g} W/m3; give one above 0.")
    return _side("pool volume at the power density entered", _power(discharge_m3_s, drop_m, settings) / power_w_m3, "m3")


def jet_speed(drop_m: float, settings: Settings | None = None) -> Figure:
    """Speed of the jet through a slot or notch under a drop, m/s: sqrt(2 g dh), without loss.

    Raises ``ValueError`` for a negative drop.
    """
    _refuse(drop=drop_m)
    return _side("jet speed for a drop", math.sqrt(2 * (settings or Settings())["gravity_m_s2"] * drop_m), "m/s")


def _power(discharge_m3_s: float, drop_m: float, settings: Settings | None) -> float:
    used = settings or Settings()
    return used["density_kg_m3"] * used["gravity_m_s2"] * discharge_m3_s * drop_m


def _refuse(**values: float) -> None:
    for name, value in values.items():
        if not value >= 0:
            raise ValueError(f"the {name} is {value:g}; give 0 or more.")


def _side(quantity: str, value: float, unit: str) -> Figure:
    return Figure(quantity, value, unit, flags=(NOT_FROM_MODEL,), cautions=("screening",), note=NOT_FROM_MODEL)
