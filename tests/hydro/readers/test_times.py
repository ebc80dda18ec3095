"""Times of files: instants, calendars, kinds of frames, and runs that are split over files."""

from __future__ import annotations

import numpy as np
import pytest

from hydro.readers import open_run
from hydro.readers.times import _offset_minutes
from tests import reader_drafts as drafts


def timed(tmp_path, values, **attributes):
    """A run of as many frames as there are times."""
    draft = drafts.sound()
    values = np.asarray(values, float)
    for name in "huv":
        draft.set(name, np.repeat(draft.values(name)[:1], len(values), axis=0))
    draft.put("time", ("time",), values, **attributes)
    return open_run(draft.write(tmp_path / "run.nc"))


def test_a_clock_behind_utc(tmp_path):
    """CF conventions, 4.4, the example "seconds since 1992-10-8 15:15:42.5 -6:00": 21:15:42.5 UTC."""
    run = timed(tmp_path, [0, 1], units="seconds since 1992-10-8 15:15:42.5 -6:00")
    assert run.times.instants[0] == np.datetime64("1992-10-08T21:15:42.500")
    np.testing.assert_array_equal(run.times.seconds, [0.0, 1.0])


@pytest.mark.parametrize(
    ("text", "minutes"), [("-6:00", -360), ("+05:30", 330), ("1030", 630), ("+930", 570), ("-3", -180), (None, 0)]
)
def test_every_form_of_offset(text, minutes):
    """CF conventions, 4.4: offsets are H, H:M, HHMM or HMM."""
    assert _offset_minutes(text) == minutes


@pytest.mark.parametrize(
    ("calendar", "date"),
    [("standard", "2024-03-01"), ("gregorian", "2024-03-01"), ("proleptic_gregorian", "2024-03-01"), ("noleap", "2024-03-02"),
     ("360_day", "2024-03-01"), ("utc", "2024-03-01")],
)
def test_sixty_days_in_each_calendar(tmp_path, calendar, date):
    """Day 60 after 1 January 2024 by counting: a leap year has 31 + 29, noleap 31 + 28, 360_day 30 + 30 days before March."""
    run = timed(tmp_path, [60, 61], units="days since 2024-01-01", calendar=calendar)
    assert run.times.instants[0] == np.datetime64(date)
    np.testing.assert_array_equal(run.times.seconds, [0.0, 86400.0])


def test_the_standard_calendar_leaps_over_ten_days_of_1582(tmp_path):
    """CF conventions, 4.4.1: in the standard calendar 1582-10-15 follows 1582-10-04."""
    run = timed(tmp_path, [0, 1], units="days since 1582-10-04", calendar="standard")
    assert run.times.instants[1].astype("datetime64[D]") == np.datetime64("1582-10-15")


def test_days_that_utc_lacks_leave_times_undated(tmp_path):
    run = timed(tmp_path, [59, 60], units="days since 2024-01-01", calendar="360_day")  # 30 February
    assert run.times.instants is None
    assert any("days that UTC lacks" in n.text for n in run.notes)


def test_a_zone_name_is_read_as_utc_and_said(tmp_path):
    run = timed(tmp_path, [1], units="hours since 2015-04-15 00:00:00.000 UTC")
    assert run.times.instants[0] == np.datetime64("2015-04-15T01:00")
    assert any("zone name 'UTC'" in n.text for n in run.notes)


@pytest.mark.parametrize(("unit", "seconds"), [("s", 1.0), ("minutes", 60.0), ("h", 3600.0), ("days since start of run", 86400.0)])
def test_undated_times_count_from_the_start(tmp_path, unit, seconds):
    run = timed(tmp_path, [5, 7], units=unit)
    assert run.times.instants is None
    np.testing.assert_array_equal(run.times.seconds, [0.0, 2 * seconds])
    assert any("undated" in n.text for n in run.notes)


def test_a_mapping_gives_the_unit_of_time(tmp_path):
    draft = drafts.sound().say("time", units=None, calendar=None)
    run = open_run(draft.write(tmp_path / "run.nc"), mapping={"time": {"unit": "min"}})
    np.testing.assert_array_equal(run.times.seconds, 60 * drafts.TIMES)


def test_a_file_of_one_frame_without_time(tmp_path):
    draft = drafts.sound().drop("time")
    for name in "huv":
        _, values, attributes = draft.variables[name]
        draft.put(name, ("face",), values[0], **attributes)
    run = open_run(draft.write(tmp_path / "run.nc"))
    assert run.n_frames == 1 and run.frame(0).time is None


def test_a_scalar_time_dates_the_one_frame(tmp_path):
    draft = drafts.sound()
    for name in "huv":
        _, values, attributes = draft.variables[name]
        draft.put(name, ("face",), values[0], **attributes)
    draft.put("when", (), 90.0, units="minutes since 2031-03-02", standard_name="time").drop("time")
    run = open_run(draft.write(tmp_path / "run.nc"))
    assert run.frame(0).time == np.datetime64("2031-03-02T01:30")


@pytest.mark.parametrize(
    ("methods", "kind"),
    [("time: mean", "mean"), ("time: point", "instant"), ("time: maximum", "maximum"), ("area: mean time: mean", "mean"),
     ("time: maximum (interval: 10 s)", "maximum"), ("area: time: mean", "mean")],
)
def test_cell_methods_say_what_the_frames_are(tmp_path, methods, kind):
    draft = drafts.sound()
    for name in "huv":
        draft.say(name, cell_methods=methods)
    draft.say("time", bounds="spans").put("spans", ("time", "two"), np.column_stack([drafts.TIMES - 30, drafts.TIMES]))
    run = open_run(draft.write(tmp_path / "run.nc"))
    assert set(run.times.kinds) == {kind}
    if kind == "instant":
        assert run.frame(1).interval_s is None
    else:
        assert run.frame(1).interval_s == 30.0


