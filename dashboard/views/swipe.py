"""Two runs on one map: the first left of an upright divider, the second right of it."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import replace

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from ..raster import View
from .scene import Beside, LineMark, Scene, StructureMark, Tag, ZoneMark

_FAR = 1e7  # m: beyond any reach


def joined(first: Scene, second: Scene, run_id: str, x: float, shift: np.ndarray, names: tuple[str, str]) -> Scene:
    """One scene of two, each cut at the divider.

    Parameters
    ----------
    run_id : str
        The second scene's run.
    x : float
        Where the divider stands, m from the first run's origin.
    shift : (2,) m
        The second run's origin minus the first's: brings its coordinates to the first's.
    names : (left, right)
        What the runs are called at the divider.
    """
    assert first.water is not None and second.water is not None  # a question with two runs has both
    left, right = _Half(-_FAR, x), _Half(x, _FAR, shift)
    water = replace(first.water, tube_lines=(*left.lines(first.water.tube_lines), *right.lines(second.water.tube_lines)))
    return replace(
        first,
        water=water,
        beside=Beside(run_id, second.water, x, (float(shift[0]), float(shift[1])), names),
        shore=(*left.lines(first.shore), *right.lines(second.shore)),
        structures=(*left.structures(first), *right.structures(second)),
        zones=(*left.zones(first), *right.zones(second)),
        tags=(),
    )


def labelled(scene: Scene, view: View) -> Scene:
    """The divider and both names as marks of the map itself, for a drawing that is kept."""
    if scene.beside is None:
        return scene
    _, south, _, north = view.extent
    line = LineMark("crest", np.array([[scene.beside.x, south], [scene.beside.x, north]]))
    y, aside = north - 0.08 * view.height_m, 0.16 * view.width_m
    left, right = scene.beside.names
    tags = (Tag(left, (scene.beside.x - aside, y)), Tag(right, (scene.beside.x + aside, y)))
    return replace(scene, lines=(*scene.lines, line), tags=(*tags, *scene.tags))


def composed(left: np.ndarray, right: np.ndarray, view: View, water: Beside) -> np.ndarray:
    """Pictures (rows, columns) of one view joined at the divider; a column belongs where its middle lies."""
    column = int(np.clip(np.ceil((water.x - view.extent[0]) / view.step - 0.5), 0, view.columns))
    return np.hstack([left[:, :column], right[:, column:]])


class _Half:
    """The part of a scene from west to east, moved by ``shift`` first."""

    def __init__(self, west: float, east: float, shift: np.ndarray | None = None) -> None:
        self.west, self.east = west, east
        self.shift = np.zeros(2) if shift is None else np.asarray(shift, float)

    def lines(self, lines: Iterable[np.ndarray]) -> list[np.ndarray]:
        shapes = [shapely.linestrings(line + self.shift) for line in lines if len(line) > 1]
        parts = shapely.get_parts([self.cut(s) for s in shapes]) if shapes else np.empty(0, object)
        return [shapely.get_coordinates(p) for p in parts if p.geom_type == "LineString"]

    def cut(self, shape: BaseGeometry) -> BaseGeometry:
        """The part of an outline or line on this side, of its own kind only."""
        west, _, east, _ = shapely.bounds(shape)
        if west >= self.west and east <= self.east:
            return shape
        within = shapely.intersection(shape, shapely.box(self.west, -_FAR, self.east, _FAR))
        own = [p for p in shapely.get_parts(within) if shapely.get_dimensions(p) == shapely.get_dimensions(shape)]
        if len(own) == 1:
            return own[0]
        return shapely.union_all(own)

    def outline(self, shape: BaseGeometry) -> BaseGeometry:
        return self.cut(shapely.transform(shape, self._move))

    def point(self, at: np.ndarray | None) -> np.ndarray | None:
        return at + self.shift if at is not None and self.holds(at) else None

    def holds(self, at: np.ndarray) -> bool:
        return bool(self.west <= at[0] + self.shift[0] < self.east)

    def structures(self, scene: Scene) -> list[StructureMark]:
        """Cut; the name stays on the part that holds the middle."""
        out = []
        for mark in scene.structures:
            shape = self.outline(mark.shape)
            named = self.holds(shapely.get_coordinates(mark.shape.centroid)[0])
            if not shape.is_empty:
                out.append(replace(mark, shape=shape, name=mark.name if named else ""))
        return out

    def zones(self, scene: Scene) -> list[ZoneMark]:
        """Cut; the tag, the turning and the contact points stay on the part that holds them."""
        out = []
        for zone in scene.zones:
            outline = self.outline(zone.outline)
            if outline.is_empty:
                continue
            out.append(replace(
                zone, outline=outline, inner=tuple(self.lines(zone.inner)), centre=zone.centre + self.shift,
                tag=zone.tag if self.holds(zone.centre) else "", separation=self.point(zone.separation),
                reattachment=self.point(zone.reattachment),
            ))
        return out

    @property
    def _move(self) -> Callable[[np.ndarray], np.ndarray]:
        return lambda c: c + self.shift
