"""The sample, spoilt on purpose: each fault is named at its place, and the sample as it is raises none of them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from hydro.arrival import audit
from hydro.arrival.ask import request_sheet
from hydro.frame import RawFrame
from hydro.mesh import build_mesh
from hydro.review import SAMPLE, open_review
from hydro.run import Run, StoredLevel, TimeAxis

STILL, FLOOD = "existing_bankfull_coarse", "existing_flood"


@cache
def review():
    return open_review(SAMPLE)


@cache
def sample(name: str) -> tuple[Run, object]:
    run = review().open(name)
    if name != FLOOD:
        return run, review().reach_for(run)
    return _frames(run, list(range(0, run.n_frames, 4))), review().reach_for(run)


def _frames(run: Run, index: list[int]) -> Run:
    """A run with some of its frames, each read once."""
    held = cache(run.read)
    times = TimeAxis(
        run.times.seconds[index] - run.times.seconds[index[0]], None, tuple(run.times.kinds[i] for i in index),
        run.times.intervals_s[index],
    )
    return replace(run, times=times, read=lambda i: held(index[i]), series={k: v[index] for k, v in run.series.items()})


def _with(run: Run, change: Callable[[RawFrame], RawFrame], **more) -> Run:
    return replace(run, read=lambda i: change(run.read(i)), **more)


def _flow(change: Callable[[np.ndarray], np.ndarray]) -> Callable[[RawFrame], RawFrame]:
    """A raw frame with another unit discharge and no edge discharge, which would give the fault away."""
    return lambda raw: RawFrame(raw.stored_on, raw.depth, change(raw.unit_discharge), None)


def _chainage(run: Run) -> np.ndarray:
    return review().reach.centre_line.locate(run.mesh.face_centroid)[0]


def _at(run: Run, chainage: float, offset: float) -> np.ndarray:
    return review().reach.centre_line.at(np.array([chainage]), offset)[0]


def depth_in_centimetres(run):
    return _with(run, lambda raw: RawFrame(raw.stored_on, raw.depth * 100, raw.unit_discharge, None))


def velocity_in_feet(run):
    return _with(run, _flow(lambda q: q / 0.3048))


def mirrored_velocity(run):
    return _with(run, _flow(lambda q: q * [1, -1]))


def shifted_bed(run):
    return replace(run, node_bed=run.node_bed + 0.5, face_bed=run.face_bed + 0.5)


def mixed_datums(run):
    """The downstream part stands 0.4 m higher than it should."""
    far = review().reach.centre_line.locate(run.mesh.node_xy)[0] > 650
    faces = _chainage(run) > 650
    return replace(run, node_bed=run.node_bed + 0.4 * far, face_bed=run.face_bed + 0.4 * faces)


def leaking_wall(run):
    """1 m2/s out through the right abutment of the bridge, at chainage 654 m."""
    mesh = run.mesh
    edges = mesh.boundary_edges
    middle = mesh.node_xy[mesh.edge_nodes[edges]].mean(axis=1)
    s, n = review().reach.centre_line.locate(middle)
    wet = run.frame(0).face_depth[mesh.edge_faces[edges].max(axis=1)] > 0.5
    chosen = edges[(np.abs(s - 654) < 6) & (n < -17) & wet]
    a, b = mesh.node_xy[mesh.edge_nodes[chosen]].transpose(1, 0, 2)
    face = mesh.edge_faces[chosen].max(axis=1)
    out = np.column_stack([(b - a)[:, 1], -(b - a)[:, 0]]) / np.hypot(*(b - a).T)[:, None]
    out *= np.sign((((a + b) / 2 - mesh.face_centroid[face]) * out).sum(axis=1, keepdims=True))

    def change(q):
        q = q.copy()
        q[face] += out
        return q

    return _with(run, _flow(change))


def undeclared_source(run):
    """2 m3/s more from chainage 300 m on, spread over the flow."""
    more = 1 + 2.0 / 112 * (_chainage(run) > 300)
    return _with(run, _flow(lambda q: q * more[:, None]))


def speed_spike(run):
    frame = run.frame(0)
    shallow = np.flatnonzero((frame.face_depth > 0.06) & (frame.face_depth < 0.15))
    face = shallow[np.abs(_chainage(run)[shallow] - 700).argmin()]

    def change(q):
        q = q.copy()
        q[face] = frame.face_depth[face] * np.array([9.0, 0.0])
        return q

    return _with(run, _flow(change))


def single_precision(run):
    xy = run.mesh.to_world(run.mesh.node_xy) + [500_000.0, 4_000_000.0]
    mesh = build_mesh(xy.astype(np.float32).astype(float), run.mesh.face_nodes, origin=tuple(np.add(run.mesh.origin, [500_000, 4_000_000])))
    raw = run.read(0)
    face, node = mesh.file_face, mesh.file_node
    moved = RawFrame(raw.stored_on, raw.depth[face], raw.unit_discharge[face], None)
    return replace(
        run, mesh=mesh, read=lambda i: moved, node_bed=run.node_bed[node], face_bed=run.face_bed[face],
        roughness=run.roughness[face], boundary_sets={},
    )


def storing_level(run, more=0.0):
    """The run as from a file that stores its level too, ``more`` (m) above bed plus depth."""
    return replace(run, stored_level=StoredLevel("level", "face", lambda i: run.face_bed + run.read(i).depth + more))


def shifted_level(run):
    """0.3 m too high on 20 m of the river, about chainage 400 m."""
    return storing_level(run, 0.3 * (np.abs(_chainage(run) - 400) < 10))


def link_left_out(run):
    return replace(run, series={})


def maximum_envelope(run):
    """The greatest depth and unit discharge of every face over the flood, said to be one instant."""
    q = np.stack([run.read(i).unit_discharge for i in range(run.n_frames)])
    depth = np.max([run.read(i).depth for i in range(run.n_frames)], axis=0)
    size = np.hypot(q[..., 0], q[..., 1])
    at = size.argmax(axis=0)
    envelope = RawFrame("face", depth, q[at, np.arange(len(at))], None)
    axis = TimeAxis(np.zeros(1), None, ("instant",), np.full(1, np.nan))
    return replace(run, times=axis, read=lambda i: envelope, series={k: v[:1] for k, v in run.series.items()})


def missing_frames(run):
    keep = [i for i in range(run.n_frames) if i not in (6, 7)]
    return _frames(run, keep)


def frozen_frame(run):
    return replace(run, read=lambda i: run.read(4 if i == 5 else i))


def time_reversed(run):
    n = run.n_frames
    return replace(run, read=lambda i: run.read(n - 1 - i), series={k: v[::-1] for k, v in run.series.items()})


SPOILT = [
    (STILL, depth_in_centimetres, "units doubted", None),
    (STILL, velocity_in_feet, "slope against friction", None),
    (STILL, mirrored_velocity, "no continuity", None),
    (STILL, shifted_bed, "crest level", (500, 560)),
    (STILL, mixed_datums, "head rises", (620, 680)),
    (STILL, leaking_wall, "leaking wall", (640, 665)),
    (STILL, undeclared_source, "undeclared source", (270, 330)),
    (STILL, speed_spike, "speed spike", (650, 750)),
    (STILL, single_precision, "coordinate step", None),
    (STILL, shifted_level, "level against depth", (390, 410)),
    (STILL, link_left_out, "link left out", (480, 600)),
    (FLOOD, maximum_envelope, "no continuity", None),
    (FLOOD, missing_frames, "missing frames", None),
    (FLOOD, frozen_frame, "frozen frame", None),
    (FLOOD, time_reversed, "storage against flow", None),
]


@pytest.mark.parametrize(("name", "spoil", "named", "chainages"), SPOILT, ids=[s[1].__name__ for s in SPOILT])
def test_every_spoiling_is_named_at_its_place(name, spoil, named, chainages):
    run, reach = sample(name)
    found = {f.id: f for f in audit(spoil(run), reach)}
    assert named in found, f"found only {sorted(found)}"
    assert found[named].grade != "note" and found[named].question
    if chainages is not None:
        assert chainages[0] <= found[named].figure.place.chainage_m <= chainages[1]


@pytest.mark.parametrize("name", [STILL, FLOOD])
def test_the_sample_as_it_is_raises_none_of_them(name):
    run, reach = sample(name)
    assert not {f.id for f in audit(run, reach)} & {named for _, _, named, _ in SPOILT}


def test_a_stored_level_is_audited_by_its_number_and_one_that_agrees_raises_nothing():
    """The number is the shift that was put in; rounding as in a file of single precision is no fault."""
    run, reach = sample(STILL)
    found = {f.id: f for f in audit(shifted_level(run), reach)}["level against depth"]
    assert found.figure.value == pytest.approx(0.3, abs=1e-9) and "+0.30 m from bed plus depth" in found.sentence
    rounding = np.random.default_rng(2).uniform(-5e-6, 5e-6, run.mesh.n_faces)
    assert "level against depth" not in {f.id for f in audit(storing_level(run, rounding), reach)}


def test_the_request_sheet_names_the_frames_spacing_of_each_pier():
    run, reach = sample(STILL)
    sheet = request_sheet(run, reach, audit(run, reach))
    assert "Pier 1: water comes at about" in sheet and "a burst with a frame every" in sheet
    assert "edge_node_connectivity" in sheet and "vertical datum" in sheet
    assert len(sheet.splitlines()) < 90
