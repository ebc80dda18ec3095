"""What a question is: the one interface behind the seven words of the rail.

A question is given a :class:`Desk` and answers in words, marks and tables. Any method may raise
``Working`` while its figures are being made; the page then keeps what it had and says what is going on.
"""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass, field

import numpy as np

from hydro.cautions import CAUTIONS
from hydro.run import Run

from ..choices import Choices
from ..raster import View
from ..reading import Moment, Reading
from ..studies import Studies
from ..theme import Look
from ..units import Units
from ..views.scene import Scene

_OF_MEANS = ("eddies", "sections")  # questions that can be asked of a mean flow


@dataclass(frozen=True, slots=True)
class Sizes:
    """What the browser measured, px: the window and the places that drawings must fit."""

    window: int = 1440
    ratio: float = 1.0
    ribbon: int = 752
    section: int = 408
    map: tuple[int, int] = (752, 406)

    @property
    def narrow(self) -> bool:
        """A phone's width."""
        return self.window < 640


@dataclass(frozen=True, eq=False)
class Desk:
    """What one viewer looks at: the choices and how they are shown."""

    choices: Choices
    reading: Reading
    studies: Studies
    look: Look
    sizes: Sizes = field(default_factory=Sizes)
    view: View | None = None  # of the map; None until the mesh is known

    @property
    def units(self) -> Units:
        return Units(self.choices.units)

    @property
    def run_id(self) -> str:
        """The chosen run, else the question's first choice of the review's."""
        return self.choices.run or self.reading.matter().runs[0][0]

    @property
    def run(self) -> Run:
        return self.reading.run(self.run_id)

    @property
    def index(self) -> int:
        """The frame nearest to the chosen time; the last one where none was chosen."""
        run = self.run
        return run.n_frames - 1 if self.choices.seconds is None else run.nearest(self.choices.seconds)

    @property
    def moment(self) -> Moment:
        """The chosen frame, or the chosen window of a run of several frames."""
        window = self.choices.window if self.choices.question in _OF_MEANS else None
        return window if window is not None and self.run.n_frames > 1 else self.index


class Question:
    """The interface, and what holds where a question says nothing else."""

    key: str
    word: str
    asks: str
    has_map = True
    has_time = True
    has_section = False  # a section stands beside the map
    numbered: tuple[str, ...] = ()  # tables of figures that can be saved
    places: tuple[tuple[str, str], ...] = (("subject", "the place"),)  # of the caption's words for where to look

    def summary(self, desk: Desk) -> str:
        """The rail's line, plain text; must not start long work."""
        return "not looked at yet"

    def sentence(self, desk: Desk) -> str:
        """The answer as HTML: one or two sentences with figures and units."""
        raise NotImplementedError

    def scene(self, desk: Desk) -> Scene:
        """What the map shows."""
        raise NotImplementedError

    def view(self, desk: Desk) -> tuple[float, float, float] | None:
        """Local centre and width of the map, m, where the reader chose none; None: the whole reach."""
        return None

    def caption(self, desk: Desk, scene: Scene, view: View) -> str:
        """HTML of the plate's caption; its underlined words are buttons."""
        return ""

    def key_html(self, desk: Desk) -> str:
        """HTML of the key on the plate."""
        return ""

    def alternative(self, desk: Desk) -> str:
        """The map in words, with its numbers."""
        return ""

    def awaited(self, desk: Desk) -> set[Hashable]:
        """Results that the ribbon still wants, beside those of the story."""
        return set()

    def ribbon(self, desk: Desk) -> str:
        """SVG of the time ribbon."""
        return ""

    def moments(self, desk: Desk) -> dict[str, object] | None:
        """For the slider: index, last, words, and the x of each frame on the ribbon, px."""
        return None

    def times(self, desk: Desk) -> np.ndarray:
        """Moments that the slider steps through, s of the run."""
        return desk.run.times.seconds

    def progress(self, desk: Desk) -> tuple[str, int, int] | None:
        """Label, done and whole of long work that this question has running; None: none."""
        return None

    def side(self, desk: Desk) -> dict[str, str]:
        """HTML for "section" (upper) and "table" (lower) beside the map."""
        return {}

    def numbers(self, desk: Desk, which: str) -> tuple[list[dict[str, object]], str]:
        """One of ``numbered``: rows of figures in SI units and full digits, and the command that gives them again."""
        raise ValueError(f"{self.word} has no table {which!r} to save.")

    def cautions(self, desk: Desk) -> tuple[str, ...]:
        """Ids of the cautions that concern this screen's figures, in order of their letters."""
        return ()

    def swipe(self, desk: Desk) -> dict[str, object] | None:
        """The swipe's divider: its share of the map's width and what stands left and right of it; None: there is none."""
        return None

    def section_ends(self, desk: Desk) -> tuple[tuple[float, float], tuple[float, float]] | None:
        """Local left and right end of the section line; None: there is none."""
        return None


def footnote(ids: tuple[str, ...], id_: str) -> str:
    """The raised letter of a caution, linked to its text at the foot; empty where it is not shown."""
    if id_ not in ids:
        return ""
    letter = chr(ord("a") + ids.index(id_))
    return f'<sup><a class="note" href="#caution-{letter}" title="{CAUTIONS[id_].short}">{letter}</a></sup>'
