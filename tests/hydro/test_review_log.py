"""The settings log leads from the first state of review.toml to the file as it is, whoever changed it."""

from __future__ import annotations

import shutil

import pytest
from hypothesis import given
from hypothesis import strategies as st

from dashboard.cli import main
from hydro.automatic import accept, automatic_choices, overrule
from hydro.review import SAMPLE, new_review, open_review
from hydro.review_log import NAME, alone, check_replay, patch, patched, replay, told

LINES = st.lists(st.sampled_from(["a\n", "b = 1\n", "\n", "# said so\n", "[c]\n", "é\r\n", "d"]), max_size=8).map("".join)


@given(LINES, LINES)
def test_a_change_put_back_on_the_text_it_was_taken_from_gives_the_other(before, after):
    assert patched(before, patch(before, after)) == after


@given(LINES, LINES, LINES)
def test_a_change_is_refused_on_a_text_without_its_lines(before, after, other):
    """Law: a text that lacks the lines to take out, where they stood, cannot be the state before."""
    changes = patch(before, after)
    lines = other.splitlines(keepends=True)
    fits = all(lines[at : at + len(out)] == out for at, out, _ in changes)
    if fits:
        patched(other, changes)
    else:
        with pytest.raises(ValueError):
            patched(other, changes)


def edits(folder):
    """A review changed five times by two people, once with another program between."""
    review = new_review(folder, "Two piers")
    review = review.edit(lambda d: d.update({"place": "Invented"}), who="A", what="named the place")
    review = review.edit(lambda d: d.update({"settings": {"wet_depth_m": 0.03}}), who="B", what="thinner water")
    path = folder / "review.toml"
    path.write_bytes(path.read_bytes() + b"# asked by the county\n")
    review = open_review(folder).edit(lambda d: d["settings"].update({"tubes": 30}), who="A", what="more tubes")
    review = review.edit(lambda d: d["settings"].pop("wet_depth_m"), who="B", what="the default after all")
    return review.edit(lambda d: d.update({"title": "Two piers, one weir"}), who="A", what="a better title")


def test_the_log_replayed_from_its_first_state_gives_the_file_to_the_byte(tmp_path):
    review = edits(tmp_path / "r")
    assert replay(review.logged()).encode() == (review.folder / "review.toml").read_bytes()
    assert check_replay(review.folder) == 5


def test_every_state_on_the_way_is_the_one_that_stood_then(tmp_path):
    """Replaying the first k entries gives the k-th state: here its title, place and settings."""
    log = edits(tmp_path / "r").logged()
    assert "wet_depth_m = 0.03" in replay(log[:2]) and "county" not in replay(log[:2])
    assert "county" in replay(log[:3]) and "tubes = 30" in replay(log[:3])
    assert "wet_depth_m" not in replay(log[:4]) and "one weir" not in replay(log[:4])


def test_the_log_tells_who_changed_what_and_that_another_program_did(tmp_path):
    rows = told(edits(tmp_path / "r").logged())
    assert [(r[1], r[2]) for r in rows] == [
        ("A", "named the place"), ("B", "thinner water"), ("not known", "changed with another program"), ("A", "more tubes"),
        ("B", "the default after all"), ("A", "a better title"),
    ]
    assert rows[2][3] == "nothing became # asked by the county" and "wet_depth_m = 0.03 became nothing" in rows[4][3]


def test_a_file_changed_behind_the_logs_back_is_told_with_its_line(tmp_path):
    review = edits(tmp_path / "r")
    path = review.folder / "review.toml"
    path.write_text(path.read_text().replace("Invented", "Elsewhere"))
    line = 1 + path.read_text().splitlines().index('place = "Elsewhere"')
    with pytest.raises(ValueError, match=f"differs from what its log gives, first in line {line}: .* another program"):
        check_replay(review.folder)


def test_a_log_with_an_entry_lost_is_refused_and_names_where(tmp_path):
    review = edits(tmp_path / "r")
    log = review.folder / NAME
    lines = log.read_text().splitlines(keepends=True)
    log.write_text("".join(lines[:1] + lines[3:]))
    with pytest.raises(ValueError, match=r"entry 2 \(the default after all\) does not fit the state before it"):
        check_replay(review.folder)


def test_a_save_during_somebody_elses_is_told_and_writes_nothing(tmp_path):
    review = new_review(tmp_path / "r", "One")
    before = (review.folder / "review.toml").read_bytes()
    with alone(review.folder), pytest.raises(ValueError, match="being saved by somebody else; try again"):
        review.edit(lambda d: d.update({"place": "mine"}), who="A", what="place")
    assert (review.folder / "review.toml").read_bytes() == before and review.logged() == []
    assert review.edit(lambda d: d.update({"place": "mine"}), who="A", what="place").contents.place == "mine"


