"""A UGRID file gives the same run however it is laid out; what was mended or derived is said."""

from __future__ import annotations

import gc
import tracemalloc

import h5netcdf
import h5py
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from hydro.readers import open_run
from tests import reader_drafts as drafts


def same_run(run, draft=None):
    """Compare a run with the made field at the file's own places; the field is linear, so exact."""
    mesh = run.mesh
    faces, nodes = mesh.to_world(_corner_mean(mesh)), mesh.to_world(mesh.node_xy)
    for i, t in enumerate(drafts.TIMES):
        frame = run.frame(i)
        h, (u, v) = drafts.depth(*faces.T, t), drafts.velocity(*faces.T, t)
        np.testing.assert_allclose(frame.face_depth, h, atol=2e-6)
        np.testing.assert_allclose(frame.face_unit_discharge, np.column_stack([h * u, h * v]), atol=1e-5)
    np.testing.assert_allclose(run.node_bed, drafts.bed(*nodes.T), atol=1e-5)


def _corner_mean(mesh):
    return np.array([mesh.node_xy[row[row >= 0]].mean(axis=0) for row in mesh.face_nodes])


def said(run, words):
    return any(words in note.text for note in run.notes)


@pytest.mark.parametrize("form", ["netcdf4", "classic"])
def test_a_sound_file_gives_its_field_back(tmp_path, form):
    run = open_run(drafts.sound().write(tmp_path / "run.nc", form))
    same_run(run)
    assert run.name == "a channel made for a test"
    assert run.times.kinds == ("instant",) * 3
    assert run.times.instants[1] == np.datetime64("2031-03-02T06:01:00")
    assert run.depth_is == "mean"
    assert run.statements["Conventions"] == "CF-1.11"
    # 4 x 3 cells of 10 m by 5 m.
    assert run.mesh.face_area.sum() == pytest.approx(600.0, rel=1e-12)


def test_the_files_own_numbers_are_kept(tmp_path):
    draft = drafts.sound()
    run = open_run(draft.write(tmp_path / "run.nc"))
    assert sorted(run.mesh.file_face) == list(range(len(draft.values("face_nodes"))))
    xy = np.column_stack([draft.values("node_x"), draft.values("node_y")])
    np.testing.assert_allclose(run.mesh.to_world(run.mesh.node_xy), xy[run.mesh.file_node], atol=1e-9)
    np.testing.assert_allclose(run.read(1).depth, draft.values("h")[1][run.mesh.file_face], rtol=1e-12)


@given(
    start=st.sampled_from([0, 1, None, 1.0, np.float32(0), "0"]), transposed=st.booleans(), said_dimension=st.booleans(),
    pad=st.sampled_from([-1, -999, 999999, 2147483647, -2147483648]), declared=st.booleans(),
    kind=st.sampled_from(["int32", "int64", "float64"]), order=st.randoms(use_true_random=False), form=st.sampled_from(["netcdf4", "classic"]),
    turn=st.booleans(),
)
def test_numbering_padding_and_layout_change_nothing(
    tmp_path_factory, start, transposed, said_dimension, pad, declared, kind, order, form, turn
):
    """Any start_index, pad, number type, order of faces and nodes, corner turned, either layout: one run."""
    draft = drafts.sound()
    faces = draft.values("face_nodes")
    # Renumber nodes and faces at random and begin each face at another corner; some faces clockwise.
    nodes = list(range(len(draft.values("node_x"))))
    order.shuffle(nodes)
    new = np.argsort(nodes)
    rows = []
    for row in faces:
        ring = [int(new[n]) for n in row if n >= 0]
        k = order.randrange(len(ring))
        ring = ring[k:] + ring[:k]
        rows.append(ring[::-1] if turn and order.random() < 0.3 else ring)
    shuffled = list(range(len(rows)))
    order.shuffle(shuffled)
    first = int(float(start)) if start is not None else 0
    table = np.full(faces.shape, pad, np.int64)
    for i, f in enumerate(shuffled):
        table[i, : len(rows[f])] = np.array(rows[f]) + first
    for name in ("node_x", "node_y", "zb"):
        draft.set(name, draft.values(name)[nodes])
    for name in ("h", "u", "v"):
        draft.set(name, draft.values(name)[:, shuffled])
    table = table.astype(kind)
    attributes = {"_FillValue": table.dtype.type(pad)} if declared else {}
    if start is not None:
        attributes["start_index"] = start
    draft.put("face_nodes", ("corner", "face") if transposed else ("face", "corner"), table.T if transposed else table, **attributes)
    if said_dimension:
        draft.say("reach", face_dimension="face")
    run = open_run(draft.write(tmp_path_factory.mktemp("run") / "run.nc", form))
    same_run(run)
    assert said(run, "padded") == (not declared)
    assert said(run, "clockwise") == bool(run.mesh.turned_faces)


