"""Zones: what they are called, what bounds them, and what must not change them."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize

from hydro.eddies import find_zones
from hydro.eddies.sensitivity import range_outlines
from hydro.mesh import build_mesh
from hydro.reach import CentreLine, Reach, Structure
from hydro.streamfunction import stream_function
from tests import builders

PIER = shapely.Point(12.0, 0.0).buffer(1.5, quad_segs=12)


def wake_psi(x, y, left: float = 3.0, right: float = 3.0):
    """A stream past a round pier at (12, 0) with two eddies behind it, of their own strengths."""
    out = y - left * np.exp(-((x - 15.5) ** 2 + (y - 1.6) ** 2) / 2) + right * np.exp(-((x - 15.5) ** 2 + (y + 1.6) ** 2) / 2)
    t = np.clip((np.hypot(x - 12, y) - 1.5) / 1.5, 0, 1)
    return out * t * t * (3 - 2 * t)


def wake_mesh(size: float = 0.9):
    area = shapely.box(0, -8, 32, 8).difference(PIER)
    return builders.free_mesh(area, size, finer=[(shapely.box(9, -4, 20, 4), size / 3)])


def wake(mesh, left=3.0, right=3.0):
    frame = builders.frame_of(mesh, 1.0, builders.flow_of_psi(lambda x, y: wake_psi(x, y, left, right)))
    return stream_function(frame, boundary_sets=builders.sides(mesh))


def reach(*structures):
    return Reach((0.0, 0.0), CentreLine(np.array([[0.0, 0.0], [32.0, 0.0]])), structures)


def test_twin_eddies_are_named_after_their_pier_and_side():
    pier = Structure("p", "Pier 1", "pier", "hole", PIER)
    mesh = wake_mesh()
    frame = wake(mesh).frame
    sf = stream_function(frame, structures=[pier], boundary_sets=builders.sides(mesh))
    zones = find_zones(sf, reach=reach(pier)).zones
    left, right = sorted(zones, key=lambda z: -z.offset_m)
    assert (left.name, left.rotation) == ("Pier 1, left rear", "clockwise")
    assert (right.name, right.rotation) == ("Pier 1, right rear", "anticlockwise")
    assert {z.kind for z in zones} == {"behind structure"} and {z.wall for z in zones} == {"Pier 1"}
    assert left.offset_m > 0 > right.offset_m and left.chainage_m == pytest.approx(left.centre[0])


def test_through_flow_between_twin_eddies_leaves_them_bounded_by_a_saddle():
    """With unlike eddies some flow passes between them: the dividing level is the saddle's, found here by minimising
    the closed form's gradient, and not the wall's.
    """
    sf = wake(wake_mesh(0.6), left=4.0, right=2.0)

    def slope(p):
        e = 1e-4
        dx = (wake_psi(p[0] + e, p[1], 4, 2) - wake_psi(p[0] - e, p[1], 4, 2)) / (2 * e)
        dy = (wake_psi(p[0], p[1] + e, 4, 2) - wake_psi(p[0], p[1] - e, 4, 2)) / (2 * e)
        return float(dx * dx + dy * dy)

    saddles = [minimize(slope, start, method="Nelder-Mead", options={"xatol": 1e-7, "fatol": 1e-14}).x
               for start in ((17.0, -0.3), (14.3, -0.5), (17.5, 0.5), (16.6, -0.7))]
    levels = [float(wake_psi(*p, 4, 2)) for p in saddles if slope(p) < 1e-8]
    (island,) = [w for w in sf.walls if not w.reaches_open]
    moved = [z for z in find_zones(sf).zones if abs(z.psi_edge_m3_s - island.psi_m3_s) > z.noise_m3_s]
    assert moved, "at least one eddy is bounded away from the wall's value"
    for zone in moved:
        assert min(abs(zone.psi_edge_m3_s - island.psi_m3_s - level) for level in levels) < 2 * zone.noise_m3_s
        assert zone.psi_wall_m3_s == island.psi_m3_s and zone.kind == "behind structure"


def bank_eddy(mesh, depth=1.0):
    """A bay cut into the left bank of a channel, with a gyre in it that the stream drives."""
    def psi(x, y):
        river = np.minimum(y, 10.0)
        bay = np.where(y > 10, np.sin(np.pi * (x - 20) / 12) * np.sin(np.pi * (y - 10) / 8) * 1.5, 0.0)
        return river + bay

    return builders.frame_of(mesh, depth, builders.flow_of_psi(psi))


def test_a_gyre_in_a_bay_hangs_on_the_bank_with_the_bank_s_value():
    area = shapely.union_all([shapely.box(0, 0, 60, 10), shapely.box(20, 9, 32, 18)])
    mesh = builders.free_mesh(area, 0.8)
    sf = stream_function(bank_eddy(mesh), boundary_sets={k: v for k, v in builders.sides(mesh).items() if k in ("west", "east")})
    (zone,) = find_zones(sf, reach=reach()).zones
    assert zone.kind == "side bay" and zone.wall == "left bank" and zone.rotation == "anticlockwise"
    assert zone.psi_edge_m3_s == zone.psi_wall_m3_s == sf.wall("left bank").psi_m3_s
    assert zone.area_m2 == pytest.approx(96.0, rel=0.05)
    assert zone.centre == pytest.approx((26.0, 14.0), abs=0.2)


def test_a_resistance_pier_is_not_solid_and_has_no_separation_point():
    """The same eddies behind an outline that is no wall in the mesh."""
    mesh = builders.free_mesh(shapely.box(0, -8, 32, 8), 0.5)
    pier = Structure("p", "Pier 2", "pier", "resistance", PIER)
    frame = builders.frame_of(mesh, 1.0, builders.flow_of_psi(wake_psi))
    sf = stream_function(frame, structures=[pier], boundary_sets=builders.sides(mesh))
    zones = find_zones(sf, reach=reach(pier)).zones
    assert len(zones) == 2
    for zone in zones:
        assert zone.kind == "behind structure" and zone.name.startswith("Pier 2, ")
        assert "structure not solid" in zone.flags and zone.separation is None and zone.reattachment is None


def test_coarse_eddies_are_counted_not_listed():
    """Twelve triangles hold no zone worth a figure: under four triangles across it is counted apart."""
    mesh = builders.free_mesh(shapely.box(0, -8, 32, 8), 1.6)
    frame = builders.frame_of(mesh, 1.0, builders.flow_of_psi(wake_psi))
    found = find_zones(stream_function(frame, boundary_sets=builders.sides(mesh)))
    assert found.zones == ()
    assert "too few triangles across" in {s.why for s in found.small}


def figures(sf):
    zones = find_zones(sf).zones
    return sorted(
        (z.rotation, z.area_m2, z.recirculating_discharge_m3_s, z.length_m, z.width_m, z.volume_m3, z.psi_edge_m3_s - z.psi_centre_m3_s)
        for z in zones
    )


BASE = wake_mesh()
BASE_FLOW = wake(BASE, 4.0, 2.0).frame
BASE_SIDES = builders.sides(BASE)


def changed(nodes, faces, velocity, depth=1.0, order=None):
    """Stream function of the base flow on changed nodes and faces; velocity (f, 2) in the base's face order."""
    mesh = build_mesh(nodes, faces, origin=(0.0, 0.0))
    own = velocity[mesh.file_face]
    frame = builders.frame_of(mesh, depth, (own[:, 0], own[:, 1]))
    ends = {frozenset(BASE.edge_nodes[e].tolist()): name for name, edges in BASE_SIDES.items() for e in edges}
    inverse = np.arange(BASE.n_nodes) if order is None else order
    sets: dict[str, list[int]] = {name: [] for name in BASE_SIDES}
    for e in mesh.boundary_edges:
        key = frozenset(inverse[mesh.file_node[mesh.edge_nodes[e]]].tolist())
        if key in ends:
            sets[ends[key]].append(int(e))
    return stream_function(frame, boundary_sets={k: np.array(v, np.int32) for k, v in sets.items()})


