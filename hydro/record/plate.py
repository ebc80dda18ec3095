"""A map plate to a true scale: stream tubes, waterline, structures, zones, sections, grid, scale bar and north."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import shapely

from .._kernels import pixels
from ..contours import contour_lines
from ..figure import printed
from ..frame import Frame
from ..reach import Reach
from .model import Plate
from .svg import Drawing

SCALES = (100, 200, 250, 500, 1000, 1250, 2000, 2500, 5000, 10_000, 25_000, 50_000)
A3_MM = (390.0, 240.0)  # room for a plate on an A3 page across, margins and caption taken off
A4_MM = (170.0, 200.0)
_MARGIN = 9.0
_DOTS_PER_MM = 8.0

PAPER, GROUND, INK, INK2, SIGNAL = "#FFFFFF", "#EFE6D2", "#14232B", "#45545B", "#A8321A"
_SLOW, _MIDDLE, _FAST = (np.array(c) for c in ((225, 237, 239), (156, 195, 211), (80, 140, 171)))


@dataclass(frozen=True, slots=True)
class Window:
    """The ground a plate shows: local centre, m, scale 1:``scale``, drawing of ``size_mm``."""

    x: float
    y: float
    scale: int
    size_mm: tuple[float, float]

    @property
    def extent(self) -> tuple[float, float, float, float]:
        """Local (west, south, east, north), m."""
        w, h = (d * self.scale / 2000 for d in self.size_mm)
        return self.x - w, self.y - h, self.x + w, self.y + h

    def to_mm(self, xy: np.ndarray) -> np.ndarray:
        """Local m (k, 2) to mm on the sheet, margin included."""
        west, _, _, north = self.extent
        xy = np.asarray(xy, float)
        return np.column_stack([xy[:, 0] - west, north - xy[:, 1]]) * 1000 / self.scale + _MARGIN


def fit(bounds: tuple[float, float, float, float], room_mm: tuple[float, float], least: int = 100) -> Window:
    """The largest round scale at which local bounds (west, south, east, north) fit into the room."""
    width, height = bounds[2] - bounds[0], bounds[3] - bounds[1]
    room = (room_mm[0] - 2 * _MARGIN, room_mm[1] - 2 * _MARGIN)
    need = 1000 * max(width / room[0], height / room[1])
    scale = next((s for s in SCALES if s >= need and s >= least), SCALES[-1])
    size = (min(room[0], np.ceil(width * 1000 / scale)), min(room[1], np.ceil(height * 1000 / scale)))
    return Window((bounds[0] + bounds[2]) / 2, (bounds[1] + bounds[3]) / 2, scale, (float(size[0]), float(size[1])))


def map_plate(
    id_: str,
    title: str,
    frame: Frame,
    window: Window,
    *,
    psi: np.ndarray | None = None,
    tube_m3_s: float = 0.0,
    top_speed: float,
    reach: Reach | None = None,
    design: str | None = None,
    zones: Sequence[Any] = (),
    subject: str | None = None,
    sections: Sequence[tuple[str, np.ndarray]] = (),
    caption: str = "",
) -> Plate:
    """A plate of one frame.

    Parameters
    ----------
    psi : (n,) m3/s, NaN outside its domain, optional
        With ``tube_m3_s``, every second stream tube is drawn darker.
    top_speed : m/s
        Speed of the darkest shade: one for all plates of a record, so designs compare.
    zones : sequence of Zone
        With ``id``, ``name``, ``contour``, ``rotation``, ``area_m2`` and ``centre``.
    subject : id of the zone the text speaks of.
    sections : (name, (k, 2) local points)
    """
    sheet = Drawing(window.size_mm[0] + 2 * _MARGIN, window.size_mm[1] + 2 * _MARGIN + 12)
    _water(sheet, frame, window, psi, tube_m3_s, top_speed)
    _waterline(sheet, frame, window)
    for zone in zones:
        _zone(sheet, window, zone, zone.id == subject)
    if reach is not None:
        _structures(sheet, window, reach, design)
        _chainage(sheet, window, reach)
    for name, points in sections:
        _section(sheet, window, name, points)
    _frame(sheet, window, frame.mesh.origin)
    _legend(sheet, window, top_speed, tube_m3_s)
    return Plate(
        id_, title, sheet.svg(), sheet.width, sheet.height, _alt(title, frame, window, zones), caption, window.scale
    )


def _water(sheet: Drawing, frame: Frame, window: Window, psi, tube: float, top: float) -> None:
    mesh = frame.mesh
    columns, rows = (max(2, int(d * _DOTS_PER_MM)) for d in window.size_mm)
    west, south, _, _ = window.extent
    step = window.size_mm[0] * window.scale / 1000 / columns
    x, y = (np.ascontiguousarray(c) for c in mesh.node_xy.T)
    index = np.empty((rows, columns), np.int32)
    pixels.fill_index(x, y, mesh.triangles, pixels.bounds_of(x, y, mesh.triangles), west, south, step, index)
    painted = np.zeros((rows, columns), np.uint8)
    has_psi = psi is not None and tube > 0
    pixels.paint(
        index, x, y, mesh.triangles, west, south, step, frame.speed, top, frame.depth, frame.wet_depth_m,
        np.ascontiguousarray(psi) if has_psi else np.full(mesh.n_nodes, np.nan), tube if has_psi else 0.0,
        np.zeros(mesh.n_triangles, bool), painted,
    )
    sheet.image(_shades()[painted][::-1], _MARGIN, _MARGIN, *window.size_mm)


def _shades() -> np.ndarray:
    """(256, 3) uint8: ground, even tubes slow to fast, odd tubes the same, darker."""
    t = np.linspace(0, 1, 127)[:, None]
    ramp = np.where(t < 0.5, _SLOW + (_MIDDLE - _SLOW) * 2 * t, _MIDDLE + (_FAST - _MIDDLE) * (2 * t - 1))
    ground = np.array([[int(GROUND[i : i + 2], 16) for i in (1, 3, 5)]])
    return np.vstack([ground, ramp, ramp * 0.9, ground]).round().astype(np.uint8)


def _waterline(sheet: Drawing, frame: Frame, window: Window) -> None:
    """The waterline with the mesh's own edge: land and water are told apart without colour."""
    mesh = frame.mesh
    box = shapely.box(*window.extent)
    for line in contour_lines(mesh, frame.depth, frame.wet_depth_m, np.ones(mesh.n_triangles, bool)):
        _clipped(sheet, window, shapely.LineString(line).intersection(box), INK, 0.35)
    ends = mesh.edge_nodes[mesh.boundary_edges]
    wet = frame.wet_nodes[ends].all(axis=1)
    edges = shapely.linestrings(mesh.node_xy[ends[wet]])
    near = edges[shapely.intersects(edges, box)]
    if near.size:
        _clipped(sheet, window, shapely.line_merge(shapely.union_all(near)).intersection(box), INK, 0.35)


