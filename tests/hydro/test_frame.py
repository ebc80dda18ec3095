"""One frame: faces and nodes, exact where the field is linear, and nothing bleeds over the waterline."""

from __future__ import annotations

import numpy as np
import pytest

from hydro.frame import RawFrame, face_bed_and_node_bed, flow_from_edges, make_frame, mean_frame, to_nodes
from tests import builders

SETTINGS = {"index": 0, "seconds": 0.0, "time": None, "kind": "instant", "wet_depth_m": 0.05}


def linear(xy):
    return np.column_stack([2.0 + 0.3 * xy[:, 0] - 0.1 * xy[:, 1], -1.0 + 0.02 * xy[:, 0] + 0.5 * xy[:, 1]])


@pytest.mark.parametrize("mesh", [builders.with_hole(size=2.0), builders.channel(9, 6, quads=True), builders.channel(9, 6), builders.disc()])
def test_node_values_are_exact_for_linear_fields(mesh):
    """A linear field comes back at every node, at the boundary and round holes too, to rounding."""
    values = to_nodes(mesh, linear(mesh.face_centroid), np.ones(mesh.n_faces, bool))
    np.testing.assert_allclose(values, linear(mesh.node_xy), atol=1e-10)


def test_node_values_take_nothing_from_dry_faces():
    """However wild the values of dry faces, nodes of wet ones do not feel them; nodes without wet face have none."""
    mesh = builders.channel(12, 6)
    wet = mesh.face_centroid[:, 0] < 55.0
    values = linear(mesh.face_centroid)
    spoilt = np.where(wet[:, None], values, 1e9)
    at_nodes = to_nodes(mesh, spoilt, wet)
    np.testing.assert_array_equal(at_nodes, to_nodes(mesh, np.where(wet[:, None], values, np.nan), wet))
    start, around = mesh.node_faces
    touched = np.array([wet[around[start[i] : start[i + 1]]].any() for i in range(mesh.n_nodes)])
    np.testing.assert_array_equal(np.isfinite(at_nodes[:, 0]), touched)
    np.testing.assert_allclose(at_nodes[touched], linear(mesh.node_xy[touched]), atol=1e-9)


def test_the_waterline_does_not_bleed():
    """A level pool beside high dry ground: node depth is level less bed where wet, and no water stands on the dry."""
    mesh = builders.channel(40, 10)
    # Ground rises 1 in 10 to the east; a pool at 12.0 m ends at x = 50.
    bed = 7.0 + 0.1 * mesh.node_xy[:, 0]
    node_bed, face_bed = face_bed_and_node_bed(mesh, bed, None)
    depth = np.maximum(12.0 - face_bed, 0.0)
    raw = RawFrame("face", depth, np.zeros((mesh.n_faces, 2)))
    frame = make_frame(mesh, raw, node_bed, face_bed, **SETTINGS)
    wet = frame.wet_nodes
    np.testing.assert_allclose(frame.level[wet], 12.0, atol=1e-9)
    assert np.all(frame.depth[node_bed > 12.0] == 0.0)
    assert np.all(np.isnan(frame.level[~wet]))


def test_a_step_in_the_bed_does_not_tilt_the_level():
    """Depth at nodes comes through the level, which is flat where the bed has a step."""
    mesh = builders.channel(20, 6)
    bed = np.where(mesh.node_xy[:, 0] > 50, 3.0, 1.0)
    node_bed, face_bed = face_bed_and_node_bed(mesh, bed, None)
    frame = make_frame(mesh, RawFrame("face", 5.0 - face_bed, np.zeros((mesh.n_faces, 2))), node_bed, face_bed, **SETTINGS)
    np.testing.assert_allclose(frame.level, 5.0, atol=1e-9)


def test_flow_from_edges_is_exact_for_uniform_flow():
    """Divergence theorem: the sum of outward flux times arm over the area is the mean of a uniform field."""
    for mesh in (builders.with_hole(size=2.0), builders.channel(5, 4, quads=True)):
        along = mesh.node_xy[mesh.edge_nodes[:, 1]] - mesh.node_xy[mesh.edge_nodes[:, 0]]
        q = 1.7 * along[:, 1] + 0.4 * along[:, 0]  # through an edge from left to right: q . (t_y, -t_x) with q = (1.7, -0.4)
        np.testing.assert_allclose(flow_from_edges(mesh, q), np.tile([1.7, -0.4], (mesh.n_faces, 1)), atol=1e-12)


def test_edge_discharge_stays_the_truth_and_faces_follow():
    mesh = builders.channel(6, 4)
    along = mesh.node_xy[mesh.edge_nodes[:, 1]] - mesh.node_xy[mesh.edge_nodes[:, 0]]
    node_bed, face_bed = face_bed_and_node_bed(mesh, np.zeros(mesh.n_nodes), None)
    raw = RawFrame("edge", np.full(mesh.n_faces, 2.0), None, 3.0 * along[:, 1])
    frame = make_frame(mesh, raw, node_bed, face_bed, **SETTINGS)
    assert frame.field_name == "edge discharges"
    np.testing.assert_allclose(frame.face_velocity, np.tile([1.5, 0.0], (mesh.n_faces, 1)), atol=1e-12)
    np.testing.assert_array_equal(frame.edge_discharge, 3.0 * along[:, 1])


