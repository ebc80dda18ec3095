"""Commands on the sample review, as a user gives them: tables of works, the handbook, queries, observations."""

from __future__ import annotations

import csv
import json
import shutil
from pathlib import Path

import geopandas
import numpy as np
import openpyxl
import pytest

from dashboard.cli import main
from hydro.cautions import CAUTIONS
from hydro.queries import ask, find
from hydro.review import open_review
from sample_reach import observe

SAMPLE = Path(__file__).parents[2] / "sample_reach"
LOW, FLOOD = (str(SAMPLE / "results" / f"existing_{event}.nc") for event in ("low", "flood"))


def answer(capsys: pytest.CaptureFixture[str], *arguments: str) -> dict:
    """The JSON that a command prints."""
    assert main([*arguments, "--json", "-"]) == 0
    return json.loads(capsys.readouterr().out)


def refused(capsys: pytest.CaptureFixture[str], *arguments: str) -> str:
    """The sentence of a command that ends with status 2."""
    assert main(list(arguments)) == 2
    return capsys.readouterr().err


def test_openings_share_the_flow_of_the_bridge_between_them(capsys):
    rows = answer(capsys, "section", FLOOD, "--openings", "--frame", "30")["openings"]
    assert len(rows) == 3
    assert sum(r["share"] for r in rows) == pytest.approx(1.0)
    for r in rows:
        assert r["freeboard_m"] == pytest.approx(r["soffit_m"] - r["highest_level_m"])


def test_a_weirs_heads_differ_by_its_fall_and_the_relation_names_its_source(capsys):
    content = answer(capsys, "section", FLOOD, "--weirs", "broad-crested", "--frame", "30")
    for r in content["weirs"]:
        assert r["fall_m"] == pytest.approx(r["upstream_head_m"] - r["downstream_head_m"])
        assert "ISO 3846" in r["source"]
    assert {"weir-formula", "no-roller"} <= {c["id"] for c in content["cautions"]}
    assert main(["section", FLOOD, "--weirs", "broad-crested"]) == 0
    said = capsys.readouterr().out
    assert "no rated structure" in said and CAUTIONS["weir-formula"].text in said


def test_an_unknown_weir_relation_lists_the_known_ones(capsys):
    assert "rehbock" in refused(capsys, "section", LOW, "--weirs", "ogee")


def test_a_place_is_above_a_depth_no_longer_than_the_run_lasts(capsys):
    rows = {r["place"]: r for r in answer(capsys, "section", FLOOD, "--places", "0.2")["places"]}
    path = rows["Foot path under the bridge"]
    assert 0 < path["first_above_s"] < 600 and 0 < path["time_above_s"] < 600 - path["first_above_s"] + 1e-6
    assert path["median_depth_m"] <= path["depth_95_percent_m"] <= path["peak_depth_max_m"]


def test_the_envelope_holds_the_greatest_of_every_frame(tmp_path: Path, capsys):
    assert main(["section", FLOOD, "--envelope", str(tmp_path / "most.gpkg")]) == 0
    assert "maximum over the frames" in capsys.readouterr().out
    faces = geopandas.read_file(tmp_path / "most.gpkg", layer="envelope")
    run = open_review(SAMPLE).open("existing_flood")
    frames = [run.frame(i) for i in (0, 30, 60)]
    deepest = max(float(f.face_depth.max()) for f in frames)
    assert faces["max_depth_m"].max() >= deepest - 1e-9
    wet = np.zeros(run.mesh.n_faces, bool)
    for i in range(run.n_frames):
        frame = run.frame(i)
        wet |= frame.face_depth > frame.wet_depth_m
    assert faces.geometry.area.sum() == pytest.approx(run.mesh.face_area[wet].sum(), rel=1e-9)


