"""Backdrops: the user's own plan, air photograph or drawing as grey, on the ground of a run, for one window of a map.

A GeoTIFF, or a picture with a world file, is read at the size that is asked for, from its overviews where it has
them; a layer of a GeoPackage is drawn in thin lines. Nothing is fetched from anywhere.
"""

from __future__ import annotations

import warnings
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

import geopandas
import numpy as np
import pyogrio
import pyproj
import rasterio
import shapely
from PIL import Image, ImageDraw
from pyproj.exceptions import CRSError
from rasterio.enums import ColorInterp, Resampling
from rasterio.errors import NotGeoreferencedWarning, RasterioError
from rasterio.transform import Affine
from rasterio.vrt import WarpedVRT

_VECTOR = (".gpkg",)
_ALIKE = "EPSG:3857"  # stands for the system of both, where the two are the same: nothing is moved then
_LUMA = (0.2126, 0.7152, 0.0722)  # of red, green and blue (ITU-R BT.709)
_SAMPLE = 512  # px along a side of the reading that finds what is dark and what is light

Extent = tuple[float, float, float, float]


class Backdrop(Protocol):
    """Something that can be shown under the water."""

    def grey(self, extent: Extent, columns: int, rows: int) -> np.ndarray:
        """(rows, columns) float32 from 0, black, to 1, white, rows from the north; NaN where it has nothing.

        ``extent`` is the window's world (west, south, east, north) in metres of the run's coordinate system.
        """
        ...


def open_backdrop(path: Path, crs: str | None, layer: str | None = None) -> Backdrop:
    """A backdrop made ready for a run's coordinate system.

    Parameters
    ----------
    path : GeoTIFF, picture with a world file, or GeoPackage
    crs : WKT or None
        The run's; None where it lies in local metres.
    layer : str, optional
        Which layer of a GeoPackage; may be left out where there is only one.

    Raises
    ------
    ValueError
        The file is not there or cannot be read, says not where it lies, or its coordinate system cannot be turned
        into the run's.
    """
    if not path.is_file():
        raise ValueError(f"the backdrop {path} is not there; mend its file in review.toml, or take the entry out.")
    return _drawing(path, crs, layer) if path.suffix.lower() in _VECTOR else _picture(path, crs)


@dataclass(frozen=True, eq=False)
class _Picture:
    """A raster file; ``low`` and ``high`` are the values shown black and white."""

    path: Path
    source: str  # coordinate systems of the file and of the run
    target: str
    low: float
    high: float

    def grey(self, extent: Extent, columns: int, rows: int) -> np.ndarray:
        with rasterio.open(self.path) as file:
            # Between two numbers of a palette there is no colour: such a file is read finer, and its greys are averaged.
            finer = 2 if _has_palette(file) else 1
            with WarpedVRT(
                file, src_crs=self.source, crs=self.target, transform=_placed(extent, finer * columns, finer * rows),
                width=finer * columns, height=finer * rows, add_alpha=not _has_alpha(file),
                resampling=Resampling.nearest if finer > 1 else Resampling.bilinear,
            ) as shown:
                mask = shown.read(_alpha_band(file) if _has_alpha(file) else shown.count)
                value = _brightness(file, shown)
        out = np.clip((value - self.low) / (self.high - self.low), 0, 1).astype(np.float32)
        out[(mask < 128) | ~np.isfinite(value)] = np.nan
        return out if finer == 1 else _halved(out)


def _picture(path: Path, crs: str | None) -> _Picture:
    try:
        with warnings.catch_warnings(action="ignore", category=NotGeoreferencedWarning), rasterio.open(path) as file:
            if file.transform.is_identity or (file.crs is None and file.gcps[0]):
                raise ValueError(
                    f"{path.name} does not say where it lies; put a world file beside it (.pgw, .jgw or .tfw), or save it as a GeoTIFF."
                )
            stored = file.crs.to_wkt() if file.crs is not None else None
            low, high = _range(file)
    except RasterioError as error:
        raise ValueError(f"{path.name} cannot be read as a picture: {error}; use a GeoTIFF, PNG or JPEG.") from None
    source, target = _systems(path.name, stored, crs)
    return _Picture(path, source, target, low, high)


def _placed(extent: Extent, columns: int, rows: int) -> Affine:
    west, south, east, north = extent
    return Affine((east - west) / columns, 0, west, 0, (south - north) / rows, north)


def _range(file) -> tuple[float, float]:
    """Black and white: of bytes and colours 0 and 255; of anything else the file's own least and greatest value."""
    if file.dtypes[0] == "uint8":
        return 0.0, 255.0
    scale = min(1.0, _SAMPLE / max(file.shape))
    few = file.read(1, out_shape=tuple(max(1, round(n * scale)) for n in file.shape), masked=True).astype(float)
    known = few.compressed()
    known = known[np.isfinite(known)]
    if not known.size:
        raise ValueError(f"{Path(file.name).name} holds no value anywhere; take it out of review.toml.")
    low, high = float(known.min()), float(known.max())
    return (low, high) if high > low else (low - 1.0, high)


