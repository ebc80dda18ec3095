"""The same reach through every door gives the same section discharge; what a door cannot give is said."""

from __future__ import annotations

from functools import partial
from pathlib import Path

import geopandas
import numpy as np
import pandas as pd
import pyarrow
import pyarrow.parquet
import pytest
import rasterio
import shapely

from dashboard.cli import main
from hydro.cautions import caution
from hydro.readers import open_run
from hydro.run import Run
from hydro.section import cut, section_figures
from hydro.section.error import reading_error
from tests import reader_drafts as drafts
from tests.reader_drafts import CORNER, CRS, Draft

LENGTH, WIDTH, SIZE = 120.0, 40.0, 2.0
# The line that the discharge is taken across, oblique and inside the reach, from left to right.
LEFT, RIGHT = np.array([46.3, 37.1]), np.array([71.9, 3.3])


def psi(x, y):
    """A made stream function, m3/s: a parabolic profile that leans to and fro."""
    return 3.0 * y - 0.001 * y**3 + 4.0 * np.sin(x / 20.0) * np.sin(np.pi * y / WIDTH)


def water(x, y):
    """Depth, m, and velocity, m/s, whose unit discharge is the curl of psi, in closed form; plan metres."""
    h = 2.0 + 0.01 * x
    qx = 3.0 - 0.003 * y**2 + 4.0 * np.sin(x / 20.0) * np.cos(np.pi * y / WIDTH) * np.pi / WIDTH
    qy = -4.0 / 20.0 * np.cos(x / 20.0) * np.sin(np.pi * y / WIDTH)
    return h, qx / h, qy / h


def bed(x, y):
    return 50.0 - 0.002 * x + 0 * y


def discharge(run: Run, index: int = 0) -> float:
    """Discharge across the line by the midpoint rule on 4,000 pieces, from the field that sections use, m3/s."""
    frame, n = run.frame(index), 4000
    along = (RIGHT - LEFT) / n
    points = run.mesh.to_local(CORNER + LEFT + (np.arange(n) + 0.5)[:, None] * along)
    triangle = run.mesh.find(points)
    assert np.all(triangle >= 0)
    q = frame.triangle_unit_discharge[triangle]
    # Facing downstream with the left bank on the left: the normal of a step (dx, dy) is (-dy, dx).
    return float(np.sum(-q[:, 0] * along[1] + q[:, 1] * along[0]))


EXACT = psi(*LEFT) - psi(*RIGHT)


def straight(x):
    """Heights of the right and left bank at x, plan metres: along the sides of the lattice."""
    return 0 * x, 0 * x + WIDTH


def leaning(x):
    """Banks that run oblique to the lattice, so that cells make stair steps of them."""
    return 2.0 + 0.13 * x, 23.0 + 0.11 * x


def in_water(x, y, banks):
    right, left = banks(x)
    return (y >= right) & (y <= left)


def faces_between(banks) -> tuple[np.ndarray, np.ndarray]:
    """Nodes (plan metres) and faces of a mesh that follows the banks."""
    xy, faces = drafts.faces_of_channel(int(LENGTH / SIZE), int(WIDTH / SIZE))
    x, y = ((xy - CORNER) * [SIZE / 10, SIZE / 5]).T
    right, left = banks(x)
    return np.column_stack([x, right + (left - right) * y / WIDTH]), faces


def ugrid(folder: Path, banks=straight) -> Path:
    xy, faces = faces_between(banks)
    fx, fy = drafts.centres(xy, faces).T
    draft = drafts.sound()
    for k, axis in enumerate("xy"):
        draft.set(f"node_{axis}", xy[:, k] + CORNER[k])
    draft.set("face_nodes", faces).set("zb", bed(*xy.T)).set("time", np.array([0.0]))
    for name, values in zip("huv", water(fx, fy), strict=True):
        draft.set(name, values[None])
    return draft.write(folder / "reach.nc")