@pytest.mark.parametrize(
    ("values", "start", "words"),
    [
        ("from 0", 1, "declares start_index 1 but counts from 0"),
        ("from 1", 0, "declares start_index 0 but counts from 1"),
        ("from 1", None, "declares no start_index but counts from 1"),
    ],
)
def test_a_wrong_start_index_is_seen_and_said(tmp_path, values, start, words):
    """Never wrapped round to the last node."""
    draft = drafts.sound()
    faces = draft.values("face_nodes")
    if values == "from 1":
        draft.set("face_nodes", np.where(faces >= 0, faces + 1, -1))
    draft.say("face_nodes", start_index=start)
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, words)


def test_zeros_pad_a_table_that_counts_from_one(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes")
    draft.set("face_nodes", faces + 1).say("face_nodes", start_index=1, _FillValue=None)
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "padded with 0")


@pytest.mark.parametrize("pad", [np.uint32(4294967295), np.int64(-9223372036854775808), np.int64(9223372036854775807)])
def test_extreme_pads_are_pads(tmp_path, pad):
    draft = drafts.sound()
    faces = draft.values("face_nodes")
    draft.set("face_nodes", np.where(faces >= 0, faces.astype(pad.dtype), pad)).say("face_nodes", _FillValue=pad)
    same_run(open_run(draft.write(tmp_path / "run.nc")))


def test_repeated_last_nodes_close_up(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes")
    draft.set("face_nodes", np.where(faces >= 0, faces, faces[:, [2]]))
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "name a node twice")


def test_nodes_that_no_face_uses_do_no_harm(tmp_path):
    draft = drafts.sound()
    for name, extra in (("node_x", [0.0, np.nan]), ("node_y", [0.0, np.nan]), ("zb", [np.nan, np.nan])):
        draft.set(name, np.concatenate([draft.values(name), extra]))
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert run.mesh.bounds[2] - run.mesh.bounds[0] == pytest.approx(40.0)


def test_edge_discharge_follows_the_files_edges(tmp_path):
    """Closed form: uniform q = (2, 1) m2/s gives every face that q back from its edges (divergence theorem)."""
    draft = drafts.with_edges(drafts.sound()).drop("u", "v")
    run = open_run(draft.write(tmp_path / "run.nc"))
    frame = run.frame(0)
    assert frame.stored_on == "edge"
    np.testing.assert_allclose(frame.face_unit_discharge, np.tile([2.0, 1.0], (run.mesh.n_faces, 1)), atol=1e-9)
    np.testing.assert_array_equal(frame.edge_discharge, draft.values("flux")[0][run.mesh.file_edge])
    assert said(run, "positive from left to right of an edge")


def test_edges_against_their_stated_sense_are_turned_or_refused(tmp_path):
    draft = drafts.with_edges(drafts.sound())
    draft.set("flux", -draft.values("flux"))
    path = draft.write(tmp_path / "run.nc")
    with pytest.raises(ValueError, match="runs against the faces' own flow.*right to left"):
        open_run(path)
    run = open_run(path, mapping={"edge_discharge": {"variable": "flux", "positive": "right to left"}})
    np.testing.assert_allclose(run.read(0).edge_discharge, -draft.values("flux")[0][run.mesh.file_edge], atol=1e-12)


def test_edge_discharge_a_metre_is_multiplied_by_the_edge(tmp_path):
    draft = drafts.with_edges(drafts.sound()).drop("u", "v")
    whole = open_run(draft.write(tmp_path / "whole.nc"))
    length = np.empty(whole.mesh.n_edges)
    length[whole.mesh.file_edge] = whole.mesh.edge_length
    draft.set("flux", draft.values("flux") / length).say("flux", units="m2 s-1")
    a_metre = open_run(draft.write(tmp_path / "metre.nc"))
    np.testing.assert_allclose(a_metre.read(1).edge_discharge, whole.read(1).edge_discharge, atol=1e-12)


