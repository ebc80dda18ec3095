"""The domain of psi, its walls and open boundaries."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from hydro.reach import CentreLine, Structure
from hydro.settings import Settings
from hydro.streamfunction import Plan, stream_function
from tests import builders


def ends(mesh):
    return {k: v for k, v in builders.sides(mesh).items() if k in ("west", "east")}


def test_maxima_are_refused():
    mesh = builders.channel(4, 2)
    frame = builders.frame_of(mesh, 1.0, (1.0, 0.0), kind="maximum")
    with pytest.raises(ValueError, match="maxima.*Choose an instant or a mean"):
        stream_function(frame)


def test_a_dry_frame_is_refused_with_its_time():
    mesh = builders.channel(4, 2)
    with pytest.raises(ValueError, match="at 30 s has no depth above 0.05 m"):
        stream_function(builders.frame_of(mesh, 0.0, (0.0, 0.0), seconds=30.0))


def test_a_thin_crest_does_not_cut_the_river():
    """Design rule: a 3 cm crest carries the whole river, so psi is unbroken across it."""
    mesh = builders.channel(40, 8)
    depth = lambda x, y: np.where(np.abs(x - 50) < 5, 0.03, 1.0)  # noqa: E731
    frame = builders.frame_of(mesh, depth, (lambda x, y: 0.2 / depth(x, y), 0.0))
    sf = stream_function(frame)
    assert sf.thin_faces > 0
    assert sf.psi == pytest.approx(0.2 * mesh.node_xy[:, 1], abs=1e-10)
    assert [w.id for w in sf.walls] == ["right bank", "left bank"]


def dry_square(half: float):
    mesh = builders.channel(40, 20, 80.0, 40.0)
    depth = lambda x, y: np.where((np.abs(x - 41) < half) & (np.abs(y - 21) < half), 0.0, 1.0)  # noqa: E731
    return mesh, builders.frame_of(mesh, depth, (1.0, 0.0))


def test_a_wide_dry_patch_is_a_wall_and_a_speck_is_not():
    """Over ten faces a patch has its own value of psi; two faces of it are water without flow, counted."""
    mesh, frame = dry_square(4.0)
    sf = stream_function(frame)
    assert [w.id for w in sf.walls if not w.reaches_open] == ["island 1"] and sf.n_specks == 0
    mesh, frame = dry_square(1.0)
    sf = stream_function(frame)
    assert all(w.reaches_open for w in sf.walls) and sf.n_specks == 1
    assert sf.domain.all() and np.isfinite(sf.psi).all()


def test_a_speck_in_an_outline_of_the_review_is_a_wall():
    mesh, frame = dry_square(1.0)
    pier = Structure("s1", "Pier 1", "pier", "dry", shapely.box(40, 20, 42, 22))
    sf = stream_function(frame, structures=[pier])
    (wall,) = [w for w in sf.walls if not w.reaches_open]
    assert (wall.id, wall.structure_id) == ("Pier 1", "s1") and sf.n_specks == 0
    assert sf.psi[wall.nodes] == pytest.approx(wall.psi_m3_s, abs=0)


def test_the_discharge_splits_round_an_island_as_the_flow_does():
    """Unit speed past a thin island a quarter of the way across: a quarter passes on its right, but for its width."""
    mesh = builders.with_hole(60.0, 24.0, 1.0, hole=shapely.box(10, 5.8, 50, 6.2), finer=[(shapely.box(8, 4, 52, 8), 0.4)])
    sf = stream_function(builders.frame_of(mesh, 1.0, (1.0, 0.0)))
    (island,) = [w for w in sf.walls if not w.reaches_open]
    assert island.psi_m3_s == pytest.approx(6.0, abs=0.2)


def test_the_centre_line_decides_the_banks_when_the_flow_turns():
    mesh = builders.channel(20, 8)
    line = CentreLine(np.array([[0.0, 10.0], [100.0, 10.0]]))
    for speed in (1.0, -1.0):
        sf = stream_function(builders.frame_of(mesh, 1.0, (speed, 0.0)), centre_line=line)
        assert mesh.node_xy[sf.wall("right bank").nodes, 1] == pytest.approx(0.0)
        assert sf.wall("left bank").psi_m3_s == pytest.approx(20.0 * speed)


def test_two_separate_channels_each_have_their_own_zero():
    """A dry strip along the middle leaves two rivers; each right bank has psi = 0."""
    mesh = builders.channel(20, 12, 100.0, 24.0)
    depth = lambda x, y: np.where(np.abs(y - 12) < 4, 0.0, 1.0)  # noqa: E731
    sf = stream_function(builders.frame_of(mesh, depth, (1.5, 0.0)))
    assert sorted(w.psi_m3_s for w in sf.walls) == pytest.approx([0.0, 0.0, 12.0, 12.0], abs=1e-9)
    assert sf.through_discharge_m3_s == pytest.approx(24.0)


def test_named_boundaries_are_taken_and_walls_among_them_left():
    mesh = builders.channel(20, 8)
    sides = builders.sides(mesh)
    named = {"inflow": sides["west"], "outflow": sides["east"], "south wall": sides["south"]}
    sf = stream_function(builders.frame_of(mesh, 1.0, (1.0, 0.0)), boundary_sets=named)
    assert [b.name for b in sf.open_boundaries] == ["inflow", "outflow"]
    assert sf.open_boundaries[0].discharge_m3_s == pytest.approx(20.0)


def test_a_tributary_is_found_and_gives_the_bank_two_values():
    """12 m3/s join 40 m3/s from the left bank: below the mouth the left bank stands at 52 m3/s.

    A face's own value stands at its centre, a third of a cell off the boundary: 7 % of the tributary here.
    """
    mesh = builders.channel(50, 20, 100.0, 20.0)

    def psi(x, y):
        return 2.0 * y + 12.0 * np.clip((x - 40) / 10, 0, 1) * np.clip((y - 10) / 10, 0, 1) ** 2

    sf = stream_function(builders.frame_of(mesh, 1.0, builders.flow_of_psi(psi)))
    assert [round(b.discharge_m3_s, 6) for b in sf.open_boundaries] == pytest.approx([40.0, 12.0, -52.0], rel=0.1)
    assert sorted(w.psi_m3_s for w in sf.walls) == pytest.approx([0.0, 40.0, 52.0], abs=0.3)


def test_flow_through_a_wall_is_counted_as_such():
    """A leak through a bank that is declared closed is the walls' part of the misfit, not unexplained."""
    mesh = builders.channel(40, 20, 100.0, 20.0)
    frame = builders.frame_of(mesh, 1.0, (1.0, lambda x, y: 0.1 * y / 20))
    sf = stream_function(frame, boundary_sets=ends(mesh), depth_rate=np.zeros(mesh.n_faces))
    assert sf.misfit.walls > 5 * sf.misfit.storage
    assert sf.misfit.walls > 0.1


def test_psi_is_not_drawn_where_storage_rules():
    """Filling at a closed end: all flow is storage."""
    mesh = builders.channel(40, 10, 100.0, 20.0)
    frame = builders.frame_of(mesh, 1.0, (lambda x, y: 0.01 * (100 - x), 0.0))
    sf = stream_function(frame, boundary_sets={"west": ends(mesh)["west"]}, depth_rate=np.full(mesh.n_faces, 0.01))
    assert not sf.drawn and sf.misfit.storage > 0.9


def test_a_plan_gives_the_same_digits_and_keeps_its_factor():
    mesh, frame = dry_square(4.0)
    plan = Plan(frame, settings=Settings())
    one = stream_function(frame, plan=plan)
    system = plan.psi_system
    two = stream_function(frame, plan=plan)
    assert plan.psi_system is system
    np.testing.assert_array_equal(one.psi, two.psi)
    np.testing.assert_array_equal(one.psi, stream_function(frame).psi)
