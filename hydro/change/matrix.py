"""A review's run matrix as one table of any figure, and whether a check's answer changes over it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import pandas as pd

from ..checks import NOT_ASSESSED, Answer, Check, answer, read_checks
from ..ledger.report import time_text
from ..review import Review


@dataclass(frozen=True, eq=False)
class Matrix:
    """One check over every run: a row a run, and whether its answer is one and the same.

    ``decision_changes`` is None where fewer than two runs could be assessed.
    """

    check: Check
    table: pd.DataFrame
    decision_changes: bool | None

    @property
    def sentence(self) -> str:
        """What the matrix says of the check."""
        if self.decision_changes is None:
            return f"{self.check.name}: fewer than two runs could be assessed."
        words = "changes from run to run" if self.decision_changes else "is the same in every run that could be assessed"
        return f"{self.check.name}: the answer {words}."


def matrix(review: Review, check: Check, *, progress: Callable[[str], None] = lambda run: None) -> Matrix:
    """The figure of a check in every run of the review, at each run's worst frame of up to 25.

    Raises ``ValueError`` for a check that needs two runs (afflux), or a place the review lacks.
    """
    import numpy as np

    rows, answers = [], []
    for entry in review.runs:
        progress(entry.label)
        run = review.open(entry.id)
        chosen = np.unique(np.linspace(0, run.n_frames - 1, min(run.n_frames, 25)).astype(int))
        frames = [run.frame(int(i)) for i in chosen]
        found: Answer = answer(check, frames, review.reach_for(run))
        answers.append(found.answer)
        rows.append({
            "run": entry.label, "design": entry.design, "event": entry.event, "variant": entry.variant, "kind": frames[0].kind,
            "from": time_text(frames[0].time), "value": found.figure.value, "unit": check.unit, "answer": found.answer,
        })
    known = [a for a in answers if a != NOT_ASSESSED]
    return Matrix(check, pd.DataFrame(rows), None if len(known) < 2 else len(set(known)) > 1)


def matrices(review: Review, *, progress: Callable[[str], None] = lambda run: None) -> list[Matrix]:
    """Every check of the review that one run answers, over the whole matrix."""
    from ..checks import FIGURES

    return [matrix(review, c, progress=progress) for c in read_checks(review.checks) if c.figure in FIGURES]
