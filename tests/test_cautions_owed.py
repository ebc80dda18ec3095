"""Every table, export and screen carries the cautions that its figures owe, in full.

What each subject owes is spelled out here by its nature, apart from the code: a depth-averaged model has no vertical
roller and no secondary currents, near-bed speed differs from the mean, wakes depend on mesh and viscosity, ranges are
a reading of the file, and screening figures replace no licensed judgement.
"""

from __future__ import annotations

import html
import json
import re
import shutil

import pyarrow.parquet
import pyogrio
import pypdf
import pytest
import tomlkit

from dashboard import cli, theme
from dashboard.choices import Choices
from dashboard.cli import main
from dashboard.pack.chapter import AtOnce, Chapter
from dashboard.questions import QUESTIONS, Desk, saving
from dashboard.reading import Reading
from dashboard.studies import Studies
from dashboard.views import frame_words
from hydro.cautions import CAUTIONS
from hydro.handbook import RELATIONS
from hydro.review import SAMPLE

A, B = "existing_bankfull_coarse", "proposed_low"
DUTY = {
    "arrival": {"screening", "no-roller", "wake-detail", "section-discharge", "sensitivity"},
    "eddies": {"no-roller", "no-secondary-currents", "wake-detail", "rotation-time", "sensitivity"},
    "section": {"section-discharge", "sensitivity", "uniform-flow", "no-secondary-currents", "no-roller"},
    "profile": {"uniform-flow", "no-secondary-currents", "no-roller"},
    "weirs": {"weir-formula", "section-discharge", "no-roller"},
    "openings": {"section-discharge", "no-secondary-currents", "screening"},
    "places": {"screening", "hazard-class", "near-bed"},
    "envelope": {"screening", "hazard-class", "near-bed"},
    "observed": {"tracing", "screening"},
    "trace": {"tracing", "no-secondary-currents"},
    "drift": {"drift", "tracing", "no-roller"},
    "passage": {"passage", "endurance", "near-bed", "screening"},
    "change": {"change", "sensitivity", "section-discharge", "wake-detail", "no-roller"},
    "record": {"screening", "sensitivity", "wake-detail", "no-roller"},
}
SCREENS = {**DUTY, "sections": DUTY["section"], "eddies": DUTY["eddies"] | {"section-discharge"}}


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """A review of two small runs, one a design, with little wood, the sample's fish and checks."""
    where = tmp_path_factory.mktemp("owed") / "review"
    where.mkdir()
    shutil.copy(SAMPLE / "lines.gpkg", where)
    document = tomlkit.parse((SAMPLE / "review.toml").read_text("utf-8"))
    kept = [r for r in document["runs"] if r["id"] in (A, B)]
    for run in kept:
        run.update(file=str(SAMPLE / run["file"]), event="low", variant="")
    document["runs"] = kept
    for release in document["releases"]:
        release["number"] = 30
    document["record"] = {"parts": ["arrival", "eddies", "sections", "change", "checks", "drift", "passage"], "drift_runs": [A]}
    (where / "review.toml").write_text(tomlkit.dumps(document), "utf-8")
    return where


def plain(text: str) -> str:
    """Text as one line, without markup, line breaks or hyphens at their ends."""
    return re.sub(r"\s+", "", html.unescape(re.sub(r"<[^>]+>", " ", text)))


def lacking(text: str, owed) -> list[str]:
    """Ids of owed cautions whose text is not in it."""
    there = plain(text)
    return sorted(i for i in owed if plain(CAUTIONS[i].text) not in there)


def text_of(path) -> str:
    """All the text of an export."""
    if path.suffix == ".gpkg":
        return pyogrio.read_dataframe(path, layer="provenance")["value"].str.cat(sep="\n")
    if path.suffix == ".parquet":
        return json.loads(pyarrow.parquet.read_schema(path).metadata[b"PANDAS_ATTRS"]).__repr__()
    if path.suffix == ".pdf":
        return " ".join(page.extract_text() for page in pypdf.PdfReader(path).pages)
    return path.read_text("utf-8")