def test_stored_places_decide_the_field_of_triangles():
    mesh = builders.channel(6, 4, quads=True)
    on_faces = builders.frame_of(mesh, 2.0, lambda x, y: (0.1 * x, 0 * y))
    at_nodes = builders.frame_of(mesh, 2.0, lambda x, y: (0.1 * x, 0 * y), stored_on="node")
    np.testing.assert_allclose(on_faces.triangle_unit_discharge[:, 0], 0.2 * mesh.face_centroid[mesh.triangle_face, 0], atol=1e-12)
    np.testing.assert_allclose(at_nodes.triangle_unit_discharge[:, 0], 0.2 * mesh.triangle_centroid[:, 0], atol=1e-12)
    # A bilinear face holds the mean of its linear triangles: the same in either view for a linear field.
    np.testing.assert_allclose(at_nodes.face_unit_discharge, on_faces.face_unit_discharge, atol=1e-12)


def test_missing_values_are_dry_and_velocity_is_zero_there():
    mesh = builders.channel(6, 4)
    depth = np.full(mesh.n_faces, 1.0)
    depth[:5] = np.nan
    depth[5:8] = -0.3
    depth[8:10] = 0.04  # above nothing, below the wet depth
    q = np.full((mesh.n_faces, 2), 0.5)
    q[:5] = np.nan
    node_bed, face_bed = face_bed_and_node_bed(mesh, np.zeros(mesh.n_nodes), None)
    frame = make_frame(mesh, RawFrame("face", depth, q), node_bed, face_bed, **SETTINGS)
    assert not frame.wet_faces[:10].any() and frame.wet_faces[10:].all()
    assert np.all(frame.face_velocity[:10] == 0) and np.all(frame.face_velocity[10:] == 0.5)
    assert np.all(frame.face_depth[:8] == 0) and np.all(np.isfinite(frame.depth))


def test_bed_is_made_from_the_place_that_has_it():
    mesh = builders.channel(8, 5)
    at_nodes = 3.0 + 0.1 * mesh.node_xy[:, 0]
    at_faces = 3.0 + 0.1 * mesh.face_centroid[:, 0]
    np.testing.assert_allclose(face_bed_and_node_bed(mesh, at_nodes, None)[1], at_faces, atol=1e-12)
    np.testing.assert_allclose(face_bed_and_node_bed(mesh, None, at_faces)[0], at_nodes, atol=1e-9)
    with pytest.raises(ValueError, match="no bed level"):
        face_bed_and_node_bed(mesh, None, None)


def test_the_mean_of_frames_weighs_depth_and_unit_discharge():
    """By hand: weights 1 and 3 of depths 1 and 2 and unit discharges 1 and 4 give 1.75 m and 3.25 m2/s; not velocity 1.75."""
    mesh = builders.channel(4, 3)
    first = builders.frame_of(mesh, 1.0, (1.0, 0.0))
    second = builders.frame_of(mesh, 2.0, (2.0, 0.0), seconds=60.0, index=1)
    mean = mean_frame([(first, 1.0), (second, 3.0)])
    np.testing.assert_allclose(mean.face_depth, 1.75)
    np.testing.assert_allclose(mean.face_unit_discharge, np.tile([3.25, 0.0], (mesh.n_faces, 1)))
    np.testing.assert_allclose(mean.face_velocity[:, 0], 3.25 / 1.75)
    assert (mean.kind, mean.interval_s, mean.seconds) == ("mean", 4.0, 60.0)


def test_maxima_have_no_mean():
    mesh = builders.channel(4, 3)
    frame = builders.frame_of(mesh, 1.0, (1.0, 0.0), kind="maximum")
    with pytest.raises(ValueError, match="maxima of different moments have no mean"):
        mean_frame([(frame, 1.0)])
    with pytest.raises(ValueError, match="no frame to average"):
        mean_frame([])


def test_a_frame_needs_a_known_kind_and_a_flow():
    mesh = builders.channel(4, 3)
    node_bed, face_bed = face_bed_and_node_bed(mesh, np.zeros(mesh.n_nodes), None)
    with pytest.raises(ValueError, match="kind of frame is 'average'"):
        make_frame(mesh, RawFrame("face", face_bed, np.zeros((mesh.n_faces, 2))), node_bed, face_bed, **{**SETTINGS, "kind": "average"})
    with pytest.raises(ValueError, match="no velocity, unit discharge or edge discharge"):
        make_frame(mesh, RawFrame("edge", face_bed, None), node_bed, face_bed, **SETTINGS)