def _zone(sheet: Drawing, window: Window, zone: Any, is_subject: bool) -> None:
    shape = zone.contour.intersection(shapely.box(*window.extent))
    if shape.is_empty:
        return
    ink = SIGNAL if is_subject else INK
    fill = sheet.hatch(rising=zone.rotation == "clockwise", ink=ink)
    for polygon in _parts(shape, "Polygon"):
        rings = [window.to_mm(np.asarray(r.coords)) for r in (polygon.exterior, *polygon.interiors)]
        sheet.area(rings, fill=PAPER, opacity=0.62)
        sheet.area(rings, fill=fill)
        sheet.line(rings[0], ink=ink, width=0.5 if is_subject else 0.3, close=True)
    x, y = window.to_mm(np.array([zone.centre]))[0]
    sheet.text(x, y + 1, zone.id, size=3, ink=ink, anchor="middle", halo=PAPER)


def _structures(sheet: Drawing, window: Window, reach: Reach, design: str | None) -> None:
    box = shapely.box(*window.extent)
    for s in reach.structures_of(design):
        shape = s.geometry.intersection(box)
        if shape.is_empty:
            continue
        solid = s.kind == "pier" and s.represented_as in ("hole", "dry", "raised bed")
        for polygon in _parts(shape, "Polygon"):
            ring = window.to_mm(np.asarray(polygon.exterior.coords))
            sheet.line(ring, ink=INK, width=0.3, dash="" if solid else "2 1", close=True, fill=INK if solid else "none")
        for line in _parts(shape, "LineString"):
            sheet.line(window.to_mm(np.asarray(line.coords)), ink=INK, width=0.4, dash="3 1")
        corners = window.to_mm(shapely.get_coordinates(shape))
        x, y = corners[corners[:, 0].argmin()]
        name = f"{s.name}, above" if s.kind == "deck" else s.name
        sheet.text(x - 1.2, y - 0.5, name, size=2.6, ink=INK, anchor="end", halo=PAPER)


def _chainage(sheet: Drawing, window: Window, reach: Reach) -> None:
    """Marks with the chainage along the centre line, at a round step."""
    if reach.centre_line is None:
        return
    step = next(s for s in (10, 20, 50, 100, 200, 500, 1000, 10_000) if s * 1000 / window.scale >= 18)
    west, south, east, north = window.extent
    for chainage in np.arange(0, reach.centre_line.length, step):
        point = reach.centre_line.at(np.array([chainage]))
        if west < point[0, 0] < east and south < point[0, 1] < north:
            across = reach.centre_line.at(np.array([chainage] * 2), np.array([1.2, -1.2]) * window.scale / 1000)
            sheet.line(window.to_mm(across), ink=INK, width=0.25)
            x, y = window.to_mm(point)[0]
            sheet.text(x + 0.8, y - 0.8, f"{chainage:.0f} m", size=2.2, ink=INK2, halo=PAPER)


def _section(sheet: Drawing, window: Window, name: str, points: np.ndarray) -> None:
    shape = shapely.LineString(points).intersection(shapely.box(*window.extent))
    _clipped(sheet, window, shape, PAPER, 0.9)
    for line in _parts(shape, "LineString"):
        mm = window.to_mm(np.asarray(line.coords))
        sheet.line(mm, ink=INK, width=0.45, dash="4 1 0.6 1")
        sheet.text(mm[0, 0], mm[0, 1] - 1, f"{name}, left", size=2.4, ink=INK, anchor="middle", halo=PAPER)


