"""A photograph stands where the review or its own tags say, and is shown without its tags."""

from __future__ import annotations

import io

import pytest
from PIL import Image
from PIL.ExifTags import GPS, IFD, Base
from pyproj.crs import GeographicCRS, ProjectedCRS
from pyproj.crs.coordinate_operation import TransverseMercatorConversion

from hydro.photographs import LARGEST, read_photograph

GRID = ProjectedCRS(
    TransverseMercatorConversion(longitude_natural_origin=-3.5, false_easting=1000.0, false_northing=-2000.0),
    name="Test grid", geodetic_crs=GeographicCRS(name="WGS 84"),
).to_wkt()


@pytest.fixture
def picture(tmp_path):
    """2000 by 1000 px, taken on the equator at 3 degrees 30 minutes west, looking east-south-east, turned a quarter."""
    exif = Image.Exif()
    exif[Base.Orientation] = 6
    exif[Base.Artist] = "P. Personsson"
    exif.get_ifd(IFD.GPSInfo).update({
        GPS.GPSLatitudeRef: "N", GPS.GPSLatitude: (0.0, 0.0, 0.0), GPS.GPSLongitudeRef: "W", GPS.GPSLongitude: (3.0, 30.0, 0.0),
        GPS.GPSImgDirection: 112.5,
    })
    path = tmp_path / "weir.jpg"
    Image.new("RGB", (2000, 1000), (200, 30, 30)).save(path, exif=exif)
    return path


def test_its_own_tags_place_it(picture):
    """On the central meridian at the equator a transverse Mercator grid shows its false easting and northing."""
    photograph = read_photograph(picture, "Weir", GRID)
    assert (photograph.x, photograph.y) == pytest.approx((1000.0, -2000.0), abs=1e-6)
    assert photograph.bearing_deg == 112.5


def test_what_the_review_says_counts_first(picture):
    photograph = read_photograph(picture, "", GRID, x=12.0, y=34.0, bearing_deg=5.0)
    assert (photograph.x, photograph.y, photograph.bearing_deg, photograph.caption) == (12.0, 34.0, 5.0, "weir")


def test_it_is_shown_upright_sized_down_and_without_its_tags(picture):
    data = read_photograph(picture, "Weir", GRID).jpeg()
    with Image.open(io.BytesIO(data)) as shown:
        assert shown.size == (LARGEST // 2, LARGEST)
        assert len(shown.getexif()) == 0
    assert b"Personsson" not in data


def test_one_that_cannot_be_placed_is_refused(picture, tmp_path):
    Image.new("RGB", (4, 4)).save(tmp_path / "plain.png")
    with pytest.raises(ValueError, match="does not say where it was taken; give its x and y"):
        read_photograph(tmp_path / "plain.png", "", GRID)
    with pytest.raises(ValueError, match="the run lies in local metres; give its x and y"):
        read_photograph(picture, "", None)
    with pytest.raises(ValueError, match="is not there"):
        read_photograph(tmp_path / "none.jpg", "", GRID)
    (tmp_path / "text.jpg").write_text("no picture", encoding="utf-8")
    with pytest.raises(ValueError, match="cannot be read as a picture"):
        read_photograph(tmp_path / "text.jpg", "", GRID)
