"""Many sections over a whole run: one row a section and frame, each figure with its unit in the column's name."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import asdict

import numpy as np
import pandas as pd

from ..ledger.report import time_text
from ..reach import CentreLine
from ..run import Run
from ..streamfunction import StreamFunction
from .cut import cut
from .figures import section_figures


def section_table(
    run: Run,
    lines: Sequence[tuple[str, np.ndarray]],
    frames: Iterable[int],
    *,
    centre_line: CentreLine | None = None,
    psi_of: Callable[[int], StreamFunction] | None = None,
    progress: Callable[[int], None] = lambda done: None,
) -> pd.DataFrame:
    """Figures of sections in frames of a run; one frame is held at a time.

    Parameters
    ----------
    lines : sequence of (name, (n, 2) local points)
    frames : iterable of int
    psi_of : callable, optional
        Gives the stream function of a frame, for the discharge by psi.
    progress : callable
        Called with the number of frames done.

    Returns
    -------
    pandas.DataFrame
        Columns section, chainage_m, frame, time, seconds, kind, then the figures of
        :class:`hydro.section.SectionFigures`.
    """
    rows = []
    for done, index in enumerate(frames, 1):
        sf = psi_of(index) if psi_of else None
        frame = sf.frame if sf else run.frame(index)
        for name, points in lines:
            section = cut(frame, points, centre_line=centre_line)
            figures = asdict(section_figures(section, sf=sf, settings=run.settings))
            figures["flags"] = ", ".join(figures["flags"])
            chainage = None
            if centre_line is not None:
                chainage = float(centre_line.locate(section.points)[0].mean())
            rows.append({
                "section": name, "chainage_m": chainage, "frame": frame.index, "time": time_text(frame.time),
                "seconds": frame.seconds, "kind": frame.kind, **figures,
            })
        progress(done)
    return pd.DataFrame(rows)
