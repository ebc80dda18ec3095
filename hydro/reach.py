"""The reach: centre line with chainage and offset, structures, openings and other lines of a review."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from pathlib import Path

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from ._kernels import polyline

REPRESENTED_AS = (
    "hole", "dry", "raised bed", "resistance", "crest edge", "slit", "link", "absent", "unknown",
)


@dataclass(frozen=True, eq=False)
class CentreLine:
    """A directed line, local metres; it alone decides left, right, upstream and downstream.

    Chainage grows downstream from 0 at the first vertex; offset is positive to the left.
    """

    points: np.ndarray

    @cached_property
    def chainages(self) -> np.ndarray:
        """(k,) chainage of each vertex, m."""
        return np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(self.points, axis=0).T))])

    @property
    def length(self) -> float:
        return float(self.chainages[-1])

    def locate(self, xy: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Chainage and offset (k,) of local points (k, 2).

        The nearest point of the line decides; beyond its ends the end segments go on, so chainage
        may be negative or above the length.
        """
        xy = np.ascontiguousarray(np.atleast_2d(np.asarray(xy, float)))
        s, n = np.zeros(len(xy)), np.zeros(len(xy))
        polyline.locate(xy, np.ascontiguousarray(self.points, dtype=np.float64), self.chainages, s, n)
        return s, n

    def at(self, chainage: np.ndarray, offset: np.ndarray | float = 0.0) -> np.ndarray:
        """Local points (k, 2) at chainage and offset, m, square to the line's segment there."""
        s = np.atleast_1d(np.asarray(chainage, float))
        i = np.clip(np.searchsorted(self.chainages, s, side="right") - 1, 0, len(self.points) - 2)
        t = np.diff(self.points, axis=0)[i] / np.diff(self.chainages)[i, None]
        normal = np.column_stack([-t[:, 1], t[:, 0]])
        along = (s - self.chainages[i])[:, None]
        return self.points[i] + along * t + np.broadcast_to(offset, s.shape)[:, None] * normal

    def direction(self, chainage: np.ndarray) -> np.ndarray:
        """Unit vectors (k, 2) downstream at chainage."""
        s = np.atleast_1d(np.asarray(chainage, float))
        i = np.clip(np.searchsorted(self.chainages, s, side="right") - 1, 0, len(self.points) - 2)
        return np.diff(self.points, axis=0)[i] / np.diff(self.chainages)[i, None]


@dataclass(frozen=True, eq=False)
class Structure:
    """A pier, weir, opening, culvert, ramp or deck with its outline or line in local metres."""

    id: str
    name: str
    kind: str
    represented_as: str
    geometry: BaseGeometry
    design: str = "both"
    levels: Mapping[str, float] = field(default_factory=dict)  # crest_m, soffit_m, road_m where known
    discharge_variable: str = ""  # for a link: the run's series that holds its discharge, from its first point to its last


@dataclass(frozen=True, eq=False)
class NamedLine:
    """A line, point or polygon with a lasting id: a section, opening, release, receptor or fish place."""

    id: str
    name: str
    geometry: BaseGeometry
    attributes: Mapping[str, object] = field(default_factory=dict)


@dataclass(frozen=True, eq=False)
class Reach:
    """What a review knows of the place, in local metres about ``origin``.

    ``layers`` holds every other layer of lines.gpkg by name (sections, openings, releases, fish,
    receptors, banks ...), each a tuple of :class:`NamedLine`.
    """

    origin: tuple[float, float]
    centre_line: CentreLine | None = None
    structures: tuple[Structure, ...] = ()
    layers: Mapping[str, tuple[NamedLine, ...]] = field(default_factory=dict)

    def structures_of(self, design: str | None) -> tuple[Structure, ...]:
        """Structures that stand in this design (all where ``design`` is None)."""
        return tuple(s for s in self.structures if design is None or s.design in ("both", design))

    def of_design(self, design: str | None) -> Reach:
        """The reach as it is in one design: structures and features of the other designs left out."""
        if not design:
            return self
        kept = {
            name: tuple(i for i in items if i.attributes.get("design", "both") in ("both", design))
            for name, items in self.layers.items()
        }
        return replace(self, structures=self.structures_of(design), layers=kept)

    def layer(self, name: str) -> tuple[NamedLine, ...]:
        """The features of a layer, empty where the review has none."""
        return self.layers.get(name, ())

    def find(self, layer: str, name: str) -> NamedLine:
        """A feature by its id or name; an unknown one lists the known ones."""
        for item in self.layer(layer):
            if name in (item.id, item.name):
                return item
        known = ", ".join(i.name for i in self.layer(layer)) or "none"
        raise ValueError(f"there is no {layer} feature called {name!r}; the review has: {known}.")