def cell_centres():
    return np.arange(SIZE / 2, LENGTH, SIZE), np.arange(SIZE / 2, WIDTH, SIZE)


def grid(folder: Path, banks=straight, *, form="netcdf4", curved=False, points=False, bounds=False) -> Path:
    x, y = (np.arange(0, LENGTH + 1, SIZE), np.arange(0, WIDTH + 1, SIZE)) if points else cell_centres()
    xs, ys = np.meshgrid(x, y)
    draft = Draft()
    draft.put("crs", (), np.int32(0), crs_wkt=CRS.to_wkt())
    coordinates = {"grid_mapping": "crs", "units": "m"}
    if curved:
        # The same lattice sheared, so that rows lean.
        xs = xs + 0.3 * ys
        draft.put("xc", ("j", "i"), xs + CORNER[0], standard_name="projection_x_coordinate", **coordinates)
        draft.put("yc", ("j", "i"), ys + CORNER[1], standard_name="projection_y_coordinate", **coordinates)
        dimensions = ("j", "i")
    else:
        more = [{"bounds": f"{a}_bounds"} if bounds else {} for a in "xy"]
        draft.put("x", ("x",), x + CORNER[0], standard_name="projection_x_coordinate", **coordinates, **more[0])
        draft.put("y", ("y",), y[::-1] + CORNER[1], standard_name="projection_y_coordinate", **coordinates, **more[1])
        ys = ys[::-1]
        dimensions = ("y", "x")
        if bounds:
            draft.put("x_bounds", ("x", "two"), np.column_stack([x - SIZE / 2, x + SIZE / 2]) + CORNER[0])
            draft.put("y_bounds", ("y", "two"), (np.column_stack([y - SIZE / 2, y + SIZE / 2]) + CORNER[1])[::-1])
    keep = (xs >= 0) & (xs <= LENGTH) & in_water(xs, ys, banks)
    h, u, v = water(xs, ys)
    methods = {} if points or bounds else {"cell_methods": "area: mean"}
    draft.put("zb", dimensions, np.where(keep, bed(xs, ys), np.nan), units="m", standard_name="ground_level_altitude")
    draft.put("h", dimensions, np.where(keep, h, np.nan), units="m", long_name="water depth", **methods)
    draft.put("u", dimensions, np.where(keep, u, np.nan), units="m s-1", standard_name="sea_water_x_velocity")
    draft.put("v", dimensions, np.where(keep, v, np.nan), units="m s-1", standard_name="sea_water_y_velocity")
    return draft.write(folder / "grid.nc", form)


def point_table(scattered: bool, banks=straight) -> pd.DataFrame:
    if scattered:
        rng = np.random.default_rng(5)
        x, y = (a.ravel() for a in np.meshgrid(np.arange(0, LENGTH + 1, SIZE), np.arange(0, WIDTH + 1, SIZE)))
        inside = (x > 0) & (x < LENGTH) & (y > 0) & (y < WIDTH)
        x, y = x + inside * rng.uniform(-0.5, 0.5, x.size), y + inside * rng.uniform(-0.5, 0.5, y.size)
    else:
        x, y = (a.ravel() for a in np.meshgrid(np.arange(0, LENGTH + 1, SIZE), np.arange(0, WIDTH + 1, SIZE)))
    keep = in_water(x, y, banks)
    x, y = x[keep], y[keep]
    h, u, v = water(x, y)
    return pd.DataFrame({
        "x [m]": x + CORNER[0], "y [m]": y + CORNER[1], "depth [m]": h, "velocity_x [m/s]": u, "velocity_y (m s-1)": v,
        "bed [m]": bed(x, y),
    })


def csv(folder: Path, banks=straight, *, scattered=False) -> Path:
    point_table(scattered, banks).to_csv(folder / "points.csv", index=False)
    return folder / "points.csv"