def test_frames_of_unknown_kind_are_instants_and_that_is_said(tmp_path):
    draft = drafts.sound()
    for name in "huv":
        draft.say(name, cell_methods="area: mean")
    path = draft.write(tmp_path / "run.nc")
    assert any("does not say whether frames are instants" in n.text for n in open_run(path).notes)
    asked = open_run(path, kind="maximum")
    assert set(asked.times.kinds) == {"maximum"}
    assert not any("does not say whether" in n.text for n in asked.notes)


def split(tmp_path, *parts):
    """The sound draft cut into files by lists of frames and times; paths in the order given."""
    paths = []
    for k, (frames, times) in enumerate(parts):
        draft = drafts.sound()
        for name in "huv":
            draft.set(name, draft.values(name)[frames])
        draft.set("time", np.asarray(times, float))
        paths.append(draft.write(tmp_path / f"part{k}.nc"))
    return paths


def test_a_run_split_over_files_is_one_run_in_any_order(tmp_path):
    whole = open_run(drafts.sound().write(tmp_path / "whole.nc"))
    first, second = split(tmp_path, ([0, 1], [0, 60]), ([2], [180]))
    run = open_run([second, first])
    np.testing.assert_array_equal(run.times.seconds, whole.times.seconds)
    np.testing.assert_array_equal(run.times.instants, whole.times.instants)
    for i in range(3):
        np.testing.assert_array_equal(run.read(i).depth, whole.read(i).depth)
    assert [p.name for p in run.files] == ["part0.nc", "part1.nc"]


def test_files_may_count_from_their_own_starts(tmp_path):
    first, second = split(tmp_path, ([0, 1], [0, 60]), ([2], [0]))
    draft = drafts.sound()
    for name in "huv":
        draft.set(name, draft.values(name)[[2]])
    draft.put("time", ("time",), [2.0], units="minutes since 2031-03-02T06:01:00Z")
    run = open_run([first, draft.write(second)])
    np.testing.assert_array_equal(run.times.seconds, [0, 60, 180])


def test_a_frame_repeated_by_the_next_file_is_used_once(tmp_path):
    paths = split(tmp_path, ([0, 1], [0, 60]), ([1, 2], [60, 180]))
    run = open_run(paths)
    np.testing.assert_array_equal(run.times.seconds, [0, 60, 180])
    assert any("last frame of part0.nc is repeated by part1.nc" in n.text for n in run.notes)
    whole = open_run(drafts.sound().write(tmp_path / "whole.nc"))
    np.testing.assert_array_equal(run.read(2).depth, whole.read(2).depth)


def test_overlapping_files_are_refused(tmp_path):
    paths = split(tmp_path, ([0, 1], [0, 60]), ([1, 2], [30, 180]))
    with pytest.raises(ValueError, match=r"part0\.nc and part1\.nc overlap in time: the first ends at 60 s, the second begins at 30 s"):
        open_run(paths)


def test_gaps_between_files_are_noted(tmp_path):
    paths = split(tmp_path, ([0, 1, 2], [0, 60, 120]), ([0, 1, 2], [600, 660, 720]))
    run = open_run(paths)
    assert any("a gap of 480 s between part0.nc and part1.nc; frames are usually 60 s apart" in n.text for n in run.notes)


def test_files_of_different_meshes_are_refused(tmp_path):
    first, second = split(tmp_path, ([0, 1], [0, 60]), ([2], [180]))
    draft = drafts.sound()
    draft.set("node_x", draft.values("node_x") + 1.0)
    with pytest.raises(ValueError, match=r"part1\.nc has another mesh than part0\.nc"):
        open_run([first, draft.write(second)])


def test_files_of_different_content_are_refused(tmp_path):
    first, second = split(tmp_path, ([0, 1], [0, 60]), ([2], [180]))
    draft = drafts.sound().drop("h").set("time", np.array([180.0, 240.0, 300.0]))
    with pytest.raises(ValueError, match=r"part1\.nc lacks depth on faces, which part0\.nc has"):
        open_run([first, draft.write(second)])


def test_dated_and_undated_files_do_not_mix(tmp_path):
    first, second = split(tmp_path, ([0, 1], [0, 60]), ([2], [180]))
    draft = drafts.sound().say("time", units="s")
    with pytest.raises(ValueError, match=r"part1\.nc has undated times and another file of the run dated ones"):
        open_run([first, draft.write(second)])


def test_the_mesh_may_stand_in_a_file_of_its_own(tmp_path):
    draft = drafts.sound()
    grid = drafts.Draft({n: draft.variables[n] for n in ("reach", "crs", "node_x", "node_y", "face_nodes", "zb")})
    data = drafts.Draft({n: draft.variables[n] for n in ("time", "h", "u", "v")})
    run = open_run([grid.write(tmp_path / "grid.nc"), data.write(tmp_path / "data.nc")])
    whole = open_run(draft.write(tmp_path / "whole.nc"))
    np.testing.assert_array_equal(run.read(1).unit_discharge, whole.read(1).unit_discharge)