def test_flags_on_edges_name_boundary_stretches(tmp_path):
    draft = drafts.with_edges(drafts.sound())
    edges, x = draft.values("edge_nodes"), draft.values("node_x")
    west, east = (np.all(x[edges] == end, axis=1) for end in (x.min(), x.max()))
    flags = np.where(west, 1, np.where(east, 2, 0)).astype(np.int8)
    draft.put(
        "border", ("edge",), flags, mesh="reach", location="edge", flag_values=np.array([0, 1, 2], np.int8),
        flag_meanings="interior river_inflow outflow",
    )
    draft.put("upper", ("few",), np.flatnonzero(west)[::-1] + 1, mesh="reach", location="edge", start_index=np.int32(1),
              cf_role="location_index_set", long_name="upper end")
    run = open_run(draft.write(tmp_path / "run.nc"))
    assert len(run.boundary_sets["river inflow"]) == len(run.boundary_sets["outflow"]) == 3
    np.testing.assert_array_equal(run.boundary_sets["upper end"], run.boundary_sets["river inflow"])
    ends = run.mesh.to_world(run.mesh.node_xy)[run.mesh.edge_nodes[run.boundary_sets["outflow"]]]
    assert np.all(ends[..., 0] == x.max())


def test_data_on_part_of_the_faces_leaves_the_rest_dry(tmp_path):
    draft = drafts.sound()
    some = np.array([5, 2, 9, 3])
    draft.put("some", ("part",), some, mesh="reach", location="face")
    for name in "huv":
        dimensions, values, attributes = draft.variables[name]
        kept = {k: v for k, v in attributes.items() if k not in ("mesh", "location")}
        draft.put(name, ("time", "part"), values[:, some], location_index_set="some", **kept)
    run = open_run(draft.write(tmp_path / "run.nc"))
    frame = run.frame(0)
    wet = np.isin(run.mesh.file_face, some)
    np.testing.assert_array_equal(frame.wet_faces, wet)
    assert np.all(frame.face_unit_discharge[~wet] == 0)


def test_level_and_unit_discharge_give_depth_and_velocity(tmp_path):
    draft = drafts.sound()
    xy, faces = np.column_stack([draft.values("node_x"), draft.values("node_y")]), draft.values("face_nodes")
    fx, fy = drafts.centres(xy, faces).T
    h, u, v = (draft.values(n) for n in "huv")
    on = {"mesh": "reach", "location": "face"}
    draft.drop("h", "u", "v")
    draft.put("wl", ("time", "face"), h + drafts.bed(fx, fy), units="m", standard_name="water_surface_height_above_reference_datum", **on)
    draft.put("qx", ("time", "face"), h * u, units="m2 s-1", long_name="unit discharge, x", **on)
    draft.put("qy", ("time", "face"), h * v, units="m2 s-1", long_name="unit discharge, y", **on)
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "depth = level - bed") and said(run, "velocity = unit discharge / depth")
    np.testing.assert_allclose(run.frame(2).face_velocity[:, 0], u[2][run.mesh.file_face], rtol=1e-9)


def test_a_level_beside_depth_is_kept_and_changes_no_frame(tmp_path):
    draft = drafts.sound()
    level = 100 * (draft.values("h") + 30.0)
    draft.put("wl", ("time", "face"), level, units="cm", long_name="water level", mesh="reach", location="face")
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    kept = run.stored_level
    assert (kept.name, kept.location, kept.beside_depth) == ("wl", "face", True)
    np.testing.assert_allclose(kept.read(2), draft.values("h")[2][run.mesh.file_face] + 30.0, atol=1e-9)
    assert said(run, "the file's own level wl is kept for the audit alone")


def test_bed_from_level_less_depth_where_the_file_has_none(tmp_path):
    draft = drafts.sound()
    xy, faces = np.column_stack([draft.values("node_x"), draft.values("node_y")]), draft.values("face_nodes")
    zb = drafts.bed(*drafts.centres(xy, faces).T)
    draft.drop("zb")
    draft.put("wl", ("time", "face"), draft.values("h") + zb, units="m", long_name="water level", mesh="reach", location="face")
    run = open_run(draft.write(tmp_path / "run.nc"))
    np.testing.assert_allclose(run.face_bed, zb[run.mesh.file_face], atol=1e-9)
    assert said(run, "bed = level - depth of the first frame")