def parquet(folder: Path, banks=straight) -> Path:
    """Units as metadata of the fields, bare headings."""
    table = point_table(False, banks)
    table.columns = ["x", "y", "depth", "velocity_x", "velocity_y", "bed"]
    arrow = pyarrow.Table.from_pandas(table, preserve_index=False)
    units = ["m", "m", "m", "m s-1", "m s-1", "m"]
    fields = [f.with_metadata({"units": u}) for f, u in zip(arrow.schema, units, strict=True)]
    pyarrow.parquet.write_table(arrow.cast(pyarrow.schema(fields)), folder / "points.parquet")
    return folder / "points.parquet"


def face_tables(folder: Path, banks=straight) -> list[Path]:
    xy, faces = faces_between(banks)
    fx, fy = drafts.centres(xy, faces).T
    h, u, v = water(fx, fy)
    table = pd.DataFrame({f"node_{k + 1}": pd.array([int(n) + 1 if n >= 0 else None for n in faces[:, k]], "Int64") for k in range(4)})
    table = table.assign(**{"depth [m]": h, "velocity_x [m/s]": u, "velocity_y [m/s]": v, "bed [m]": bed(fx, fy)})
    table.to_csv(folder / "faces.csv", index=False)
    nodes = pd.DataFrame({"node": np.arange(1, len(xy) + 1), "x [m]": xy[:, 0] + CORNER[0], "y [m]": xy[:, 1] + CORNER[1]})
    nodes.to_csv(folder / "nodes.csv", index=False)
    return [folder / "faces.csv", folder / "nodes.csv"]


def rasters(folder: Path, banks=straight, *, times=("60s",)) -> Path:
    x, y = cell_centres()
    xs, ys = np.meshgrid(x, y[::-1])
    h, u, v = water(xs, ys)
    transform = rasterio.Affine(SIZE, 0, CORNER[0], 0, -SIZE, CORNER[1] + WIDTH)
    layers = {"bed": (np.where(in_water(xs, ys, banks), bed(xs, ys), -9999.0), "m")}
    for k, t in enumerate(times):
        layers |= {f"depth_{t}": (h + 0.1 * k, "m"), f"velocity_x_{t}": (u, "m s-1"), f"velocity_y_{t}": (v, "m s-1")}
    (folder / "set").mkdir()
    for name, (values, unit) in layers.items():
        with rasterio.open(
            folder / "set" / f"{name}.tif", "w", driver="GTiff", height=len(y), width=len(x), count=1, dtype="float64",
            crs=CRS.to_wkt(), transform=transform, nodata=-9999.0,
        ) as out:
            out.write(values, 1)
            out.set_band_unit(1, unit)
    return folder / "set"


def polygons(folder: Path, banks=straight, *, points=False) -> Path:
    if points:
        table = point_table(True, banks)
        shapes = shapely.points(table[["x [m]", "y [m]"]].to_numpy())
        table = table.drop(columns=["x [m]", "y [m]"])
    else:
        xy, faces = faces_between(banks)
        h, u, v = water(*drafts.centres(xy, faces).T)
        shapes = [shapely.Polygon(xy[row[row >= 0]] + CORNER) for row in faces]
        zb = bed(*drafts.centres(xy, faces).T)
        table = pd.DataFrame({"depth [m]": h, "velocity_x [m/s]": u, "velocity_y [m/s]": v, "bed [m]": zb})
    geopandas.GeoDataFrame(table, geometry=shapes, crs=CRS).to_file(folder / "faces.gpkg", layer="results", engine="pyogrio")
    return folder / "faces.gpkg"


DOORS = {
    "UGRID": ugrid,
    "rectilinear cells": grid,
    "rectilinear cells with bounds": partial(grid, bounds=True),
    "rectilinear points": partial(grid, form="classic", points=True),
    "curvilinear cells": partial(grid, form="classic", curved=True),
    "CSV on a lattice": csv,
    "CSV scattered": partial(csv, scattered=True),
    "Parquet": parquet,
    "faces and nodes": face_tables,
    "GeoTIFF": rasters,
    "GeoPackage polygons": polygons,
    "GeoPackage points": partial(polygons, points=True),
}


