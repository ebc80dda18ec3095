"""Results laid on another mesh keep their volume, and linear fields stay linear."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from scipy.spatial import Delaunay

from hydro.mesh import build_mesh
from hydro.transfer import Transfer


def _rectangle(n: int, seed: int, length: float = 40.0, width: float = 20.0):
    rng = np.random.default_rng(seed)
    inside = rng.random((n, 2)) * [length, width]
    side = np.linspace(0, 1, 12)
    rim = [(length * s, y) for s in side for y in (0, width)] + [(x, width * s) for s in side[1:-1] for x in (0, length)]
    points = np.vstack([inside, rim])
    mesh = build_mesh(points + [500_000.0, 5_000_000.0], Delaunay(points).simplices)
    return mesh


def test_volume_is_kept_to_round_off_between_two_meshes_of_one_rectangle():
    """A law: what two meshes both cover holds one volume. Tolerance: round-off of the clipping."""
    a, b = _rectangle(300, 1), _rectangle(500, 2)
    depth = 1.0 + np.random.default_rng(3).random(b.n_faces)
    moved = Transfer(a, b).conserve(depth)
    assert np.sum(moved * a.face_area) == pytest.approx(np.sum(depth * b.face_area), rel=1e-11)


def test_shared_areas_agree_with_a_general_geometry_library():
    """Source: shapely (GEOS), intersection of polygons, on every pair of 40 x 60 triangles."""
    a, b = _rectangle(8, 4), _rectangle(12, 5)
    got = Transfer(a, b).shared.toarray()
    polygon = [[shapely.Polygon(m.node_xy[f]) for f in m.face_nodes] for m in (a, b)]
    expected = np.array([[p.intersection(q).area for q in polygon[1]] for p in polygon[0]])
    np.testing.assert_allclose(got, expected, atol=1e-9)


def test_a_linear_level_is_interpolated_exactly_and_outside_is_missing():
    a, b = _rectangle(200, 6, length=50.0), _rectangle(300, 7)
    level = 100 - 0.002 * b.node_xy[:, 0] + 0.01 * b.node_xy[:, 1]
    got = Transfer(a, b).interpolate(level)
    out = a.node_xy[:, 0] > 40.0 + 1e-6
    assert np.isnan(got[out]).all() and out.any()
    expected = 100 - 0.002 * a.node_xy[:, 0] + 0.01 * a.node_xy[:, 1]
    np.testing.assert_allclose(got[~out], expected[~out], atol=1e-9)


def test_a_mesh_about_another_origin_lands_in_the_same_place():
    a, b = _rectangle(100, 8), _rectangle(120, 9)
    elsewhere = build_mesh(b.to_world(b.node_xy), b.face_nodes, origin=(499_000.0, 4_999_000.0))
    here = Transfer(a, b).conserve(b.face_centroid[:, 0])
    there = Transfer(a, elsewhere).conserve(elsewhere.face_centroid[:, 0] - 1000.0 + 0.0)
    np.testing.assert_allclose(there, here, atol=1e-6)


def test_ground_that_the_other_mesh_does_not_cover_counts_as_dry():
    a, b = _rectangle(100, 10, length=60.0), _rectangle(100, 11)
    transfer = Transfer(a, b)
    beyond = a.face_centroid[:, 0] > 45
    assert (transfer.conserve(np.ones(b.n_faces))[beyond] == 0).all()
    assert transfer.coverage[beyond].max() == 0.0
