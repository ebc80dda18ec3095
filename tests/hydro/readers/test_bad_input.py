"""Bad input gets one sentence: what is wrong, where, and what to do; nothing is half-read."""

from __future__ import annotations

import re

import h5netcdf
import numpy as np
import pytest

from hydro.readers import open_run
from tests import reader_drafts as drafts


def refused(draft, tmp_path, form="netcdf4", **options) -> str:
    """The sentence with which a draft is refused: one sentence that names the file."""
    path = draft.write(tmp_path / "run.nc", form)
    with pytest.raises(ValueError) as caught:
        open_run(path, **options)
    return one_sentence(str(caught.value))


def one_sentence(text: str) -> str:
    assert "\n" not in text and text.endswith(".") and "run.nc" in text, text
    assert not re.search(r"[a-z]\. [A-Z]", text), f"more than one sentence: {text}"
    return text


def test_a_missing_file_is_named(tmp_path):
    with pytest.raises(FileNotFoundError, match=r"run\.nc is not there; check the path\."):
        open_run(tmp_path / "run.nc")


def test_no_file_at_all():
    with pytest.raises(ValueError, match="no file was given"):
        open_run([])


def test_an_empty_file(tmp_path):
    (tmp_path / "run.nc").write_bytes(b"")
    with pytest.raises(ValueError, match=r"run\.nc is empty; copy or export the file again\."):
        open_run(tmp_path / "run.nc")


@pytest.mark.parametrize("form", ["netcdf4", "classic"])
@pytest.mark.parametrize("kept", [0.3, 0.6, 0.95])
def test_a_truncated_file(tmp_path, form, kept):
    path = drafts.sound().write(tmp_path / "run.nc", form)
    data = path.read_bytes()
    path.write_bytes(data[: int(kept * len(data))])
    with pytest.raises(ValueError, match=r"run\.nc is cut short or damaged .*; copy or export the file again\.") as caught:
        open_run(path)
    one_sentence(str(caught.value))


def test_a_file_damaged_inside_its_data(tmp_path):
    """The header opens, but a compressed part no longer unpacks."""
    draft = drafts.sound()
    draft.chunks = {"h": (1, 18)}
    path = draft.write(tmp_path / "run.nc")
    import h5py

    with h5py.File(path) as file:
        info = file["h"].id.get_chunk_info(0)
    data = bytearray(path.read_bytes())
    data[info.byte_offset : info.byte_offset + info.size] = b"\xff" * info.size
    path.write_bytes(data)
    with pytest.raises(ValueError, match=r"run\.nc: a part cannot be read .*; copy or export the file again\."):
        open_run(path)


@pytest.mark.parametrize("content", [b"\x00\x01\x02\x03" * 64, b"CDF\x05" + b"\0" * 64, b"\x7fELF" + b"\0" * 64])
def test_a_file_that_is_something_else(tmp_path, content):
    (tmp_path / "run.nc").write_bytes(content)
    with pytest.raises(ValueError, match=r"run\.nc is ") as caught:
        open_run(tmp_path / "run.nc")
    one_sentence(str(caught.value))


def test_no_mesh(tmp_path):
    text = refused(drafts.sound().say("reach", cf_role=None), tmp_path)
    assert "has no mesh: no variable has cf_role = 'mesh_topology'" in text


def test_a_mesh_in_a_group_is_pointed_at(tmp_path):
    with h5netcdf.File(tmp_path / "run.nc", "w") as file:
        file.create_group("results")
    with pytest.raises(ValueError, match="its groups results are not read"):
        open_run(tmp_path / "run.nc")


@pytest.mark.parametrize("attribute", ["node_coordinates", "face_node_connectivity"])
def test_a_mesh_without_its_parts(tmp_path, attribute):
    assert f"lacks the attribute {attribute}" in refused(drafts.sound().say("reach", **{attribute: None}), tmp_path)
    lost = drafts.sound().say("reach", **{attribute: "lost gone"})
    assert "which is not in the file" in refused(lost, tmp_path)