@pytest.fixture(scope="module")
def sample(tmp_path_factory):
    """The sample review with two of its runs, to be changed."""
    folder = tmp_path_factory.mktemp("review")
    text = (SAMPLE / "review.toml").read_text()
    (folder / "review.toml").write_text(text[: text.index("[[runs]]")])
    shutil.copy(SAMPLE / "lines.gpkg", folder)

    def fill(document):
        document["runs"] = [
            {"id": i, "design": i.split("_")[0], "file": str(SAMPLE / "results" / f"{i}.nc")} for i in ("existing_bankfull_coarse", "proposed_low")
        ]

    open_review(folder).edit(fill, who="A", what="runs")
    return folder


def standing(folder, choice):
    return next(c for c in automatic_choices(open_review(folder)) if c.id == choice)


def test_an_automatic_choice_is_open_until_it_is_accepted_and_again_when_it_changes(sample):
    assert standing(sample, "wet_depth_m").open
    accept(open_review(sample), "wet_depth_m", who="A. Reader")
    assert standing(sample, "wet_depth_m").standing.startswith("accepted by A. Reader on ")
    path = sample / "review.toml"
    path.write_text(path.read_text() + "\n[settings]\nwet_depth_m = 0.1\n")
    changed = standing(sample, "wet_depth_m")
    assert changed.open and "changed since" in changed.standing and "set in the review" in changed.sentence


def test_an_overruled_boundary_is_a_wall_in_the_runs_and_the_log_says_by_whom(sample):
    was = open_review(sample).open("proposed_low").boundary_sets
    assert "tributary inflow" in was
    review = overrule(open_review(sample), "boundaries.closed", '["tributary inflow"]', who="B", why="dry in this event")
    assert "tributary inflow" not in review.open("proposed_low").boundary_sets
    assert standing(sample, "boundaries/proposed_low").standing.startswith("overruled by B")
    assert review.logged()[-1]["what"].endswith("dry in this event")
    check_replay(sample)


def test_an_opened_stretch_holds_the_boundary_edges_between_its_points(sample):
    """Made so: the ends of the file's own outflow; nothing else may be open then."""
    review = open_review(sample)
    mesh = review.open("proposed_low").mesh
    edges = review.open("proposed_low").boundary_sets["outflow"]
    ends = mesh.to_world(mesh.node_xy[mesh.edge_nodes[edges]].reshape(-1, 2))
    far = ends[[ends[:, 1].argmin(), ends[:, 1].argmax()]]
    review = overrule(review, "boundaries.open.lower end", str(far.tolist()), who="B")
    sets = review.open("proposed_low").boundary_sets
    assert list(sets) == ["lower end"] and set(edges) <= set(sets["lower end"])
    assert len(sets["lower end"]) <= len(edges) + 2


def test_an_overruled_structure_stands_so_in_the_reach(sample):
    assert next(s for s in open_review(sample).reach.structures if s.id == "p8fz").represented_as == "resistance"
    review = overrule(open_review(sample), "represented_as.p8fz", "absent", who="B")
    assert next(s for s in review.reach.structures if s.id == "p8fz").represented_as == "absent"
    assert standing(sample, "represented_as/p8fz").standing.startswith("overruled by B")


@pytest.mark.parametrize(
    ("name", "value", "who", "says"),
    [
        ("wetness", "1", "A", "cannot be set here; name a setting"),
        ("wet_depth_m", "-1", "A", "give a value from 0"),
        ("wet_depth_m", "thin", "A", "wet_depth_m"),
        ("represented_as.none", "hole", "A", "no structure 'none'"),
        ("represented_as.p8fz", "wood", "A", "'hole', 'dry'"),
        ("boundaries.closed", '["brook"]', "A", "names no stretch 'brook'"),
        ("boundaries.open.brook", "[[0, 0], [1, 1]]", "A", "no edge of the mesh's boundary lies between"),
        ("wet_depth_m", "0.04", " ", "who changes it"),
    ],
)
def test_what_may_not_be_set_is_told_and_nothing_is_written(sample, name, value, who, says):
    before = (sample / "review.toml").read_bytes(), len(open_review(sample).logged())
    with pytest.raises(ValueError, match=says):
        overrule(open_review(sample), name, value, who=who)
    assert ((sample / "review.toml").read_bytes(), len(open_review(sample).logged())) == before


def test_the_command_sets_accepts_tells_and_replays(sample, capsys):
    folder = str(sample)
    assert main(["settings", folder, "--set", "tubes", "30", "--by", "C", "--why", "for the hall"]) == 0
    assert main(["settings", folder, "--accept", "centre_line", "--by", "C"]) == 0
    assert main(["settings", folder, "--replay"]) == 0
    assert "to the byte" in capsys.readouterr().out
    assert main(["settings", folder]) == 0
    printed = capsys.readouterr().out
    assert "tubes set to 30: for the hall" in printed and "accepted by C" in printed and "default 22" in printed
    assert main(["settings", folder, "--accept", "weather", "--by", "C"]) == 2
    assert "no automatic choice 'weather'" in capsys.readouterr().err
