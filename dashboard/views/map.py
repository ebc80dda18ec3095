"""The map's grammar: how each thing of a scene is drawn, back to front."""

from __future__ import annotations

import numpy as np
import shapely

from ..raster import View
from ..theme import Look
from . import strokes, tags
from .scene import AreaMark, LineMark, LogsMark, Name, PointMark, Scene, StructureMark, Tag, ZoneMark
from .sheet import Sheet

_CASING = 2.2  # px of paper on each side of a mark that lies on water
_LINE_STYLES = {  # kind: (width px, dash)
    "streamline": (1.2, "solid"), "pathline": (1.6, "solid"), "streakline": (2.4, "1 5"), "timeline": (1.4, "6 4"),
    "route": (4.6, "solid"), "path": (0.7, "solid"), "dotted": (1.0, "1 3"), "crest": (2.6, "solid"), "deck": (1.2, "10 6"),
}


def draw(scene: Scene, view: View, look: Look) -> Sheet:
    """The scene as columns for one view and look."""
    return _Draughtsman(view, look).draw(scene)


class _Draughtsman:
    def __init__(self, view: View, look: Look) -> None:
        self.view, self.look, self.p = view, look, look.palette
        self.px = view.step
        self.weight = look.line
        self.extent = view.widened(0.25).extent
        self.sheet = Sheet()
        self.avoid: list[tuple[float, float, float, float]] = []
        self.zone_boxes: list[int] = []

    def draw(self, scene: Scene) -> Sheet:
        if scene.water is not None:
            tubes = strokes.joined(self.seen(scene.water.tube_lines))
            self.sheet.line(tubes, self.p.ink, 0.6 * self.weight, alpha=0.34, under=True)
        for area in scene.areas:
            self.area(area)
        for zone in scene.zones:
            self.zone_area(zone)
        self.shore(scene.shore)
        for structure in scene.structures:
            self.structure(structure)
        for line in scene.lines:
            self.line(line)
        for zone in scene.zones:
            self.zone_marks(zone)
        if scene.logs is not None:
            self.logs(scene.logs)
        for point in scene.points:
            self.point(point)
        self.labels(scene)
        return self.sheet

    def seen(self, lines) -> list[np.ndarray]:
        return strokes.visible(lines, self.extent, self.px)

    def cased(self, points: np.ndarray, colour: str, width: float, dash: str = "solid") -> None:
        """A line with a paper casing, so that it reads on any water."""
        self.sheet.line(points, self.p.paper, width * self.weight + 2 * _CASING)
        self.sheet.line(points, colour, width * self.weight, dash=dash)

    def box(self, shape: shapely.Geometry) -> None:
        self.avoid.append(shapely.bounds(shape))

    # ---- water and land ---------------------------------------------------------------------------

    def shore(self, lines) -> None:
        seen = self.seen(lines)
        starts, ends = strokes.bank_ticks(seen, self.px, self.weight)
        ticks = strokes.joined(np.stack([starts, ends], axis=1))
        self.sheet.line(ticks, self.p.ink, 0.8 * self.weight, alpha=0.62)
        self.sheet.line(strokes.joined(seen), self.p.ink, 1.5 * self.weight)

    def area(self, mark: AreaMark) -> None:
        p = self.p
        if mark.pattern == "rest":  # water to rest in: outlined only
            self.sheet.area(mark.area, fill=p.paper, alpha=0.35, line=p.ink, width=0.9 * self.weight)
            return
        hatch, scale, weight = {
            "dots": (".", 7, 1.6), "levels": ("-", 7, 1), "dry": ("x", 10, 1), "wet": ("|", 9, 1),
            "stipple 1": (".", 14, 1.5), "stipple 2": (".", 10, 1.6), "stipple 3": (".", 7, 1.7), "stipple 4": (".", 5, 1.8),
        }[mark.pattern]
        fill = {"more": p.more, "less": p.less}.get(mark.tint, p.paper)
        self.sheet.area(
            mark.area, fill=fill, alpha=0.4 if mark.tint else 0.0, hatch=hatch, hatch_colour=fill if mark.tint else p.ink,
            hatch_scale=scale * self.weight, hatch_weight=weight * self.weight, line=p.ink,
        )

    # ---- eddies -----------------------------------------------------------------------------------

    def zone_area(self, zone: ZoneMark) -> None:
        colour = self.p.signal if zone.subject else self.p.ink
        if zone.travelling:
            return
        hatch = "/" if zone.rotation == "clockwise" else "\\"
        self.sheet.area(
            zone.outline, fill=self.p.paper, alpha=0.62, hatch=hatch, hatch_colour=colour,
            hatch_scale=11 * self.weight, hatch_weight=self.weight,
        )

    def zone_marks(self, zone: ZoneMark) -> None:
        colour = self.p.signal if zone.subject else self.p.ink
        for line in self.seen(zone.inner):
            self.sheet.line(line, colour, 0.8 * self.weight)
        outlines = [shapely.get_coordinates(r) for g in shapely.get_parts(zone.outline) for r in [g.exterior, *g.interiors]]
        for line in self.seen(outlines):
            if zone.subject:
                self.cased(line, colour, 2.2)
            else:
                self.sheet.line(line, colour, 1.3 * self.weight, dash="1 3" if zone.travelling else "solid")
        radius = 8.0 * self.weight * self.px
        size = self.room(zone)
        if size > 0.6 * radius:
            for stroke in strokes.turning_mark(zone.centre, min(radius, 0.75 * size), zone.rotation):
                self.cased(stroke, colour, 1.5)
        for at, filled in ((zone.separation, True), (zone.reattachment, False)):
            if at is not None and size > 0.8 * radius:
                self.contact(at, zone, filled, colour)
        self.zone_boxes.append(len(self.avoid))
        self.box(zone.outline)

    def contact(self, at: np.ndarray, zone: ZoneMark, filled: bool, colour: str) -> None:
        towards = zone.centre - at
        shape = shapely.Polygon(strokes.triangle(np.asarray(at), towards, 7.0 * self.weight * self.px))
        self.sheet.area(
            shape, fill=colour if filled else self.p.paper, alpha=1.0, line=self.p.paper if filled else colour,
            width=1.2 * self.weight,
        )

    def room(self, zone: ZoneMark) -> float:
        """Distance from the centre to the outline, m."""
        centre = shapely.Point(zone.centre)
        return float(zone.outline.boundary.distance(centre)) if zone.outline.contains(centre) else 0.0

    # ---- built things, lines and points -----------------------------------------------------------

    def structure(self, mark: StructureMark) -> None:
        """Solid ink where no water passes; else an outline, so that the water in it is seen."""
        area = mark.shape.geom_type in ("Polygon", "MultiPolygon")
        lines = self.seen(_lines_of(mark.shape))
        if area and mark.solid:
            self.sheet.area(mark.shape, fill=self.p.ink, alpha=1.0, line=self.p.ink, width=1.0)
            self.box(mark.shape)
        elif area and mark.kind == "pier":
            self.sheet.area(
                mark.shape, fill=self.p.paper, alpha=0.6, hatch="x", hatch_colour=self.p.ink, hatch_scale=6 * self.weight,
                hatch_weight=self.weight, line=self.p.ink, width=1.8 * self.weight,
            )
            self.box(mark.shape)
        elif mark.kind in ("deck", "culvert"):
            for line in lines:
                self.sheet.line(line, self.p.ink, 1.2 * self.weight, dash="10 6")
        elif area:
            for line in lines:
                self.sheet.line(line, self.p.ink, 0.9 * self.weight, alpha=0.7)
        else:
            for line in lines:
                self.cased(line, self.p.ink, 2.6)

    def line(self, mark: LineMark) -> None:
        width, dash = _LINE_STYLES[mark.kind]
        colour = self.p.signal if mark.subject else self.p.ink
        for line in self.seen([mark.points]):
            if mark.kind == "path":
                self.sheet.line(line, colour, width * self.weight, alpha=0.22)
            elif mark.kind == "route":
                self.sheet.line(line, colour, width * self.weight)
                self.sheet.line(line, self.p.paper, (width - 2.2) * self.weight)
            else:
                self.cased(line, colour, width, dash)
        if mark.kind == "pathline":
            for tick in self.seen(strokes.cross_ticks(mark.points, mark.tick, 8 * self.px)):
                self.sheet.line(tick, colour, 1.2 * self.weight)
        if mark.kind == "timeline" and len(mark.points) > 1:
            for end, other in ((0, 1), (-1, -2)):
                t = mark.points[end] - mark.points[other]
                self.cased(strokes.bar(mark.points[end], np.arctan2(t[0], -t[1]), 10 * self.px), colour, 1.4)

    def logs(self, mark: LogsMark) -> None:
        """Round-ended bars to true length, at least 7 px, all of one kind as one line: 20,000 are no slower than a few."""
        west, south, east, north = self.extent
        x, y = mark.at.T
        seen = (x > west) & (x < east) & (y > south) & (y < north)
        half = np.maximum(mark.length_m, 7 * self.px)[:, None] / 2 * np.column_stack([np.cos(mark.angle), np.sin(mark.angle)])
        bars = np.stack([mark.at - half, mark.at + half, np.full_like(half, np.nan)], axis=1)
        for own, colour in ((seen & ~mark.lodged, self.p.ink), (seen & mark.lodged, self.p.signal)):
            if own.any():
                self.cased(bars[own].reshape(-1, 2)[:-1], colour, 4.0)

    def point(self, mark: PointMark) -> None:
        colour = self.p.signal if mark.subject else self.p.ink
        r = 5.0 * self.weight * self.px
        circle = shapely.Point(mark.at).buffer(r)
        if mark.kind == "rest":
            self.sheet.area(circle, fill=self.p.paper, alpha=1, line=colour, width=1.6 * self.weight)
        elif mark.kind == "parcel":
            self.cased(strokes.bar(mark.at, 0.0, 0.1 * self.px), colour, 9.0)  # a line with round ends, over its own path
        elif mark.kind == "fish":
            self.sheet.area(_lens(mark.at, mark.angle, 2.4 * r), fill=colour, alpha=1, line=self.p.paper, width=1.2)
        elif mark.kind in ("drogue", "query", "answered"):
            x, y = mark.at
            half = 1.7 * r if mark.kind != "drogue" else r
            square = shapely.box(x - half, y - half, x + half, y + half)
            self.sheet.area(square, fill=self.p.paper, alpha=1, line=colour, width=1.5 * self.weight)
            if mark.kind == "answered":
                self.sheet.line(np.array([[x + 0.2 * half, y + half], [x + half, y + 0.2 * half]]), colour, 1.5)
            if mark.kind == "drogue":
                for a in (np.pi / 4, -np.pi / 4):
                    self.sheet.line(strokes.bar(mark.at, a, 2 * r), colour, 1.2)
            else:
                self.sheet.text(x, y, mark.label, colour, size=self.look.label_px, font="bold")
            self.box(square)

    # ---- words ------------------------------------------------------------------------------------

    def labels(self, scene: Scene) -> None:
        size = self.look.label_px
        self.margins(scene)
        for name in scene.names:
            self.name(name)
        if scene.section is not None:
            for x, y in scene.section:
                r = 18 * self.px * self.weight
                self.avoid.append((x - r, y - r, x + r, y + r))
            line = np.array(scene.section)
            for x, y in strokes.along(line, 12 * self.px)[0]:
                self.avoid.append((x - 3 * self.px, y - 3 * self.px, x + 3 * self.px, y + 3 * self.px))
        # Text on the map: eddies' tags first, the subject's before all, then what is built.
        wanted = [
            (Tag(z.tag, tuple(z.centre), z.subject, z.coarse), self.room(z), True, box)
            for z, box in zip(scene.zones, self.zone_boxes)
        ]
        wanted += [(t, 0.0, True, -1) for t in scene.tags]
        named = [s for s in scene.structures if s.name]
        wanted += [(Tag(s.name, tuple(shapely.get_coordinates(s.shape.centroid)[0])), 0.0, False, -1) for s in named]
        wanted.sort(key=lambda w: (not w[0].subject, not w[2]))
        west, south, east, north = self.view.extent
        wanted = [w for w in wanted if w[0].text and west < w[0].at[0] < east and south < w[0].at[1] < north]
        if not wanted:
            return
        sizes = np.array([[(len(t.text) * 0.6 * size + 12) * self.px, (size * 1.25 + 8) * self.px] for t, *_ in wanted])
        anchors = np.array([t.at for t, *_ in wanted])
        room = [r for _, r, _, _ in wanted]
        clear = np.array(self.avoid).reshape(-1, 4)
        free, own = [boxed for _, _, boxed, _ in wanted], [box for *_, box in wanted]
        spots = tags.place(anchors, sizes, clear, self.view.extent, inside=room, leaders=free, own=own)
        for (tag, _, boxed, _), spot in zip(wanted, spots):
            if not spot.shown:
                self.sheet.hidden += boxed
            elif boxed:
                self.tag(tag, spot)
            else:
                self.plain(tag, spot)

    def margins(self, scene: Scene) -> None:
        """Keep labels off the key, the north arrow and the scale bar, which lie over the map's corners.

        The key takes the first corner in which it covers nothing of the section.
        """
        west, south, east, north = self.view.extent
        unit = self.look.label_px * self.px
        wide, high = ((17.5, 9.5) if self.view.columns > 640 and not self.look.hall else (15, 5.5)) * np.array(unit)
        corners = {
            "nw": (west, north - high, west + wide, north), "sw": (west, south, west + wide, south + high),
            "ne": (east - wide - 3.5 * unit, north - high, east, north),
        }
        taken = shapely.LineString(scene.section).buffer(22 * self.px * self.weight) if scene.section else shapely.Point()
        self.sheet.key = next((name for name, box in corners.items() if not taken.intersects(shapely.box(*box))), "nw")
        self.avoid.append(corners[self.sheet.key])
        for x, y in scene.buttons:
            self.avoid.append((x - unit, y - unit, x + unit, y + unit))
        self.avoid.append((east - 3.5 * unit, north - 5.5 * unit, east, north))
        self.avoid.append((east - 12 * unit, south, east, south + 3.4 * unit))

    def tag(self, tag: Tag, spot: tags.Placed) -> None:
        p, colour = self.p, self.p.signal if tag.subject else self.p.ink
        if spot.leader:
            self.cased(np.array([tag.at, (spot.x, spot.y)]), colour, 1.0)
        self.sheet.text(
            spot.x, spot.y, tag.text, p.on_signal if tag.subject else p.ink, size=self.look.label_px, font="bold",
            fill=p.signal if tag.subject else p.paper, fill_alpha=1.0, border=colour,
            dash="dashed" if tag.coarse else "solid", pad=4.0,
        )

    def plain(self, tag: Tag, spot: tags.Placed) -> None:
        self.sheet.text(
            spot.x, spot.y, tag.text, self.p.ink, size=self.look.label_px, font="bold", fill=self.p.paper, fill_alpha=0.72,
            pad=2.0,
        )

    def name(self, name: Name) -> None:
        size = self.look.label_px * (1.35 if name.arrow else 1.12)
        self.sheet.text(
            name.x, name.y, name.text, self.p.ink if name.arrow else self.p.ink2, size=size, angle=name.angle,
            style="italic", font="literata",
        )
        half = np.array([0.3 * len(name.text) * size + (28 if name.arrow else 0), 0.8 * size]) * self.px
        turn = np.abs([[np.cos(name.angle), -np.sin(name.angle)], [np.sin(name.angle), np.cos(name.angle)]]) @ half
        self.avoid.append((name.x - turn[0], name.y - turn[1], name.x + turn[0], name.y + turn[1]))
        if name.arrow:
            ahead = np.array([np.cos(name.angle), np.sin(name.angle)])
            start = np.array([name.x, name.y]) + 0.36 * len(name.text) * size * self.px * ahead
            tip = start + 20 * self.px * self.weight * ahead
            side = np.array([-ahead[1], ahead[0]]) * 3.5 * self.px * self.weight
            back = tip - 7 * self.px * self.weight * ahead
            for stroke in ([start, tip], [back + side, tip], [back - side, tip]):
                self.sheet.line(np.array(stroke), self.p.ink, 1.3 * self.weight)


def _lines_of(shape: shapely.Geometry) -> list[np.ndarray]:
    parts = shapely.get_parts(shape)
    return [shapely.get_coordinates(p.exterior if p.geom_type == "Polygon" else p) for p in parts]


def _lens(at: np.ndarray, angle: float, length: float) -> shapely.Polygon:
    t = np.linspace(-1, 1, 12)
    upper = np.column_stack([t, 0.28 * (1 - t**2)])
    lower = np.column_stack([t[::-1], -0.28 * (1 - t[::-1] ** 2)])
    notch = np.array([[-1.35, 0.22], [-1.1, 0.0], [-1.35, -0.22]])
    shape = np.vstack([upper, lower, notch[::-1]]) * length / 2
    c, s = np.cos(angle), np.sin(angle)
    return shapely.Polygon(np.asarray(at) + shape @ np.array([[c, s], [-s, c]]))
