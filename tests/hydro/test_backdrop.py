"""A backdrop lies where its file says, in grey, at the size asked for; one that cannot be placed is refused."""

from __future__ import annotations

import geopandas
import numpy as np
import pytest
import rasterio
import shapely
from PIL import Image
from pyproj.crs import GeographicCRS, ProjectedCRS
from pyproj.crs.coordinate_operation import TransverseMercatorConversion
from rasterio.transform import Affine

from dashboard.theme import LIGHT
from dashboard.views import backdrop as view
from hydro.backdrop import open_backdrop

EAST, NORTH = 500_000.0, 5_300_000.0  # of the picture's upper left corner


def system(false_easting: float = 500_000.0) -> str:
    how = TransverseMercatorConversion(longitude_natural_origin=9.0, scale_factor_natural_origin=0.9996, false_easting=false_easting)
    return ProjectedCRS(how, name=f"Test grid {false_easting:g}", geodetic_crs=GeographicCRS(name="WGS 84")).to_wkt()


def checks(bands: int = 1) -> np.ndarray:
    """40 by 20 pixels: the left half black, the right half white."""
    grey = np.zeros((20, 40), np.uint8)
    grey[:, 20:] = 255
    return np.stack([grey] * bands)


def geotiff(path, crs: str | None = None, data: np.ndarray | None = None, **more):
    data = checks() if data is None else data
    with rasterio.open(
        path, "w", driver="GTiff", height=data.shape[1], width=data.shape[2], count=len(data), dtype=data.dtype,
        transform=Affine(1, 0, EAST, 0, -1, NORTH), crs=crs, **more,
    ) as file:
        file.write(data)
    return path


def test_a_pixel_lies_where_the_geotiff_says(tmp_path):
    """Black from x = 500 000 to 500 020, white to 500 040, y down to 5 299 980; beyond there is nothing."""
    shown = open_backdrop(geotiff(tmp_path / "a.tif", system()), system())
    grey = shown.grey((EAST - 10, NORTH - 30, EAST + 50, NORTH + 10), 60, 40)
    assert grey.shape == (40, 60)
    assert np.isnan(grey[:9]).all() and np.isnan(grey[31:]).all() and np.isnan(grey[:, :9]).all() and np.isnan(grey[:, 51:]).all()
    assert (grey[11:29, 11:28] == 0).all() and (grey[11:29, 32:49] == 1).all()


def test_a_picture_with_a_world_file_lies_the_same(tmp_path):
    """A world file gives the middle of the upper left pixel."""
    Image.fromarray(checks()[0]).save(tmp_path / "a.png")
    (tmp_path / "a.pgw").write_text(f"1\n0\n0\n-1\n{EAST + 0.5}\n{NORTH - 0.5}\n", encoding="ascii")
    window = (EAST - 10, NORTH - 30, EAST + 50, NORTH + 10)
    one = open_backdrop(tmp_path / "a.png", None).grey(window, 60, 40)
    other = open_backdrop(geotiff(tmp_path / "b.tif", system()), system()).grey(window, 60, 40)
    np.testing.assert_array_equal(one, other)


def test_a_picture_in_another_system_is_moved_into_the_runs(tmp_path):
    """Two grids that differ by their false easting alone: every place moves by that many metres, whatever the projection."""
    shown = open_backdrop(geotiff(tmp_path / "a.tif", system(500_000.0)), system(100_000.0))
    grey = shown.grey((EAST - 400_000, NORTH - 20, EAST - 400_000 + 40, NORTH), 40, 20)
    assert (grey[2:-2, 2:18] == 0).all() and (grey[2:-2, 22:-2] == 1).all()


def test_colours_become_grey_by_their_luminance(tmp_path):
    """Pure red, green and blue are 0.2126, 0.7152 and 0.0722 of white (ITU-R BT.709)."""
    for band, expected in enumerate((0.2126, 0.7152, 0.0722)):
        data = np.zeros((3, 20, 40), np.uint8)
        data[band] = 255
        shown = open_backdrop(geotiff(tmp_path / f"{band}.tif", data=data, photometric="RGB"), None)
        assert shown.grey((EAST + 5, NORTH - 15, EAST + 35, NORTH - 5), 30, 10) == pytest.approx(expected, abs=1e-6)