def test_a_bed_positive_down_is_turned(tmp_path):
    draft = drafts.sound()
    draft.set("zb", -draft.values("zb")).say("zb", standard_name="sea_floor_depth_below_geopotential_datum")
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "bed turned in sign")


def test_node_data_are_read_at_nodes(tmp_path):
    draft = drafts.sound()
    x, y = draft.values("node_x"), draft.values("node_y")
    for k, name in enumerate("uv"):
        own = draft.variables[name][2] | {"location": "node"}
        draft.put(name, ("time", "node"), np.array([drafts.velocity(x, y, t)[k] for t in drafts.TIMES]), **own)
    own = draft.variables["h"][2] | {"location": "node"}
    draft.put("h", ("time", "node"), np.array([drafts.depth(x, y, t) for t in drafts.TIMES]), **own)
    frame = open_run(draft.write(tmp_path / "run.nc")).frame(1)
    assert frame.stored_on == "node"
    world = frame.mesh.to_world(frame.mesh.node_xy)
    np.testing.assert_allclose(frame.depth, drafts.depth(*world.T, 60.0), rtol=1e-12)


def test_depth_on_nodes_with_velocity_on_faces_is_averaged_and_said(tmp_path):
    draft = drafts.sound()
    x, y = draft.values("node_x"), draft.values("node_y")
    own = draft.variables["h"][2] | {"location": "node"}
    draft.put("h", ("time", "node"), np.array([drafts.depth(x, y, t) for t in drafts.TIMES]), **own)
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)  # a linear depth has its centroid value as area mean
    assert said(run, "h stands on nodes and the flow on faces")


def test_packed_values_are_unpacked_before_anything(tmp_path):
    """Tolerance: half a packing step of 0.001."""
    draft = drafts.sound()
    fill = np.int16(-32768)
    for name in "huv":
        packed = np.round((draft.values(name) - 1.0) / 0.001).astype(np.int16)
        if name == "h":
            packed[:, 0] = fill
        draft.set(name, packed).say(name, scale_factor=0.001, add_offset=1.0, _FillValue=fill)
    raw = open_run(draft.write(tmp_path / "run.nc")).read(2)
    run = open_run(tmp_path / "run.nc")
    expected = drafts.sound().values("h")[2][run.mesh.file_face]
    dry = run.mesh.file_face == 0
    assert np.all(raw.depth[dry] == 0)
    np.testing.assert_allclose(raw.depth[~dry], expected[~dry], atol=0.0005001)


def test_valid_range_applies_before_use(tmp_path):
    draft = drafts.sound()
    h = draft.values("h").copy()
    h[:, 4] = 77.0
    run = open_run(draft.set("h", h).say("h", valid_range=np.array([0.0, 50.0])).write(tmp_path / "run.nc"))
    assert run.read(0).depth[run.mesh.file_face == 4] == 0


def test_units_are_converted_by_their_attribute(tmp_path):
    """Factors: 1 ft = 0.3048 m, 1 US survey foot = 1200/3937 m (NIST SP 811, from memory)."""
    draft = drafts.sound()
    draft.set("h", draft.values("h") / 0.3048).say("h", units="ft")
    draft.set("u", draft.values("u") * 100).say("u", units="cm s-1")
    draft.set("zb", draft.values("zb") * 3937 / 1200).say("zb", units="US_survey_foot")
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "converted from ft")


def test_a_mapping_names_what_the_metadata_does_not(tmp_path):
    draft = drafts.sound()
    draft.say("h", long_name=None, units=None).say("u", standard_name=None).say("v", standard_name=None)
    path = draft.write(tmp_path / "run.nc")
    with pytest.raises(ValueError, match="no velocity, unit discharge or edge discharge"):
        open_run(path)
    mapping = {"depth": {"variable": "h", "unit": "m", "is": "point"}, "velocity_x": "u", "velocity_y": "v", "datum": "Local 2031"}
    run = open_run(path, mapping=mapping)
    same_run(run)
    assert run.depth_is == "point" and run.datum == "Local 2031"


