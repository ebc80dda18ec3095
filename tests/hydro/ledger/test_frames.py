"""The ledger of frames and means: the same digits on one process, two, or a cluster; means; what is kept when stopped."""

from __future__ import annotations

from pathlib import Path

import geopandas
import numpy as np
import pytest
from distributed import LocalCluster

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