@pytest.mark.parametrize("door", DOORS)
def test_every_door_gives_the_same_section_discharge(tmp_path, door):
    """Closed form: the discharge across a line is the difference of psi between its ends.

    Tolerance 0.5 %: values constant in cells of 2 m (linear between points of 2 m) miss a smooth field by a share
    of (cell / scale of the field)^2, here (2 / 20)^2 / 8 = 0.13 %, and of where the line enters its end cells.
    """
    run = open_run(DOORS[door](tmp_path))
    assert discharge(run) == pytest.approx(EXACT, rel=0.005)
    assert run.frame(0).level[0] == pytest.approx(52.0 + 0.008 * (run.mesh.to_world(run.mesh.node_xy)[0, 0] - CORNER[0]), abs=0.05)


def lines_across(banks, count: int = 60):
    """Lines and the discharge across each by psi: every second ends in the water, the others reach past both banks."""
    rng = np.random.default_rng(1)
    for k in range(count):
        x = rng.uniform(20, 100, 2)
        right, left = banks(x)
        inset = rng.uniform(3, 8, 2) * (k % 2)
        ends = np.column_stack([x, [left[0] - inset[0], right[1] + inset[1]]])
        exact = psi(*ends[0]) - psi(*ends[1])
        yield (ends if k % 2 else ends + np.array([[-0.2], [0.2]]) * (ends[1] - ends[0])), exact


@pytest.mark.parametrize("banks", [straight, leaning])
@pytest.mark.parametrize("door", DOORS)
def test_the_true_discharge_lies_within_the_error_that_each_door_states(tmp_path, door, banks):
    """Closed form: the difference of psi between a line's ends, whether or not the banks run along the lattice.

    The error states a coverage of about 95 % (JCGM 100:2008, 6.3.3), so one line in twenty may lie outside,
    by no more than half. It may not be had by stating much: inside the water under 3 % of the flow, and at
    stepped banks under two diagonals of a cell of the fastest flow.
    """
    run = open_run(DOORS[door](tmp_path, banks))
    frame = run.frame(0)
    misses, inside = [], []
    for ends, exact in lines_across(banks):
        section = cut(frame, run.mesh.to_local(CORNER + ends))
        stated = reading_error(section)
        misses.append(abs(section_figures(section).discharge_m3_s - exact) / stated.total_m3_s)
        if not stated.banks_m3_s:
            inside.append(stated.total_m3_s / abs(exact))
        fastest = np.hypot(*frame.unit_discharge.T).max()
        assert stated.banks_m3_s <= (2 * np.sqrt(2) * 1.5 * SIZE * fastest if run.mesh.stepped else 0.0)
    assert np.mean(np.array(misses) > 1) <= 0.05 and max(misses) < 1.5
    assert np.median(inside) < 0.03


def test_an_error_that_counts_no_steps_of_the_banks_would_be_too_small(tmp_path):
    """Why the banks are counted: on stair steps the discharge misses by far more than two readings of it differ."""
    run = open_run(csv(tmp_path, leaning))
    missed = []
    for ends, exact in lines_across(leaning):
        section = cut(run.frame(0), run.mesh.to_local(CORNER + ends))
        stated = reading_error(section)
        if stated.banks_m3_s:
            missed.append(abs(section_figures(section).discharge_m3_s - exact) > stated.within_m3_s)
    assert np.mean(missed) > 0.5