def test_one_of_several_meshes_is_picked_by_the_user(tmp_path):
    draft = drafts.sound()
    draft.put("other", (), np.int32(0), **draft.variables["reach"][2])
    path = draft.write(tmp_path / "run.nc")
    with pytest.raises(ValueError, match="several meshes: reach, other; pick one"):
        open_run(path)
    with pytest.raises(ValueError, match="no mesh 'mill'; it has reach, other"):
        open_run(path, mesh="mill")
    same_run(open_run(path, mesh="reach"))


def test_a_network_beside_the_mesh_is_no_choice(tmp_path):
    draft = drafts.sound()
    draft.put("network", (), np.int32(0), cf_role="mesh_topology", topology_dimension=np.int32(1), node_coordinates="node_x node_y",
              edge_node_connectivity="pipes")
    same_run(open_run(draft.write(tmp_path / "run.nc")))


def test_look_alikes_and_missing_options_are_noted_not_fatal(tmp_path):
    draft = drafts.sound()
    draft.say("reach", node_face_connectivity="nowhere", boundary_dimension="rim", face_face_connectivity="lost")
    draft.put("kinds", ("rim",), np.array([1, 2]), mesh="reach", location="boundary")
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "lost") and said(run, "'boundary'")


def test_no_coordinate_system_means_local_metres_and_is_said(tmp_path):
    draft = drafts.sound().drop("crs")
    for name in ("node_x", "node_y", "h", "u", "v", "zb"):
        draft.say(name, grid_mapping=None)
    run = open_run(draft.write(tmp_path / "run.nc"))
    assert run.crs is None and said(run, "local metres")


def test_a_grid_mapping_by_parameters_or_in_extended_form(tmp_path):
    draft = drafts.sound()
    draft.put("crs", (), np.int32(0), **{k: v for k, v in drafts.CRS.to_cf().items() if k != "crs_wkt"}, geoid_name="Made Geoid")
    for name in ("node_x", "h"):
        draft.say(name, grid_mapping="crs: node_x node_y")
    run = open_run(draft.write(tmp_path / "run.nc"))
    assert "Transverse Mercator" in run.crs and run.datum == "Made Geoid"


def test_coordinates_in_us_survey_feet_become_metres_with_their_system(tmp_path):
    """The same place has the same longitude and latitude in either system (pyproj does the sum)."""
    import pyproj

    feet = pyproj.CRS.from_proj4("+proj=tmerc +lat_0=52 +lon_0=-28 +k=0.9996 +x_0=500000 +y_0=100000 +ellps=GRS80 +units=us-ft")
    draft = drafts.sound().put("crs", (), np.int32(0), crs_wkt=feet.to_wkt())
    for name in ("node_x", "node_y"):
        draft.set(name, draft.values(name) * 3937 / 1200).say(name, units="US_survey_foot")
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    there = pyproj.Transformer.from_crs(feet, feet.geodetic_crs, always_xy=True).transform(
        draft.values("node_x")[0], draft.values("node_y")[0]
    )
    here = pyproj.Transformer.from_crs(run.crs, feet.geodetic_crs, always_xy=True).transform(*drafts.CORNER)
    np.testing.assert_allclose(here, there, atol=1e-12)
    assert said(run, "US survey feet to metres")


def test_roughness_is_read_to_faces(tmp_path):
    draft = drafts.sound()
    n = 0.02 + 0.001 * np.arange(len(draft.values("face_nodes")))
    draft.put("n", ("face",), n, units="s m-1/3", long_name="Manning roughness", mesh="reach", location="face")
    run = open_run(draft.write(tmp_path / "run.nc"))
    np.testing.assert_allclose(run.roughness, n[run.mesh.file_face])


def test_single_layers_are_dropped_and_dimensions_may_come_in_any_order(tmp_path):
    draft = drafts.sound()
    for name in "huv":
        _, values, attributes = draft.variables[name]
        draft.put(name, ("face", "layer", "time"), values.T[:, None, :], **attributes)
    draft.chunks = {name: (5, 1, 3) for name in "huv"}
    same_run(open_run(draft.write(tmp_path / "run.nc")))


def test_times_stored_together_are_read_together(tmp_path, monkeypatch):
    """A file in chunks over many times is opened once for all of them, not once a frame."""
    draft = drafts.sound()
    draft.chunks = {name: (3, 6) for name in "huv"}
    run = open_run(draft.write(tmp_path / "run.nc"))
    opened = []
    own = h5py.File
    monkeypatch.setattr(h5py, "File", lambda *a, **k: opened.append(a) or own(*a, **k))
    for i in range(3):
        run.frame(i)
    assert len(opened) == 0  # the first frame was read when the run was checked
    same_run(run)


