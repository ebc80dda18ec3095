"""lines.gpkg: centre line, banks, structures, openings, sections and the other lines of the sample review.

Ids are random text, drawn once and kept here, so that they outlive names and order.
"""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import geopandas
import numpy as np
import pyogrio
import shapely
from shapely.geometry import LineString, Polygon

from . import geometry as geo
from .write import crs_wkt

SOFFIT, ROAD = 104.05, 105.10  # bridge deck, m above the datum
_LEVELS = ("crest_m", "soffit_m", "road_m")

SECTIONS = (
    ("s4kq", "Inflow", 30.0), ("s7md", "Below the tributary", 180.0), ("s1vx", "Bend", 305.0), ("s9tb", "Mill basin", 443.0),
    ("s3hn", "Above the weir", 495.0), ("s8zc", "Below the weir", 560.0), ("s2wf", "Above the bridge", 632.0),
    ("s6pj", "Bridge", geo.BRIDGE), ("s5rg", "Below the bridge", 685.0), ("s0ly", "Outflow", 870.0),
)


def _across(s: float, left: float, right: float) -> LineString:
    """A line square to the river from the left offset to the right one."""
    return LineString(geo.course().at([s, s], [left, right]))


def _patch(s1: float, s2: float, n1: float, n2: float) -> Polygon:
    """The area between two chainages and two offsets."""
    s = np.linspace(s1, s2, 9)
    return Polygon(np.vstack([geo.course().at(s, n1), geo.course().at(s[::-1], n2)]))


def _course() -> Iterable[tuple[str, list[dict]]]:
    c = geo.course()
    s = np.arange(0.0, geo.LENGTH + 0.5, 5.0)
    yield "centre_line", [{"id": "c5xw", "name": "Centre line", "geometry": LineString(c.at(s))}]
    edge = geo.half_bottom(s) + geo.BANK_WIDTH
    yield "banks", [
        {"id": "b2lm", "name": "left bank", "geometry": LineString(c.at(s, edge))},
        {"id": "b6rq", "name": "right bank", "geometry": LineString(c.at(s, -edge))},
    ]


def _structures() -> list[dict]:
    ids = {"existing": ("p3ka", "p8fz", "r4dm"), "proposed": ("p6uy", "p1ne", "r9ht")}
    rows = []
    for design in geo.DESIGNS:
        place = geo.Place(design)
        for pier, key in zip(place.piers, ids[design], strict=False):
            how = "hole" if pier.hole else "resistance"
            rows.append({
                "id": key, "name": pier.name, "kind": "pier", "represented_as": how, "design": design, "soffit_m": SOFFIT,
                "geometry": pier.outline,
            })
        crest = float(place.crest(np.array([sum(place.ramp_span[:2]) / 2]))[0])
        rows.append({
            "id": ids[design][2], "name": "Rock ramp", "kind": "ramp", "represented_as": "raised bed", "design": design,
            "crest_m": crest, "geometry": place.ramp_outline,
        })
    crest = float(geo.Place("existing").crest(np.array([2.0]))[0])
    rows.append({
        "id": "w7qs", "name": "Weir", "kind": "weir", "represented_as": "raised bed", "design": "both", "crest_m": crest,
        "geometry": geo.Place("existing").weir_outline,
    })
    rows.append({
        "id": "d2vj", "name": "Road bridge deck", "kind": "deck", "represented_as": "absent", "design": "both",
        "soffit_m": SOFFIT, "road_m": ROAD, "geometry": _patch(geo.BRIDGE - 4, geo.BRIDGE + 4, -25, 25),
    })
    return rows


def _structure_lines() -> list[dict]:
    n = np.linspace(19.5, -19.5, 40)
    crest = float(geo.Place("existing").crest(np.array([2.0]))[0])
    ends = [geo.course().at(s, n)[0] for s, n in geo.CULVERT]
    return [
        {"id": "w4ec", "name": "Weir crest", "kind": "weir", "represented_as": "raised bed", "design": "both",
         "crest_m": crest, "geometry": LineString(geo.course().at(np.full(len(n), geo.WEIR), n))},
        {"id": "k8bt", "name": "Mill culvert", "kind": "culvert", "represented_as": "link", "design": "both",
         "discharge_variable": "culvert_discharge", "geometry": LineString(ends)},
    ]


