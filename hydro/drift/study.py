"""Logs let go in a run: where they pass, what they touch, where they lodge."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from .._kernels import wood as kernel
from ..figure import printed
from ..reach import NamedLine, Structure
from ..run import Run
from ..streamfunction import OpenBoundary
from ..tracks.lines import open_sides
from ..tracks.unsteady import FramePair
from .share import Share, share_of
from .wood import Wood

STATES = {
    kernel.AFLOAT: "afloat", kernel.LEFT: "left", kernel.AGROUND: "aground", kernel.LODGED: "lodged",
    kernel.WAITING: "not let go yet", kernel.OUTSIDE: "outside the water",
}


@dataclass(frozen=True, slots=True)
class Rules:
    """How logs move; every one is a choice of the user.

    ``profile``: 1/m power of the velocity profile (7: Rantz 1982, from memory; 0: the depth mean).
    ``mixing_m2_s``: random walk (0: none; resolved eddies already mix). ``lodge_share``: a log lodges when
    it meets an outline within this share of its half length from its middle (0: never).
    """

    profile: float = 7.0
    mixing_m2_s: float = 0.0
    lodge_share: float = 0.15
    step_s: float = 0.2


@dataclass(frozen=True, eq=False)
class Drifted:
    """Logs after a run. (k,) arrays unless said otherwise; times s of the run.

    ``times`` (j,) and ``paths`` (k, j, 3): local x, y and angle of each log (NaN before its release and
    after it left), for drawing. ``touched`` (k, piers) bool; ``passed`` opening or -1.
    """

    wood: Wood
    release: np.ndarray
    release_names: tuple[str, ...]
    piers: tuple[Structure, ...]
    openings: tuple[NamedLine, ...]
    state: np.ndarray
    touched: np.ndarray
    first_touch: np.ndarray
    passed: np.ndarray
    pass_time: np.ndarray
    pass_level: np.ndarray
    lodged_at: np.ndarray
    times: np.ndarray
    paths: np.ndarray
    rules: Rules
    stopped_early: bool

    def _groups(self) -> np.ndarray:
        """Logs let go within a fiftieth of the release's time count as let go together."""
        t = self.wood.released
        span = np.ptp(t)
        return np.zeros(len(t), int) if span == 0 else (50 * (t - t.min()) / span).astype(int)

    def touches(self, pier: int) -> Share:
        """Logs that touch a pier."""
        return share_of(self.touched[:, pier], self._groups())

    def lodges(self, pier: int) -> Share:
        """Logs that lodge on a pier, by the rule chosen."""
        return share_of(self.lodged_at == pier, self._groups())

    def passes(self, opening: int) -> Share:
        """Logs whose middle goes through an opening."""
        return share_of(self.passed == opening, self._groups())

    def fed(self, pier: int) -> dict[str, int]:
        """How many of the logs that touch a pier come from each release."""
        who = self.release[self.touched[:, pier]]
        return {name: int((who == i).sum()) for i, name in enumerate(self.release_names)}

    def deck_contacts(self, soffit_m: float) -> Share:
        """Logs whose top stands above the soffit when they pass an opening: level - draft + diameter."""
        top = self.pass_level - self.wood.draft + self.wood.diameter
        return share_of((self.passed >= 0) & (top > soffit_m), self._groups())

    def corridor(self, cell_m: float) -> tuple[np.ndarray, tuple[float, float]]:
        """Grid of where logs spend their time; it sums to the number of logs that were let go in the water.

        Returns (rows from the south, columns) float64 and the local south-west corner.
        """
        known = np.isfinite(self.paths[..., 0])
        xy = self.paths[..., :2][known]
        if not len(xy):
            return np.zeros((1, 1)), (0.0, 0.0)
        corner = xy.min(axis=0)
        weight = np.repeat(1.0 / np.maximum(known.sum(axis=1), 1), known.sum(axis=1))
        column, row = ((xy - corner) / cell_m).astype(int).T
        grid = np.zeros((row.max() + 1, column.max() + 1))
        np.add.at(grid, (row, column), weight)
        return grid, (float(corner[0]), float(corner[1]))

    def time_inside(self, shape) -> np.ndarray:
        """Seconds (k,) that each log's middle spends inside a polygon, such as an eddy."""
        import shapely

        shapely.prepare(shape)
        inside = shapely.contains_xy(shape, self.paths[..., 0], self.paths[..., 1])
        return inside.sum(axis=1) * (float(self.times[1] - self.times[0]) if len(self.times) > 1 else 0.0)