def test_no_file_stays_open(tmp_path):
    """On some systems a file that is open cannot be renamed or replaced by the user's next export."""
    path = drafts.sound().write(tmp_path / "run.nc")
    run = open_run(path)
    run.frame(0)
    gc.collect()
    with h5py.File(path, "r+") as file:
        assert "h" in file


def test_a_file_changed_since_it_was_opened_is_refused(tmp_path):
    path = drafts.sound().write(tmp_path / "run.nc")
    run = open_run(path)
    drafts.with_edges(drafts.sound()).write(path)
    with pytest.raises(ValueError, match="changed on disk since it was opened; open it again"):
        run.frame(0)


@pytest.mark.parametrize(
    ("table", "attributes", "dimensions"),
    [
        ([[0, 1, 2, 999999], [1, 3, 4, 2]], {"_FillValue": np.int64(999999)}, ("face", "corner")),
        ([[0, 1, 2, -1], [1, 3, 4, 2]], {}, ("face", "corner")),
        ([[1, 2, 3, -(2**63)], [2, 4, 5, 3]], {"_FillValue": np.int64(-(2**63)), "start_index": np.int32(1)}, ("face", "corner")),
        ([[0, 1], [1, 3], [2, 4], [-1, 2]], {"_FillValue": np.int64(-1)}, ("corner", "face")),
        ([[2, 1, 0, -1], [1, 3, 4, 2]], {"_FillValue": np.int64(-1), "start_index": 0.0}, ("face", "corner")),
    ],
    ids=["padded 999999", "padded -1 undeclared", "from 1, least integer", "transposed, not declared", "clockwise"],
)
def test_the_two_face_mesh_in_every_listing(tmp_path, table, attributes, dimensions):
    """Areas 0.5 and 1.0, six edges, V - E + F = 1, by hand (half base times height; a parallelogram of 1 by 1)."""
    draft = drafts.sound()
    nodes = np.array([(0, 0), (1, 0), (0.5, 1), (1.5, 1), (1, 2)]) + drafts.CORNER
    draft.set("node_x", nodes[:, 0]).set("node_y", nodes[:, 1]).set("zb", np.zeros(5))
    for name in "huv":
        draft.set(name, np.ones((3, 2)))
        if dimensions == ("corner", "face"):
            draft.say(name, mesh=None, location=None)  # found by its dimension alone
    mesh = open_run(draft.put("face_nodes", dimensions, np.array(table), **attributes).write(tmp_path / "run.nc")).mesh
    np.testing.assert_allclose(mesh.face_area[np.argsort(mesh.file_face)], [0.5, 1.0], rtol=1e-9)
    assert (mesh.n_edges, mesh.n_nodes - mesh.n_edges + mesh.n_faces) == (6, 1)


@settings(max_examples=12)
@given(angle=st.floats(0, 2 * np.pi), shift=st.tuples(st.floats(-4e5, 4e5), st.floats(-4e5, 4e5)))
def test_a_turned_and_moved_file_gives_a_turned_and_moved_run(tmp_path_factory, angle, shift):
    """Scalars stay, vectors turn. Tolerance: coordinates of half a million metres hold to 1e-10 m."""
    draft = drafts.sound()
    whole = open_run(draft.write(tmp_path_factory.mktemp("run") / "run.nc"))
    turn = np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    xy = np.column_stack([draft.values("node_x"), draft.values("node_y")]) - drafts.CORNER
    x, y = (xy @ turn + drafts.CORNER + shift).T
    u, v = np.moveaxis(np.stack([draft.values("u"), draft.values("v")], axis=-1) @ turn, -1, 0)
    moved = draft.set("node_x", x).set("node_y", y).set("u", u).set("v", v)
    run = open_run(moved.write(tmp_path_factory.mktemp("run") / "run.nc"))
    here, there = np.argsort(run.mesh.file_face), np.argsort(whole.mesh.file_face)
    np.testing.assert_allclose(run.frame(1).face_depth[here], whole.frame(1).face_depth[there], rtol=1e-9)
    turned = whole.frame(1).face_unit_discharge[there] @ turn
    np.testing.assert_allclose(run.frame(1).face_unit_discharge[here], turned, atol=1e-9)
    np.testing.assert_allclose(run.mesh.face_area[here], whole.mesh.face_area[there], rtol=1e-8)