@pytest.mark.parametrize(("door", "stepped"), [("UGRID", False), ("rectilinear cells", True), ("GeoTIFF", True), ("CSV scattered", True)])
def test_commands_print_the_error_of_the_door(tmp_path, capsys, door, stepped):
    made = DOORS[door](tmp_path)
    corner = " ".join(f"{x},{y}" for x, y in CORNER + [[50.0, 45.0], [55.0, -5.0]])
    path = str(made)
    assert main(["section", path, "--line", corner]) == 0
    printed = capsys.readouterr().out
    assert "read within" in printed and ("stair steps" in printed) == stepped
    assert caution("sensitivity").text in printed
    assert main(["arrival", path]) == 0
    found = [line for line in capsys.readouterr().out.splitlines() if "across a section reads within" in line]
    assert len(found) == 1 and ("stair steps" in found[0]) == stepped


@pytest.mark.parametrize(
    ("door", "words"),
    [("rectilinear cells", "stair steps"), ("GeoTIFF", "stair steps"), ("CSV on a lattice", "no edges"),
     ("CSV scattered", "no edges of the model"), ("faces and nodes", "edge discharges cannot be given"),
     ("GeoPackage polygons", "no edge discharges")],
)
def test_a_door_says_what_it_cannot_give(tmp_path, door, words):
    run = open_run(DOORS[door](tmp_path))
    assert any(words in n.text for n in run.notes), [n.text for n in run.notes]


@pytest.mark.parametrize("door", ["rectilinear cells", "GeoTIFF", "GeoPackage polygons", "curvilinear cells"])
def test_doors_with_a_system_keep_it(tmp_path, door):
    assert "Transverse Mercator" in open_run(DOORS[door](tmp_path)).crs


def test_cells_without_bed_are_no_part_of_the_mesh(tmp_path):
    run = open_run(grid(tmp_path, curved=True))
    x = run.mesh.to_world(run.mesh.node_xy)[:, 0] - CORNER[0]
    # Lattice centres stay inside the reach; corners reach half a cell further along the lean.
    assert x.min() > -2.0 and x.max() < LENGTH + 2.0


def test_rasters_are_ordered_by_time_and_read_one_at_a_time(tmp_path):
    run = open_run(rasters(tmp_path, times=("120s", "60s", "5min")))
    np.testing.assert_array_equal(run.times.seconds, [0.0, 60.0, 240.0])
    depth = [run.read(i).depth[0] for i in range(3)]
    np.testing.assert_allclose(np.diff(depth), [-0.1, 0.2], atol=1e-9)


def test_rasters_may_be_dated(tmp_path):
    run = open_run(rasters(tmp_path, times=("20310302T060000Z", "20310302T061500Z")))
    assert run.times.instants[1] == np.datetime64("2031-03-02T06:15")


def test_a_pattern_and_words_name_rasters_otherwise(tmp_path):
    folder = rasters(tmp_path)
    for path in list(folder.iterdir()):
        word = {"bed": "zb", "depth": "h", "velocity_x": "u", "velocity_y": "v"}[path.stem.removesuffix("_60s")]
        path.rename(folder / (f"{word}.tif" if word == "zb" else f"t60 {word}.tif"))
    mapping = {"pattern": "t{time} {quantity}.tif", "time": {"unit": "s"}, "depth": "h", "velocity_x": "u", "velocity_y": "v", "bed": "zb"}
    assert discharge(open_run(folder, mapping=mapping)) == pytest.approx(EXACT, rel=0.005)


def test_tables_and_layers_hold_several_times(tmp_path):
    first, second = point_table(False), point_table(False).sample(frac=1, random_state=3)
    second["depth [m]"] += 0.5
    both = pd.concat([second.assign(time="2031-03-02T07:00:00+01:00"), first.assign(time="2031-03-02T05:00:00Z")])
    both.to_csv(tmp_path / "points.csv", index=False)
    run = open_run(tmp_path / "points.csv")
    assert list(run.times.instants.astype(str)) == ["2031-03-02T05:00:00.000000", "2031-03-02T06:00:00.000000"]
    np.testing.assert_allclose(run.read(1).depth - run.read(0).depth, 0.5, atol=1e-12)
    shapes = shapely.points(both[["x [m]", "y [m]"]].to_numpy())
    geopandas.GeoDataFrame(both.drop(columns=["x [m]", "y [m]"]), geometry=shapes, crs=CRS).to_file(tmp_path / "points.gpkg")
    layer = open_run(tmp_path / "points.gpkg")
    np.testing.assert_allclose(np.sort(layer.read(1).depth), np.sort(run.read(1).depth), atol=1e-12)


