"""The record's exports say the same: PDF, JSON and CSV hold one set of figures, and plates are true to scale."""

from __future__ import annotations

import csv
import json
import re
import xml.etree.ElementTree as ET

import numpy as np
import pypdf
import pytest

from hydro.figure import Figure
from hydro.record.model import Part, Plate, Record, Table, as_json, cell_text
from hydro.record.pdf import write_pdf, write_plates
from hydro.record.plate import A3_MM, Window, fit, map_plate, scale_bar_mm
from hydro.record.tables import write_csv
from tests.builders import frame_of, with_hole

SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def plate() -> Plate:
    frame = frame_of(with_hole(), 1.5, (1.0, 0.0))
    return map_plate("made", "A made channel", frame, fit(frame.mesh.bounds, A3_MM), top_speed=2.0, caption="Made")


@pytest.fixture
def record(plate) -> Record:
    table = Table(
        "zones", "Zones", ("Eddy", "Area, m2", "Note"),
        (
            ("Z1", Figure("area", 456.31, "m2", 440.2, 474.9, cautions=("wake-detail",)), "<script>alert(1)</script>"),
            ("Z2", Figure("area", None, "m2", note="not available"), "#eval(1) $x$ *b*"),
        ),
    )
    part = Part("eddies", "Zones & walls", ("One sentence with 12 % of it.",), (table,), (plate,), ("no-roller",))
    return Record("A <b>review</b>", {"Reviewer": "A. Reader"}, (part,), (), {"wet_depth_m": 0.05}, "2031-03-02T00:00:00Z")


def _written(record: Record, folder):
    (folder / "record.json").write_text(json.dumps(as_json(record)))
    write_plates(record, folder)
    return write_pdf(folder, "record", 1_930_000_000)


def test_the_pdf_is_tagged_titled_and_declares_both_standards(record, tmp_path):
    """Source: ISO 14289-1 (PDF/UA-1) and ISO 19005-2 (PDF/A-2a): title, language, tags, identification."""
    pdf = pypdf.PdfReader(_written(record, tmp_path))
    root = pdf.trailer["/Root"]
    assert root["/MarkInfo"]["/Marked"].value is True
    assert "/StructTreeRoot" in root and root["/Lang"].startswith("en")
    assert pdf.metadata.title == "A <b>review</b>"
    xmp = root["/Metadata"].get_data().decode()
    assert re.search(r"pdfuaid:part[^0-9]*1", xmp) and re.search(r"pdfaid:part[^0-9]*2", xmp)


def test_text_that_a_file_wrote_is_just_text_in_the_pdf(record, tmp_path):
    pages = pypdf.PdfReader(_written(record, tmp_path)).pages
    text = " ".join(p.extract_text() for p in pages)
    for words in ("<script>alert(1)</script>", "#eval(1) $x$ *b*"):
        assert words.replace(" ", "") in text.replace(" ", "").replace("\n", "")


def test_every_figure_of_the_pdf_is_in_the_json_and_every_owed_caution_is_printed(record, tmp_path):
    pages = pypdf.PdfReader(_written(record, tmp_path)).pages
    text = "".join(p.extract_text() for p in pages).replace("\n", " ")
    stored = json.loads((tmp_path / "record.json").read_text())
    for figure in stored["figures"].values():
        assert figure["printed"] in text
    squeezed = re.sub(r"[\s-]", "", text)
    assert [c["id"] for c in stored["cautions"]] == ["no-roller", "wake-detail"]
    for caution in stored["cautions"]:
        assert re.sub(r"[\s-]", "", caution["text"]) in squeezed


def test_two_typesettings_of_one_record_are_the_same_bytes(record, tmp_path):
    first = _written(record, tmp_path).read_bytes()
    assert _written(record, tmp_path).read_bytes() == first


def test_csv_holds_the_printed_text_and_the_full_digits(record, tmp_path):
    write_csv(record, tmp_path)
    lines = (tmp_path / "zones.csv").read_text().splitlines()
    rows = list(csv.reader(line for line in lines if not line.startswith("#")))
    assert rows[0] == ["Eddy", "Area, m2", "Area, m2 (full digits)", "Note"]
    assert rows[1][1].startswith("460 (440 to 470)") and float(rows[1][2]) == 456.31


def test_a_figure_is_printed_with_its_range_rounded_to_it():
    assert cell_text(Figure("x", 456.31, "m2", 440.2, 474.9)) == "460 (440 to 470)"
    assert cell_text(Figure("x", float("nan"), "m2", note="not assessed")) == "not assessed"


@pytest.mark.parametrize("scale", [500, 1000, 2500])
def test_a_distance_on_the_ground_has_its_true_length_on_the_sheet(scale):
    """A law: at 1:n, 1 m on the ground is 1000/n mm on paper."""
    window = Window(100.0, 50.0, scale, (200.0, 100.0))
    a, b = window.to_mm(np.array([[100.0, 50.0], [103.0, 54.0]]))
    assert np.hypot(*(b - a)) == pytest.approx(5.0 * 1000 / scale, rel=1e-12)


def test_the_scale_bar_is_as_long_as_it_says(plate):
    sheet = ET.fromstring(plate.svg)
    boxes = [p for p in sheet.iter(f"{SVG}polygon") if p.get("stroke-width") == "0.2"]
    xs = [float(pair.split(",")[0]) for box in boxes for pair in box.get("points").split()]
    ground, mm = scale_bar_mm(plate.scale)
    assert max(xs) - min(xs) == pytest.approx(mm, abs=1e-3)
    assert mm == pytest.approx(ground * 1000 / plate.scale)
    assert f"{ground:g} m" in [t.text for t in sheet.iter(f"{SVG}text")]
    assert sheet.get("width") == f"{plate.width_mm}mm"


def test_the_plate_fits_its_sheet_at_a_round_scale():
    window = fit((0.0, 0.0, 60.0, 24.0), A3_MM)
    west, south, east, north = window.extent
    assert west <= 0 and south <= 0 and east >= 60 and north >= 24 and window.scale == 200
