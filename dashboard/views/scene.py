"""What a map shows, as data: a question says what lies where, the plate says how it is drawn.

All coordinates are local metres.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from shapely.geometry.base import BaseGeometry

from hydro.frame import Frame

LINE_KINDS = ("streamline", "pathline", "streakline", "timeline", "route", "path", "dotted", "crest", "deck")
MARK_KINDS = ("parcel", "drogue", "fish", "leaves", "returns", "rest", "query", "answered")
PATTERNS = ("dots", "levels", "stipple 1", "stipple 2", "stipple 3", "stipple 4", "rest", "dry", "wet")


@dataclass(frozen=True, eq=False)
class Water:
    """The water's shade: ``value`` (n,) from 0 to ``top``, in alternate tubes of psi where given."""

    frame: Frame
    value: np.ndarray
    top: float
    psi: np.ndarray | None = None
    tube_m3_s: float = 0.0
    carries: np.ndarray | None = None
    tube_lines: tuple[np.ndarray, ...] = ()


@dataclass(frozen=True, eq=False)
class Beside:
    """A second run's water, shown east of ``x``; ``shift`` (m) brings its coordinates to the first run's."""

    run_id: str
    water: Water
    x: float
    shift: tuple[float, float]
    names: tuple[str, str]


@dataclass(frozen=True, eq=False)
class ZoneMark:
    """An eddy: outline, two inner streamlines, its turning and its tag."""

    tag: str
    outline: BaseGeometry
    inner: tuple[np.ndarray, ...]
    rotation: str
    centre: np.ndarray
    subject: bool = False
    coarse: bool = False  # under-resolved: the tag's outline is dashed
    travelling: bool = False
    separation: np.ndarray | None = None
    reattachment: np.ndarray | None = None


@dataclass(frozen=True, eq=False)
class LineMark:
    """A line of one of ``LINE_KINDS``; ``subject`` draws it in signal; a pathline has a cross tick every ``tick`` points."""

    kind: str
    points: np.ndarray
    label: str = ""
    subject: bool = False
    tick: int = 60


@dataclass(frozen=True, eq=False)
class PointMark:
    """A small thing of one of ``MARK_KINDS``; ``angle`` (rad) and ``length_m`` where it has a direction."""

    kind: str
    at: np.ndarray
    angle: float = 0.0
    length_m: float = 0.0
    label: str = ""
    subject: bool = False


@dataclass(frozen=True, eq=False)
class LogsMark:
    """Many logs at once: middles (k, 2), angles (k,) rad, lengths (k,) m, and which have lodged (k,)."""

    at: np.ndarray
    angle: np.ndarray
    length_m: np.ndarray
    lodged: np.ndarray


@dataclass(frozen=True, eq=False)
class AreaMark:
    """An area filled by one of ``PATTERNS``; ``tint`` is "more", "less" or empty."""

    pattern: str
    area: BaseGeometry
    tint: str = ""


@dataclass(frozen=True, eq=False)
class StructureMark:
    """A structure in ink with its name beside; ``solid`` where the model lets no water through."""

    name: str
    kind: str
    shape: BaseGeometry
    solid: bool = True


@dataclass(frozen=True, slots=True)
class Name:
    """An italic name on the map, such as a bank's or "flow"; ``angle`` in rad."""

    text: str
    x: float
    y: float
    angle: float = 0.0
    arrow: bool = False


@dataclass(frozen=True, eq=False)
class Tag:
    """A label tied to a place, in order of importance."""

    text: str
    at: tuple[float, float]
    subject: bool = False
    coarse: bool = False


@dataclass(frozen=True, eq=False)
class Scene:
    """Everything on one map, back to front."""

    water: Water | None = None
    beside: Beside | None = None
    shore: tuple[np.ndarray, ...] = ()
    structures: tuple[StructureMark, ...] = ()
    zones: tuple[ZoneMark, ...] = ()
    areas: tuple[AreaMark, ...] = ()
    lines: tuple[LineMark, ...] = ()
    points: tuple[PointMark, ...] = ()
    logs: LogsMark | None = None
    names: tuple[Name, ...] = ()
    tags: tuple[Tag, ...] = ()
    section: tuple[tuple[float, float], tuple[float, float]] | None = None
    buttons: tuple[tuple[float, float], ...] = ()  # places of marks that the page itself lays over the map
    notes: tuple[str, ...] = field(default=())
