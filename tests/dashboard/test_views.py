"""Views draw what they are given: checked as text and numbers, without a browser."""

from __future__ import annotations

import re
from types import SimpleNamespace
from xml.etree import ElementTree

import numpy as np
import pytest
import shapely

from dashboard import theme
from dashboard.questions.common import link_marks
from dashboard.raster import View
from dashboard.units import Units
from dashboard.views import map as drawing
from dashboard.views import marks, observed, ribbon, section, shore, strokes, table, tags
from dashboard.views import profile as lengthwise
from dashboard.views.scene import LogsMark, Scene, StructureMark, Tag, ZoneMark
from hydro.observations import Observed
from hydro.section.profile import Profile
from tests.builders import channel, frame_of, with_hole

VIEW = View(0.0, 0.0, 100.0, 800, 400)
DAY = theme.look("day")


def area_of(lines: list[np.ndarray]) -> float:
    """Area inside closed lines that have it on their left (shoelace), holes counted against it."""
    return sum(0.5 * float(np.sum(p[:-1, 0] * p[1:, 1] - p[1:, 0] * p[:-1, 1])) for p in lines)


def test_the_waterline_closes_round_the_water_with_the_water_on_its_left():
    """A channel with a round hole, all wet: the line's own shoelace area is the mesh's area."""
    mesh = with_hole()
    lines = shore.shoreline(frame_of(mesh, 1.0, (1.0, 0.0)))
    assert len(lines) == 2
    assert area_of(lines) == pytest.approx(mesh.triangle_area.sum(), rel=1e-9)


def test_no_bank_is_drawn_across_an_open_boundary():
    mesh = channel(10, 4, 100.0, 20.0)
    middle = mesh.node_xy[mesh.edge_nodes[mesh.boundary_edges]].mean(axis=1)
    ends = mesh.boundary_edges[(middle[:, 0] < 1e-6) | (middle[:, 0] > 100 - 1e-6)]
    lines = shore.shoreline(frame_of(mesh, 1.0, (1.0, 0.0)), ends)
    assert sum(np.hypot(*np.diff(line, axis=0).T).sum() for line in lines) == pytest.approx(200.0)


def test_inside_the_mesh_the_waterline_stands_where_depth_meets_the_threshold():
    mesh = channel(40, 20, 40.0, 20.0)
    frame = frame_of(mesh, lambda x, y: np.maximum(y - 10, 0) / 10, (0.0, 0.0), stored_on="node")
    inner = [line for line in shore.shoreline(frame) if np.ptp(line[:, 1]) < 0.5 and line[0, 1] < 15]
    assert inner and np.concatenate(inner)[:, 1] == pytest.approx(10 + 10 * frame.wet_depth_m, abs=1e-9)


def test_bank_ticks_stand_on_the_dry_side_long_and_short_by_turns():
    starts, ends = strokes.bank_ticks([np.array([[0.0, 0.0], [100.0, 0.0]])], 0.5)
    reach = ends - starts
    assert (reach[:, 1] < 0).all()  # water on the left is north; ticks go south
    assert np.hypot(*reach.T)[:4] == pytest.approx([4.5, 2.25, 4.5, 2.25])
    assert np.diff(starts[:, 0]) == pytest.approx(2.5)


@pytest.mark.parametrize(("rotation", "sign"), [("anticlockwise", 1.0), ("clockwise", -1.0)])
def test_the_turning_mark_turns_the_way_it_says(rotation, sign):
    arc = strokes.turning_mark(np.zeros(2), 1.0, rotation)[0]
    angle = np.unwrap(np.arctan2(arc[:, 1], arc[:, 0]))
    assert (sign * np.diff(angle) > 0).all()


def test_labels_cover_neither_each_other_nor_what_must_stay_clear():
    """Fifty seeded layouts: every label that is shown keeps off the boxes by the share that it may."""
    rng = np.random.default_rng(7)
    for _ in range(50):
        anchors = rng.uniform(10, 90, (6, 2))
        sizes = np.tile([8.0, 3.0], (6, 1))
        corners = rng.uniform(0, 90, (5, 2))
        avoid = np.hstack([corners, corners + 8])
        placed = tags.place(anchors, sizes, avoid, (0, 0, 100, 100))
        boxes = [shapely.box(p.x - 4, p.y - 1.5, p.x + 4, p.y + 1.5) for p in placed if p.shown]
        clear = shapely.union_all([shapely.box(*b) for b in avoid])
        for i, box in enumerate(boxes):
            others = shapely.union_all([clear, *boxes[:i]])
            assert box.intersection(others).area <= 0.36 * box.area
            assert shapely.box(0, 0, 100, 100).contains(box)