def same(got, expected, scale=(1.0, 1.0, 1.0, 1.0, 1.0, 1.0)):
    assert len(got) == len(expected) > 0
    for g, e in zip(got, expected, strict=True):
        assert g[0] == e[0]
        assert g[1:] == pytest.approx([v * s for v, s in zip(e[1:], scale)], rel=1e-6)


EXPECTED = figures(wake(BASE, 4.0, 2.0))
VELOCITY = BASE_FLOW.face_velocity


@settings(max_examples=6)
@given(angle=st.floats(0, 6.28), east=st.floats(-9e4, 9e4), north=st.floats(-9e4, 9e4))
def test_turned_and_moved_the_figures_stay(angle, east, north):
    turn = np.array([[np.cos(angle), -np.sin(angle)], [np.sin(angle), np.cos(angle)]])
    sf = changed(BASE.node_xy @ turn.T + (east, north), BASE.face_nodes, VELOCITY @ turn.T)
    same(figures(sf), EXPECTED)


def test_mirrored_the_eddies_turn_the_other_way():
    flip = np.array([1.0, -1.0])
    sf = changed(BASE.node_xy * flip, BASE.face_nodes[:, ::-1], VELOCITY * flip)
    other = {"clockwise": "anticlockwise", "anticlockwise": "clockwise"}
    expected = sorted((other[e[0]], *e[1:-1], -e[-1]) for e in EXPECTED)
    same(figures(sf), expected)


