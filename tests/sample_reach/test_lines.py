"""The sample's lines and review fit its files and can be opened."""

import geopandas
import numpy as np
import pyogrio
import pytest
import shapely

from hydro.reach import read_lines
from hydro.review import open_review
from sample_reach import geometry as geo
from sample_reach.lines import write_lines
from sample_reach.make import HERE


@pytest.fixture(scope="module")
def reach():
    return read_lines(HERE / "lines.gpkg", geo.ORIGIN)


def test_every_layer_has_the_invented_grid_and_every_feature_its_own_id():
    ids = []
    for name, _ in pyogrio.list_layers(HERE / "lines.gpkg"):
        table = geopandas.read_file(HERE / "lines.gpkg", layer=name)
        assert table.crs.name == "Leewater sample grid (invented)", name
        assert table["name"].str.len().min() > 0 and table.geometry.is_valid.all(), name
        ids += list(table["id"])
    assert len(ids) == len(set(ids))


def test_the_committed_lines_are_what_the_generator_writes(tmp_path):
    """A regression test."""
    write_lines(tmp_path / "lines.gpkg")
    for name, _ in pyogrio.list_layers(HERE / "lines.gpkg"):
        old, new = (geopandas.read_file(p / "lines.gpkg", layer=name) for p in (HERE, tmp_path))
        assert old.drop(columns="geometry").equals(new.drop(columns="geometry")), name
        assert old.geometry.geom_equals_exact(new.geometry, 1e-3).all(), name


def test_lines_run_the_way_they_say(reach):
    """Sections and openings from the left bank to the right one; the culvert downstream."""
    for item in (*reach.layer("sections"), *reach.layer("openings")):
        _, n = reach.centre_line.locate(np.asarray(item.geometry.coords))
        assert n[0] > n[-1], item.name
    culvert = next(s for s in reach.structures if s.kind == "culvert")
    s, _ = reach.centre_line.locate(np.asarray(culvert.geometry.coords))
    assert s[0] < geo.WEIR < s[-1] and culvert.represented_as == "link"


def test_openings_touch_piers_and_cross_none(reach):
    for design in geo.DESIGNS:
        piers = shapely.union_all([s.geometry for s in reach.structures_of(design) if s.kind == "pier"])
        spans = [o.geometry for o in reach.layer("openings") if o.attributes["design"] == design]
        assert len(spans) == 3
        for span in spans:
            assert span.intersection(piers).length < 1e-3
            assert span.distance(piers) < 1e-3


def test_one_pier_is_resistance_and_every_other_a_hole(reach):
    how = {(s.design, s.name): s.represented_as for s in reach.structures if s.kind == "pier"}
    assert how.pop(("existing", "Pier 2")) == "resistance"
    assert len(how) == 3 and set(how.values()) == {"hole"}
    for design in geo.DESIGNS:
        holes = shapely.union_all([shapely.Polygon(r) for r in geo.Place(design).domain.interiors])
        drawn = shapely.union_all(
            [s.geometry for s in reach.structures_of(design) if s.kind == "pier" and s.represented_as == "hole"]
        )
        # Drawn to a tenth of a millimetre: an outline of some 25 m may differ by a few square millimetres.
        assert shapely.symmetric_difference(holes, drawn).area < 0.01


def test_the_review_opens_with_every_run_and_every_place_it_names(reach):
    review = open_review(HERE)
    for entry in review.runs:
        assert review.paths(entry)
    known = {s.id for s in reach.structures} | {i.id for items in reach.layers.values() for i in items}
    assert {r["line"] for r in review.releases} <= known
    assert {c["place"] for c in review.checks if "place" in c} <= known