@pytest.mark.parametrize("dimension", [1, 3])
def test_a_mesh_that_is_no_surface(tmp_path, dimension):
    text = refused(drafts.sound().say("reach", topology_dimension=np.int32(dimension)), tmp_path)
    assert f"topology_dimension {dimension}; a depth-averaged model needs a mesh of faces (2)" in text


def test_a_face_dimension_that_the_table_lacks(tmp_path):
    text = refused(drafts.sound().say("reach", face_dimension="cells"), tmp_path)
    assert "face_dimension is 'cells', but face_nodes has face and corner" in text


def test_data_of_the_wrong_size(tmp_path):
    draft = drafts.sound()
    dimensions, values, attributes = draft.variables["h"]
    draft.put("h", ("time", "cells"), values[:, :-2], **attributes)
    assert "variable h is said to stand on faces" in refused(draft, tmp_path)


def test_coordinates_of_different_sizes(tmp_path):
    draft = drafts.sound()
    _, values, attributes = draft.variables["node_y"]
    draft.put("node_y", ("rows",), values[:-3], **attributes)
    assert "node_x and node_y do not stand on one list of nodes" in refused(draft, tmp_path)


@pytest.mark.parametrize(("number", "start"), [(99, 0), (20, 0), (21, 1), (-5, 0)])
def test_a_node_number_out_of_range(tmp_path, number, start):
    draft = drafts.sound()
    faces = draft.values("face_nodes")
    faces = np.where(faces >= 0, faces + start, -1)
    faces[7, 1] = number
    draft.set("face_nodes", faces).say("face_nodes", start_index=np.int32(start))
    text = refused(draft, tmp_path)
    assert f"variable face_nodes: face 7 names node {number}, but nodes are numbered {start} to {19 + start}" in text


def test_a_start_index_that_is_neither(tmp_path):
    assert "start_index is 2; it must be 0 or 1" in refused(drafts.sound().say("face_nodes", start_index=2), tmp_path)


