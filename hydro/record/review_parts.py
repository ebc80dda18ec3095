"""Parts of the record on what was asked and compared: arrival, queries, sections, change, checks, drift, passage."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict

import numpy as np

from ..arrival import audit
from ..cautions import OWED
from ..change import Change, compare, pair_frames
from ..change.answers import rise_at
from ..change.matrix import matrices
from ..checks import AFFLUX, answer, answer_afflux, read_checks
from ..drift.report import DriftAnswer
from ..figure import Figure
from ..frame import Frame
from ..passage import Study
from ..passage.report import figures as passage_figures
from ..queries import queries
from ..review import Review
from ..section import FORMULAS, cut, section_figures
from .eddies import Reading, source
from .model import Part, Table

_SECTION = (
    ("discharge_m3_s", "m3/s"), ("discharge_error_m3_s", "m3/s"), ("discharge_psi_m3_s", "m3/s"), ("discharge_mid_section_m3_s", "m3/s"), ("area_m2", "m2"),
    ("width_m", "m"), ("mean_velocity_m_s", "m/s"), ("froude", "-"), ("mean_level_m", "m"), ("head_m", "m"),
)

_LEVELS = ("mean_level_m", "head_m")


def arrival(review: Review, readings: Sequence[Reading]) -> Part:
    """Findings of the audit, run by run. Not a verdict."""
    tables = []
    for r in readings:
        found = [f for f in audit(r.run, r.reach) if f.id != "reading"]
        rows = tuple((f.grade, f.sentence, f.meaning, f.question) for f in found)
        tables.append(Table(f"findings-{r.entry.id}", f"Findings, {r.entry.label}", ("Grade", "Finding", "What it means", "What to ask"), rows))
    return Part("arrival", "What has arrived, and what must be asked", (
        "Findings only, graded note, ask, or resolve before use; none of them is a verdict on the model.",
    ), tuple(tables), cautions=OWED["arrival"])


def asked(review: Review) -> Part:
    """The log of queries with their answers."""
    rows = tuple(
        (str(q.number), q.text, q.importance, q.asked_of, q.date, q.state, q.answer) for q in queries(review.folder)
    )
    table = Table("queries", "Queries", ("No.", "Query", "Importance", "Asked of", "Date", "State", "Answer"), rows)
    open_ = sum(1 for r in rows if r[5] == "asked")
    return Part("queries", "Queries and answers", (f"{len(rows)} queries; {open_} not answered yet.",), (table,))


def sections(readings: Sequence[Reading]) -> Part:
    """The review's sections in every run."""
    tables = []
    for r in readings:
        at = source(r.run, r.ledger.frame)
        rows: list[tuple[str | Figure, ...]] = []
        for line in r.reach.layer("sections"):
            section = cut(r.ledger.frame, np.asarray(line.geometry.coords)[:, :2], centre_line=r.reach.centre_line)
            found = asdict(section_figures(section, sf=r.ledger.sf, settings=r.run.settings))
            rows.append((line.name, *(
                Figure(name, found[name], unit, cautions=("section-discharge",), source=at, note="not available",
                    decimals=3 if name in _LEVELS else None) for name, unit in _SECTION
            )))
        columns = ("Section", "Q, m3/s", "Read within, m3/s", "Q by psi, m3/s", "Q mid-section, m3/s", "Area, m2", "Width, m", "Mean speed, m/s", "Froude", "Level, m", "Head, m")
        tables.append(Table(f"sections-{r.entry.id}", f"Sections, {r.entry.label}", columns, tuple(rows)))
    formulas = Table("formulas", "How the figures of a section are made", ("Figure", "Formula"), tuple(FORMULAS.items()))
    return Part("sections", "Sections", (), (*tables, formulas), cautions=OWED["sections"])


def pairs(readings: Sequence[Reading]) -> list[tuple[Reading, Reading]]:
    """Runs of the same event and variant in two designs: each later design beside the first."""
    out = []
    for i, a in enumerate(readings):
        for b in readings[i + 1 :]:
            same = a.entry.event == b.entry.event and a.entry.variant == b.entry.variant
            if same and a.entry.design != b.entry.design:
                out.append((a, b))
    return out


def changes(readings: Sequence[Reading]) -> list[tuple[Reading, Reading, Change]]:
    """Each pair of runs compared at its first pair of frames of one time (their only ones for means)."""
    return [
        (a, b, compare(a.run, b.run, pair_frames(a.run, b.run)[-1], reach_a=a.reach, reach_b=b.reach)) for a, b in pairs(readings)
    ]