@settings(max_examples=6)
@given(seed=st.integers(0, 2**31))
def test_renumbered_the_figures_stay(seed):
    rng = np.random.default_rng(seed)
    order = rng.permutation(BASE.n_nodes)  # new node k is old node order[k]
    place = np.argsort(order)
    faces = rng.permutation(BASE.n_faces)
    sf = changed(BASE.node_xy[order], place[BASE.face_nodes[faces]], VELOCITY[faces], order=order)
    same(figures(sf), EXPECTED)


@settings(max_examples=6)
@given(length=st.floats(0.1, 10), speed=st.floats(0.1, 10))
def test_units_scale_the_figures_as_they_must(length, speed):
    sf = changed(BASE.node_xy * length, BASE.face_nodes, VELOCITY * speed)
    flow = length * speed
    same(figures(sf), EXPECTED, (length**2, flow, length, length, length**2, flow))


def test_quads_split_in_two_give_the_same_zones():
    """A quad and its own two triangles hold the same field: each triangle has the quad's unit discharge."""
    quads = builders.channel(64, 32, 32.0, 16.0, quads=True, corner=(0.0, -8.0))
    flow = builders.flow_of_psi(lambda x, y: wake_psi(x, y, 4, 2))
    whole = stream_function(builders.frame_of(quads, 1.0, flow), boundary_sets=builders.sides(quads))
    split = build_mesh(quads.node_xy, quads.triangles, origin=(0.0, 0.0))
    own = whole.frame.face_velocity[quads.triangle_face][split.file_face]
    halves = stream_function(builders.frame_of(split, 1.0, (own[:, 0], own[:, 1])), boundary_sets=builders.sides(split))
    same(figures(halves), figures(whole))


def test_the_dotted_outlines_enclose_the_least_and_the_greatest_area():
    """A free round eddy of 100 m2 read as 81 to 121: circles of nine and eleven tenths of its radius (closed form)."""
    radius = np.sqrt(100 / np.pi)
    zone = SimpleNamespace(contour=shapely.Point(0, 0).buffer(radius, 256), area_m2=100.0, sensitivity={"area_m2": (81.0, 121.0)})
    nothing = np.zeros(0, int)
    shape = SimpleNamespace(a=nothing, b=nothing, opening=nothing)
    sf = SimpleNamespace(shape=shape, frame=SimpleNamespace(mesh=SimpleNamespace(node_xy=np.zeros((1, 2)))))
    inner, outer = range_outlines(sf, zone)  # type: ignore[arg-type]
    # Moved by the difference of areas over the length of the outline: right to second order in the distance.
    assert shapely.Polygon(np.concatenate(inner)).area == pytest.approx(81, rel=0.02)
    assert shapely.Polygon(np.concatenate(outer)).area == pytest.approx(121, rel=0.02)