def test_a_label_with_room_stands_inside_without_a_leader():
    placed = tags.place(np.array([[50.0, 50.0]]), np.array([[8.0, 3.0]]), np.empty((0, 4)), (0, 0, 100, 100), inside=[30.0])
    assert placed[0].shown and not placed[0].leader


def zone(tag: str, x: float, rotation: str, subject: bool) -> ZoneMark:
    return ZoneMark(tag, shapely.Point(x, 0).buffer(8), (), rotation, np.array([x, 0.0]), subject)


def test_the_subject_alone_is_drawn_in_signal_and_rotation_shows_in_the_hatch():
    scene = Scene(zones=(zone("E1", -20, "clockwise", False), zone("E2", 20, "anticlockwise", True)))
    sheet = drawing.draw(scene, VIEW, DAY)
    signal, ink = DAY.palette.signal, DAY.palette.ink
    assert [(h, c) for h, c in zip(sheet.areas["hatch"], sheet.areas["hatch_colour"])][:2] == [("/", ink), ("\\", signal)]
    filled = dict(zip(sheet.texts["text"], sheet.texts["fill"]))
    assert filled["E2"] == signal and filled["E1"] == DAY.palette.paper


def test_a_pier_that_lets_water_through_is_not_drawn_solid():
    pier = shapely.box(-5, -2, 5, 2)
    for solid, alpha in ((True, 1.0), (False, 0.6)):
        sheet = drawing.draw(Scene(structures=(StructureMark("Pier", "pier", pier, solid),)), VIEW, DAY)
        assert sheet.areas["alpha"] == [alpha]


def test_labels_without_room_are_counted():
    crowd = tuple(Tag(f"a long name {i}", (0.0, 0.0)) for i in range(60))
    sheet = drawing.draw(Scene(tags=crowd), VIEW, DAY)
    assert sheet.hidden > 0
    assert sheet.hidden + sum(t.startswith("a long name") for t in sheet.texts["text"]) == 60


def test_a_log_is_drawn_to_its_true_length():
    log = LogsMark(np.zeros((1, 2)), np.zeros(1), np.array([12.0]), np.zeros(1, bool))
    sheet = drawing.draw(Scene(logs=log), VIEW, DAY)
    assert np.ptp(sheet.over["xs"][0]) == pytest.approx(12.0)


def test_twenty_thousand_logs_are_two_lines_and_only_those_in_view_are_sent():
    chance = np.random.default_rng(1)
    at = chance.uniform(-500, 500, (20_000, 2))
    lodged = np.arange(20_000) % 10 == 0
    sheet = drawing.draw(Scene(logs=LogsMark(at, chance.uniform(0, 3, 20_000), np.full(20_000, 5.0), lodged)), VIEW, DAY)
    assert len(sheet.over["xs"]) == 4  # each kind with its casing
    assert {DAY.palette.ink, DAY.palette.signal} <= set(sheet.over["colour"])
    west, south, east, north = VIEW.widened(0.25).extent
    inside = (np.abs(at - [(west + east) / 2, (south + north) / 2]) < [(east - west) / 2, (north - south) / 2]).all(axis=1)
    assert sum(len(x) for x in sheet.over["xs"]) == pytest.approx(2 * 3 * inside.sum(), abs=4)


def course(index: int = 2, **more) -> ribbon.Course:
    seconds = np.array([0.0, 600.0, 1200.0, 3600.0])
    instants = np.datetime64("2031-03-02T06:00:00") + seconds.astype("timedelta64[s]")
    return ribbon.Course(seconds, instants, np.array([10.0, 40.0, 73.0, 20.0]), (), index, **more)


