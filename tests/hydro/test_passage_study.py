"""The whole answer over a review: why the way is excluded at one flow and not at another, and for how much of the time."""

from __future__ import annotations

import json
import math

import geopandas
import numpy as np
import pytest
import shapely

from hydro.passage import EXCLUDED, NOT_EXCLUDED, figures, passage_json, study, write_tables
from hydro.review import Review, new_review, open_review
from tests.builders import channel, raw_of, run_of
from tests.passage_cases import fish_table

ORIGIN = (50_000.0, 30_000.0)
WIDTH, GRID = 4.0, "EPSG:32630"


@pytest.fixture(scope="module")
def slots(tmp_path_factory) -> Review:
    """60 m of channel with a slot of 1 m at x = 30 in which the water runs twenty times as fast as elsewhere.

    Discharge 4 h u with h = 1 m and u elsewhere: 0.2 to 1.2 m3/s, so up to 6 m/s in the slot. Flow along +x.
    """
    mesh = channel(120, 4, 60, WIDTH, corner=ORIGIN, origin=ORIGIN)

    def raw(q: float):
        def speed(x, y):
            return np.where(np.abs(x - ORIGIN[0] - 30) < 0.6, 20.0, 1.0) * q / WIDTH

        return raw_of(mesh, 1.0, (speed, 0.0), stored_on="node")

    folder = tmp_path_factory.mktemp("slots")
    review = new_review(folder / "review", "Slots")
    rows = {"role": ["start", "goal", "entrance"], "id": ["a", "b", "c"], "name": ["below", "above", "ramp"]}
    shapes = [shapely.box(55, 0, 60, 4), shapely.box(0, 0, 5, 4), shapely.LineString([(20, 1), (20, 4)])]
    moved = [shapely.transform(g, lambda c: c + ORIGIN) for g in shapes]
    geopandas.GeoDataFrame(rows, geometry=moved, crs=GRID).to_file(review.folder / "lines.gpkg", layer="fish")
    line = shapely.transform(shapely.LineString([(0, 2), (60, 2)]), lambda c: c + ORIGIN)
    geopandas.GeoDataFrame({"name": ["c"]}, geometry=[line], crs=GRID).to_file(review.folder / "lines.gpkg", layer="centre_line")

    def fill(document):
        names = ("low", "high", "flood")
        document["runs"] = [{"id": n, "design": "existing", "event": n, "file": f"{n}.nc"} for n in names]
        document["fish"] = [fish_table(length_sd_m=0.03, endurance_sd=0.3, migration_months=[10])]
        document["flows"] = {
            "source": "made up", "exceedance_percent": [10, 50, 90], "monthly_m3_s": {"10": [1.0, 0.4, 0.2], "11": [1.2, 0.8, 0.2]},
        }

    filled = review.edit(fill, who="A. Reader", what="runs, fish and flows")
    opened = {
        "low": run_of(mesh, [0.0], [raw(0.2)], crs=GRID), "high": run_of(mesh, [0.0], [raw(1.2)], crs=GRID),
        "flood": run_of(mesh, [0, 600, 1200, 1800, 2400], [raw(q) for q in (0.2, 0.4, 1.2, 0.8, 0.2)], crs=GRID),
    }
    return Review(filled.folder, open_review(filled.folder).contents, filled.stamp, opened)


@pytest.fixture(scope="module")
def found(slots):
    return study(slots, every=1)


def _of(found, run: str, frame: int = 0):
    return next(a for a in found.answers if a.entry.id == run and a.answer.stamp.index == frame)


def test_at_the_low_flow_the_way_is_not_excluded_and_at_the_high_flow_the_slot_is_named(found):
    """Twenty times 0.2/4 is 1 m/s, twenty times 1.2/4 is 6 m/s; the sprint data end at 4.8 m/s."""
    low, high = _of(found, "low").answer, _of(found, "high").answer
    assert (low.status, high.status) == (NOT_EXCLUDED, EXCLUDED)
    assert low.worst_leg.fatigue < 1 and low.barriers == ()
    barrier = high.barriers[0]
    assert (barrier.kind, barrier.unit) == ("too fast", "m/s")
    assert barrier.value == pytest.approx(6.0, rel=1e-6)
    assert barrier.beyond == pytest.approx(1.2, rel=1e-6)
    assert 29 < barrier.xy[0] < 31
    assert 1.0 <= barrier.length_m <= 2.5  # the slot, and what of its rise and fall is beyond the data too
    assert "not excluded by depth and mean speed" in low.sentence
    assert "leg" in high.sentence and "too fast: 6.00 m/s" in high.sentence and "chainage 30 m" in high.sentence


def test_words_that_promise_passage_are_never_used(found):
    text = json.dumps(passage_json(found)).lower()
    assert "passable" not in text and "safe" not in text
    owed = {"passage", "endurance", "near-bed", "screening"}
    assert owed == {c["id"] for c in passage_json(found)["cautions"]}
    assert all(set(f.cautions) == owed for a in found.answers for f in figures(a, None))