def cautions_within(value) -> set[str]:
    """Ids in every ``cautions`` list of nested values: what single figures owe beyond their subject."""
    found = set()
    if isinstance(value, dict):
        own = value.get("cautions", [])
        found |= {c if isinstance(c, str) else c["id"] for c in own}
        value = list(value.values())
    if isinstance(value, list):
        found |= set().union(*(cautions_within(v) for v in value)) if value else set()
    return found


COMMANDS = {
    "arrival": lambda f: ["arrival", file_of(A)],
    "eddies": lambda f: ["eddies", file_of(A)],
    "section": lambda f: ["section", str(SAMPLE / "results" / f"{A}.nc")],
    "profile": lambda f: ["section", file_of(A), "--profile", "--line", "Bend"],
    "weirs": lambda f: ["section", file_of(A), "--weirs", "broad-crested"],
    "openings": lambda f: ["section", file_of(A), "--openings"],
    "places": lambda f: ["section", file_of(A), "--places", "0.3"],
    "observed": lambda f: ["observed", str(SAMPLE)],
    "trace": lambda f: ["trace", file_of(A), "--line", "Bend", "--spacing", "8"],
    "drift": lambda f: ["drift", str(f), "--run", A],
    "passage": lambda f: ["passage", str(f), "--run", A],
    "change": lambda f: ["change", file_of(A), file_of(B)],
}
NO_FOLDER = {"arrival"}


def file_of(run: str) -> str:
    return str(SAMPLE / "results" / f"{run}.nc")


@pytest.mark.parametrize("command", COMMANDS)
def test_a_command_prints_and_writes_what_its_figures_owe(folder, tmp_path, capsys, command):
    made = tmp_path / "out.json"
    arguments = [*COMMANDS[command](folder), "--json", str(made)]
    arguments += [] if command in NO_FOLDER else ["--out", str(tmp_path / "out")]
    assert main(arguments) == 0
    printed = capsys.readouterr().out
    owed = DUTY[command] | cautions_within(json.loads(made.read_text()))
    assert lacking(printed, owed) == []
    assert lacking(text_of(made), owed) == []
    written = [p for p in (tmp_path / "out").rglob("*") if p.is_file()]
    assert written or command in NO_FOLDER
    assert {p.name: lacking(text_of(p), owed) for p in written} == {p.name: [] for p in written}


def test_an_envelope_carries_what_it_owes(tmp_path):
    assert main(["section", file_of(A), "--envelope", str(tmp_path / "most.gpkg")]) == 0
    assert lacking(text_of(tmp_path / "most.gpkg"), DUTY["envelope"]) == []


@pytest.mark.parametrize("name", RELATIONS)
def test_a_relation_prints_the_cautions_that_it_owes(name):
    """Its own, as the handbook has them: there is no relation without one, and none is left out of what is printed."""
    from dashboard.commands.relation import _content

    found = RELATIONS[name]
    content = _content(found, {}, 1.0)
    assert found.cautions and {c["id"] for c in content["cautions"]} == set(found.cautions)


def test_every_command_that_gives_figures_is_looked_at_here():
    """A new command must be entered above, or here with those that give none of their own."""
    looked_at = {call(SAMPLE)[0] for call in COMMANDS.values()} | {"record", "pack", "relation"}
    assert set(cli.COMMANDS) - looked_at == {"begin", "open", "queries", "settings"}


def test_what_finds_no_eddy_still_says_that_this_is_no_evidence(tmp_path, capsys):
    """Where nothing turns, nobody may take the empty table for calm water."""
    from tests.hydro.readers.test_doors import ugrid

    assert main(["eddies", str(ugrid(tmp_path)), "--out", str(tmp_path / "out")]) == 0
    printed = capsys.readouterr().out
    assert "under the floor: 0" in printed and lacking(printed, DUTY["eddies"]) == []
    for path in (tmp_path / "out").iterdir():
        assert lacking(text_of(path), DUTY["eddies"]) == [], path.name


@pytest.fixture(scope="module")
def reading(folder):
    reading = Reading(folder, AtOnce())
    reading.long = AtOnce()
    return reading, Studies(reading)


def desk_of(reading, key: str, *, hall: bool = False) -> Desk:
    return Desk(Choices(run=A, question=key), *reading, theme.look("day", hall=hall))