def drift(
    run: Run, releases: Sequence[tuple[str, np.ndarray, Wood]], *, piers: Sequence[Structure] = (),
    openings: Sequence[NamedLine] = (), boundaries: tuple[OpenBoundary, ...] = (), rules: Rules | None = None, seed: int = 1,
    duration_s: float | None = None, every_s: float = 2.0, stop: Callable[[], bool] = lambda: False,
    progress: Callable[[float], None] = lambda share: None,
) -> Drifted:
    """Let logs go and move them through a run.

    Parameters
    ----------
    releases : sequence of (name, line (n, 2) local m, Wood)
    duration_s : float, optional
        For a run of one frame, which is taken as steady; default 900 s. Runs of several frames last to
        their end.
    every_s : float
        Spacing of the positions kept for drawing.
    stop : callable
        Looked at between frames; what was done is kept.

    Raises
    ------
    ValueError
        No release, or a line that lies outside the water.
    """
    if not releases:
        raise ValueError("there is nothing to let go; give a release line in the review and a [[releases]] entry.")
    rules = rules or Rules()
    wood, release = _joined(releases)
    xy = np.vstack([_places(line, w.place) for _, line, w in releases])
    mesh = run.mesh
    t = mesh.find(xy).astype(np.int32)
    if (t < 0).all():
        raise ValueError("every release lies outside the mesh; move the release line onto the water.")
    s = run.times.seconds
    end = float(s[-1]) if run.n_frames > 1 else float(duration_s or 900.0)
    times = np.arange(float(s[0]), end + 1e-9, every_s)
    log = _State(xy, t, wood, len(piers))
    rings, starts, boxes = _outlines(piers)
    lines = np.array([np.asarray(o.geometry.coords)[[0, -1], :2].ravel() for o in openings]).reshape(-1, 4)
    sides, pair = open_sides(mesh, boundaries), FramePair(run)
    paths = np.full((len(xy), len(times), 3), np.nan, np.float32)
    log.keep(paths, 0)
    done = 1
    for j in range(1, len(times)):
        if stop():
            break
        before = float(times[j - 1])
        for until in pair.stops(times[j - 1], times[j]):
            a, b, (f0, f1) = pair.around(until, False)
            ta, tb = (0.0, 0.0) if a is b else (a.seconds, b.seconds)
            kernel.drift(
                mesh.node_xy, mesh.triangles, mesh.neighbours, sides, f0, f1, a.bed, rules.mixing_m2_s, ta, tb, before, float(until),
                rules.step_s, rules.profile, rules.lodge_share, seed, wood.draft, wood.length, wood.diameter / 2, log.x, log.y, log.t,
                log.angle, log.state, wood.released, log.touched, log.first_touch, log.passed, log.pass_time, log.pass_level,
                log.lodged_at, log.step, rings, starts, boxes, lines,
            )
            before = float(until)
        log.keep(paths, j)
        done = j + 1
        progress(j / (len(times) - 1))
    return Drifted(
        wood, release, tuple(name for name, _, _ in releases), tuple(piers), tuple(openings), log.state, log.touched,
        log.first_touch, log.passed, log.pass_time, log.pass_level, log.lodged_at, times[:done], paths[:, :done], rules,
        done < len(times),
    )


def settings_tried(rules: Rules) -> dict[str, Rules]:
    """The settings that the range is taken over, by what is different in them."""
    return {
        "as chosen": rules,
        "depth-mean velocity": replace(rules, profile=0.0),
        "with mixing of 0.05 m2/s": replace(rules, mixing_m2_s=0.05),
        "half the time step": replace(rules, step_s=rules.step_s / 2),
    }


def sentence(base: Drifted, pier: int, tried: Sequence[Drifted]) -> str:
    """What the modelled logs do at a pier, with both kinds of interval. Not a forecast."""
    share = base.touches(pier)
    values = [100 * d.touches(pier).value for d in (base, *tried)]
    return (
        f"With these settings, {printed(100 * share.value, digits=2)} % of the {share.whole:,} modelled logs touch "
        f"{base.piers[pier].name} ({100 * share.low:.0f} to {100 * share.high:.0f} % from their number alone; "
        f"{min(values):.0f} to {max(values):.0f} % over the settings tried). Not a forecast of jams."
    )


class _State:
    """Arrays that the kernel changes in place."""

    def __init__(self, xy: np.ndarray, t: np.ndarray, wood: Wood, piers: int) -> None:
        k = len(xy)
        self.x, self.y, self.t = xy[:, 0].copy(), xy[:, 1].copy(), np.maximum(t, 0)
        self.angle = wood.angle.copy()
        self.state = np.where(t < 0, kernel.OUTSIDE, kernel.WAITING).astype(np.int64)
        self.touched, self.first_touch = np.zeros((k, piers), bool), np.full((k, piers), np.nan)
        self.passed, self.lodged_at = np.full(k, -1, np.int64), np.full(k, -1, np.int64)
        self.pass_time, self.pass_level = np.full(k, np.nan), np.full(k, np.nan)
        self.step = np.zeros(k, np.int64)

    def keep(self, paths: np.ndarray, j: int) -> None:
        there = ~np.isin(self.state, (kernel.WAITING, kernel.OUTSIDE, kernel.LEFT))
        paths[there, j] = np.column_stack([self.x, self.y, self.angle])[there]


def _joined(releases) -> tuple[Wood, np.ndarray]:
    woods = [w for _, _, w in releases]
    fields = Wood.__dataclass_fields__
    whole = Wood(**{f: np.concatenate([getattr(w, f) for w in woods]) for f in fields})
    return whole, np.repeat(np.arange(len(woods)), [len(w.length) for w in woods])


def _places(line: np.ndarray, share: np.ndarray) -> np.ndarray:
    line = np.asarray(line, float)
    if len(line) == 1:
        return np.repeat(line, len(share), axis=0)
    d = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(line, axis=0).T))])
    return np.column_stack([np.interp(share * d[-1], d, line[:, i]) for i in range(2)])


def _outlines(piers: Sequence[Structure]) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Rings of all outlines one after the other, where each begins, and their boxes."""
    rings = [np.asarray(p.geometry.exterior.coords)[:, :2] for p in piers]
    starts = np.concatenate([[0], np.cumsum([len(r) for r in rings])]).astype(np.int64)
    boxes = np.array([[*r.min(axis=0), *r.max(axis=0)] for r in rings]).reshape(-1, 4)
    return (np.vstack(rings) if rings else np.zeros((0, 2))), starts, boxes
