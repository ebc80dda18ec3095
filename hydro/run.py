"""A run: one model result with its mesh, its times and its frames, read one frame at a time."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path

import numpy as np

from .frame import Frame, RawFrame, make_frame, mean_frame
from .mesh import Mesh
from .settings import Settings

_HELD = 3  # frames kept in memory: one and its neighbours


@dataclass(frozen=True, slots=True)
class TimeAxis:
    """Times of the frames: seconds from the first, dated instants where the file has them.

    ``kinds`` (one a frame: instant, mean, maximum); ``intervals_s`` NaN for instants.
    """

    seconds: np.ndarray
    instants: np.ndarray | None
    kinds: tuple[str, ...]
    intervals_s: np.ndarray

    def __len__(self) -> int:
        return len(self.seconds)


@dataclass(frozen=True, slots=True)
class Note:
    """Something the reader mended, derived or wants known, with where it stands in the file."""

    text: str
    variable: str = ""
    count: int = 1


@dataclass(frozen=True, eq=False)
class StoredLevel:
    """The file's own water level where it also stores depth: kept for the audit, used by no figure.

    ``read(i)`` gives it at frame i on every "face" or "node" of the mesh, m above the run's datum, NaN where
    missing; ``name`` is the file's. ``beside_depth``: depth is stored on the same places, so that bed plus depth
    is not carried from others.
    """

    name: str
    location: str
    read: Callable[[int], np.ndarray]
    beside_depth: bool = True


@dataclass(frozen=True, eq=False)
class Run:
    """Results of one model run.

    Attributes
    ----------
    name : str
        A label, never an identity.
    files : tuple of Path
    mesh : Mesh
    times : TimeAxis
    node_bed, face_bed : (n,), (f,) float64
        m above ``datum``.
    crs : str or None
        WKT of the projected system; None: local metres.
    datum : str
        Name of the vertical datum; empty where the file names none.
    read : callable
        ``read(i)`` gives the raw frame i.
    roughness : (f,) float64 or None
        Manning's n, s/m^(1/3).
    boundary_sets : dict
        Edges (mesh numbering) of boundary stretches that the file names, by name.
    notes : tuple of Note
        What was mended, derived or assumed on reading.
    depth_is : "point", "mean" or "maximum"
        What the stored depth is within a face or at a node.
    statements : dict
        What the file says of itself (global attributes), as text.
    series : dict
        Discharges that depend on time alone, (frames,) m3/s by the file's name: what links carry.
    stored_level : StoredLevel or None
        The file's own level beside its depth; level in every figure is bed + depth.
    """

    name: str
    files: tuple[Path, ...]
    mesh: Mesh
    times: TimeAxis
    node_bed: np.ndarray
    face_bed: np.ndarray
    crs: str | None
    datum: str
    read: Callable[[int], RawFrame]
    settings: Settings = field(default_factory=Settings)
    roughness: np.ndarray | None = None
    boundary_sets: dict[str, np.ndarray] = field(default_factory=dict)
    notes: tuple[Note, ...] = ()
    depth_is: str = "mean"
    statements: dict[str, str] = field(default_factory=dict)
    series: dict[str, np.ndarray] = field(default_factory=dict)
    _recent: dict[str, tuple[Frame, ...]] = field(init=False, default_factory=dict, repr=False)
    stored_level: StoredLevel | None = None

    @property
    def n_frames(self) -> int:
        return len(self.times)

    @cached_property
    def hash(self) -> str:
        """SHA-256 of the files' bytes, in order of the files: the run's identity."""
        from .provenance import files_hash

        return files_hash(self.files)

    def frame(self, index: int) -> Frame:
        """Frame ``index`` (negative counts from the end).

        Raises ``ValueError`` when there is no such frame.
        """
        n = self.n_frames
        if not -n <= index < n:
            raise ValueError(f"there is no frame {index}; {self.name} has {n}, numbered 0 to {n - 1}.")
        i = index % n
        # Neighbours are asked for again and again: for storage, for what moves. One tuple in place of another, so that
        # two threads never see it half changed.
        held = self._recent.get("frames", ())
        frame = next((f for f in held if f.index == i), None) or self._made(i)
        self._recent["frames"] = (*(f for f in held if f.index != i), frame)[-_HELD:]
        return frame

    def _made(self, i: int) -> Frame:
        t = self.times
        interval = float(t.intervals_s[i])
        return make_frame(
            self.mesh, self.read(i), self.node_bed, self.face_bed,
            index=i, seconds=float(t.seconds[i]),
            time=None if t.instants is None else t.instants[i],
            kind=t.kinds[i], interval_s=None if np.isnan(interval) else interval,
            wet_depth_m=self.settings["wet_depth_m"],
            series={name: float(values[i]) for name, values in self.series.items()},
        )

    def frames(self) -> Iterator[Frame]:
        """Every frame in turn; only one is held."""
        return (self.frame(i) for i in range(self.n_frames))

    def nearest(self, seconds: float) -> int:
        """Index of the frame nearest to this time, s from the first frame."""
        return int(np.abs(self.times.seconds - seconds).argmin())

    def window(self, t1: float, t2: float) -> tuple[np.ndarray, np.ndarray]:
        """Frames from t1 to t2 (s, both ends in) and the seconds that each stands for.

        Raises ``ValueError`` where the window holds no frame.
        """
        s = self.times.seconds
        chosen = np.flatnonzero((s >= t1 - 1e-9) & (s <= t2 + 1e-9))
        if not chosen.size:
            raise ValueError(f"no frame between {t1:g} s and {t2:g} s; the run goes from {s[0]:g} s to {s[-1]:g} s.")
        if chosen.size == 1:
            interval = self.times.intervals_s[chosen[0]]
            return chosen, np.array([interval if np.isfinite(interval) and interval > 0 else 1.0])
        half = np.diff(s[chosen]) / 2
        return chosen, np.concatenate([half, [0]]) + np.concatenate([[0], half])

    def mean(self, t1: float, t2: float) -> Frame:
        """Time mean of depth and unit discharge between t1 and t2, s (trapezoidal in time)."""
        chosen, weights = self.window(t1, t2)
        return mean_frame((self.frame(int(i)), float(w)) for i, w in zip(chosen, weights, strict=True))
