"""The water's picture puts every pixel in its triangle, and every value in its shade."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from dashboard.raster import View, canvas
from tests.builders import channel, disc, frame_of


def test_the_index_agrees_with_shapely_at_every_pixel():
    """Second method: shapely's point-in-polygon; pixel centres on a side may belong to either triangle."""
    mesh = disc(10.0, 2.0)
    view = View(0.3, -0.7, 23.0, 97, 61)
    index = canvas(mesh).index(view).index
    west, south, _, _ = view.extent
    polygons = shapely.polygons(mesh.node_xy[mesh.triangles])
    x = west + (np.arange(view.columns) + 0.5) * view.step
    y = south + (np.arange(view.rows) + 0.5) * view.step
    for r in range(view.rows):
        points = shapely.points(x, np.full(len(x), y[r]))
        for c, t in enumerate(index[r]):
            near = shapely.distance(polygons, points[c])
            if t >= 0:
                assert near[t] < 1e-9
            else:
                assert near.min() > -1e-9 and (near > 0).all()


def test_neighbours_leave_no_gap_and_claim_no_pixel_twice():
    """A rectangle of triangles whose sides run through pixel centres is covered whole, each pixel once."""
    mesh = channel(8, 4, 80.0, 40.0)
    view = View(40.0, 20.0, 80.0, 80, 40)
    index = canvas(mesh).index(view).index
    assert (index >= 0).all()
    counts = np.bincount(index.ravel(), minlength=mesh.n_triangles)
    assert counts.sum() == 80 * 40
    assert counts == pytest.approx(np.full(mesh.n_triangles, 50), abs=10)  # 50 m2 each, less or more its diagonal


def test_a_linear_field_is_read_exactly_at_pixel_centres():
    mesh = disc(10.0, 2.0)
    view = View(0.0, 0.0, 12.0, 40, 30)
    raster = canvas(mesh).index(view)
    field = 2.0 + 0.3 * mesh.node_xy[:, 0] - 0.7 * mesh.node_xy[:, 1]
    west, south, _, _ = view.extent
    x = west + (np.arange(40) + 0.5) * view.step
    y = south + (np.arange(30) + 0.5) * view.step
    expected = 2.0 + 0.3 * x[None, :] - 0.7 * y[:, None]
    assert raster.values(field) == pytest.approx(expected, abs=1e-12)


def test_shades_tell_speed_and_parity_tells_the_tube():
    """Speed 1 of top 2 stands in the ramp's middle; psi = y, tubes of 5 m3/s: odd from 5 to 10 and so on."""
    mesh = channel(40, 20, 80.0, 40.0)
    frame = frame_of(mesh, 1.0, (1.0, 0.0))
    view = View(40.0, 20.0, 80.0, 80, 40)
    raster = canvas(mesh).index(view)
    shades = raster.paint(frame, np.ones(mesh.n_nodes), 2.0, psi=mesh.node_xy[:, 1].copy(), tube=5.0)
    rows = (np.arange(40) + 0.5) // 5 % 2
    assert (shades[rows == 0] == 1 + 63).all()
    assert (shades[rows == 1] == 1 + 63 + 127).all()


def test_dry_ground_and_what_is_off_the_mesh_stay_blank():
    mesh = channel(40, 20, 80.0, 40.0)
    frame = frame_of(mesh, lambda x, y: np.where(y > 20, 1.0, 0.0), (1.0, 0.0), stored_on="node")
    view = View(40.0, 20.0, 100.0, 100, 60)
    shades = canvas(mesh).index(view).paint(frame, frame.speed, 2.0)
    assert (shades[:, :9] == 0).all()
    assert (shades[12:28] == 0).all()
    assert (shades[35:48, 12:88] > 0).all()


def test_a_sheet_that_carries_flow_is_water_however_thin():
    mesh = channel(20, 10, 80.0, 40.0)
    frame = frame_of(mesh, 0.03, (1.0, 0.0), stored_on="node")
    raster = canvas(mesh).index(View(40.0, 20.0, 60.0, 60, 30))
    value = np.ones(mesh.n_nodes)
    assert (raster.paint(frame, value, 2.0) == 0).all()
    assert (raster.paint(frame, value, 2.0, carries=np.ones(mesh.n_triangles, bool)) > 0).all()


def test_a_view_without_pixels_is_refused():
    with pytest.raises(ValueError, match="cannot be drawn"):
        canvas(disc(5.0, 2.0)).index(View(0.0, 0.0, 10.0, 0, 10))
