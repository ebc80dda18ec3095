"""Whatever is wrong with a file, a command says it in one sentence and gives status 2; nothing else is printed or read.

A law over made damage (seeded by hypothesis): single entries of sound files are changed, emptied, dropped or swapped,
bytes are lost or turned. What is then still readable must give finite fields.
"""

from __future__ import annotations

import re
import shutil
import warnings
from pathlib import Path

import geopandas
import h5py
import numpy as np
import pandas as pd
import pytest
import rasterio
import shapely
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from dashboard.cli import main
from hydro._kernels import meshcheck
from hydro.readers import open_run
from tests import reader_drafts as drafts
from tests.hydro.readers import test_doors as doors

VALUES = (np.nan, np.inf, -np.inf, 1e20, 9.969e36, 1e300, -999.0, 0.0)
TEXTS = ("", "nonsense", "-1", "m", "s", "degrees_north", "days since 0000-00-00", "node_x", "time", "x y", "crs: x y", "lunar", "é")
ATTRIBUTES = (
    "units", "standard_name", "long_name", "mesh", "location", "cf_role", "start_index", "missing_value", "scale_factor", "add_offset",
    "valid_min", "valid_max", "valid_range", "cell_methods", "calendar", "grid_mapping", "node_coordinates", "face_node_connectivity",
    "face_dimension", "topology_dimension", "crs_wkt", "bounds", "positive", "location_index_set", "flag_meanings",
)
SOUND = (drafts.sound, lambda: drafts.with_edges(drafts.sound()))


def change(draft: drafts.Draft, data) -> None:
    """One entry of a draft made wrong."""
    name = data.draw(st.sampled_from(sorted(draft.variables)))
    dimensions, values, _ = draft.variables[name]
    kind = data.draw(st.sampled_from(["attribute", "value", "all", "drop", "empty", "cut", "swap", "turn"]))
    if kind == "attribute":
        wrong = st.one_of(st.sampled_from(TEXTS), st.sampled_from([np.int32(7), np.float64(np.nan), np.array([1.0, 2.0, 3.0])]))
        draft.say(name, **{data.draw(st.sampled_from(ATTRIBUTES)): data.draw(wrong)})
    elif kind in ("value", "all") and values.size:
        integer = values.dtype.kind in "iu"
        wrong = data.draw(st.sampled_from([-1, 0, 5, 999999] if integer else VALUES))
        values = values.copy()
        values.ravel()[slice(None) if kind == "all" else data.draw(st.integers(0, values.size - 1))] = wrong
        draft.set(name, values)
    elif kind == "drop":
        draft.drop(name)
    elif kind in ("empty", "cut") and dimensions:
        _shorten(draft, dimensions[0], 0 if kind == "empty" else 1)
    elif kind == "swap":
        other = data.draw(st.sampled_from(sorted(draft.variables)))
        own, theirs = draft.variables[name], draft.variables[other]
        draft.variables[name], draft.variables[other] = theirs, own
    elif kind == "turn" and values.ndim > 1:
        draft.variables[name] = (dimensions[::-1], values.T, draft.variables[name][2])


def _shorten(draft: drafts.Draft, dimension: str, size: int) -> None:
    for name, (own, values, attributes) in list(draft.variables.items()):
        if dimension in own:
            axis = own.index(dimension)
            draft.variables[name] = (own, np.take(values, range(min(size, values.shape[axis])), axis=axis), attributes)


def finite_or_one_sentence(paths) -> str:
    """What is read is finite; else the one sentence."""
    try:
        run = open_run(paths)
        for frame in run.frames():
            for field in (frame.bed, frame.depth, frame.unit_discharge, frame.face_depth, frame.face_unit_discharge, frame.velocity):
                assert np.isfinite(field).all()
    except (ValueError, OSError) as error:
        text = str(error)
        assert "\n" not in text and text.endswith(".") and len(text) > 20, text
        return text
    return ""