def test_a_palette_is_looked_up_and_never_blended(tmp_path):
    """Entries 0 and 1 are white, 255 is black: between 1 and 255 there would be other colours if numbers were blended."""
    data = np.where(checks() == 0, 1, 255).astype(np.uint8)
    path = geotiff(tmp_path / "a.tif", data=data, photometric="palette")
    with rasterio.open(path, "r+") as file:
        file.write_colormap(1, {0: (255, 255, 255, 255), 1: (255, 255, 255, 255), **{k: (0, 255, 0, 255) for k in range(2, 255)}, 255: (0, 0, 0, 255)})
    grey = open_backdrop(path, None).grey((EAST, NORTH - 20, EAST + 40, NORTH), 40, 20)
    assert set(np.unique(grey)) <= {0.0, 0.5, 1.0}


def test_heights_are_stretched_between_their_least_and_greatest(tmp_path):
    data = np.linspace(100, 120, 800, dtype=np.float32).reshape(1, 20, 40)
    data[0, :, :5] = -9999
    grey = open_backdrop(geotiff(tmp_path / "a.tif", data=data, nodata=-9999), None).grey((EAST, NORTH - 20, EAST + 40, NORTH), 40, 20)
    assert np.isnan(grey[:, :4]).all()
    assert np.nanmin(grey) == pytest.approx(0, abs=0.02) and np.nanmax(grey) == pytest.approx(1, abs=0.02)


def test_a_layer_of_a_geopackage_is_drawn_in_lines(tmp_path):
    path = tmp_path / "plan.gpkg"
    line = shapely.LineString([(EAST, NORTH - 10.25), (EAST + 40, NORTH - 10.25)])
    geopandas.GeoDataFrame(geometry=[line], crs=system()).to_file(path, layer="walls")
    geopandas.GeoDataFrame(geometry=[shapely.box(EAST, NORTH - 20, EAST + 5, NORTH)], crs=system()).to_file(path, layer="houses")
    grey = open_backdrop(path, system(), "walls").grey((EAST, NORTH - 20, EAST + 40, NORTH), 80, 40)
    assert np.isfinite(grey[20]).all()
    assert np.isnan(grey[:18]).all() and np.isnan(grey[23:]).all()
    with pytest.raises(ValueError, match="walls.*houses.*|houses.*walls.*"):
        open_backdrop(path, system())
    with pytest.raises(ValueError, match="no layer 'trees'"):
        open_backdrop(path, system(), "trees")


@pytest.mark.parametrize("make, message", [
    (lambda p: p / "none.png", "is not there"),
    (lambda p: (Image.fromarray(checks()[0]).save(p / "a.png"), p / "a.png")[1], "does not say where it lies; put a world file"),
    (lambda p: ((p / "a.tif").write_text("no picture"), p / "a.tif")[1], "cannot be read as a picture"),
    (lambda p: geotiff(p / "a.tif", system()), "the run lies in local metres"),
])
def test_what_cannot_be_placed_is_refused_with_one_sentence(tmp_path, make, message):
    with pytest.raises(ValueError, match=message):
        open_backdrop(make(tmp_path), None)


def test_layers_cover_each_other_and_the_picture_is_turned_over():
    """A half-covering white layer over a half-covering black one: three quarters covered, two thirds of it white (Porter and Duff 1984)."""
    black, white = np.zeros((2, 1), np.float32), np.array([[1.0], [np.nan]], np.float32)
    out = view.colours([(black, 0.5), (white, 0.5)], LIGHT)
    assert out is not None
    south, north = out.view(np.uint8).reshape(2, 4).astype(int)
    ink, paper = ([int(c[i : i + 2], 16) for i in (1, 3, 5)] for c in (LIGHT.ink, LIGHT.paper))
    assert south.tolist() == [*ink, 128]
    assert north[3] == 191
    assert north[:3] == pytest.approx([p * 2 / 3 + i / 3 for i, p in zip(ink, paper)], abs=1)
    assert view.colours([], LIGHT) is None