def _frame(sheet: Drawing, window: Window, origin: tuple[float, float]) -> None:
    """Border with ticks and world coordinates, scale bar and north."""
    w, h = window.size_mm
    m = _MARGIN
    sheet.line(np.array([[m, m], [m + w, m], [m + w, m + h], [m, m + h]]), ink=INK, width=0.4, close=True)
    west, south, east, north = window.extent
    step = next(s for s in (10, 20, 50, 100, 200, 500, 1000, 10_000) if s * 1000 / window.scale >= 25)
    for world in np.arange(np.ceil((west + origin[0]) / step) * step, east + origin[0], step):
        x = (world - origin[0] - west) * 1000 / window.scale + m
        sheet.line(np.array([[x, m + h], [x, m + h - 1.5]]), ink=INK, width=0.25)
        sheet.text(x, m + h + 3, f"{world:.0f} E", size=2.2, ink=INK2, anchor="middle")
    for world in np.arange(np.ceil((south + origin[1]) / step) * step, north + origin[1], step):
        y = (north - (world - origin[1])) * 1000 / window.scale + m
        sheet.line(np.array([[m, y], [m + 1.5, y]]), ink=INK, width=0.25)
        sheet.text(m + 2, y - 0.5, f"{world:.0f} N", size=2.2, ink=INK2, halo=PAPER)
    x, y = m + w - 5, m + 12
    sheet.line(np.array([[x, y], [x, y - 8]]), ink=INK, width=0.5)
    sheet.line(np.array([[x - 1.2, y - 5.5], [x, y - 8], [x + 1.2, y - 5.5]]), ink=INK, width=0.5)
    sheet.text(x, y + 3, "N", size=3, ink=INK, anchor="middle", halo=PAPER)


def scale_bar_mm(scale: int) -> tuple[float, float]:
    """Length of the scale bar: m on the ground, mm on the sheet; a round length of 25 to 60 mm."""
    ground = next(g for g in (2, 5, 10, 20, 50, 100, 200, 500, 1000, 2000) if g * 1000 / scale >= 25)
    return float(ground), ground * 1000 / scale


def _legend(sheet: Drawing, window: Window, top: float, tube: float) -> None:
    m, y = _MARGIN, _MARGIN + window.size_mm[1] + 7
    ground, bar = scale_bar_mm(window.scale)
    for k, fill in enumerate((INK, PAPER)):
        x = m + k * bar / 2
        box = np.array([[x, y], [x + bar / 2, y], [x + bar / 2, y + 1.6], [x, y + 1.6]])
        sheet.line(box, ink=INK, width=0.2, close=True, fill=fill)
    sheet.text(m, y + 5, "0", size=2.4, ink=INK)
    sheet.text(m + bar, y + 5, f"{ground:g} m", size=2.4, ink=INK, anchor="middle")
    sheet.text(m + bar + 10, y + 1.6, f"1:{window.scale}", size=3, ink=INK)
    x = m + bar + 30
    ramp = np.repeat(_shades()[1:128][None], 12, axis=0)
    sheet.image(ramp, x, y, 30, 2.4)
    sheet.text(x, y + 5, "0", size=2.4, ink=INK)
    sheet.text(x + 30, y + 5, f"{top:g} m/s", size=2.4, ink=INK, anchor="end")
    words = f"stream tubes of {printed(tube)} m3/s, every second one darker" if tube > 0 else "speed, no stream tubes"
    sheet.text(x + 34, y + 2, words, size=2.4, ink=INK)
    sheet.text(x + 34, y + 5, "eddies hatched: rising to the right turns clockwise seen from above", size=2.4, ink=INK)


def _clipped(sheet: Drawing, window: Window, shape: Any, ink: str, width: float) -> None:
    for line in _parts(shape, "LineString"):
        sheet.line(window.to_mm(np.asarray(line.coords)), ink=ink, width=width)


def _parts(shape: Any, kind: str) -> list[Any]:
    return [g for g in shapely.get_parts(shape) if g.geom_type == kind and not g.is_empty]


def _alt(title: str, frame: Frame, window: Window, zones: Sequence[Any]) -> str:
    west, south, east, north = window.extent
    x, y = frame.mesh.node_xy.T
    seen = (x >= west) & (x <= east) & (y >= south) & (y <= north) & frame.wet_nodes
    fastest = float(frame.speed[seen].max()) if seen.any() else 0.0
    box = shapely.box(*window.extent)
    inside = [z for z in zones if z.contour.intersects(box)]
    text = f"{title}. Map at 1:{window.scale}; the greatest speed shown is {fastest:.2f} m/s."
    if inside:
        largest = max(inside, key=lambda z: z.area_m2)
        text += f" {len(inside)} recirculation zones; the largest, {largest.name}, covers {largest.area_m2:.0f} m2."
    return text
