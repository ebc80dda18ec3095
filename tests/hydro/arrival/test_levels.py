"""The file's own level against bed plus depth, on the same places and carried between faces and nodes."""

from __future__ import annotations

import numpy as np
import pytest

from hydro.arrival import audit
from hydro.readers import open_run
from tests import reader_drafts as drafts


def level_finding(draft, folder):
    run = open_run(draft.write(folder / "run.nc"))
    return next((f for f in audit(run) if f.id == "level against depth"), None)


def with_level(location: str, more) -> drafts.Draft:
    """The sound draft, its level stored too: the plane that its bed and depth add up to, and ``more`` m of (x, y)."""
    draft = drafts.sound()
    nodes = np.column_stack([draft.values("node_x"), draft.values("node_y")])
    x, y = (nodes if location == "node" else drafts.centres(nodes, draft.values("face_nodes"))).T
    level = np.array([drafts.bed(x, y) + drafts.depth(x, y, t) + more(x - drafts.CORNER[0]) for t in drafts.TIMES])
    return draft.put(
        "wl", ("time", location), level, units="m", long_name="water level", mesh="reach", location=location,
        grid_mapping="crs", cell_methods="time: point",
    )


@pytest.mark.parametrize("location", ["face", "node"])
def test_a_level_that_agrees_with_bed_and_depth_raises_nothing(tmp_path, location):
    assert level_finding(with_level(location, lambda x: 0 * x), tmp_path) is None


@pytest.mark.parametrize("location", ["face", "node"])
def test_a_level_shifted_downstream_is_found_there_with_its_number(tmp_path, location):
    """Made so: 0.3 m too low beyond x = 15 m of 40 m."""
    found = level_finding(with_level(location, lambda x: -0.3 * (x > 15)), tmp_path)
    assert found.grade == "resolve before use"
    assert found.figure.value == pytest.approx(-0.3, abs=1e-9)
    assert found.figure.place.x - drafts.CORNER[0] > 15


def test_rounding_to_the_centimetre_is_no_fault(tmp_path):
    draft = with_level("face", lambda x: 0 * x)
    draft.set("wl", np.round(draft.values("wl"), 2))
    assert level_finding(draft, tmp_path) is None
