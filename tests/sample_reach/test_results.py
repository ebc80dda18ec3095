"""The committed demonstration files are what the generator makes, and hold what they say they hold."""

from functools import lru_cache

import h5netcdf
import numpy as np
import pytest
import tomlkit

from hydro.provenance import files_hash
from sample_reach import geometry as geo
from sample_reach import runs
from sample_reach.make import HERE, NAMES, RESULTS
from sample_reach.mesher import SIZES, make_mesh
from sample_reach.solver import topology

FILES = [f"{design}_{name}" for design, names in NAMES.items() for name in names]
MEANS = [name for name in FILES if "low" in name or "bankfull" in name]


@lru_cache(maxsize=2)
def _file(name):
    """Every variable of a file as plain numbers, scaled, with local coordinates; and its attributes."""
    out = {}
    with h5netcdf.File(RESULTS / f"{name}.nc") as f:
        for key, v in f.variables.items():
            out[key] = np.asarray(v[...], float) * v.attrs["scale_factor"] if "scale_factor" in v.attrs else np.asarray(v[...])
        out["attributes"] = dict(f.attrs)
    for where in ("node", "face"):
        out[where] = np.column_stack([out[f"mesh2d_{where}_{a}"] for a in "xy"]) - geo.ORIGIN
    return out


def _faces_of(f, chosen_s, chosen_n):
    s, n = geo.course().locate(f["face"])
    return (s > chosen_s[0]) & (s < chosen_s[1]) & (n > chosen_n[0]) & (n < chosen_n[1])


def test_all_files_are_there_and_small_enough_to_commit():
    """The limit of 25 MB is the project's own."""
    files = [RESULTS / f"{name}.nc" for name in FILES]
    assert sorted(RESULTS.glob("*")) == sorted(files)
    assert sum(p.stat().st_size for p in [*files, HERE / "lines.gpkg"]) < 25e6


def test_the_review_holds_the_hash_of_every_file():
    entries = tomlkit.parse((HERE / "review.toml").read_text(encoding="utf-8"))["runs"]
    assert {e["file"] for e in entries} == {f"results/{name}.nc" for name in FILES}
    for entry in entries:
        assert entry["sha256"] == files_hash([HERE / entry["file"]]), entry["id"]


@pytest.mark.parametrize("name", FILES)
def test_the_bed_in_a_file_is_the_bed_of_its_design(name):
    """Tolerance: float32 holds 100 m to 8e-6 m."""
    f = _file(name)
    place = geo.Place(f["attributes"]["design"])
    assert np.abs(place.bed(f["node"]) - f["node_bed"]).max() < 2e-5
    assert np.abs(f["node_bed"][f["mesh2d_face_nodes"]].mean(axis=1) - f["face_bed"]).max() < 2e-5


def test_the_generator_makes_the_committed_mesh_again():
    """A regression test, of the coarse mesh because it is quick. Tolerance: coordinates are held to 1e-6 m."""
    made, f = make_mesh(geo.Place("existing"), SIZES["existing", "coarse"]), _file("existing_bankfull_coarse")
    assert np.array_equal(made.cells, f["mesh2d_face_nodes"])
    assert np.abs(made.xy - f["node"]).max() < 1e-6


@pytest.mark.parametrize("name", MEANS)
def test_edge_discharges_keep_the_water(name):
    """Law: in a mean, what enters a face leaves it, but for the change of storage over the interval.

    The inflow is the one stated, and the culvert's two faces are the only ones that take or give.
    Tolerance: float32 discharges of 100 m3/s over some tens of edges add up to 1e-4; storage is held
    to 3 % of the inflow, the wave that still crosses the reach after settling.
    """
    f = _file(name)
    q, pair = f["edge_discharge"][0].astype(float), f["mesh2d_edge_faces"]
    river, side = {"low": runs.LOW, "bankfull": runs.BANKFULL}[f["attributes"]["event"]]
    assert -q[f["boundary"] == 2].sum() == pytest.approx(river, rel=1e-5)
    assert -q[f["boundary"] == 3].sum() == pytest.approx(side, rel=1e-5)
    assert np.abs(q[np.isin(f["boundary"], (1, 5))]).max() == 0
    gain = np.zeros(len(f["face"]))
    np.add.at(gain, pair[:, 0], -q)
    inner = pair[:, 1] >= 0
    np.add.at(gain, pair[inner, 1], q[inner])
    inlet, outlet = gain.argmax(), gain.argmin()
    pipe = f["culvert_discharge"][0]
    # The pipe's faces also store a little, as their neighbours do.
    assert gain[inlet] == pytest.approx(pipe, rel=0.02) and gain[outlet] == pytest.approx(-pipe, rel=0.02)
    for face, (s, n) in zip((inlet, outlet), geo.CULVERT, strict=True):
        assert np.hypot(*(f["face"][face] - geo.course().at(s, n)[0])) < 2.0
    assert abs(gain.sum()) < 0.03 * (river + side)


@pytest.mark.parametrize("name", MEANS)
def test_face_velocities_come_from_the_edge_discharges(name):
    """Identity: for a closed polygon, area x mean unit discharge = sum of outward discharge x edge midpoint
    less the mean of divergence x place; written about the centroid, the last term is zero for constant divergence.

    Tolerance: velocity is stored to 1 mm/s and depth to 1 mm, so unit discharge is off by up to
    0.5 mm/s x depth + 0.5 mm x speed.
    """
    f = _file(name)
    t = topology(f["node"], f["mesh2d_face_nodes"])
    assert np.array_equal(t.edges, f["mesh2d_edge_nodes"])
    q = np.where(t.cell_side == 0, 1, -1) * f["edge_discharge"][0].astype(float)[t.cell_edge]
    flow = np.einsum("ck,ckd->cd", q, t.middle[t.cell_edge] - t.centre[:, None]) / t.area[:, None]
    depth, speed = f["depth"][0], np.column_stack([f["velocity_x"][0], f["velocity_y"][0]])
    deep = depth > 0.05
    limit = 0.00051 * (depth[:, None] + np.abs(speed)) + 1e-5
    assert np.all((np.abs(depth[:, None] * speed - flow) <= limit)[deep])


def test_the_weir_has_a_crest_under_five_centimetres_deep_that_still_carries_water():
    """The shallow crest that the sample is made to have; at low flow, at the right end."""
    f = _file("existing_low")
    crest = _faces_of(f, (geo.WEIR - 1, geo.WEIR + 1), (-15, -8))
    depth = f["depth"][0][crest]
    carried = depth * np.hypot(f["velocity_x"][0][crest], f["velocity_y"][0][crest])
    assert 0.0 < np.median(depth) < 0.05
    assert np.median(carried) > 1e-3


def _reverse_area(name):
    """Area of water that runs upstream within five widths behind the piers, m2."""
    f = _file(name)
    t = topology(f["node"], f["mesh2d_face_nodes"])
    behind = _faces_of(f, (geo.BRIDGE, geo.BRIDGE + 25), (-14, 14)) & (f["depth"][0] > 0.05)
    along = geo.course().direction(geo.course().locate(f["face"])[0])
    down = f["velocity_x"][0] * along[:, 0] + f["velocity_y"][0] * along[:, 1]
    return t.area[behind & (down < 0)].sum()


def test_the_blunt_pier_has_the_larger_wake():
    """A body tapered downstream has a smaller wake than a blunt one: common practice, no source."""
    blunt, tapered = (_reverse_area(f"{design}_bankfull") for design in geo.DESIGNS)
    assert blunt > 10.0
    assert tapered < blunt / 4