def test_the_ribbon_places_frames_by_time_not_by_number():
    box = ribbon.Box(700.0)
    x = ribbon.places(course(), box)
    assert (x - box.left) / (box.right - box.left) == pytest.approx([0, 1 / 6, 1 / 3, 1])


def test_the_ribbon_is_sound_svg_with_the_flag_s_words():
    svg = ribbon.draw(course(), ribbon.Box(700.0), Units())
    ElementTree.fromstring(svg)
    assert "06:20 \u00b7 73.0\u00a0m\u00b3/s" in svg
    assert ribbon.words(course(), Units()) == "06:20, 2 March, 73.0\u00a0m\u00b3/s"


def test_a_spindle_is_drawn_only_where_the_eddy_exists():
    rows = [ribbon.Row("E1", np.array([np.nan, 4.0, 9.0, np.nan]), True)]
    many = ribbon.Course(course().seconds, course().instants, course().amount, rows, 1)
    svg = ribbon.draw(many, ribbon.Box(700.0), Units())
    shape = re.search(r'<polygon class="subject" points="([^"]+)"', svg)
    assert shape
    x = sorted({float(p.split(",")[0]) for p in shape[1].split()})
    assert x == pytest.approx(list(ribbon.places(many, ribbon.Box(700.0))[1:3]), abs=0.1)


def test_a_name_with_a_tag_in_it_stays_text_in_the_ribbon():
    rows = [ribbon.Row("<script>", np.full(4, 2.0))]
    svg = ribbon.draw(ribbon.Course(course().seconds, None, course().amount, rows, 0), ribbon.Box(700.0), Units())
    assert "<script>" not in svg and "&lt;script&gt;" in svg


def profile(speed) -> section.Profile:
    d = np.linspace(0, 20, 81)
    bed = 100 - 2 * (1 - ((d - 10) / 10) ** 2)
    return section.Profile(d, bed, np.full(81, 100.0), speed(d), psi=d * 1.0, tube_m3_s=2.0, length=20.0)


def test_bars_stand_downstream_and_hang_upstream():
    svg = section.draw(profile(lambda d: np.where(d < 10, 1.0, -0.5)), section.Box(400.0), Units())
    ElementTree.fromstring(svg)
    surface = section.Box(400.0).surface
    for kind, x, y1, y2 in re.findall(r'<line class="(bar(?: back)?)" x1="([\d.]+)" x2="[\d.]+" y1="([\d.]+)" y2="([\d.]+)"', svg):
        assert float(y1) == pytest.approx(surface, abs=0.1)
        left = float(x) < section.Box(400.0).right / 2
        assert (float(y2) < surface) == left
        assert kind == ("bar" if left else "bar back")


def test_the_section_s_water_changes_tube_where_psi_does():
    """psi = distance, tubes of 2: ten strips of 2 m on a section of 20 m, even and odd by turns."""
    svg = section.draw(profile(np.ones_like), section.Box(400.0), Units())
    strips = re.findall(r'class="tube (even|odd)"', svg)
    assert strips[:10] == ["even", "odd"] * 5


def test_a_dry_section_says_so():
    dry = section.Profile(np.array([0.0, 1.0]), np.array([1.0, 1.0]), np.full(2, np.nan), np.full(2, np.nan))
    assert "crosses no water" in section.draw(dry, section.Box(300.0), Units())


def test_the_scale_bar_is_as_long_as_it_says():
    svg = marks.scale_bar(0.25, Units())
    length = float(re.search(r"Scale bar (\d+)", svg)[1])
    width = sum(float(w) for w in re.findall(r'<rect class="(?:half|rest)" x="[\d.]+" y="[\d.]+" width="([\d.]+)"', svg))
    assert width * 0.25 == pytest.approx(length, abs=0.1)


def test_a_table_has_headings_a_caption_and_buttons_that_say_what_they_do():
    columns = (table.Column("Eddy", figure=False), table.Column("Area,", "m2"))
    lines = [table.Line((("E1", ""), ("456", "440 to 474")), True, ("subject", 'E"1'), "Show <E1>")]
    html = table.html(table.Table("Ledger", "today", "Zones <now>", columns, lines))
    sound = html.replace(" class=subject", ' class="subject"').replace("<br>", "<br/>")
    root = ElementTree.fromstring(f"<div>{sound}</div>")
    assert root.find(".//caption").text == "Zones <now>"
    assert [th.get("scope") for th in root.iter("th")] == ["col", "col", "row"]
    button = root.find(".//button")
    assert button.get("data-value") == 'E"1' and button.get("aria-label") == "Show <E1>"