def test_the_table_kept_as_csv_names_its_source_and_its_cautions(tmp_path: Path, capsys):
    assert main(["section", FLOOD, "--openings", "--out", str(tmp_path)]) == 0
    text = (tmp_path / "openings.csv").read_text(encoding="utf-8")
    assert "SHA-256" in text and CAUTIONS["section-discharge"].text in text
    assert len(list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))) == 3


def test_the_handbook_gives_a_worked_example(capsys):
    """Trapezoid 20 m by 2 m, sides 1 to 1 taken as R = 40/24 m, S = 0.001, n = 0.030: V = R^(2/3) S^(1/2) / n = 1.48 m/s."""
    content = answer(capsys, "relation", "manning-velocity", f"radius_m={40 / 24}", "slope=0.001", "n=0.03")
    assert next(iter(content["result"].values())) == pytest.approx((40 / 24) ** (2 / 3) * 0.001**0.5 / 0.03)


def test_every_relation_of_the_handbook_says_what_it_gives_and_owes_a_caution(capsys):
    from hydro.handbook import RELATIONS

    assert main(["relation"]) == 0
    listed = capsys.readouterr().out
    for name, found in RELATIONS.items():
        assert name in listed and found.source in listed
        assert found.cautions and all(c in CAUTIONS for c in found.cautions)


@pytest.mark.parametrize(
    ("given", "said"),
    [
        (["ogee"], "known are"), (["bed-shear", "depth_m=1"], "needs velocity_m_s"), (["bed-shear", "d=1"], "no argument 'd'"),
        (["bed-shear", "velocity_m_s=x", "depth_m=1", "n=0.03"], "no number"), (["bed-shear", "fast"], "no ARGUMENT=VALUE"),
        (["bed-mobility", "depth_m=0.1", "grain_m=0.05"], "says nothing"), (["jump-loss", "before_m=0", "after_m=1"], "check for zeros"),
    ],
)
def test_a_relation_that_cannot_be_reckoned_says_why(given: list[str], said: str, capsys):
    assert said in refused(capsys, "relation", *given)


@pytest.fixture
def review(tmp_path: Path) -> Path:
    """A copy of the sample without its large runs."""
    folder = tmp_path / "review"
    shutil.copytree(SAMPLE, folder, ignore=shutil.ignore_patterns("__pycache__", "*.py", "*flood.nc", "*burst.nc", "proposed*", "*coarse*"))
    return folder


@pytest.mark.parametrize("kind", ["csv", "xlsx"])
def test_answers_come_back_by_number_whatever_the_order_of_rows(review: Path, kind: str, capsys):
    for text in ("Which roughness?", "Which datum?", "=1+1"):
        ask(review, text, who="A. Reviewer")
    out = review / f"sent.{kind}"
    assert main(["queries", str(review), "--out", str(out)]) == 0
    if kind == "csv":
        rows = list(csv.DictReader(out.read_text(encoding="utf-8").splitlines()))
        rows.reverse()
        rows[1]["answer"] = "Local datum, see drawing 4."
        with out.open("w", newline="", encoding="utf-8") as stream:
            writer = csv.DictWriter(stream, rows[0])
            writer.writeheader()
            writer.writerows(rows)
    else:
        book = openpyxl.load_workbook(out)
        sheet = book.active
        head = [c.value for c in sheet[1]]
        sheet.cell(3, head.index("answer") + 1, "Local datum, see drawing 4.")
        sheet.move_range("A2:Z2", rows=8)
        sheet.delete_rows(2)
        book.save(out)
        book.close()
    assert main(["queries", str(review), "--answers", str(out), "--by", "C. Modeller"]) == 0
    assert find(review, 2).answer == "Local datum, see drawing 4." and find(review, 2).state == "answered"
    assert find(review, 1).state == find(review, 3).state == "asked"


def test_answers_without_a_name_are_refused(review: Path, capsys):
    assert "--by NAME" in refused(capsys, "queries", str(review), "--answers", "x.csv")


