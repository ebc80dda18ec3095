"""Weirs and bridges read from a frame."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from hydro.reach import CentreLine, NamedLine, Structure
from hydro.section.crossings import bridge_openings, crest_points, weir_line
from hydro.section.profile import profile, thalweg
from hydro.section.weir import broad_crested
from tests.builders import channel, frame_of

CENTRE = CentreLine(np.array([[0.0, 10.0], [100.0, 10.0]]))


def _stepped():
    """Level 12 m above x = 50 and 11 m below it, bed 10 m, a crest at 11.3 m at x = 50."""
    bed = lambda x, y: np.where(np.abs(x - 50) < 1.3, 11.3, 10.0)  # noqa: E731
    level = lambda x: np.where(x < 50, 12.0, 11.0)  # noqa: E731
    depth = lambda x, y: np.maximum(level(x) - bed(x, y), 0.1)  # noqa: E731
    return frame_of(channel(80, 10), depth, (lambda x, y: 1.0 / depth(x, y), 0.0), bed=bed, stored_on="node")


def test_a_weirs_heads_are_section_heads_four_heads_away():
    """Source: definition; level 12 and 11 m with q = 1 m2/s over 2 and 1 m of water, crest 11.3 m."""
    weir = Structure("w", "Weir", "weir", "raised bed", shapely.LineString([(50, 20), (50, 0)]), levels={"crest_m": 11.3})
    line = weir_line(_stepped(), weir, CENTRE, relation="broad-crested")
    assert line.upstream_head_m == pytest.approx(0.7 + 0.25 / 19.62, abs=1e-3)
    assert line.downstream_head_m == pytest.approx(-0.3 + 1 / 19.62, abs=1e-3)
    assert line.reading.discharge_m3_s == pytest.approx(broad_crested(line.upstream_head_m, 20.0), rel=1e-9)
    assert 50 - line.stations[0] == pytest.approx(4 * line.upstream_head_m, rel=0.02)
    assert {"weir-formula", "no-roller"} <= set(line.cautions)


def test_a_weir_without_a_crest_level_says_so():
    weir = Structure("w", "Weir", "weir", "raised bed", shapely.LineString([(50, 20), (50, 0)]))
    with pytest.raises(ValueError, match="give crest_m"):
        weir_line(_stepped(), weir, CENTRE, relation="broad-crested")


def test_the_crest_of_an_outline_is_its_long_axis():
    weir = Structure("w", "Weir", "weir", "raised bed", shapely.box(49, 0, 51, 20))
    points = crest_points(weir)
    assert np.hypot(*np.diff(points, axis=0)[0]) == pytest.approx(20) and points[:, 0] == pytest.approx(50)


def test_openings_share_the_flow_by_their_width_and_tell_approach_and_freeboard():
    """Source: geometry: uniform flow at 10 degrees to the left of the openings' normal; level 12 m, soffit 13.5 m."""
    turn = np.radians(10)
    frame = frame_of(channel(40, 20), 2.0, (float(np.cos(turn)), float(np.sin(turn))), bed=10.0)
    openings = [
        NamedLine("a", "Left opening", shapely.LineString([(50, 19), (50, 13)])),
        NamedLine("b", "Right opening", shapely.LineString([(50, 11), (50, 2)])),
    ]
    left, right = bridge_openings(frame, openings, CENTRE, soffit_m=13.5)
    assert [left.share, right.share] == pytest.approx([0.4, 0.6])
    assert left.approach_deg == pytest.approx(10.0)
    assert right.freeboard_m == pytest.approx(1.5)
    drowned = bridge_openings(frame, openings, CENTRE, soffit_m=11.0)[0]
    assert drowned.freeboard_m == pytest.approx(-1.0)
    assert "pressure-flow" in drowned.cautions and any("not assessed" in f for f in drowned.flags)


def test_freeboard_under_a_tilted_water_surface_is_the_least():
    """Source: geometry: a plane rising 0.1 m over 10 m of opening leaves the soffit by its highest point."""
    frame = frame_of(channel(40, 20), lambda x, y: 2 + 0.01 * y, (1.0, 0.0), bed=10.0, stored_on="node")
    line = NamedLine("a", "Opening", shapely.LineString([(50, 15), (50, 5)]))
    assert bridge_openings(frame, [line], CENTRE, soffit_m=13.0)[0].freeboard_m == pytest.approx(1 - 0.15, abs=1e-9)


def test_a_profile_of_uniform_flow_has_the_head_and_critical_depth_of_the_book():
    """Source: Henderson 1966: h = 1.5 m, q = 3 m2/s: E = 1.70387 m, h_c = 0.971683 m, Fr = 0.521375."""
    p = profile(frame_of(channel(40, 10), 1.5, (2.0, 0.0), bed=100.0), [(5, 10), (95, 10)])
    assert p.head == pytest.approx(101.70387, abs=1e-5)
    assert p.critical_level == pytest.approx(100.971683, abs=1e-6)
    assert p.froude == pytest.approx(0.521375, abs=1e-5)
    assert p.loss() == pytest.approx(0.0, abs=1e-9) and p.jumps == ()


def test_a_jump_is_where_the_froude_number_falls_through_one_along_the_flow():
    depth = lambda x, y: np.where(x < 60, 0.4, 1.525)  # noqa: E731
    frame = frame_of(channel(100, 6), depth, (lambda x, y: 2.4 / depth(x, y), 0.0), stored_on="node")
    for line in ([(5, 10), (95, 10)], [(95, 10), (5, 10)]):
        p = profile(frame, line)
        assert len(p.jumps) == 1
        assert abs((p.jumps[0] if line[0][0] == 5 else 90 - p.jumps[0]) - 55) < 2


def test_the_thalweg_follows_the_deepest_bed():
    deepest = lambda x: 10 + 4 * np.sin(x / 20)  # noqa: E731
    frame = frame_of(channel(100, 40), 2.0, (1.0, 0.0), bed=lambda x, y: 0.02 * (y - deepest(x)) ** 2, stored_on="node")
    line = thalweg(frame, CENTRE, 5.0)
    assert np.abs(line[:, 1] - deepest(line[:, 0])).max() < 0.6