@settings(max_examples=40, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_a_file_made_wrong_is_refused_in_one_sentence_or_read_whole(tmp_path, data):
    draft = data.draw(st.sampled_from(SOUND))()
    for _ in range(data.draw(st.integers(1, 2))):
        change(draft, data)
    path = tmp_path / "run.nc"
    path.unlink(missing_ok=True)
    try:
        draft.write(path)
    except (ValueError, TypeError, KeyError, RuntimeError, OSError):
        return  # the writer refuses it first
    finite_or_one_sentence(path)


@pytest.fixture(scope="module")
def sound_files(tmp_path_factory):
    """Files of every door, by its name."""
    made = {}
    for door in ("UGRID", "rectilinear points", "CSV scattered", "Parquet", "faces and nodes", "GeoTIFF", "GeoPackage polygons"):
        folder = tmp_path_factory.mktemp("door")
        found = doors.DOORS[door](folder)
        paths = found if isinstance(found, list) else sorted(found.iterdir()) if found.is_dir() else [found]
        made[door] = [(p.name, p.read_bytes()) for p in paths]
    return made


@settings(max_examples=60, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
@pytest.mark.filterwarnings("ignore:Unable to parse srs_id:RuntimeWarning")
def test_lost_and_turned_bytes_are_told_in_one_sentence_or_do_no_harm(tmp_path, sound_files, data):
    files = sound_files[data.draw(st.sampled_from(sorted(sound_files)))]
    folder = tmp_path / "files"
    shutil.rmtree(folder, ignore_errors=True)
    folder.mkdir()
    hit = data.draw(st.integers(0, len(files) - 1))
    for i, (name, content) in enumerate(files):
        if i == hit:
            at = data.draw(st.integers(0, len(content) - 1))
            how = data.draw(st.sampled_from(["cut", "blank", "turn"]))
            turned = {"cut": b"", "blank": bytes(200) + content[at + 200 :], "turn": bytes([content[at] ^ 255]) + content[at + 1 :]}
            content = content[:at] + turned[how]
        (folder / name).write_bytes(content)
    finite_or_one_sentence(sorted(folder.iterdir()))


def told(path, capsys) -> str:
    """The one line that a command prints for bad input, with its status."""
    assert main(["arrival", str(path)]) == 2
    out = capsys.readouterr()
    lines = [line for line in out.err.splitlines() if not line.startswith("leewater: reading")]
    assert out.out == "" and len(lines) == 1 and lines[0].startswith("leewater: "), out.err
    return lines[0]


def _values(name, value):
    def spoil(draft):
        values = draft.values(name).copy()
        values.ravel()[-1] = value
        return draft.set(name, values)

    return spoil


@pytest.mark.parametrize(
    ("spoil", "says"),
    [
        (_values("h", 1e20), r"the water is 1e\+20 m deep at face .* in frame 2; check the unit and fill value"),
        (_values("u", 9.969e36), r"the water moves at .* in frame 2; check the unit and fill value of velocity"),
        (_values("flux", 1e300), r"flux is 1e\+300 m3/s at edge .* in frame 2; check its unit and fill value"),
        (_values("node_x", np.nan), "coordinates node_x, node_y are missing at node"),
        (lambda d: d.say("h", valid_max="deep"), "valid_max is 'deep', which is no number"),
        (lambda d: d.say("h", missing_value="none"), "missing_value is 'none', which is no number"),
        (lambda d: d.say("node_x", units="cubits"), "node_x or y: the unit 'cubits' is not understood; correct the attribute"),
        (lambda d: _shortened(d, "face"), "face_nodes lists no faces; export the complete mesh"),
        (lambda d: _shortened(d, "edge"), "edge_nodes lists no edges; export the complete mesh"),
        (lambda d: _shortened(d, "time"), "no frames|no times|frame"),
    ],
    ids=["late fill depth", "late fill speed", "late edge flow", "NaN node", "text bound", "text fill", "unit", "no faces", "no edges", "no times"],
)
def test_a_command_prints_one_line_and_gives_status_two(tmp_path, capsys, spoil, says):
    """Values beyond any river in a later frame are found when that frame is read, not only in the first."""
    path = spoil(drafts.with_edges(drafts.sound())).write(tmp_path / "run.nc")
    assert re.search(says, told(path, capsys))


def _shortened(draft: drafts.Draft, dimension: str) -> drafts.Draft:
    _shorten(draft, dimension, 0)
    return draft


def test_a_damaged_root_of_an_hdf5_file_leaves_no_noise(tmp_path, capsys):
    """A library that fails half way must not print its own complaints beside the sentence."""
    path = drafts.sound().write(tmp_path / "run.nc")
    data = bytearray(path.read_bytes())
    with h5py.File(path) as file:
        at = int(h5py.h5o.get_info(file["/"].id).addr)
    data[at : at + 64] = bytes(64)
    path.write_bytes(data)
    assert "cut short or damaged" in told(path, capsys)


@given(st.lists(st.tuples(st.floats(-1e3, 1e3), st.floats(-1e3, 1e3), st.floats(0, 5)), min_size=1, max_size=30))
def test_the_search_for_absurd_speeds_is_its_numpy_twin(rows):
    """Second method: the same bound with whole arrays."""
    u, v, depth = np.array(rows).T
    flow, wet, fastest = np.column_stack([u, v]), 0.05, 50.0
    beyond = np.flatnonzero((np.abs(flow) > fastest * np.where(depth > wet, depth, 1.0)[:, None]).any(axis=1))
    assert meshcheck.too_fast(flow, depth, wet, fastest) == (beyond[0] if beyond.size else -1, beyond.size)


def test_rasters_without_a_place_are_refused(tmp_path, capsys):
    """Read as cells of one metre they would look sound and be wrong."""
    folder = doors.rasters(tmp_path)
    for path in list(folder.iterdir()):
        with rasterio.open(path) as source:
            values, unit = source.read(1), source.units[0]
        _bare(path, values, unit)
    assert "bed.tif has no georeference" in told(folder, capsys)


def _bare(path: Path, values: np.ndarray, unit: str) -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", rasterio.errors.NotGeoreferencedWarning)
        with rasterio.open(path, "w", driver="GTiff", height=len(values), width=len(values[0]), count=1, dtype="float64") as out:
            out.write(values, 1)
            out.set_band_unit(1, unit)


@pytest.mark.parametrize(
    ("spoil", "says"),
    [
        (lambda faces, nodes: (faces.assign(node_2=["x", *faces["node_2"][1:]]), nodes), "column 'node_2' holds 'x' in row 1"),
        (lambda faces, nodes: (faces, nodes.assign(node=["7a", *nodes["node"][1:]])), "column 'node' holds '7a' in row 1"),
        (lambda faces, nodes: (faces, nodes.assign(node=[2, *nodes["node"][1:]])), "node 2 stands twice in column 'node'"),
        (lambda faces, nodes: (faces, nodes.assign(node=[1.5, *nodes["node"][1:]])), "row 1 has no whole number in column 'node'"),
    ],
)
def test_numbers_of_nodes_that_are_none(tmp_path, spoil, says):
    """A node that cannot be read may not leave a face with a corner less."""
    paths = doors.face_tables(tmp_path)
    for path, table in zip(paths, spoil(*(pd.read_csv(p) for p in paths)), strict=True):
        table.to_csv(path, index=False)
    assert says in finite_or_one_sentence(paths)


def test_a_geopackage_whose_system_cannot_be_read_is_not_taken_as_local_metres(tmp_path):
    path = doors.polygons(tmp_path)
    data = path.read_bytes()
    at = data.index(b"PROJCS[")
    path.write_bytes(data[:at] + b"XXXXXX[" + data[at + 7 :])
    assert "its coordinate system cannot be read" in finite_or_one_sentence(path)
    assert open_run(path, mapping={"crs": drafts.CRS.to_wkt()}).crs is not None


def test_a_grid_with_coordinates_that_are_no_numbers_says_so(tmp_path):
    path = doors.grid(tmp_path, curved=True)
    with h5py.File(path, "a") as file:
        file["yc"][...] = -np.inf
    assert "no place of the grid has both coordinates" in finite_or_one_sentence(path)


def test_points_without_a_finite_place_are_told(tmp_path):
    table = geopandas.read_file(doors.polygons(tmp_path, points=True))
    table.loc[2, "geometry"] = shapely.Point(np.inf, 0)
    table.to_file(tmp_path / "away.gpkg")
    assert "feature 3 has coordinates that are no numbers" in finite_or_one_sentence(tmp_path / "away.gpkg")


def test_polygons_with_a_broken_ring_are_told(tmp_path):
    table = geopandas.read_file(doors.polygons(tmp_path))
    table.loc[3, "geometry"] = None
    table.to_file(tmp_path / "gap.gpkg")
    assert "feature 4 has no geometry" in finite_or_one_sentence(tmp_path / "gap.gpkg")