@pytest.mark.parametrize("key", [k for k in QUESTIONS if k != "record"])
def test_a_screen_shows_what_its_figures_owe_and_its_footnotes_lead_there(reading, key):
    question, desk = QUESTIONS[key], desk_of(reading, key)
    shown = question.cautions(desk)
    strip = frame_words.cautions(shown)
    assert lacking(strip, SCREENS[key]) == []
    body = question.sentence(desk) + "".join(question.side(desk).values())
    letters = set(re.findall(r'href="#(caution-\w)"', body))
    assert letters <= set(re.findall(r'id="(caution-\w)"', strip))
    assert letters or key == "arrival", "no figure of the screen leads to its caution"


@pytest.mark.parametrize("key", QUESTIONS)
def test_the_hall_shortens_the_words_and_not_the_list(reading, key):
    question, desk = QUESTIONS[key], desk_of(reading, key, hall=True)
    strip = plain(frame_words.cautions(question.cautions(desk), short=True))
    assert [i for i in SCREENS[key] if plain(CAUTIONS[i].short) not in strip] == []


@pytest.mark.parametrize("key", [k for k, q in QUESTIONS.items() if q.numbered])
def test_a_saved_table_carries_what_its_screen_shows(reading, key):
    question, desk = QUESTIONS[key], desk_of(reading, key)
    for which in question.numbered:
        saved = saving.file_of(question, desk, None, f"{which}.csv")
        assert lacking(saved.text, SCREENS[key]) == [], which


@pytest.fixture(scope="module")
def record(folder):
    assert main(["record", str(folder), "--out", str(folder / "record")]) == 0
    return folder / "record"


RECORDED = {"findings": "arrival", "eddies": "eddies", "balance": "eddies", "sections": "section", "change": "change", "afflux": "change", "setup": "change",
            "drift": "drift", "passage": "passage"}


def test_a_record_carries_what_all_its_figures_owe(record):
    content = json.loads((record / "record.json").read_text())
    owed = set().union(*(DUTY[k] for k in RECORDED.values())) | cautions_within(content["figures"]) | cautions_within(content["parts"])
    assert {"screening", "passage", "drift", "change"} <= owed
    told = {c["id"] for c in content["cautions"]}
    assert owed <= told
    for name in ("record.pdf", "evening.pdf", "record.json"):
        assert lacking(text_of(record / name), owed) == [], name


def test_every_table_of_a_record_carries_what_it_owes(record):
    tables = {p.stem: p for p in (record / "tables").glob("*.csv")}
    subjects = {name: RECORDED[name.split("-")[0]] for name in tables if name.split("-")[0] in RECORDED}
    assert set(subjects.values()) == set(RECORDED.values())
    assert {n: lacking(text_of(tables[n]), DUTY[s]) for n, s in subjects.items()} == {n: [] for n in subjects}
    for path in (record / "gis").rglob("*"):
        assert path.is_dir() or lacking(text_of(path), DUTY["eddies"]) == [], path.name


def test_a_pack_carries_what_each_of_its_answers_owes(reading):
    chapter = Chapter(reading[0], A)
    also = chapter.also()
    parts = dict(zip(("Drift", "Passage", "Change"), re.split(r'(?=<section aria-label=")', also)[1:]))
    assert {k: lacking(parts[k], DUTY[k.lower()]) for k in parts} == {"Drift": [], "Passage": [], "Change": []}
    shown = chapter.question.cautions(chapter.desk(0))
    assert SCREENS["eddies"] | {"public-water", "tracing"} <= set(shown)


def test_every_caution_of_the_registry_is_owed_by_something_or_by_a_figure_of_its_own():
    """A caution that nothing owes would never be read; those of weirs, scour, pressure and classes stand with single figures."""
    from hydro.checks import FIGURES
    from hydro.screening import Scour
    from hydro.section.crossings import WeirLine

    single = {c for q in FIGURES.values() for c in q.cautions}
    single |= {c for kind in (WeirLine, Scour) for c in kind.__dataclass_fields__["cautions"].default}
    assert set(CAUTIONS) == set().union(*DUTY.values()) | single | {"public-water"}
