"""The run matrix shows one figure over every run and says whether the decision changes."""

from __future__ import annotations

import shapely

from hydro.change.matrix import matrix
from hydro.checks import BEYOND, WITHIN, read_checks
from hydro.reach import NamedLine, Reach
from hydro.review import Review, new_review, open_review
from tests.builders import channel, raw_of, run_of

CHECK = {
    "name": "Speed at the gravel", "figure": "mean speed", "place": "g", "comparison": "at most", "value": 1.2, "unit": "m/s",
    "source": "Example county note (invented)",
}


def _review(tmp_path, speeds):
    made = new_review(tmp_path / "r", "Matrix")
    made = made.edit(
        lambda d: d.update({"runs": [{"id": f"r{i}", "design": f"d{i}", "file": f"{i}.nc"} for i in range(len(speeds))]}),
        who="A", what="runs",
    )
    mesh = channel()
    opened = {f"r{i}": run_of(mesh, [0.0], [raw_of(mesh, 1.0, (v, 0.0))]) for i, v in enumerate(speeds)}
    review = Review(made.folder, open_review(made.folder).contents, made.stamp, opened)
    gravel = NamedLine("g", "Gravel", shapely.box(20, 5, 40, 15))
    review.__dict__["reach"] = Reach((0.0, 0.0), None, (), {"receptors": (gravel,)})
    return review


def test_a_decision_that_changes_from_run_to_run_is_said(tmp_path):
    found = matrix(_review(tmp_path, (1.0, 1.5)), read_checks([CHECK])[0])
    assert list(found.table["answer"]) == [WITHIN, BEYOND] and found.decision_changes is True
    assert "changes from run to run" in found.sentence


def test_a_decision_that_stays_is_said_too(tmp_path):
    found = matrix(_review(tmp_path, (1.0, 0.8)), read_checks([CHECK])[0])
    assert found.decision_changes is False and "same in every run" in found.sentence