def _brightness(file, shown) -> np.ndarray:
    """Grey of one window; colours by their luminance."""
    if file.count >= 3 and ColorInterp.red in file.colorinterp:
        return np.tensordot(_LUMA, shown.read([1, 2, 3]).astype(np.float32), 1)
    band = shown.read(1)
    if _has_palette(file):
        table = np.zeros(256, np.float32)
        for index, colour in file.colormap(1).items():
            table[index] = np.dot(_LUMA, colour[:3])
        return table[band]
    return band.astype(np.float32)


def _halved(grey: np.ndarray) -> np.ndarray:
    """Means of two by two pixels, of those that hold something."""
    four = np.stack([grey[i::2, j::2] for i in (0, 1) for j in (0, 1)])
    there = np.isfinite(four)
    count = there.sum(axis=0)
    total = np.where(there, four, 0).sum(axis=0)
    return np.divide(total, count, out=np.full(total.shape, np.nan, np.float32), where=count > 0)


def _has_palette(file) -> bool:
    return file.colorinterp[0] == ColorInterp.palette


def _has_alpha(file) -> bool:
    return ColorInterp.alpha in file.colorinterp


def _alpha_band(file) -> int:
    return file.colorinterp.index(ColorInterp.alpha) + 1


@dataclass(frozen=True, eq=False)
class _Drawing:
    """Lines of a layer in the run's coordinate system."""

    lines: Sequence[np.ndarray]

    def grey(self, extent: Extent, columns: int, rows: int) -> np.ndarray:
        west, south, east, north = extent
        step = np.array([(east - west) / columns, (north - south) / rows])
        # Drawn at twice its size and halved: an even line of about one and a half pixels.
        sheet = Image.new("L", (2 * columns, 2 * rows), 0)
        pen = ImageDraw.Draw(sheet)
        for line in self.lines:
            if line[:, 0].max() < west or line[:, 0].min() > east or line[:, 1].max() < south or line[:, 1].min() > north:
                continue
            pixels = 2 * (np.column_stack([line[:, 0] - west, north - line[:, 1]]) / step)
            pen.line([tuple(p) for p in pixels.tolist()], fill=255, width=3)
        ink = np.asarray(sheet.resize((columns, rows), Image.Resampling.BOX), np.float32) / 255
        return np.where(ink > 0.1, 1 - ink, np.nan).astype(np.float32)


def _drawing(path: Path, crs: str | None, layer: str | None) -> _Drawing:
    names = [name for name, _ in pyogrio.list_layers(path)]
    if layer is None and len(names) > 1:
        raise ValueError(f"the backdrop {path.name} has the layers {', '.join(names)}; name one of them as layer in review.toml.")
    if layer is not None and layer not in names:
        raise ValueError(f"the backdrop {path.name} has no layer {layer!r}; it has {', '.join(names)}.")
    table = geopandas.read_file(path, layer=layer or names[0])
    stored = table.crs.to_wkt() if table.crs is not None else None
    source, target = _systems(path.name, stored, crs)
    if source != target:
        table = table.set_crs(source, allow_override=True).to_crs(target)
    parts = [p for g in shapely.force_2d(table.geometry.to_numpy()) if g is not None for p in shapely.get_parts(g)]
    rings = [r for p in parts for r in ([p.exterior, *p.interiors] if p.geom_type == "Polygon" else [p])]
    lines = tuple(shapely.get_coordinates(r) for r in rings if shapely.get_num_coordinates(r) > 1)
    if not lines:
        raise ValueError(f"layer {layer or names[0]} of {path.name} holds no line and no area; name another layer in review.toml.")
    return _Drawing(lines)


def _systems(name: str, stored: str | None, wanted: str | None) -> tuple[str, str]:
    """Coordinate systems to turn from and to; a file that names none lies in the run's own."""
    if stored is None:
        return _ALIKE, _ALIKE
    if wanted is None:
        raise ValueError(
            f"{name} lies in {pyproj.CRS(stored).name}, but the run lies in local metres; save it without a coordinate system in "
            "the run's own metres."
        )
    source, target = pyproj.CRS(stored), pyproj.CRS(wanted)
    if source.equals(target, ignore_axis_order=True):
        return _ALIKE, _ALIKE
    try:
        pyproj.Transformer.from_crs(source, target, always_xy=True)
    except (CRSError, pyproj.exceptions.ProjError):
        raise ValueError(
            f"{name} lies in {source.name}, which cannot be turned into the run's {target.name}; save it in the run's own."
        ) from None
    return source.to_wkt(), target.to_wkt()