def test_padding_in_the_middle_of_a_face(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes").copy()
    faces[3] = [faces[3, 0], -1, *faces[3, 1:3]]
    assert "face 3 has an unused place before its last node" in refused(draft.set("face_nodes", faces), tmp_path)


def test_an_edge_list_that_lacks_a_side(tmp_path):
    draft = drafts.with_edges(drafts.sound())
    for name in ("edge_nodes", "flux"):
        dimensions, values, attributes = draft.variables[name]
        draft.put(name, dimensions, values[..., 2:] if name == "flux" else values[2:], **attributes)
    assert "edge_node_connectivity lacks the side between nodes" in refused(draft, tmp_path)


def test_missing_coordinates(tmp_path):
    draft = drafts.sound()
    x = draft.values("node_x").copy()
    x[[6, 11]] = np.nan
    assert "coordinates node_x, node_y are missing at node 6 (and 1 more" in refused(draft.set("node_x", x), tmp_path)


def test_missing_bed(tmp_path):
    draft = drafts.sound()
    zb = draft.values("zb").copy()
    zb[12] = np.nan
    text = refused(draft.set("zb", zb), tmp_path)
    x, y = draft.values("node_x")[12], draft.values("node_y")[12]
    assert f"bed zb is missing at node 12 ({x:.2f} E, {y:.2f} N)" in text


def test_a_face_without_area(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes").copy()
    faces[5, :3] = [2, 3, 4]  # three nodes in a row
    assert "face 5 at " in (text := refused(draft.set("face_nodes", faces), tmp_path)) and "has no area" in text


def test_a_face_of_two_different_nodes(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes").copy()
    faces[5] = [2, 3, 3, 2]
    assert "face 5 has 2 different nodes (and 0 more)" in refused(draft.set("face_nodes", faces), tmp_path)


def test_a_face_that_crosses_itself(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes").copy()
    quad = int(np.flatnonzero(faces[:, 3] >= 0)[1])
    faces[quad] = faces[quad][[0, 2, 1, 3]]
    assert f"face {quad} at " in (text := refused(draft.set("face_nodes", faces), tmp_path)) and "crosses itself" in text


def _with_face(draft, nodes, corners):
    """The draft with further nodes (k, 2) about the corner of the channel, and one further face."""
    draft = draft.copy()
    n = len(draft.values("node_x"))
    nodes = np.asarray(nodes, float).reshape(-1, 2) + drafts.CORNER
    for name, extra in (("node_x", nodes[:, 0]), ("node_y", nodes[:, 1]), ("zb", np.full(len(nodes), 11.0))):
        draft.set(name, np.concatenate([draft.values(name), extra]))
    row = [c if c >= 0 else n - 1 - c for c in corners]
    faces = draft.values("face_nodes")
    draft.set("face_nodes", np.vstack([faces, [row + [-1] * (4 - len(row))]]).astype(np.int32))
    for name in "huv":
        values = draft.values(name)
        draft.set(name, np.column_stack([values, values[:, -1]]))
    return draft


@pytest.mark.parametrize(
    ("nodes", "corners", "words"),
    [
        ([[12, 3], [18, 3], [15, 4]], [-1, -2, -3], "faces overlap there"),  # inside another face
        ([[-5, 1], [5, 1.2], [5, 1.4]], [-1, -2, -3], "faces overlap there"),  # poking into another
        ([[15, -5], [16, 20], [14, 20]], [-1, -2, -3], "overlap"),  # right across the channel
        ([], [0, 1, 6, 5], "two on the same side"),  # the first face again
        ([[0, 0], [10, 0], [10, 5], [0, 5]], [-1, -2, -3, -4], "lie on one another"),  # again, with nodes of its own
        ([[10, -5]], [0, -1, 2], "hangs on a side of face 18"),  # node 1 lies on the side from 0 to 2
    ],
)
def test_overlapping_faces_and_hanging_nodes(tmp_path, nodes, corners, words):
    assert words in refused(_with_face(drafts.sound(), nodes, corners), tmp_path)


def test_three_faces_on_one_side(tmp_path):
    draft = _with_face(drafts.sound(), [[-4, 2]], [0, 5, -1])
    draft = _with_face(draft, [[-4, 3]], [0, 5, -1])
    assert "shared by more than two faces or by two on the same side" in refused(draft, tmp_path)


def test_faces_that_share_no_nodes(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes")
    used = faces >= 0
    x, y, zb = (draft.values(n)[faces[used]] for n in ("node_x", "node_y", "zb"))
    own = np.full(faces.shape, -1, np.int32)
    own[used] = np.arange(used.sum())
    draft.set("node_x", x).set("node_y", y).set("zb", zb).set("face_nodes", own)
    assert "faces are not joined; export a mesh whose faces share their nodes" in refused(draft, tmp_path)


def test_a_slit_is_sound_and_noted(tmp_path):
    draft = drafts.sound()
    faces = draft.values("face_nodes").copy()
    for name in ("node_x", "node_y", "zb"):
        draft.set(name, np.append(draft.values(name), draft.values(name)[7]))
    upper = (faces == 7).any(axis=1) & (drafts.centres(_xy(draft), faces)[:, 1] > draft.values("node_y")[7])
    faces[upper] = np.where(faces[upper] == 7, 20, faces[upper])
    run = open_run(draft.set("face_nodes", faces).write(tmp_path / "run.nc"))
    assert any("not joined, as at a slit" in n.text for n in run.notes)


def _xy(draft):
    return np.column_stack([draft.values("node_x"), draft.values("node_y")])


def test_velocity_missing(tmp_path):
    assert "has no velocity, unit discharge or edge discharge" in refused(drafts.sound().drop("u", "v"), tmp_path)


def test_half_a_velocity(tmp_path):
    text = refused(drafts.sound().drop("v"), tmp_path)
    assert "velocity has its x component (u) but not y" in text and "mapping.velocity_y.variable" in text


def test_velocity_without_depth(tmp_path):
    text = refused(drafts.sound().drop("h"), tmp_path)
    assert "has velocity but neither depth nor water level" in text


def test_velocity_missing_everywhere(tmp_path):
    draft = drafts.sound()
    text = refused(draft.set("u", np.full_like(draft.values("u"), np.nan)), tmp_path)
    assert "velocity u is missing everywhere in the water of frame 0" in text


def test_velocity_missing_everywhere_in_a_later_frame(tmp_path):
    draft = drafts.sound()
    u = draft.values("u").copy()
    u[2] = np.nan
    run = open_run(draft.set("u", u).write(tmp_path / "run.nc"))
    with pytest.raises(ValueError, match="velocity u is missing everywhere in the water of frame 2"):
        run.frame(2)


def test_velocity_on_nodes_and_faces_mixed(tmp_path):
    draft = drafts.sound()
    attributes = draft.variables["v"][2] | {"location": "node"}
    draft.put("v", ("time", "node"), np.zeros((3, 20)), **attributes)
    assert "u stands on faces and v on nodes" in refused(draft, tmp_path)


def test_no_bed(tmp_path):
    assert "has no bed level that can be recognised" in refused(drafts.sound().drop("zb"), tmp_path)


@pytest.mark.parametrize("name", ["h", "u", "zb", "time"])
def test_no_units(tmp_path, name):
    text = refused(drafts.sound().say(name, units=None), tmp_path)
    assert f"variable {name} has no units" in text and "mapping." in text


def test_coordinates_without_units_and_system(tmp_path):
    draft = drafts.sound().drop("crs")
    for name in ("node_x", "node_y", "h", "u", "v", "zb"):
        draft.say(name, grid_mapping=None)
    for name in ("node_x", "node_y"):
        draft.say(name, units=None)
    assert "variable node_x has no units and the file no coordinate system" in refused(draft, tmp_path)
    run = open_run(tmp_path / "run.nc", mapping={"x": {"unit": "m"}, "y": {"unit": "m"}})
    assert run.crs is None


@pytest.mark.parametrize(("name", "unit"), [("h", "kg"), ("u", "furlong s-1"), ("zb", "m s-1"), ("time", "months since 2031-01-01")])
def test_units_that_measure_something_else(tmp_path, name, unit):
    draft = drafts.sound()
    if name == "h":
        draft.say("h", standard_name="flood_water_thickness")
    text = refused(draft.say(name, units=unit), tmp_path)
    assert f"variable {name}: the unit " in text


def test_absurd_depth(tmp_path):
    draft = drafts.sound()
    text = refused(draft.set("h", draft.values("h") * 1000), tmp_path)
    assert "the water is 1" in text and "m deep at face" in text and "check the unit" in text


def test_absurd_speed(tmp_path):
    draft = drafts.sound()
    text = refused(draft.set("u", draft.values("u") * 1000), tmp_path)
    assert "the water moves at " in text and "check the unit and fill value of velocity" in text


def test_absurd_bed(tmp_path):
    draft = drafts.sound()
    zb = draft.values("zb").copy()
    zb[3] = -99999.0
    assert "bed zb is -1e+05 m at node 3" in refused(draft.set("zb", zb), tmp_path)


def test_absurd_roughness(tmp_path):
    draft = drafts.sound()
    draft.put("n", ("face",), np.full(18, 30.0), units="s m-1/3", long_name="Manning roughness", mesh="reach", location="face")
    assert "roughness n is 30 at face" in refused(draft, tmp_path)


def test_an_absurd_extent(tmp_path):
    draft = drafts.sound()
    x = draft.values("node_x").copy()
    x[0] = -9e9
    assert "which no river model does" in refused(draft.set("node_x", x), tmp_path)


@pytest.mark.parametrize(("times", "words"), [([0, 120, 60], "runs backwards from frame 1 (120) to frame 2 (60)"), ([0, 60, 60], "stands still")])
def test_time_running_backwards_or_standing_still(tmp_path, times, words):
    assert f"variable time: time {words}" in refused(drafts.sound().set("time", np.array(times, float)), tmp_path)


def test_a_missing_time(tmp_path):
    text = refused(drafts.sound().set("time", np.array([0.0, np.nan, 9.0])), tmp_path)
    assert "variable time has no time for frame 1" in text


def test_frames_without_times(tmp_path):
    assert "dimension 'time' has 3 steps but no time variable" in refused(drafts.sound().drop("time"), tmp_path)


def test_no_frames(tmp_path):
    draft = drafts.sound()
    for name in ("h", "u", "v", "time"):
        draft.set(name, draft.values(name)[:0])
    assert "the file has no frames" in refused(draft, tmp_path)


def test_layers(tmp_path):
    draft = drafts.sound()
    for name in "huv":
        _, values, attributes = draft.variables[name]
        draft.put(name, ("time", "layer", "face"), np.repeat(values[:, None], 4, axis=1), **attributes)
    assert "has a dimension 'layer' of 4 steps that is neither time nor mesh" in refused(draft, tmp_path)


def test_kinds_that_disagree(tmp_path):
    draft = drafts.sound().say("u", cell_methods="time: maximum").say("v", cell_methods="time: maximum")
    assert "cell_methods disagree about time" in refused(draft, tmp_path)


def test_a_system_in_degrees(tmp_path):
    import pyproj

    draft = drafts.sound().put("crs", (), np.int32(0), crs_wkt=pyproj.CRS.from_epsg(4326).to_wkt())
    assert "is in degrees, not metres; project the mesh" in refused(draft, tmp_path)


@pytest.mark.parametrize("change", [{"units": "degrees_east"}, {"standard_name": "longitude"}])
def test_coordinates_in_degrees(tmp_path, change):
    text = refused(drafts.sound().say("node_x", **change), tmp_path)
    assert "variable node_x is in degrees of longitude or latitude; lengths and areas need metres" in text


@pytest.mark.parametrize(
    ("attributes", "words"),
    [({"crs_wkt": "PROJCS[nonsense"}, "cannot be read"), ({}, "has neither crs_wkt nor grid_mapping_name"),
     ({"grid_mapping_name": "of my own"}, "its grid mapping cannot be read")],
)
def test_a_system_that_cannot_be_read(tmp_path, attributes, words):
    assert words in refused(drafts.sound().put("crs", (), np.int32(0), **attributes), tmp_path)


def test_units_against_the_system(tmp_path):
    draft = drafts.sound().say("node_x", units="ft").say("node_y", units="ft")
    assert "is in ft, but its coordinate system counts metres" in refused(draft, tmp_path)


def test_two_variables_for_one_quantity(tmp_path):
    draft = drafts.sound()
    draft.put("h2", ("time", "face"), draft.values("h"), **draft.variables["h"][2])
    assert "variables h and h2 both claim to be depth; say which with mapping.depth.variable" in refused(draft, tmp_path)


@pytest.mark.parametrize(
    ("mapping", "words"),
    [
        ({"deth": "h"}, "unknown entry 'deth'; the known ones are depth, level"),
        ({"depth": {"var": "h"}}, "depth has an unknown key 'var'; the known ones are variable, unit, is"),
        ({"depth": {"variable": "h", "is": "average"}}, "depth.is is 'average'; say one of 'point', 'mean', 'maximum'"),
        ({"depth": {"variable": 3}}, "depth.variable is 3; give it as text"),
        ({"depth": "nowhere"}, "depth names variable 'nowhere', which does not stand on the mesh; those that do: h, u, v, zb"),
    ],
)
def test_a_wrong_mapping(tmp_path, mapping, words):
    path = drafts.sound().write(tmp_path / "run.nc")
    with pytest.raises(ValueError, match=re.escape(words)):
        open_run(path, mapping=mapping)


def test_an_unknown_kind(tmp_path):
    with pytest.raises(ValueError, match="kind of frame is 'average'; say one of instant, mean, maximum"):
        open_run(drafts.sound().write(tmp_path / "run.nc"), kind="average")
