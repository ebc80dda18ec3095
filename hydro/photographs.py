"""Site photographs: where each was taken and which way it looks, from the review or from the picture's own GPS tags."""

from __future__ import annotations

import io
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pyproj
from PIL import Image, ImageOps, UnidentifiedImageError
from PIL.ExifTags import GPS, IFD

LARGEST = 1600  # px along the longer side of what is shown
_WGS84 = "EPSG:4326"


@dataclass(frozen=True, slots=True)
class Photograph:
    """A picture of the site: world x, y, m, where it was taken, and its bearing, degrees clockwise from north (None: not known)."""

    file: Path
    caption: str
    x: float
    y: float
    bearing_deg: float | None

    def jpeg(self) -> bytes:
        """The picture upright, sized down to the screen, without its tags: they may hold who took it, and more."""
        with Image.open(self.file) as image:
            upright = ImageOps.exif_transpose(image).convert("RGB")
        upright.thumbnail((LARGEST, LARGEST))
        out = io.BytesIO()
        upright.save(out, "JPEG", quality=85)
        return out.getvalue()


def read_photograph(
    file: Path, caption: str, crs: str | None, *, x: float | None = None, y: float | None = None, bearing_deg: float | None = None,
) -> Photograph:
    """A photograph with its place in a run's coordinate system (WKT; None: local metres).

    What is given counts before the picture's own tags.

    Raises ``ValueError`` when the file is no picture, or its place is neither given nor in its tags, or the tags'
    place cannot be turned into the run's coordinates.
    """
    tags = _tags(file)
    if bearing_deg is None and GPS.GPSImgDirection in tags:
        bearing_deg = float(tags[GPS.GPSImgDirection]) % 360
    if x is None or y is None:
        x, y = _projected(file, tags, crs)
    return Photograph(file, caption or file.stem, x, y, bearing_deg)


def _tags(file: Path) -> dict[int, Any]:
    try:
        with Image.open(file) as image:
            return dict(image.getexif().get_ifd(IFD.GPSInfo))
    except FileNotFoundError:
        raise ValueError(f"the photograph {file} is not there; mend its file in review.toml, or take the entry out.") from None
    except (UnidentifiedImageError, OSError) as error:
        raise ValueError(f"{file.name} cannot be read as a picture ({error}); use JPEG or PNG.") from None


def _projected(file: Path, tags: dict[int, Any], crs: str | None) -> tuple[float, float]:
    where = "give its x and y in review.toml."
    if GPS.GPSLatitude not in tags or GPS.GPSLongitude not in tags:
        raise ValueError(f"{file.name} does not say where it was taken; {where}")
    if crs is None:
        raise ValueError(f"{file.name} says where it was taken in degrees, but the run lies in local metres; {where}")
    latitude = _degrees(tags[GPS.GPSLatitude], tags.get(GPS.GPSLatitudeRef), "S")
    longitude = _degrees(tags[GPS.GPSLongitude], tags.get(GPS.GPSLongitudeRef), "W")
    try:
        x, y = pyproj.Transformer.from_crs(_WGS84, crs, always_xy=True).transform(longitude, latitude, errcheck=True)
    except pyproj.exceptions.ProjError as error:
        raise ValueError(f"{file.name} was taken where the run's coordinate system does not reach ({error}); {where}") from None
    return float(x), float(y)


def _degrees(parts: Any, side: Any, negative: str) -> float:
    """Degrees from a tag's degrees, minutes and seconds (Exif 2.32, 4.6.6: GPSLatitude)."""
    degrees, minutes, seconds = (float(p) for p in parts)
    value = degrees + minutes / 60 + seconds / 3600
    return -value if str(side).strip("\x00 ").upper() == negative else value
