"""A review's record is written whole, can be derived again, and notices one changed byte."""

from __future__ import annotations

import json
import re
import shutil

import geopandas
import pypdf
import pytest

from hydro.provenance import file_hash
from hydro.record.build import PARTS, Material, build_record
from hydro.record.model import as_json, cell_text
from hydro.record.verify import verify
from hydro.record.write import write_record
from hydro.review import SAMPLE, open_review

RUN = "existing_bankfull_coarse"


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """The sample review with its smallest run only."""
    where = tmp_path_factory.mktemp("desk") / "review"
    (where / "results").mkdir(parents=True)
    shutil.copy(SAMPLE / "lines.gpkg", where)
    shutil.copytree(SAMPLE / "documents", where / "documents")
    shutil.copy(SAMPLE / "results" / f"{RUN}.nc", where / "results")
    text = (SAMPLE / "review.toml").read_text(encoding="utf-8")
    head, *runs = re.split(r"(?m)^\[\[runs\]\]\n", text)
    last, rest = re.split(r"(?m)^(?=\[settings\])", runs[-1])
    mine = next(r for r in (*runs[:-1], last) if f'id = "{RUN}"' in r)
    mine = re.sub(r'sha256 = "[^"]*"', f'sha256 = "{file_hash(where / "results" / f"{RUN}.nc")}"', mine)
    parts = [p for p in PARTS if p not in ("drift", "passage")]
    (where / "review.toml").write_text(head + "[[runs]]\n" + mine + rest + f"\n[record]\nparts = {json.dumps(parts)}\n", encoding="utf-8")
    return where


@pytest.fixture(scope="module")
def written(folder):
    material = Material(open_review(folder))
    record = build_record(material)
    write_record(record, folder / "record", review=material.review, readings=material.readings)
    return record


def _again(review):
    return as_json(build_record(Material(review)))


def test_every_part_and_file_is_there(folder, written):
    names = {p.name for p in (folder / "record").iterdir()}
    assert {"record.pdf", "record.json", "evening.pdf", "tables", "gis"} <= names
    assert len(written.figures()) > 60 and len(written.parts) == len(PARTS) - 2


def test_every_number_of_a_table_in_the_pdf_is_in_the_json(folder, written):
    text = re.sub(r"\s", "", "".join(p.extract_text() for p in pypdf.PdfReader(folder / "record" / "record.pdf").pages))
    stored = json.loads((folder / "record" / "record.json").read_text())
    missing = [k for k, f in stored["figures"].items() if re.sub(r"\s", "", f["printed"]) not in text]
    assert not missing


def test_the_geopackage_has_the_areas_of_the_table(folder, written):
    zones = geopandas.read_file(folder / "record" / "gis" / RUN / "eddies.gpkg", layer="zones")
    table = next(t for p in written.parts for t in p.tables if t.id == f"eddies-{RUN}")
    figures = {row[0]: row[4].value for row in table.rows}
    for row in zones.itertuples():
        assert row.geometry.area == pytest.approx(figures[row.id], rel=1e-6)


def test_derived_again_all_printed_digits_are_the_same(folder, written):
    verdict = verify(folder / "record", open_review(folder), _again)
    assert verdict.same and verdict.compared == len(written.figures())


def test_one_changed_byte_is_found_and_named(folder, written, tmp_path):
    copy = tmp_path / "copy"
    shutil.copytree(folder, copy)
    path = copy / "results" / f"{RUN}.nc"
    data = bytearray(path.read_bytes())
    data[len(data) // 2] ^= 1
    path.write_bytes(bytes(data))
    verdict = verify(copy / "record", open_review(copy), _again)
    assert not verdict.same and any(f"{RUN}.nc" in text for text in verdict.inputs)


def test_the_review_moved_and_its_run_renamed_still_opens(folder, tmp_path):
    moved = tmp_path / "elsewhere" / "renamed"
    shutil.copytree(folder, moved)
    (moved / "results" / f"{RUN}.nc").rename(moved / "results" / "somewhere else.nc")
    assert open_review(moved).open(RUN).n_frames == 1


def test_a_record_of_a_changed_run_is_refused(folder, tmp_path):
    copy = tmp_path / "copy"
    shutil.copytree(folder, copy)
    with open(copy / "results" / f"{RUN}.nc", "ab") as stream:
        stream.write(b"x")
    with pytest.raises(ValueError, match="changed after it was reviewed"):
        build_record(Material(open_review(copy)))


def test_an_unknown_part_lists_the_known_ones(folder, tmp_path):
    copy = tmp_path / "copy"
    shutil.copytree(folder, copy)
    path = copy / "review.toml"
    path.write_text(path.read_text().replace('"arrival"', '"magic"'))
    with pytest.raises(ValueError, match="there is no part 'magic'; the parts are documents"):
        build_record(Material(open_review(copy)))


def test_documents_received_and_awaited_stand_apart_each_with_what_identifies_it(written):
    received, awaited = next(p for p in written.parts if p.id == "documents").tables
    note = file_hash(SAMPLE / "documents" / "model_note.txt")[:16]
    assert [row[-1] for row in received.rows] == [note, "hash not available"]
    assert len(awaited.rows) == 2 and not {row[0] for row in awaited.rows} & {row[0] for row in received.rows}
    assert all(row[0] in written.front["Still awaited"] for row in awaited.rows)


def test_one_changed_byte_of_a_received_document_is_named(folder, written, tmp_path):
    moved = tmp_path / "review"
    shutil.copytree(folder, moved)
    note = moved / "documents" / "model_note.txt"
    note.write_bytes(note.read_bytes().replace(b"0.045", b"0.035"))
    found = verify(moved / "record", open_review(moved), _again)
    assert any("documents/model_note.txt" in sentence for sentence in found.inputs)


def test_levels_are_printed_to_the_millimetre_however_high_the_datum(written):
    sections = next(p for p in written.parts if p.id == "sections").tables[0]
    levels = [cell_text(row[sections.columns.index("Level, m")]) for row in sections.rows]
    assert levels and all(re.fullmatch(r"\d+\.\d{3}", text) for text in levels)