def test_the_answer_without_recovery_stands_beside_it(found):
    """Between the resting areas there is only the slot, so the fatigue of the whole way is that of its one tiring leg."""
    low = _of(found, "low").answer
    assert low.alone_status == NOT_EXCLUDED
    assert low.alone_fatigue == pytest.approx(low.worst_leg.fatigue, rel=0.01)
    assert math.isinf(_of(found, "high").answer.alone_fatigue)


def test_ranges_of_discharge_and_shares_of_time_by_hand(found):
    """0.2 and 0.4 m3/s: up to 2 m/s in the slot, not excluded; 0.8 and 1.2: 4 and 6 m/s, excluded (1 m at 4 m/s costs
    0.45/0.4 exp(1 - 5 + 0.45/0.4 4) = 1.9). October: 0.2 is exceeded for 90 %, 0.4 for 50 %, and 0.8 for
    10 + 40 ln(1/0.8)/ln(1/0.4) = 19.74 %."""
    flow = found.flows[0]
    assert [(b.low_m3_s, b.high_m3_s, b.status) for b in flow.bands] == [
        (pytest.approx(0.2), pytest.approx(0.4), NOT_EXCLUDED), (pytest.approx(0.4), pytest.approx(0.8), "undecided"),
        (pytest.approx(0.8), pytest.approx(1.2), EXCLUDED),
    ]
    october, november, window = flow.months
    at_08 = 0.1 + 0.4 * math.log(1 / 0.8) / math.log(1 / 0.4)
    assert (october.not_excluded, october.undecided, october.excluded) == (
        pytest.approx(0.4), pytest.approx(0.5 - at_08), pytest.approx(at_08 - 0.1),
    )
    assert october.outside == pytest.approx(0.2)
    assert (window.not_excluded, window.label) == (october.not_excluded, "migration window")
    assert november.not_excluded != october.not_excluded


def test_a_hydrograph_gives_its_share_of_time_and_its_longest_excluded_spell(found):
    """Frames at 0, 600 ... 2400 s stand for 300, 600, 600, 600, 300 s; those at 1200 and 1800 s are excluded."""
    label, hydrograph = found.flows[0].runs[0]
    assert label == "existing flood"
    assert hydrograph.shares.not_excluded == pytest.approx(0.5)
    spell = hydrograph.longest_excluded
    assert (spell.from_s, spell.to_s, spell.at_least) == (900, 2100, False)
    assert hydrograph.not_excluded_m3_s == (pytest.approx(0.2), pytest.approx(0.4))


def test_a_flow_that_changes_during_the_swim_is_said_to(found):
    first = _of(found, "flood", 0).answer
    assert first.transit_s > 60
    assert any("flow changes by" in flag for flag in first.flags)
    assert not any("flow changes by" in flag for flag in _of(found, "low").answer.flags)


def test_the_entrance_takes_its_part_of_the_flow(found):
    """A line over 3 of 4 m of uniform flow, along sides of the mesh. Tolerance: round-off."""
    entrance = _of(found, "low").entrances[0]
    assert entrance.share == pytest.approx(0.75, rel=1e-9)
    assert entrance.competing_m3_s == pytest.approx(0.05, rel=1e-9)


def test_files_hold_the_answers_their_places_and_their_sources(found, tmp_path):
    paths = write_tables(tmp_path, found)
    assert sorted(p.name for p in paths) == ["passage-flows.csv", "passage-routes.csv", "passage.csv", "passage.gpkg"]
    legs = geopandas.read_file(tmp_path / "passage.gpkg", layer="legs")
    assert set(legs["run"]) == {"low", "high", "flood"}
    west, _, east, _ = legs.total_bounds
    assert ORIGIN[0] <= west < east <= ORIGIN[0] + 60
    barriers = geopandas.read_file(tmp_path / "passage.gpkg", layer="barriers")
    assert barriers.geometry.x.between(ORIGIN[0] + 29, ORIGIN[0] + 31).all()
    head = (tmp_path / "passage.csv").read_text().splitlines()
    assert head[0].startswith("# run low") and "settings:" in head[3]
    data = json.loads(json.dumps(passage_json(found), allow_nan=False))
    assert data["schema"] == "leewater/passage/1"
    assert data["settings"]["wet_depth_m"] == 0.05


def test_unknown_names_list_the_known_ones(slots):
    with pytest.raises(ValueError, match="it has Made-up fish"):
        study(slots, fish=["Eel"])
    with pytest.raises(ValueError, match="it has low, high, flood"):
        study(slots, runs=["summer"])


def test_progress_is_told_and_can_stop_the_work(slots):
    told = []

    def stop(share, what):
        told.append((share, what))
        if len(told) == 2:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        study(slots, progress=stop)
    assert [share for share, _ in told] == [0.0, pytest.approx(1 / 3)]