@pytest.mark.parametrize("ends, corner", [
    (None, "nw"), (((20.0, 0.0), (30.0, -10.0)), "nw"), (((-45.0, 22.0), (10.0, 0.0)), "sw"), (((-45.0, 22.0), (-45.0, -22.0)), "ne"),
    (((-60.0, 22.0), (60.0, 22.0)), "sw"),
])
def test_the_key_goes_where_it_covers_nothing_of_the_section(ends, corner):
    """The view is 100 by 50 m about (0, 0); the key is some 28 by 15 m of it."""
    sheet = drawing.draw(Scene(section=ends), VIEW, theme.look("day"))
    assert sheet.key == corner


def test_labels_keep_off_the_marks_that_the_page_lays_over_the_map():
    tag = Tag("Pier 1", (10.0, 0.0))
    free = drawing.draw(Scene(tags=(tag,)), VIEW, theme.look("day")).texts
    kept = drawing.draw(Scene(tags=(tag,), buttons=((free["x"][0], free["y"][0]),)), VIEW, theme.look("day")).texts
    assert np.hypot(kept["x"][0] - free["x"][0], kept["y"][0] - free["y"][0]) > 1.0


def test_a_profile_draws_bed_water_head_and_a_mark_at_every_jump():
    d = np.linspace(0, 100, 51)
    bed = np.where(d < 50, 2.0, 1.0)
    found = Profile(d, np.column_stack([d, d]), bed, np.full(51, 1.0), bed + 1, bed + 0.4, bed + 1.2, np.ones(51), np.full(51, 0.3), (50.0,))
    drawn = lengthwise.draw(found, 700, 13.0, Units())
    tree = ElementTree.fromstring(drawn)
    lines = [e for e in tree.iter() if e.tag.endswith("polyline")]
    assert len(lines) == 4  # bed, surface, head, critical depth
    (mark,) = [e for e in tree.iter() if e.get("class") == "subject"]
    right = 700 - 5.2 * 13
    assert float(mark.get("d", "")[1:].split()[0]) + 5 == pytest.approx(right / 2, abs=0.5)
    surface = np.array([[float(v) for v in p.split(",")] for p in lines[1].get("points", "").split()])
    assert surface[0, 1] < surface[-1, 1]  # it falls downstream


def test_a_dry_profile_draws_nothing():
    nothing = np.full(3, np.nan)
    found = Profile(np.arange(3.0), np.zeros((3, 2)), np.ones(3), np.zeros(3), nothing, nothing, nothing, np.zeros(3), nothing, ())
    assert lengthwise.draw(found, 700, 13.0, Units()) == ""


def test_observed_marks_stand_on_the_map_with_their_difference():
    found = [Observed("marks", "Marks", "made up", "m", {}, np.array([[1.0, 2.0]]), np.array([-0.04]))]
    points, lines, tags_ = observed.marks(found, Units())
    assert points[0].kind == "rest" and tags_[0].text.replace("\u00a0", " ") == "\u22120.040 m" and not lines


def test_a_links_path_is_dotted_and_named_with_what_it_carries():
    path = SimpleNamespace(name="Culvert", nodes=np.array([0, 2, 1]))
    sf = SimpleNamespace(links=(SimpleNamespace(path=path, discharge_m3_s=0.87),))
    mesh = SimpleNamespace(node_xy=np.array([[0.0, 0], [2, 0], [1, 1]]))
    (line,), (tag,) = link_marks(SimpleNamespace(frame=SimpleNamespace(mesh=mesh), sf=sf), Units())  # type: ignore[arg-type]
    assert line.kind == "dotted" and line.points.tolist() == [[0, 0], [1, 1], [2, 0]]
    assert tag.text.replace("\u00a0", " ") == "Culvert, 0.87 m\u00b3/s" and tag.at == (1.0, 1.0)
