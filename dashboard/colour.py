"""Colour arithmetic: sRGB, CIELAB, the CIEDE2000 difference, and ramps of equal steps."""

from __future__ import annotations

import numpy as np

_WHITE = np.array([0.95047, 1.0, 1.08883])  # D65, 2 degree observer
_TO_XYZ = np.array([
    [0.4124564, 0.3575761, 0.1804375],
    [0.2126729, 0.7151522, 0.0721750],
    [0.0193339, 0.1191920, 0.9503041],
])


def rgb(hex_colours: str | list[str]) -> np.ndarray:
    """sRGB (..., 3) from 0 to 1 of "#rrggbb"."""
    if isinstance(hex_colours, str):
        return np.array([int(hex_colours[i : i + 2], 16) for i in (1, 3, 5)]) / 255
    return np.array([rgb(c) for c in hex_colours])


def hexed(colour: np.ndarray) -> str:
    """"#rrggbb" of one sRGB colour (3,); values out of range are cut."""
    return "#" + "".join(f"{int(round(v * 255)):02x}" for v in np.clip(colour, 0, 1))


def mixed(first: str, second: str, share: float) -> str:
    """"#rrggbb" of two colours mixed in sRGB, ``share`` of the first."""
    return hexed(share * rgb(first) + (1 - share) * rgb(second))


def lab(colour: np.ndarray) -> np.ndarray:
    """CIELAB (..., 3) of sRGB (..., 3); IEC 61966-2-1 and CIE 15."""
    linear = np.where(colour <= 0.04045, colour / 12.92, ((colour + 0.055) / 1.055) ** 2.4)
    t = linear @ _TO_XYZ.T / _WHITE
    f = np.where(t > 216 / 24389, np.cbrt(t), (24389 / 27 * t + 16) / 116)
    return np.stack([116 * f[..., 1] - 16, 500 * (f[..., 0] - f[..., 1]), 200 * (f[..., 1] - f[..., 2])], axis=-1)


def from_lab(values: np.ndarray) -> np.ndarray:
    """sRGB (..., 3) of CIELAB (..., 3), cut to the gamut."""
    fy = (values[..., 0] + 16) / 116
    f = np.stack([fy + values[..., 1] / 500, fy, fy - values[..., 2] / 200], axis=-1)
    t = np.where(f**3 > 216 / 24389, f**3, (116 * f - 16) * 27 / 24389)
    linear = np.clip(t * _WHITE @ np.linalg.inv(_TO_XYZ).T, 0, 1)
    return np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)


def ciede2000(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Perceived difference of two CIELAB colours (..., 3).

    References
    ----------
    Sharma, Wu & Dalal 2005, The CIEDE2000 color-difference formula, Color Res. Appl. 30.
    """
    (l1, a1, b1), (l2, a2, b2) = np.moveaxis(first, -1, 0), np.moveaxis(second, -1, 0)
    mean_c7 = ((np.hypot(a1, b1) + np.hypot(a2, b2)) / 2) ** 7
    g = (1 - np.sqrt(mean_c7 / (mean_c7 + 25.0**7))) / 2
    a1, a2 = a1 * (1 + g), a2 * (1 + g)
    c1, c2 = np.hypot(a1, b1), np.hypot(a2, b2)
    h1, h2 = np.degrees(np.arctan2(b1, a1)) % 360, np.degrees(np.arctan2(b2, a2)) % 360
    grey = c1 * c2 == 0
    turn = np.where(grey, 0.0, (h2 - h1 + 180) % 360 - 180)
    d_hue = 2 * np.sqrt(c1 * c2) * np.sin(np.radians(turn / 2))
    hue = np.where(grey, h1 + h2, (h1 + turn / 2) % 360)
    chroma, light = (c1 + c2) / 2, (l1 + l2) / 2
    t = (
        1 - 0.17 * np.cos(np.radians(hue - 30)) + 0.24 * np.cos(np.radians(2 * hue))
        + 0.32 * np.cos(np.radians(3 * hue + 6)) - 0.20 * np.cos(np.radians(4 * hue - 63))
    )
    s_l = 1 + 0.015 * (light - 50) ** 2 / np.sqrt(20 + (light - 50) ** 2)
    s_c, s_h = 1 + 0.045 * chroma, 1 + 0.015 * chroma * t
    c7 = chroma**7
    rotation = -2 * np.sqrt(c7 / (c7 + 25.0**7)) * np.sin(np.radians(60 * np.exp(-(((hue - 275) / 25) ** 2))))
    l, c, h = (l2 - l1) / s_l, (c2 - c1) / s_c, d_hue / s_h
    return np.sqrt(l * l + c * c + h * h + rotation * c * h)


def ramp(knots: list[str], count: int) -> np.ndarray:
    """(count, 3) CIELAB: straight lines through the knots, spaced so that CIEDE2000 steps are equal."""
    corners = lab(rgb(knots))
    fine = np.linspace(0, len(knots) - 1, 2001)
    path = np.column_stack([np.interp(fine, np.arange(len(knots)), corners[:, k]) for k in range(3)])
    along = np.concatenate([[0.0], np.cumsum(ciede2000(path[:-1], path[1:]))])
    even = np.interp(np.linspace(0, along[-1], count), along, fine)
    return np.column_stack([np.interp(even, fine, path[:, k]) for k in range(3)])
