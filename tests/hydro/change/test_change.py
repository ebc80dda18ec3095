"""A comparison is zero against itself, finds what was changed on purpose, and says what it cannot tell apart."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely

from hydro.change import compare, level_change, map_change, pair_frames, setup_differences
from hydro.change.eddies import match_zones
from hydro.reach import CentreLine, NamedLine, Reach, Structure
from tests.builders import channel, frame_of, free_mesh, raw_of, run_of

CENTRE = CentreLine(np.array([[0.0, 10.0], [100.0, 10.0]]))
PLAIN = Reach((0.0, 0.0), CENTRE)


def _run(depth=2.0, mesh=None, **options):
    mesh = mesh or channel(40, 10)
    return run_of(mesh, [0.0], [raw_of(mesh, depth, (1.0, 0.0), stored_on="node")], bed=10.0, **options)


def test_a_run_against_itself_is_nothing():
    run = _run()
    change = compare(run, run, pair_frames(run, run)[0], reach_a=PLAIN, reach_b=PLAIN)
    assert np.nanmax(np.abs(change.levels.rise)) == 0
    assert np.nanmax(np.abs(change.maps.level)) == pytest.approx(0, abs=1e-12)
    assert change.maps.newly_wet_m2 == change.maps.no_longer_wet_m2 == 0
    assert [d.what for d in change.setup] == ["roughness"]  # neither run states one: a question, not a difference
    assert not change.levels.told_apart


def test_a_known_rise_of_level_is_recovered_with_its_place_and_extent():
    """Source: the change imposed: 0.10 m between chainage 20 and 60 m, 2 mm elsewhere by rounding."""
    bump = lambda x, y: 2.0 + np.where((x > 20) & (x < 60), 0.10, 0.002)  # noqa: E731
    mesh = channel(200, 10)
    a, b = (frame_of(mesh, d, (1.0, 0.0), bed=10.0, stored_on="node") for d in (2.0, bump))
    levels = level_change(a, b, CENTRE, spacing_m=2.0, quiet=(70, 100))
    i = levels.headline
    assert levels.rise[i] == pytest.approx(0.10, abs=1e-9) and 20 < levels.chainage[i] < 60
    assert levels.noise_m == pytest.approx(0.002, abs=1e-9) and levels.told_apart
    inside = levels.chainage[levels.rise > 0.05]
    assert inside.min() == pytest.approx(20, abs=2) and inside.max() == pytest.approx(60, abs=2)
    assert level_change(a, b, CENTRE, spacing_m=2.0, works=[shapely.box(15, 0, 65, 20)], quiet=(70, 100)).told_apart is False


def test_the_rise_stays_above_a_value_for_as_far_upstream_as_it_was_put_there():
    ramp = lambda x, y: 2.0 + np.maximum(0.0, 0.1 * (1 - np.abs(x - 60) / 40))  # noqa: E731
    mesh = channel(200, 4)
    a, b = (frame_of(mesh, d, (1.0, 0.0), bed=10.0, stored_on="node") for d in (2.0, ramp))
    levels = level_change(a, b, CENTRE, spacing_m=1.0)
    assert levels.upstream_reach(0.05) == pytest.approx(20.0, abs=1.5)


def test_newly_wet_ground_has_the_area_that_was_flooded():
    mesh = channel(100, 40, quads=True)
    bank = lambda x, y: np.where(y > 10, 1.0, 0.0)  # noqa: E731
    a = frame_of(mesh, lambda x, y: np.maximum(0.5 - bank(x, y), 0.0), (1.0, 0.0), bed=bank)
    b = frame_of(mesh, lambda x, y: np.maximum(1.3 - bank(x, y), 0.0), (1.0, 0.0), bed=bank)
    change = map_change(a, b)
    assert change.newly_wet_m2 == pytest.approx(1000.0, rel=1e-9) and change.no_longer_wet_m2 == 0
    assert map_change(b, a).no_longer_wet_m2 == pytest.approx(1000.0, rel=1e-9)


def test_a_rougher_bed_outside_the_works_is_named_with_its_share():
    run = _run()
    half = run.mesh.face_centroid[:, 0] > 50
    n = np.full(run.mesh.n_faces, 0.03)
    a, b = replace(run, roughness=n), replace(run, roughness=np.where(half, n * 1.05, n))
    found = {d.what: d for d in setup_differences(a, b, a.frame(0), b.frame(0))}
    assert found["roughness"].largest == pytest.approx(0.05, rel=1e-6)
    assert found["roughness"].share == pytest.approx(half.mean()) and found["roughness"].at[0] > 50
    inside = setup_differences(a, b, a.frame(0), b.frame(0), [shapely.box(45, -5, 105, 25)])
    assert "roughness" not in {d.what for d in inside}


def test_differences_of_two_meshes_fall_with_the_square_of_their_size():
    """Source: linear interpolation; a smooth level on two free meshes differs by O(size^2)."""
    def largest(size):
        box = shapely.box(0, 0, 60, 20)
        meshes = free_mesh(box, size), free_mesh(box, size * 0.77)
        level = lambda x, y: 2 + 0.3 * np.sin(x / 8) * np.cos(y / 6)  # noqa: E731
        a, b = (frame_of(m, level, (1.0, 0.0), stored_on="node") for m in meshes)
        return np.nanpercentile(np.abs(map_change(a, b).level), 90)

    assert largest(1.0) < largest(2.0) / 2.8


def test_pairs_by_time_discharge_and_order():
    mesh = channel(4, 2)
    raw = raw_of(mesh, 1.0, (1.0, 0.0))
    a, b = run_of(mesh, [0, 10, 20, 30], [raw] * 4), run_of(mesh, [0, 9, 21, 50], [raw] * 4)
    assert [(p.a, p.b) for p in pair_frames(a, b)] == [(0, 0), (1, 1), (2, 2)]  # 9 s is further than half of b's spacing
    by = pair_frames(a, b, "discharge", inflow_a=np.array([1, 5, 9, 4]), inflow_b=np.array([1, 8, 5, 2]))
    assert [(p.a, p.b) for p in by] == [(0, 0), (1, 1), (2, 1), (3, 2)]
    with pytest.raises(ValueError, match="time, discharge, order"):
        pair_frames(a, b, "luck")


class _Zone:
    def __init__(self, name, x, radius, rotation="clockwise", spread=0.0):
        self.name, self.rotation, self.centre = name, rotation, np.array([x, 0.0])
        self.contour = shapely.Point(x, 0).buffer(radius)
        self.area_m2 = self.contour.area
        self.recirculating_discharge_m3_s = radius
        self.sensitivity = {"area_m2": (self.area_m2 - spread, self.area_m2 + spread)}


def test_zones_are_matched_by_shared_ground_and_turning_sense():
    a = [_Zone("same", 0, 3), _Zone("grows", 20, 3, spread=5), _Zone("goes", 40, 2), _Zone("turns", 60, 3)]
    b = [_Zone("grows", 20.5, 5, spread=5), _Zone("same", 0, 3), _Zone("comes", 80, 2), _Zone("turns", 60, 3, "anticlockwise")]
    states = sorted((c.name, c.state) for c in match_zones(a, b))
    assert states == [
        ("comes", "new"), ("goes", "gone"), ("grows", "grown"), ("same", "not distinguishable"), ("turns", "gone"), ("turns", "new"),
    ]


def test_a_change_within_the_sensitivities_is_not_distinguishable():
    states = [c.state for c in match_zones([_Zone("z", 0, 3.0, spread=4)], [_Zone("z", 0, 3.2, spread=4)])]
    assert states == ["not distinguishable"]


def test_openings_of_one_name_are_compared_by_their_share():
    openings = (
        NamedLine("l", "Left opening", shapely.LineString([(50, 20), (50, 12)])),
        NamedLine("r", "Right opening", shapely.LineString([(50, 12), (50, 0)])),
    )
    reach = Reach((0.0, 0.0), CENTRE, (Structure("d", "Deck", "deck", "absent", shapely.box(48, 0, 52, 20), levels={"soffit_m": 14.0}),), {"openings": openings})
    mesh = channel(40, 20)
    a = run_of(mesh, [0.0], [raw_of(mesh, 2.0, (1.0, 0.0), stored_on="node")], bed=10.0)
    b = run_of(mesh, [0.0], [raw_of(mesh, 2.0, (lambda x, y: np.where(y > 12, 2.0, 1.0), 0.0), stored_on="node")], bed=10.0)
    found = compare(a, b, pair_frames(a, b)[0], reach_a=reach, reach_b=reach).findings
    assert any(f.sentence.startswith("Left opening carries 5") and "was 40.0 %" in f.sentence for f in found)