def test_the_samples_flood_marks_show_the_offset_that_was_put_into_them(capsys):
    """The marks are the model's highest level plus 0.02 m plus 0.03 m times known normal numbers: the bias is minus their mean."""
    found = {o["name"]: o for r in answer(capsys, "observed", str(SAMPLE))["runs"] for o in r["observations"]}
    scatter = np.random.default_rng(observe._SEED).standard_normal(6)
    assert found["Flood marks"]["bias"] == pytest.approx(-(0.02 + 0.03 * scatter.mean()), abs=6e-4)  # kept to the millimetre
    assert found["Gauge at the bridge"]["within_accuracy"] > 0.9
    assert 0.9 < found["Drogue from the bend"]["skill"] <= 1.0


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('kind = "gauge"', 'kind = "gage"', "say one of levels"), ('file = "observed/boat_transect.csv"', 'file = "observed/none.csv"', "is not in the review"),
        ("y = ", "why = ", "lacks 'y'"), ('line = "Bridge"\naccuracy', 'line = "Fridge"\naccuracy', "Bridge"),
        ('file = "observed/boat_transect.csv"', 'file = "lines.gpkg"', "name one with layer"),
    ],
)
def test_an_observation_that_cannot_be_used_says_why(review: Path, old: str, new: str, said: str, capsys):
    toml = review / "review.toml"
    head, tail = toml.read_text(encoding="utf-8").split("[[observations]]", 1)
    assert old in tail
    toml.write_text(head + "[[observations]]" + tail.replace(old, new, 1), encoding="utf-8")
    assert said in refused(capsys, "observed", str(review), "--run", "existing_bankfull")


def test_a_review_is_begun_round_a_file_with_a_centre_line_that_follows_the_bend(tmp_path: Path, capsys):
    """The proposed line against the sample's drawn one: within a third of the river's width everywhere, and downstream."""
    assert main(["begin", str(tmp_path / "new"), str(SAMPLE / "results" / "existing_bankfull.nc"), "--title", "Weir"]) == 0
    assert "proposed from the flow" in capsys.readouterr().out
    begun, sample = open_review(tmp_path / "new"), open_review(SAMPLE)
    assert begun.runs[0].sha256 == sample.entry("existing_bankfull").sha256
    proposed, drawn = begun.reach.centre_line, sample.reach.centre_line
    assert proposed is not None and drawn is not None
    world = proposed.points + np.array(begun.origin) - np.array(sample.origin)
    chainage, offset = drawn.locate(world)
    assert np.abs(offset).max() < 14 and (np.diff(chainage) > 0).all()
    assert proposed.length > 0.9 * drawn.length
    assert main(["begin", str(tmp_path / "new"), LOW]) == 2
    assert "exists already" in capsys.readouterr().err


def test_the_thalweg_loses_as_much_head_as_the_streamline_beside_it(capsys):
    """Source: both lie in one river from end to end; their losses of head agree within a tenth."""
    bankfull = str(SAMPLE / "results" / "existing_bankfull.nc")
    (deepest,) = answer(capsys, "section", bankfull, "--thalweg")["profiles"]
    (stream,) = answer(capsys, "section", bankfull, "--streamline", "52029.6,31004.5")["profiles"]
    assert deepest["head_lost_m"] == pytest.approx(stream["head_lost_m"], rel=0.1)
    assert "outside the water" in refused(capsys, "section", bankfull, "--streamline", "1,1")
    assert "write it as" in refused(capsys, "section", bankfull, "--streamline", "here")


def test_answers_in_a_file_that_is_no_workbook_are_refused_in_a_sentence(review: Path, capsys):
    (review / "bad.xlsx").write_text("no workbook", encoding="utf-8")
    assert "cannot be read as a workbook" in refused(capsys, "queries", str(review), "--answers", str(review / "bad.xlsx"), "--by", "C")


def test_places_take_no_frame_and_no_line(capsys):
    assert "leave out" in refused(capsys, "section", FLOOD, "--places", "0.2", "--frame", "3")