def test_a_long_file_opens_in_little_memory(tmp_path):
    """20 GB of frames of which two were ever written: opening reads the mesh, the times and one frame."""
    xy, faces = drafts.faces_of_channel(40, 30)
    n, steps = len(faces), 500_000
    draft = drafts.sound()
    draft.set("node_x", xy[:, 0]).set("node_y", xy[:, 1]).set("face_nodes", faces).set("zb", np.zeros(len(xy)))
    draft.set("time", np.arange(steps, dtype=float))
    on = {"mesh": "reach", "location": "face"}
    draft.drop(*"huv")
    path = draft.write(tmp_path / "run.nc")
    with h5netcdf.File(path, "a") as file:
        for name, unit, words in (("h", "m", "water depth"), ("u", "m s-1", "velocity, x"), ("v", "m s-1", "velocity, y")):
            made = file.create_variable(name, ("time", "face"), "f8", chunks=(1, n), compression="gzip", shuffle=True)
            made.attrs.update(units=unit, long_name=words, **on)
            made[0] = made[steps - 1] = np.ones(n)
    assert 3 * 8 * n * steps > 20e9
    tracemalloc.start()
    run = open_run(path)
    frame = run.frame(-1)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert run.n_frames == steps and frame.face_depth[0] == 1.0
    # The time axis alone takes 8 bytes and a date object a frame.
    assert peak < 400e6


def test_eastward_velocity_is_grid_velocity_and_the_difference_is_said(tmp_path):
    """Meridian convergence east of the central meridian, north of the equator: true north lies anticlockwise of grid north.

    Closed form on the sphere: tan(convergence) = tan(longitude from the meridian) sin(latitude); the ellipsoid's differs
    by less than 1 % at this latitude.
    """
    draft = drafts.sound().say("u", standard_name="eastward_sea_water_velocity").say("v", standard_name="northward_sea_water_velocity")
    draft.set("node_x", draft.values("node_x") + 100_000)
    run = open_run(draft.write(tmp_path / "run.nc"))
    text = next(n.text for n in run.notes if "true north lies" in n.text)
    stated = float(text.split("true north lies ")[1].split()[0])
    longitude, latitude = 100_000 / (6_371_000 * np.cos(np.radians(52.0))), np.radians(52.0)
    assert -stated == pytest.approx(np.degrees(np.arctan(np.tan(longitude) * np.sin(latitude))), rel=0.02)


def test_a_bed_that_moves_is_said(tmp_path):
    draft = drafts.sound()
    attributes = draft.variables["zb"][2]
    draft.put("zb", ("time", "node"), np.array([draft.values("zb") + k for k in (0.0, 0.1, 0.25)]), **attributes)
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "the bed changes in time by up to 0.25 m; the first frame's is used throughout")


def test_texts_and_other_oddities_in_a_file_do_no_harm(tmp_path):
    path = drafts.sound().write(tmp_path / "run.nc")
    with h5py.File(path, "a") as file:
        file.create_dataset("remarks", data=np.array(["dry year", "gate stuck"], object), dtype=h5py.string_dtype())
        file.create_dataset("codes", data=np.array([b"a", b"b"]))
        file.create_dataset("pairs", data=np.zeros(3, [("a", "f4"), ("b", "i4")]))
        file.create_group("log")
        file["h"].attrs["remark"] = h5py.Empty("S10")
    same_run(open_run(path))


def test_float32_coordinates_are_noted_with_their_step(tmp_path):
    """Northings of 500 km in single precision step by 1/32 m (24 bits of significand: 2^19 / 2^24)."""
    draft = drafts.sound()
    for name in ("node_x", "node_y"):
        draft.set(name, draft.values(name).astype(np.float32))
    assert said(open_run(draft.write(tmp_path / "run.nc")), "stored in steps of 0.031 m")


def test_a_maximum_beside_depth_is_left_aside(tmp_path):
    draft = drafts.sound()
    dimensions, values, attributes = draft.variables["h"]
    draft.put("h_max", ("face",), values.max(axis=0), **{**attributes, "cell_methods": "time: maximum"})
    run = open_run(draft.write(tmp_path / "run.nc"))
    same_run(run)
    assert said(run, "depth is read from h; not from h_max")