def change(compared: Sequence[tuple[Reading, Reading, Change]]) -> Part:
    """What the proposal changes."""
    tables, says = [], []
    for a, b, c in compared:
        key, label = f"{a.entry.id}-{b.entry.id}", f"{a.entry.label} to {b.entry.label}"
        says += [f"{label}: {f.sentence}" for f in c.findings[:1]]
        tables.append(Table(f"setup-{key}", f"What differs outside the works, {label}", ("What", "Sentence"), tuple((d.what, d.sentence) for d in c.setup)))
        tables.append(Table(f"changes-{key}", f"What changes, {label}", ("Finding",), tuple((f.sentence,) for f in c.findings)))
        if c.levels is not None:
            rows = tuple(
                (Figure("chainage", float(s), "m", decimals=0), Figure("rise", float(d), "m", cautions=("change",), decimals=3), "yes" if o else "in the works")
                for s, d, o in zip(c.levels.chainage, c.levels.rise, c.levels.outside, strict=True)
            )
            tables.append(Table(f"afflux-{key}", f"Rise of the width-mean level, {label}", ("Chainage, m", "Rise, m", "Outside the works"), rows))
    if not compared:
        says = ["No two runs of one event in two designs are read in this record; nothing is compared."]
    return Part("change", "What changes", tuple(says), tuple(tables), cautions=tuple(dict.fromkeys([*OWED["change"], *(i for _, _, c in compared for i in c.cautions)])))


def checks(review: Review, readings: Sequence[Reading], compared: Sequence[tuple[Reading, Reading, Change]]) -> Part:
    """Figures against the values entered, with their sources."""
    rows = []
    for check in read_checks(review.checks):
        if check.figure == AFFLUX:
            for a, b, c in compared:
                if c.levels is not None and (not check.events or a.entry.event in check.events):
                    known = next((i for i in review.reach.layer("receptors") if check.place in (i.id, i.name)), None)
                    centre = review.reach.centre_line
                    rise = rise_at(c.levels, centre, known) if known is not None and centre is not None else None
                    found = answer_afflux(check, rise, c.levels.noise_m)
                    rows.append((check.name, f"{a.entry.label} to {b.entry.label}", found.figure, _limit(check), found.answer, check.source))
            continue
        for r in readings:
            if not check.events or r.entry.event in check.events:
                frames: list[Frame] = [r.ledger.frame]
                found = answer(check, frames, r.reach)
                rows.append((check.name, r.entry.label, found.figure, _limit(check), found.answer, check.source))
    matrix_rows = tuple((m.check.name, m.sentence) for m in matrices(review))
    over = Table("checks-matrix", "Does the decision change over the run matrix?", ("Check", "Answer"), matrix_rows)
    table = Table("checks", "Checks against values entered", ("Check", "Run", "Figure", "Value entered", "Answer", "Source"), tuple(rows))
    return Part("checks", "Checks", (
        "Each answer compares a figure with a value that the reviewer entered together with its source. It is no judgement of fitness.",
    ), (table, over), cautions=("screening",))


def drift_part(answers: Sequence[DriftAnswer]) -> Part:
    """Floating wood against piers and openings, run by run."""
    tables, says = [], []
    for one in answers:
        base, label = one.base, one.entry.label
        says += [f"{label}: {text}" for text in one.sentences()]

        def share(name: str, s) -> Figure:
            return Figure(name, 100 * s.value, "%", 100 * s.low, 100 * s.high, cautions=OWED["drift"])

        rows: list[tuple[str | Figure, ...]] = [(p.name, share("touch", base.touches(i)), share("lodge", base.lodges(i)), "") for i, p in enumerate(base.piers)]
        rows += [(o.name, "", "", share("pass", base.passes(i))) for i, o in enumerate(base.openings)]
        tables.append(Table(f"drift-{one.entry.id}", f"Of {len(base.state):,} modelled logs, {label}", ("Where", "Touch, %", "Lodge, %", "Pass, %"), tuple(rows)))
    return Part("drift", "Floating wood", tuple(says), tuple(tables), cautions=OWED["drift"])


def passage_part(found: Study | None) -> Part:
    """Whether a way upstream is excluded, run by run and fish by fish."""
    if found is None:
        return Part("passage", "Fish passage", ("The review names no fish; passage was not looked at.",))
    tables, says = [], []
    for i, one in enumerate(found.answers):
        says.append(f"{one.entry.label}: {one.answer.sentence}")
        rows = tuple((f.quantity, f, f.unit, f.note) for f in passage_figures(one, None))
        tables.append(Table(f"passage-{one.entry.id}-{i}", f"{one.answer.fish.name}, {one.entry.label}", ("Figure", "Value", "Unit", "Note"), rows))
    return Part("passage", "Fish passage", tuple(says), tuple(tables), cautions=OWED["passage"])


def _limit(check) -> str:
    return f"{check.comparison} {check.value:g} {check.unit}"

