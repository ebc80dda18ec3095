"""The mesh: counts that topology fixes, one mesh from many listings, and points found where they lie."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from hydro.mesh import build_mesh, default_origin
from tests import builders

NODES = np.array([(0, 0), (1, 0), (0.5, 1), (1.5, 1), (1, 2)], float)
FACES = [[0, 1, 2], [1, 3, 4, 2]]


def euler(mesh):
    return mesh.n_nodes - mesh.n_edges + mesh.n_faces


def test_the_two_face_mesh():
    """Areas 0.5 and 1.0, six edges, V - E + F = 1: by hand (half base times height; a parallelogram of base and height 1)."""
    mesh = build_mesh(NODES, FACES, origin=(0, 0))
    by_file = np.empty(2)
    by_file[mesh.file_face] = mesh.face_area
    np.testing.assert_allclose(by_file, [0.5, 1.0], rtol=1e-15)
    assert (mesh.n_edges, euler(mesh), mesh.n_triangles) == (6, 1, 3)


def test_reversing_a_face_turns_it_and_changes_nothing_else():
    mesh = build_mesh(NODES, FACES, origin=(0, 0))
    turned = build_mesh(NODES, [FACES[0][::-1], FACES[1]], origin=(0, 0))
    assert (mesh.turned_faces, turned.turned_faces) == (0, 1)
    np.testing.assert_array_equal(turned.face_area, mesh.face_area)
    assert np.all(turned.triangle_area > 0)


@pytest.mark.parametrize(
    ("mesh", "holes"),
    [
        (builders.channel(7, 5), 0),
        (builders.channel(7, 5, quads=True), 0),
        (builders.with_hole(size=2.0), 1),
        (builders.free_mesh(shapely.box(0, 0, 40, 20) - shapely.box(5, 5, 9, 9) - shapely.box(20, 8, 26, 12), 2.0), 2),
    ],
)
def test_euler_number_is_one_less_holes(mesh, holes):
    """Euler: V - E + F = 1 for a disc, one less for every hole."""
    assert euler(mesh) == 1 - holes
    # The same of its triangles, whose edges are the mesh's and the cuts.
    cuts = mesh.n_triangles - mesh.n_faces
    assert mesh.n_nodes - (mesh.n_edges + cuts) + mesh.n_triangles == 1 - holes


def test_edges_have_their_faces_on_their_two_sides():
    """The face on the left of a directed edge has its centre to the left of it (cross product positive)."""
    mesh = builders.with_hole(size=1.5)
    a, b = (mesh.node_xy[mesh.edge_nodes[:, k]] for k in (0, 1))
    for side, sign in ((0, 1.0), (1, -1.0)):
        has = mesh.edge_faces[:, side] >= 0
        away = mesh.face_centroid[mesh.edge_faces[has, side]] - a[has]
        along = (b - a)[has]
        assert np.all(sign * (along[:, 0] * away[:, 1] - along[:, 1] * away[:, 0]) > 0)
    # A closed boundary: as many boundary edges as boundary nodes.
    assert len(mesh.boundary_edges) == len(np.unique(mesh.edge_nodes[mesh.boundary_edges]))


def test_neighbours_share_the_side_they_are_said_to():
    mesh = builders.disc(8.0, 1.0)
    for k in range(3):
        has = mesh.neighbours[:, k] >= 0
        mine = np.sort(mesh.triangles[has][:, [k, (k + 1) % 3]], axis=1)
        theirs = mesh.triangles[mesh.neighbours[has, k]]
        assert np.all((theirs[:, :, None] == mine[:, None, :]).any(axis=1).all(axis=1))
    edges = mesh.triangle_edges[:, 0]
    np.testing.assert_array_equal(np.sort(mesh.edge_nodes[edges], axis=1), np.sort(mesh.triangles[:, :2], axis=1))


def test_areas_and_centroids_are_those_of_shapely():
    mesh = builders.channel(6, 4, length=13.0, width=7.0, quads=True)
    shapes = shapely.polygons(mesh.node_xy[mesh.face_nodes])
    np.testing.assert_allclose(mesh.face_area, shapely.area(shapes), rtol=1e-12)
    np.testing.assert_allclose(mesh.face_centroid, shapely.get_coordinates(shapely.centroid(shapes)), atol=1e-12)


def test_files_edges_keep_their_numbers_and_directions():
    edges = np.array([(4, 3), (1, 0), (2, 1), (2, 0), (3, 1), (2, 4)])
    mesh = build_mesh(NODES, FACES, edge_nodes=edges, origin=(0, 0))
    np.testing.assert_array_equal(mesh.file_node[mesh.edge_nodes], edges[mesh.file_edge])
    # Walking from node 2 down to node 1, the triangle lies on the right and the quad on the left.
    between = int(np.flatnonzero(mesh.file_edge == 2)[0])
    np.testing.assert_array_equal(mesh.file_face[mesh.edge_faces[between]], [1, 0])


def test_nodes_that_no_face_uses_are_left_out():
    mesh = build_mesh(np.vstack([[9e5, 9e5], NODES, [np.nan, np.nan]]), [[n + 1 for n in f] for f in FACES])
    assert mesh.n_nodes == 5 and mesh.origin == (0.0, 0.0)
    edges = np.array([(0, 6), (1, 2), (2, 3), (3, 1), (2, 4), (4, 5), (5, 3)])
    with_edges = build_mesh(np.vstack([[9e5, 9e5], NODES, [0, 0]]), [[n + 1 for n in f] for f in FACES], edge_nodes=edges)
    assert sorted(with_edges.file_edge) == [1, 2, 3, 4, 5, 6]


@pytest.mark.parametrize("corners", [5, 6, 7, 8])
def test_faces_with_nodes_along_their_sides_are_cut_into_sound_triangles(corners):
    """A square with nodes added along its sides keeps its area, and no triangle is flat or runs along its own node."""
    ring = [(0, 0), (2, 0), (2, 2), (0, 2)]
    middles = [(1, 0), (2, 1), (1, 2), (0, 1)]
    nodes = []
    for k, corner in enumerate(ring):
        nodes += [corner] + ([middles[k]] if k < corners - 4 else [])
    mesh = build_mesh(nodes, [list(range(corners))])
    assert mesh.triangle_area.sum() == pytest.approx(4.0)
    assert mesh.triangle_area.min() > 0.3


def test_a_triangle_with_three_nodes_along_one_side():
    mesh = build_mesh([(0, 0), (1, 0), (2, 0), (3, 0), (1.5, 5)], [[0, 1, 2, 3, 4]])
    np.testing.assert_allclose(mesh.triangle_area, 2.5)


def test_a_dented_face_is_never_cut_outside_itself():
    nodes = [(0, 0), (4, 0), (4, 4), (2, 1), (0, 4)]
    mesh = build_mesh(nodes, [[0, 1, 2, 3, 4]])
    shape = shapely.Polygon(nodes)
    inside = shapely.contains_xy(shape, mesh.to_world(mesh.triangle_centroid))
    assert inside.all() and mesh.triangle_area.sum() == pytest.approx(shape.area)


@given(order=st.randoms(use_true_random=False), angle=st.floats(0, 2 * np.pi), shift=st.tuples(st.floats(-1e6, 1e6), st.floats(-1e6, 1e6)))
def test_renumbering_rotation_and_translation_keep_the_mesh(order, angle, shift):
    """Same faces (as sets of file nodes), areas and Euler number, whatever the listing, direction and place."""
    base = builders.channel(5, 4, quads=True)
    nodes, faces = base.node_xy, base.face_nodes
    new = list(range(len(nodes)))
    order.shuffle(new)
    turn = np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    moved = np.empty_like(nodes)
    moved[new] = nodes @ turn + shift
    listing = [[new[n] for n in row] for row in faces]
    order.shuffle(listing)
    mesh = build_mesh(moved, listing)
    assert {frozenset(mesh.file_node[row]) for row in mesh.face_nodes} == {frozenset(row) for row in listing}
    # Coordinates of a million metres hold to 1e-10 m, sides are 5 m and more.
    np.testing.assert_allclose(np.sort(mesh.face_area), np.sort(base.face_area), rtol=1e-9)
    assert euler(mesh) == 1 and mesh.n_edges == base.n_edges


def test_points_are_found_where_they_lie():
    """Against shapely: inside the triangle named, or outside all of them."""
    mesh = builders.with_hole(size=1.5)
    points = np.random.default_rng(3).uniform([-3, -3], [63, 27], (2000, 2))
    found = mesh.find(points)
    whole = shapely.union_all(shapely.polygons(mesh.node_xy[mesh.triangles]))
    np.testing.assert_array_equal(found >= 0, shapely.contains_xy(whole, points))
    inside = found >= 0
    triangles = shapely.polygons(mesh.node_xy[mesh.triangles[found[inside]]])
    assert shapely.distance(triangles, shapely.points(points[inside])).max() < 1e-9


def test_points_on_nodes_and_sides_are_found():
    mesh = builders.disc(5.0, 1.0)
    assert np.all(mesh.find(mesh.node_xy) >= 0)
    assert np.all(mesh.find(mesh.node_xy[mesh.edge_nodes].mean(axis=1)) >= 0)
    assert mesh.find(np.empty((0, 2))).shape == (0,)


def test_one_reach_has_one_origin():
    assert default_origin(np.array([[512_345.0, 103_456.0], [513_000.0, 104_000.0]])) == (510_000.0, 100_000.0)
    assert default_origin(np.array([[-5.0, -15_000.0]])) == (-10_000.0, -20_000.0)


@pytest.mark.parametrize(
    ("faces", "words"),
    [
        ([], "has no faces"),
        ([[0, 1]], "face 0 has 2 nodes"),
        ([[0, 1, 7]], "face 0 names node 7, but there are only 5 nodes"),
        ([[0, 1, 2], [0, 1, 1]], "face 1 at .* has no area"),
        ([[0, 1, 2], [0, 1, 3]], "shared by more than two faces or by two on the same side"),
    ],
)
def test_faulty_faces_are_refused(faces, words):
    with pytest.raises(ValueError, match=words):
        build_mesh(NODES, faces)


def test_an_edge_list_that_lacks_a_side_is_refused():
    with pytest.raises(ValueError, match="lacks the side between nodes"):
        build_mesh(NODES, FACES, edge_nodes=np.array([(0, 1), (1, 2)]))


def test_arrays_cannot_be_written():
    mesh = build_mesh(NODES, FACES)
    with pytest.raises(ValueError, match="read-only"):
        mesh.face_area[0] = 3.0