def test_scattered_points_do_not_bridge_a_pier(tmp_path):
    """A round pier of 4 m radius among points 2 m apart stays a hole, and its side is a boundary."""
    table = point_table(True)
    away = np.hypot(table["x [m]"] - CORNER[0] - 60.0, table["y [m]"] - CORNER[1] - 20.0)
    table[away > 4.0].to_csv(tmp_path / "points.csv", index=False)
    run = open_run(tmp_path / "points.csv")
    assert run.mesh.find(run.mesh.to_local(CORNER + [[60.0, 20.0]]))[0] == -1
    assert run.mesh.find(run.mesh.to_local(CORNER + [[70.0, 20.0]]))[0] >= 0


def refused(paths, **options) -> str:
    with pytest.raises(ValueError) as caught:
        open_run(paths, **options)
    text = str(caught.value)
    assert "\n" not in text and text.endswith("."), text
    return text


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda t: t.drop(columns="x [m]"), "has no column 'x'"),
        (lambda t: t.rename(columns={"depth [m]": "depth"}), "column 'depth' has no unit"),
        (lambda t: t.rename(columns={"depth [m]": "depth [kg]"}), "column 'depth [kg]': the unit 'kg' is not understood"),
        (lambda t: t.drop(columns="bed [m]"), "has no bed level"),
        (lambda t: t.drop(columns="velocity_x [m/s]"), "velocity has its y component"),
        (lambda t: pd.concat([t, t.iloc[:1]]), "stands twice in frame 0"),
        (lambda t: pd.concat([t.assign(**{"time [s]": 0}), t.iloc[1:].assign(**{"time [s]": 9})]), "is missing from frame 1"),
        (lambda t: t.astype({"depth [m]": object}).assign(**{"depth [m]": ["wet", *t["depth [m]"][1:]]}), "holds 'wet' in row 1"),
        (lambda t: t.assign(time=3), "needs a unit of time"),
        (lambda t: t.assign(time="noon"), "holds times that cannot be read"),
        (lambda t: t.iloc[:0], "has headings but no rows"),
        (lambda t: t.iloc[:2], "fewer than three points make no mesh"),
        (lambda t: t.iloc[:5].assign(**{"x [m]": np.arange(5.0), "y [m]": 2 * np.arange(5.0)}), "in a line"),
    ],
)
def test_bad_tables(tmp_path, change, words):
    change(point_table(False)).to_csv(tmp_path / "points.csv", index=False)
    text = refused(tmp_path / "points.csv")
    assert words in text and "points.csv" in text


def test_a_text_that_is_no_table(tmp_path):
    (tmp_path / "notes.csv").write_text("The river was high.\nWe left early, having seen it, and went home.\n")
    assert "notes.csv" in refused(tmp_path / "notes.csv")


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (lambda s: (s / "bed.tif").unlink(), "has no bed"),
        (lambda s: (s / "depth_60s.tif").rename(s / "deep_60s.tif"), "does not say what it holds"),
        (lambda s: (s / "velocity_y_60s.tif").unlink(), "velocity has its x component"),
        (lambda s: [p.rename(s / p.name.replace("60s", "60")) for p in list(s.glob("*_60s.tif"))], "have no unit; write 60s"),
        (lambda s: [p.rename(s / p.name.replace("60s", "soon")) for p in list(s.glob("*_60s.tif"))], "'soon' is no time"),
        (lambda s: (s / "bed.tif").write_bytes((s / "bed.tif").read_bytes()[:200]), "cannot be read"),
    ],
)
def test_bad_raster_sets(tmp_path, spoil, words):
    folder = rasters(tmp_path)
    spoil(folder)
    assert words in refused(folder)


