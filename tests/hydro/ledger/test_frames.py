"""The ledger of frames and means: the same digits on one process, two, or a cluster; means; what is kept when stopped."""

from __future__ import annotations

import re
from pathlib import Path

import geopandas
import numpy as np
import pytest
from distributed import LocalCluster

from dashboard.cli import main
from hydro.ledger import FrameReader, Job, instants_of, ledger_json, read_all, write_tables
from hydro.review import open_review
from hydro.run import Run

SAMPLE = Path(__file__).parents[3] / "sample_reach"
FLOOD = SAMPLE / "results" / "existing_flood.nc"
CHOSEN = (28, 29, 30, 31, 32, 33)


@pytest.fixture(scope="module")
def flood() -> tuple[Run, object]:
    review = open_review(SAMPLE)
    run = review.open("existing_flood")
    return run, review.reach_for(run)


@pytest.fixture(scope="module")
def alone(flood) -> list:
    """Summaries read one after the other in this process."""
    run, reach = flood
    return list(read_all(run, CHOSEN, reach=reach, job=Job(FLOOD, sensitivity=False), workers=1, sensitivity=False))


def test_two_processes_give_the_same_digits_as_one(flood, alone):
    run, reach = flood
    both = list(read_all(run, CHOSEN, reach=reach, job=Job(FLOOD, sensitivity=False), workers=2, sensitivity=False))
    assert [s.values for s in both] == [s.values for s in alone]


@pytest.mark.filterwarnings("ignore::DeprecationWarning")
def test_a_cluster_of_two_processes_gives_the_same_digits(flood, alone):
    run, reach = flood
    with LocalCluster(n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None) as cluster:
        found = list(read_all(
            run, CHOSEN, reach=reach, job=Job(FLOOD, sensitivity=False), workers=1, scheduler=cluster.scheduler_address, sensitivity=False,
        ))
    assert [s.values for s in found] == [s.values for s in alone]


def test_work_that_is_stopped_keeps_what_was_done_in_order(flood, alone):
    run, reach = flood
    made = read_all(run, CHOSEN, reach=reach, job=Job(FLOOD, sensitivity=False), workers=2, sensitivity=False)
    first = [next(made), next(made)]
    made.close()
    assert [s.index for s in first] == [28, 29]
    assert [s.values for s in first] == [s.values for s in alone[:2]]


def test_the_mean_carries_the_time_mean_of_the_discharges(flood):
    """Source: linearity: psi of the mean flow has the trapezoidal mean in time of the moments' discharge (storage aside)."""
    run, reach = flood
    reader = FrameReader(run, reach=reach, sensitivity=False)
    t = run.times.seconds
    q = np.array([reader.frame(i).sf.inflow_m3_s for i in range(28, 34)])
    mean = reader.mean(float(t[28]), float(t[33]))
    assert mean.sf.inflow_m3_s == pytest.approx(np.trapezoid(q, t[28:34]) / (t[33] - t[28]), rel=1e-6)
    assert mean.frame.kind == "mean" and mean.window_s == (t[28], t[33])


def test_instants_of_a_mean_lie_within_their_own_least_and_greatest(flood, alone):
    run, reach = flood
    reader = FrameReader(run, reach=reach, sensitivity=False)
    t = run.times.seconds
    mean = reader.mean(float(t[28]), float(t[33]))
    found = instants_of(reader, mean, alone)
    bay = next(z for z in mean.zones.zones if "bay" in z.name)
    told = found[bay.id]
    assert told.frames == 6 and 0 < told.seen <= 6 and 0 < told.share_of_time <= 1
    low, high = told.ranges["area_m2"]
    assert low <= high and low < 1.3 * bay.area_m2 and high > 0.7 * bay.area_m2


def test_zones_written_to_a_geopackage_have_the_areas_of_the_table(flood, tmp_path: Path):
    run, reach = flood
    entry = FrameReader(run, reach=reach, sensitivity=False).frame(30)
    write_tables(tmp_path, run, [entry])
    zones = geopandas.read_file(tmp_path / "eddies.gpkg", layer="zones").set_index("id")
    for zone in ledger_json(run, [entry])["frames"][0]["zones"]:
        assert zones.loc[zone["id"]].geometry.area == pytest.approx(zone["area_m2"], rel=1e-6)
    page = (tmp_path / "eddies.html").read_text(encoding="utf-8")
    assert "Adjacent sections differ" in page and "Mill culvert carries" in page


def test_bands_along_banks_that_only_fill_are_no_eddies(flood):
    """While the reach fills, psi closes on itself along whole banks; no zone is kept in which no water flows back."""
    run, reach = flood
    entry = FrameReader(run, reach=reach, sensitivity=False).frame(30)
    assert all(z.max_reverse_speed_m_s > 0.1 for z in entry.zones.zones)
    assert any(s.why == "the field itself does not turn back there" for s in entry.zones.small)


def test_the_sample_answers_for_a_pier_that_water_passes_through(flood):
    """Pier 2 of the existing design is drag in the mesh (sample_reach/runs.py): no eddy, and the reason said."""
    run, reach = flood
    notes = FrameReader(run, reach=reach, sensitivity=False).frame(30).zones.notes
    assert any("no eddy is kept behind Pier 2; it is not solid in this mesh" in note for note in notes)


def test_the_sample_says_that_the_flood_cannot_follow_a_shedding_eddy_and_the_burst_counts_its_periods(capsys):
    """Frames of the flood are 10 s apart, of the burst 1 s; the wake sheds every 12 to 16 s (Strouhal 0.2 as plausibility only)."""
    assert main(["eddies", str(FLOOD), "--all"]) == 0
    said = capsys.readouterr().out
    assert "Pier 1" in said and "not followed: frames too far apart" in said
    assert main(["eddies", str(SAMPLE / "results" / "existing_burst.nc"), "--mean", "0", "90"]) == 0
    periods = re.search(r"([\d.]+) periods of ([\d.]+) s \(measured\)", capsys.readouterr().out)
    assert periods is not None
    assert 5 < float(periods[1]) < 12 and 8 < float(periods[2]) < 18
