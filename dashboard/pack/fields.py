"""The water as numbers for the page: the mesh once, and each frame's field in whole numbers.

The page's coordinates are m from the mesh's south-west corner, so that single precision is enough.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import shapely

from hydro.frame import Frame
from hydro.mesh import Mesh
from hydro.streamfunction import OpenBoundary, StreamFunction
from hydro.tracks import open_sides

from .items import quantised, signed

Arrays = dict[str, np.ndarray]


def corner(mesh: Mesh) -> np.ndarray:
    """Local (x, y) of the page's origin, m."""
    return np.array(mesh.bounds[:2])


def mesh_arrays(mesh: Mesh, boundaries: Sequence[OpenBoundary]) -> Arrays:
    """Nodes (m from the corner), triangles, and the sides where water may leave, as 3 * triangle + side."""
    xy = (mesh.node_xy - corner(mesh)).astype(np.float32)
    whole = np.uint16 if mesh.n_nodes <= 65536 else np.uint32
    return {
        "x": xy[:, 0], "y": xy[:, 1], "triangles": mesh.triangles.astype(whole),
        "open": np.flatnonzero(open_sides(mesh, tuple(boundaries))).astype(np.uint32),
    }


def frame_arrays(frame: Frame, sf: StreamFunction | None) -> tuple[dict[str, Any], Arrays]:
    """One frame's field at nodes: unit discharge, depth and, where there is one, psi with its domain.

    Returns what the whole numbers are worth, and the arrays.
    """
    depth = quantised(np.append(frame.depth, 0.0))  # 0 is one of the values: dry stays dry
    across, up = signed(frame.unit_discharge[:, 0]), signed(frame.unit_discharge[:, 1])
    scale: dict[str, Any] = {"h": [depth.low, depth.step], "qx": across.step, "qy": up.step}
    arrays = {"h": depth.numbers[:-1], "qx": across.numbers, "qy": up.numbers}
    if sf is not None:
        psi = quantised(np.nan_to_num(sf.psi))
        scale["psi"] = [psi.low, psi.step]
        arrays |= {"psi": psi.numbers, "domain": np.packbits(sf.domain, bitorder="little")}
    return scale, arrays


def line_arrays(lines: Sequence[np.ndarray], mesh: Mesh, name: str) -> tuple[float, Arrays]:
    """Lines (k, 2), local m, as whole numbers of a step (m, returned) from the corner, with their lengths."""
    west, south, east, north = mesh.bounds
    step = max(east - west, north - south) / 65535
    points = np.vstack([np.empty((0, 2)), *lines]) - corner(mesh)
    numbers = np.round(np.clip(points / step, 0, 65535)).astype(np.uint16)
    return step, {
        f"{name}_x": numbers[:, 0], f"{name}_y": numbers[:, 1],
        f"{name}_n": np.array([len(line) for line in lines], np.uint32),
    }


def ring_lists(shape: shapely.Geometry, mesh: Mesh) -> list[list[list[float]]]:
    """Outlines of polygons and lines as [[x, y], ...] to the centimetre, m from the corner."""
    out = []
    for part in shapely.get_parts(shape):
        rings = [part.exterior, *part.interiors] if part.geom_type == "Polygon" else [part]
        out += [point_list(np.asarray(r.coords)[:, :2], mesh) for r in rings if not r.is_empty]
    return out


def point_list(points: np.ndarray, mesh: Mesh) -> list[list[float]]:
    """Local points (k, 2) as [[x, y], ...] to the centimetre, m from the corner."""
    return np.round(np.asarray(points, float).reshape(-1, 2) - corner(mesh), 2).tolist()