def read_lines(path: Path, origin: tuple[float, float]) -> Reach:
    """The reach in a lines.gpkg, moved to the local origin.

    Layers ``structures`` and ``structure_lines`` become structures, ``centre_line`` the centre
    line, all others stay layers by name. Raises ``ValueError`` for a file without layers, an
    unknown ``represented_as`` or a centre line of other than one part.
    """
    import geopandas
    import pyogrio

    if not Path(path).is_file():
        raise ValueError(f"{path} is not there; the review's lines are kept in it.")
    centre, structures, layers = None, [], {}
    for name, _ in pyogrio.list_layers(path):
        table = geopandas.read_file(path, layer=name)
        moved = [shapely.force_2d(shapely.transform(g, lambda c: c - origin)) for g in table.geometry]
        rows = list(zip(moved, table.drop(columns="geometry").to_dict("records"), strict=True))
        if name == "centre_line":
            centre = _centre_line(rows, path)
        elif name in ("structures", "structure_lines"):
            structures += [_structure(g, row, path) for g, row in rows]
        else:
            layers[name] = tuple(_named(g, row, name, i) for i, (g, row) in enumerate(rows))
    return Reach(origin, centre, tuple(structures), layers)


def origin_of_lines(path: Path) -> tuple[float, float] | None:
    """Local origin by :func:`hydro.mesh.default_origin` for a lines.gpkg; None where it holds nothing."""
    import pyogrio

    from .mesh import default_origin

    bounds = [pyogrio.read_info(path, layer=name)["total_bounds"] for name, _ in pyogrio.list_layers(path)]
    known = np.array([b for b in bounds if b is not None and np.isfinite(b).all()])
    return default_origin(known[:, :2]) if len(known) else None


def automatic_sections(centre_line: CentreLine, xy: np.ndarray, spacing_m: float) -> list[tuple[float, np.ndarray]]:
    """Sections square to the centre line, every ``spacing_m`` m, over the whole width of the mesh.

    Parameters
    ----------
    xy : (n, 2) array
        Local nodes of the mesh; those within half a spacing of a section set its ends.
    spacing_m : float
        Distance along the centre line, m.

    Returns
    -------
    list of (chainage, (2, 2) local points from left bank to right bank)
        None within half a spacing of the mesh's ends, where a section would leave the model.
    """
    s, n = centre_line.locate(xy)
    low, high = max(0.0, float(s.min())), min(centre_line.length, float(s.max()))
    out = []
    for chainage in np.arange(low + spacing_m / 2, high - spacing_m / 2, spacing_m):
        line = _across(centre_line, s, n, float(chainage), spacing_m / 2)
        if line is not None:
            out.append((float(chainage), line))
    return out


def section_at(centre_line: CentreLine, xy: np.ndarray, chainage: float, near_m: float) -> np.ndarray | None:
    """Line (2, 2) square to the centre line at a chainage, left bank first, over the width of the mesh.

    Nodes ``xy`` (n, 2) within ``near_m`` of the chainage set its ends; None where there are none.
    """
    return _across(centre_line, *centre_line.locate(xy), chainage, near_m)


def _across(centre_line: CentreLine, s: np.ndarray, n: np.ndarray, chainage: float, near_m: float) -> np.ndarray | None:
    near = np.abs(s - chainage) <= near_m
    if not near.any():
        return None
    return centre_line.at(np.array([chainage] * 2), np.array([float(n[near].max()) + 1.0, float(n[near].min()) - 1.0]))


def proposed_centre_line(xy: np.ndarray, axis: np.ndarray) -> CentreLine:
    """A straight centre line through points (k, 2) along ``axis`` (2,), to be confirmed by the user."""
    d = axis / np.hypot(*axis)
    middle = xy.mean(axis=0)
    along = (xy - middle) @ d
    return CentreLine(np.array([middle + along.min() * d, middle + along.max() * d]))


def _centre_line(rows: Iterable, path: Path) -> CentreLine:
    lines = [shapely.line_merge(g) for g, _ in rows]
    if len(lines) != 1 or lines[0].geom_type != "LineString":
        raise ValueError(f"layer centre_line of {path} needs exactly one line in one part; it has {len(lines)}.")
    return CentreLine(np.asarray(lines[0].coords)[:, :2].copy())


def _structure(geometry, row: Mapping, path: Path) -> Structure:
    how = row.get("represented_as") or "unknown"
    if how not in REPRESENTED_AS:
        raise ValueError(
            f"structure {row.get('name')!r} of {path} is represented_as {how!r}; say one of {', '.join(REPRESENTED_AS)}."
        )
    levels = {k: float(row[k]) for k in ("crest_m", "soffit_m", "road_m") if _given(row.get(k))}
    return Structure(
        str(row["id"]), str(row["name"]), str(row["kind"]), how, geometry, str(row.get("design") or "both"), levels,
        str(row["discharge_variable"]) if _given(row.get("discharge_variable")) else "",
    )


def _named(geometry, row: Mapping, layer: str, i: int) -> NamedLine:
    rest = {k: v for k, v in row.items() if k not in ("id", "name") and _given(v)}
    return NamedLine(str(row.get("id") or f"{layer}-{i}"), str(row.get("name") or f"{layer} {i + 1}"), geometry, rest)


def _given(value: object) -> bool:
    return value is not None and value == value