def test_a_time_that_lacks_a_raster(tmp_path):
    folder = rasters(tmp_path, times=("60s", "120s"))
    (folder / "velocity_x_120s.tif").unlink()
    assert "the set lacks velocity x at time 120s" in refused(folder)


def test_rasters_on_other_cells(tmp_path):
    folder = rasters(tmp_path)
    with rasterio.open(folder / "bed.tif", "r+") as out:
        out.transform = rasterio.Affine(SIZE, 0, CORNER[0] + 1, 0, -SIZE, CORNER[1] + WIDTH)
    assert "other cells than bed.tif" in refused(folder)


def test_rasters_without_unit(tmp_path):
    folder = rasters(tmp_path)
    with rasterio.open(folder / "depth_60s.tif", "r+") as out:
        out.set_band_unit(1, "")
    assert "depth_60s.tif has no unit" in refused(folder)
    assert discharge(open_run(folder, mapping={"depth": {"unit": "m"}})) == pytest.approx(EXACT, rel=0.005)


def test_layers_of_a_geopackage_are_picked_by_the_user(tmp_path):
    path = polygons(tmp_path)
    geopandas.read_file(path).to_file(path, layer="again", engine="pyogrio")
    assert "several layers: results, again; pick one" in refused(path)
    assert "has no layer 'lost'" in refused(path, mesh="lost")
    assert open_run(path, mesh="again").mesh.n_faces == open_run(path, mesh="results").mesh.n_faces


def test_bad_geopackages(tmp_path):
    (tmp_path / "cut.gpkg").write_bytes(polygons(tmp_path).read_bytes()[:5000])
    assert "cut.gpkg" in refused(tmp_path / "cut.gpkg")
    lines = geopandas.GeoDataFrame({"depth [m]": [1.0]}, geometry=[shapely.LineString([(0, 0), (1, 1)])], crs=CRS)
    lines.to_file(tmp_path / "lines.gpkg")
    assert "holds LineString; give polygons (faces) or points" in refused(tmp_path / "lines.gpkg")
    degrees = geopandas.read_file(tmp_path / "faces.gpkg").to_crs(4326)
    degrees.to_file(tmp_path / "degrees.gpkg")
    assert "is in degrees, not metres" in refused(tmp_path / "degrees.gpkg")


def test_polygons_that_do_not_meet_corner_to_corner(tmp_path):
    table = geopandas.read_file(polygons(tmp_path))
    square = shapely.box(*CORNER, *(CORNER + [2 * SIZE, SIZE]))
    kept = table[~table.geometry.centroid.within(square)]
    big = table.iloc[:1].assign(geometry=[square]).set_crs(CRS)
    pd.concat([kept, big]).to_file(tmp_path / "hanging.gpkg")
    assert "hangs on a side of face" in refused(tmp_path / "hanging.gpkg")


def test_a_grid_with_staggered_velocity(tmp_path):
    path = grid(tmp_path)
    import h5netcdf

    with h5netcdf.File(path, "a") as file:
        u = file["u"][...]
        del file.variables["u"]._h5ds.parent["u"]
        file.dimensions["xu"] = u.shape[1] + 1
        made = file.create_variable("us", ("y", "xu"), data=np.pad(u, ((0, 0), (0, 1))))
        made.attrs.update(units="m s-1", standard_name="sea_water_x_velocity")
    assert "velocity has its y component (v) but not x" in refused(path)


def test_files_of_different_kinds(tmp_path):
    assert "are of different kinds" in refused([ugrid(tmp_path), csv(tmp_path)])


def test_a_folder_without_results(tmp_path):
    assert "holds no results files" in refused(tmp_path)