def _openings() -> list[dict]:
    """Lines between piers and abutments at the middle of the bridge, left to right; names go with the side."""
    ids = {"existing": ("o1rd", "o5xk", "o9gw"), "proposed": ("o3pv", "o7zn", "o2sh")}
    rows = []
    for design in geo.DESIGNS:
        place = geo.Place(design)
        solid = shapely.union_all([*place.abutments, *(p.outline for p in place.piers)])
        parts = shapely.get_parts(shapely.difference(_across(geo.BRIDGE, 26, -26), solid))
        inside = [p for p in parts if p.length > 2 and abs(geo.course().locate(np.array(p.centroid.coords))[1][0]) < 20]
        inside.sort(key=lambda p: -geo.course().locate(np.array(p.centroid.coords))[1][0])
        for part, name, key in zip(inside, ("Left opening", "Middle opening", "Right opening"), ids[design], strict=True):
            rows.append({"id": key, "name": name, "design": design, "geometry": part})
    return rows


def _abutments() -> list[dict]:
    ids = {"existing": ("a4tw", "a8cy"), "proposed": ("a1mf", "a6jb")}
    return [
        {"id": key, "name": f"{side} abutment", "design": design, "geometry": shape}
        for design in geo.DESIGNS
        for side, key, shape in zip(("Right", "Left"), ids[design], geo.Place(design).abutments, strict=True)
    ]


def _sections() -> list[dict]:
    rows = []
    for key, name, s in SECTIONS:
        reach = float(geo.half_bottom(s)) + geo.BANK_WIDTH + 1.0
        right = -43.0 if name == "Mill basin" else -reach
        rows.append({"id": key, "name": name, "geometry": _across(s, reach, right)})
    return rows


def _releases() -> list[dict]:
    a, b = (np.array(p) for p in geo.tributary_mouth().coords)
    inward = geo.course().at(geo.TRIBUTARY, 14.0)[0] - (a + b) / 2
    inward *= 6 / np.hypot(*inward)
    middle, half = (a + b) / 2 + inward, (b - a) / np.hypot(*(b - a)) * 2.5
    return [
        {"id": "l3yd", "name": "Wood from upstream", "kind": "wood", "geometry": _across(60.0, 13, -13)},
        {"id": "l7kg", "name": "Wood from the tributary", "kind": "wood", "geometry": LineString([middle - half, middle + half])},
        {"id": "l9ca", "name": "Wood above the bridge", "kind": "wood", "geometry": _across(570.0, 14, -14)},
    ]


def _fish() -> list[dict]:
    return [
        {"id": "f2nq", "name": "Below the bridge", "role": "start", "geometry": _patch(700, 715, -12, 12)},
        {"id": "f6wz", "name": "Lee of Pier 1", "role": "rest", "geometry": _patch(661, 672, -10, -4)},
        {"id": "f1hv", "name": "Scour pool, left", "role": "rest", "geometry": _patch(538, 550, 3, 14)},
        {"id": "f8td", "name": "Scour pool, right", "role": "rest", "geometry": _patch(534, 550, -15, -3)},
        {"id": "f5xr", "name": "Above the weir", "role": "goal", "geometry": _patch(470, 490, -12, 12)},
    ]


def _receptors() -> list[dict]:
    def bank(s: float) -> float:
        return float(geo.half_bottom(s)) + geo.BANK_WIDTH

    return [
        {"id": "e4bm", "name": "Mill house garden", "kind": "property", "geometry": _patch(480, 500, 3.4 - bank(490), -bank(490) - 10)},
        {"id": "e9ls", "name": "Allotments", "kind": "property", "geometry": _patch(590, 630, bank(610) - 2.4, bank(610) + 14)},
        {"id": "e7tp", "name": "Foot path under the bridge", "kind": "path", "geometry": _patch(642, 668, 3.6 - bank(655), 2.2 - bank(655))},
        {"id": "e2gk", "name": "Spawning gravel", "kind": "habitat", "geometry": _patch(575, 600, -9, 9)},
    ]


def write_lines(path: Path) -> None:
    """Write every layer of lines.gpkg anew."""
    layers = dict(_course())
    layers |= {
        "structures": _structures(), "structure_lines": _structure_lines(), "openings": _openings(),
        "abutments": _abutments(), "sections": _sections(), "releases": _releases(), "fish": _fish(),
        "receptors": _receptors(),
    }
    # A fixed date inside the file: written twice, it is the same.
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": "2031-03-09T00:00:00.000Z"})
    beside = path.with_suffix(".part.gpkg")
    beside.unlink(missing_ok=True)
    crs = crs_wkt()
    for name, rows in layers.items():
        table = geopandas.GeoDataFrame(rows, geometry="geometry", crs=crs)
        if name in ("structures", "structure_lines"):
            table = table.reindex(columns=[*table.columns, *(c for c in _LEVELS if c not in table.columns)])
            table[list(_LEVELS)] = table[list(_LEVELS)].astype(float).round(3)
        if name == "structures":
            table["discharge_variable"] = None
        table.geometry = shapely.transform(table.geometry.values, lambda xy: np.round(xy + geo.ORIGIN, 4))
        table.to_file(beside, layer=name, driver="GPKG")
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": None})
    beside.replace(path)
