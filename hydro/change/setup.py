"""What differs between two runs before the water is looked at: bed, roughness, mesh, boundaries, version."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from ..figure import percent
from ..frame import Frame
from ..run import Run
from ..transfer import Transfer

BED_STEP_M = 0.01  # smaller differences of bed are rounding in storage (common practice, no source)
ROUGHNESS_STEP = 0.005  # relative
# Statements that say which run it is, not how it was made: they differ between any two runs.
_LABELS = {
    "title", "comment", "history", "links", "local_origin", "design", "event", "references", "institution", "date_created",
    "id", "uuid", "_NCProperties", "mesh_note",
}


@dataclass(frozen=True, slots=True)
class Difference:
    """Something that differs between two runs outside the works, with its size and place.

    ``largest`` in ``unit``; ``share`` of the common area outside the works where it differs
    (None: not a map); ``at`` local point of the largest difference.
    """

    what: str
    sentence: str
    largest: float | None = None
    unit: str = ""
    share: float | None = None
    at: tuple[float, float] | None = None


def outside(works: Sequence[BaseGeometry], points: np.ndarray, margin_m: float = 0.0) -> np.ndarray:
    """(k,) bool: local points (k, 2) that lie outside every outline of the works, margin included."""
    if not works:
        return np.ones(len(points), bool)
    area = shapely.union_all([g.buffer(margin_m) for g in works])
    shapely.prepare(area)
    return ~shapely.contains_xy(area, points[:, 0], points[:, 1])


def setup_differences(
    a: Run, b: Run, frame_a: Frame, frame_b: Frame, works: Sequence[BaseGeometry] = (), margin_m: float = 0.0
) -> tuple[Difference, ...]:
    """What the two runs do not share outside the works.

    Parameters
    ----------
    frame_a, frame_b : Frame
        A pair of frames, for the boundary discharge and level.
    works : polygons, local m
        Outlines within which a difference is meant.
    margin_m : float
        Ground beside the outlines that counts as the works'.

    Returns
    -------
    tuple of Difference
        Empty where nothing differs.
    """
    move = Transfer(a.mesh, b.mesh)
    found = [
        _mesh(a, b),
        _bed(a, b, move, works, margin_m),
        _roughness(a, b, move, works, margin_m),
        *_times(a, b),
        *_settings(a, b),
        _kind(frame_a, frame_b),
    ]
    return tuple(d for d in found if d is not None)


def _mesh(a: Run, b: Run) -> Difference | None:
    same = a.mesh.n_faces == b.mesh.n_faces and a.mesh.n_nodes == b.mesh.n_nodes
    if same and np.abs(a.mesh.node_xy - b.mesh.node_xy).max() < 1e-3:
        return None
    return Difference(
        "mesh",
        f"The meshes differ: {a.mesh.n_faces:,} faces and {b.mesh.n_faces:,}. Differences below hold that too.",
    )


def _bed(a: Run, b: Run, move: Transfer, works, margin) -> Difference | None:
    other = move.interpolate(b.node_bed)
    step = other - a.node_bed
    used = np.isfinite(step) & outside(works, a.mesh.node_xy, margin)
    return _map_difference(
        "bed", step, used, a.mesh.node_xy, BED_STEP_M, "m",
        "Outside the works the bed differs by more than {limit:g} m on {share} of the nodes, by up to {largest:.2f} m.",
    )


def _roughness(a: Run, b: Run, move: Transfer, works, margin) -> Difference | None:
    if a.roughness is None and b.roughness is None:
        return Difference("roughness", "Neither run states its roughness; ask for Manning's n of both.")
    if a.roughness is None or b.roughness is None:
        lacking = a.name if a.roughness is None else b.name
        return Difference("roughness", f"{lacking} does not state its roughness; ask for Manning's n.")
    other = move.conserve(b.roughness) / np.maximum(move.coverage, 1e-12)
    relative = other / a.roughness - 1
    used = (move.coverage > 0.99) & outside(works, a.mesh.face_centroid, margin)
    return _map_difference(
        "roughness", relative, used, a.mesh.face_centroid, ROUGHNESS_STEP, "-",
        "Outside the works roughness differs by more than {percent:g} % on {share} of the faces, by up to {most}.",
    )


def _map_difference(what, values, used, points, limit, unit, text) -> Difference | None:
    size = np.where(used, np.abs(values), 0.0)
    beyond = size > limit
    if not beyond.any():
        return None
    i = int(size.argmax())
    share = float(beyond.sum() / max(used.sum(), 1))
    sentence = text.format(
        limit=limit, percent=100 * limit, share=percent(share), largest=size[i], most=percent(float(size[i]), 1),
    )
    return Difference(what, sentence, float(values[i]), unit, share, (float(points[i, 0]), float(points[i, 1])))


def _times(a: Run, b: Run) -> list[Difference]:
    out = []
    if a.n_frames > 1 and b.n_frames > 1:
        da, db = float(np.median(np.diff(a.times.seconds))), float(np.median(np.diff(b.times.seconds)))
        if abs(da - db) > 0.01 * max(da, db):
            out.append(Difference("output spacing", f"Frames stand {da:g} s apart in one run and {db:g} s in the other."))
    if a.datum != b.datum:
        out.append(Difference("datum", f"The vertical datums are named {a.datum or 'nothing'} and {b.datum or 'nothing'}."))
    return out


def _settings(a: Run, b: Run) -> list[Difference]:
    """Statements of the files about themselves that differ: code version, eddy viscosity and the like."""
    out = []
    for key in sorted({*a.statements, *b.statements} - _LABELS):
        here, there = a.statements.get(key, "not stated"), b.statements.get(key, "not stated")
        if here != there:
            out.append(Difference("statement", f"{key}: {here} in one run, {there} in the other."))
    return out


def _kind(a: Frame, b: Frame) -> Difference | None:
    if a.kind == b.kind:
        return None
    return Difference("kind of frame", f"One frame is {_article(a.kind)}, the other {_article(b.kind)}.")


def _article(kind: str) -> str:
    return {"instant": "an instant", "mean": "a mean", "maximum": "a maximum"}[kind]
