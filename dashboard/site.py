"""What a review lays under and beside the water: its backdrops in grey, and its photographs."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from hydro.backdrop import Backdrop, open_backdrop
from hydro.photographs import Photograph, read_photograph

from .raster import View
from .reading import Reading
from .results import SOON


class Site:
    """Backdrops and photographs of one reading; each answers at once or raises ``Working``."""

    def __init__(self, reading: Reading) -> None:
        self.reading = reading

    def backdrop_names(self) -> list[str]:
        """The files that lie under the water."""
        review = self.reading.matter().review
        return [Path(entry.file).name for entry in review.contents.backdrop] if review else []

    def layers(self, run_id: str, view: View) -> tuple[tuple[np.ndarray, float], ...]:
        """Grey (rows, columns), rows from the north, and opacity of each backdrop in a view, the lowest first."""
        review, run = self.reading.matter().review, self.reading.run(run_id)
        if review is None or not review.contents.backdrop:
            return ()
        west, south, east, north = view.extent
        corners = run.mesh.to_world(np.array([[west, south], [east, north]]))

        def make() -> tuple[tuple[np.ndarray, float], ...]:
            opened = self._backdrops(run_id)
            x1, y1, x2, y2 = corners.ravel()
            return tuple((b.grey((x1, y1, x2, y2), view.columns, view.rows), opacity) for b, opacity in opened)

        return self.reading.results.get(("ground", run_id, view), make, label="Reading the backdrop.", rank=SOON, heavy=True)

    def _backdrops(self, run_id: str) -> tuple[tuple[Backdrop, float], ...]:
        review, run = self.reading.matter().review, self.reading.run(run_id)
        assert review is not None  # layers says so

        def make() -> tuple[tuple[Backdrop, float], ...]:
            return tuple((open_backdrop(review.folder / e.file, run.crs, e.layer), e.opacity) for e in review.contents.backdrop)

        return self.reading.results.get(("backdrops", run_id), make, label="Opening the backdrop.", rank=SOON)

    def photographs(self, run_id: str) -> tuple[Photograph, ...]:
        """The review's photographs, in its order, on the ground of a run."""
        review, run = self.reading.matter().review, self.reading.run(run_id)
        if review is None or not review.contents.photograph:
            return ()

        def make() -> tuple[Photograph, ...]:
            return tuple(
                read_photograph(review.folder / e.file, e.caption, run.crs, x=e.x, y=e.y, bearing_deg=e.bearing)
                for e in review.contents.photograph
            )

        return self.reading.results.get(("photographs", run_id), make, label="Placing the photographs.", rank=SOON)

    def picture(self, number: int) -> bytes:
        """A photograph as JPEG without its tags; ``ValueError`` where there is no such number."""
        matter = self.reading.matter()
        found = self.photographs(matter.runs[0][0])
        if not 0 <= number < len(found):
            raise ValueError(f"there is no photograph {number}; the review has {len(found)}.")
        return found[number].jpeg()
