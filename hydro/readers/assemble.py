"""From fields in the file's own numbering to a run: which field becomes what, derived by one rule for every door."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from ..frame import RawFrame, face_bed_and_node_bed, flow_from_edges, of_corners, to_nodes
from ..mesh import Mesh
from ..run import Note, Run, StoredLevel, TimeAxis
from ..settings import Settings
from . import faults
from .crs import Ground
from .mapping import Said


@dataclass(frozen=True, slots=True)
class Asked:
    """What the caller asked every door for: mapping, settings, local origin, kind of frame, label."""

    said: Said
    settings: Settings
    origin: tuple[float, float] | None = None
    kind: str | None = None
    name: str | None = None


@dataclass(frozen=True, eq=False)
class Field:
    """A quantity on nodes, faces or edges.

    ``read(i, places)`` gives a new array of its values at frame i, SI, NaN where missing, at the places
    (k,) that are listed by the file's numbers.
    """

    name: str
    location: str
    read: Callable[[int, np.ndarray], np.ndarray]
    per_length: bool = False


@dataclass(frozen=True, eq=False)
class Parts:
    """What a door found: everything that a run is made of. ``fields`` by quantity; bed as node bed and face bed."""

    name: str
    files: tuple[Path, ...]
    mesh: Mesh
    fields: dict[str, Field]
    times: TimeAxis
    ground: Ground
    settings: Settings
    depth_is: str
    notes: list[Note] = field(default_factory=list)
    boundary_sets: dict[str, np.ndarray] = field(default_factory=dict)
    statements: dict[str, str] = field(default_factory=dict)

    @property
    def file(self) -> str:
        """For messages."""
        return self.files[0].name if len(self.files) == 1 else f"{self.files[0].name} and {len(self.files) - 1} more"


def make_run(parts: Parts) -> Run:
    """A run, its first frame checked.

    Raises ``ValueError`` for what is missing (bed, depth or level, velocity), for values that are
    missing throughout, and for values that no river has.
    """
    node_bed, face_bed = _bed(parts)
    frames = _Frames(parts, node_bed, face_bed)
    parts.notes.extend(_derivations(parts))
    first = frames(0)
    parts.notes.extend(faults.check_frame(parts.mesh, first, parts.settings["wet_depth_m"]))
    return Run(
        parts.name, parts.files, parts.mesh, parts.times, node_bed, face_bed, parts.ground.crs, parts.ground.datum,
        frames, parts.settings, _roughness(parts), parts.boundary_sets, (*parts.ground.notes, *parts.notes), parts.depth_is,
        parts.statements, stored_level=_stored_level(parts),
    )


@dataclass(frozen=True, eq=False)
class _Flow:
    """The components of the flow (none: edge discharges alone) and whether they are velocities."""

    components: tuple[Field, ...]
    of_velocity: bool

    @property
    def stored_on(self) -> str:
        return self.components[0].location if self.components else "edge"

    @property
    def place(self) -> str:
        """Where depth must stand with it."""
        return "node" if self.stored_on == "node" else "face"


def _flow(parts: Parts) -> _Flow:
    """Unit discharge before velocity before edge discharge alone."""
    for kind in ("unit_discharge", "velocity"):
        x, y = (parts.fields.get(f"{kind}_{axis}") for axis in "xy")
        if x is not None and y is not None:
            if x.location != y.location or x.location == "edge":
                raise ValueError(
                    f"{parts.file}: {x.name} stands on {x.location}s and {y.name} on {y.location}s; export both "
                    "components "
                    "on faces (or both on nodes)."
                )
            return _Flow((x, y), kind == "velocity")
        one = x or y
        if one is not None:
            there, lacking = "xy" if x is not None else "yx"
            raise ValueError(
                f"{parts.file}: {kind.replace('_', ' ')} has its {there} component ({one.name}) but not {lacking}; "
                "export "
                f"both, or name it with mapping.{kind}_{lacking}.variable."
            )
    if "edge_discharge" in parts.fields:
        return _Flow((), False)
    raise ValueError(
        f"{parts.file} has no velocity, unit discharge or edge discharge that can be recognised; export one, or name "
        "it "
        "with mapping.velocity_x.variable and mapping.velocity_y.variable."
    )


def _water(parts: Parts, flow: _Flow) -> Field:
    """The field that depth comes from: depth itself, else level."""
    source = parts.fields.get("depth") or parts.fields.get("level")
    if source is None:
        what = "velocity" if flow.of_velocity else "discharge"
        raise ValueError(
            f"{parts.file} has {what} but neither depth nor water level that can be recognised; export one, or name it "
            "with "
            "mapping.depth.variable or mapping.level.variable."
        )
    if source.location == "edge":
        raise ValueError(f"{parts.file}: {source.name} stands on edges; export depth or level on faces or nodes.")
    return source


class _Frames:
    """Raw frames of a run, one at a time."""

    def __init__(self, parts: Parts, node_bed: np.ndarray, face_bed: np.ndarray) -> None:
        self._file, self._mesh = parts.file, parts.mesh
        self._bed = {"node": node_bed, "face": face_bed}
        self._wet = parts.settings["wet_depth_m"]
        self._flow = _flow(parts)
        self._water = _water(parts, self._flow)
        self._from_level = "depth" not in parts.fields
        self._edge = parts.fields.get("edge_discharge")

    def __call__(self, index: int) -> RawFrame:
        stored_on, components = self._flow.stored_on, self._flow.components
        with ThreadPoolExecutor(2) as side_by_side:
            read = [side_by_side.submit(self._read, f, index) for f in components]
            depth = self._depth(index)
            edge = self._edge_discharge(index)
            values = [r.result() for r in read]
        if edge is not None and self._edge is not None:
            faults.check_edge_flow(self._file, self._edge.name, self._mesh, index, edge)
        if not components:
            return RawFrame(stored_on, depth, None, edge)
        if self._flow.of_velocity:
            faults.check_velocity(self._file, components[0].name, index, values, depth > self._wet)
        flow = np.empty((len(depth), 2))
        with np.errstate(over="ignore", invalid="ignore"):  # a fill value may be too large; that is told below
            for k, value in enumerate(values):
                np.multiply(value, depth if self._flow.of_velocity else 1.0, out=flow[:, k])
        dry = depth == 0
        if dry.any():
            flow[dry] = 0.0  # whatever the file holds there, NaN too
        faults.check_flow(self._file, self._mesh, stored_on, index, flow, depth, self._wet)
        return RawFrame(stored_on, depth, flow, edge)

    def _read(self, f: Field, index: int) -> np.ndarray:
        return f.read(index, _order(self._mesh, f.location))

    def _depth(self, index: int) -> np.ndarray:
        """Depth where the flow stands, m; 0 where it is missing or negative."""
        source = self._water
        values = self._read(source, index)
        if self._from_level:
            values -= self._bed[source.location]
        depth = np.fmax(values, 0.0)  # fmax takes the number where the other is missing
        faults.check_depth(self._file, self._mesh, source.location, index, depth)
        if source.location == self._flow.place:
            return depth
        if source.location == "node":
            return self._mesh.triangle_to_face(of_corners(self._mesh, depth))
        level = (depth + self._bed["face"])[:, None]
        at_nodes = to_nodes(self._mesh, level, depth > self._wet)[:, 0] - self._bed["node"]
        return np.fmax(at_nodes, 0.0)

    def _edge_discharge(self, index: int) -> np.ndarray | None:
        if self._edge is None:
            return None
        values = np.nan_to_num(self._read(self._edge, index))
        return values * self._mesh.edge_length if self._edge.per_length else values


def _derivations(parts: Parts) -> list[Note]:
    """What is derived and by which rule, for the reader of the figures."""
    flow = _flow(parts)
    source, level = _water(parts, flow), parts.fields.get("level")
    notes = []
    if "depth" not in parts.fields:
        notes.append(Note("depth = level - bed, 0 where negative or missing", source.name))
    elif level is None:
        notes.append(Note("level = bed + depth", source.name))
    else:
        notes.append(Note(f"level = bed + depth; the file's own level {level.name} is kept for the audit alone", source.name))
    if source.location != flow.place:
        rule = "the area mean of nodes" if flow.place == "face" else "carried from faces exactly for linear fields"
        text = f"{source.name} stands on {source.location}s and the flow on {flow.stored_on}s: depth is {rule}"
        notes.append(Note(text, source.name))
    edge = parts.fields.get("edge_discharge")
    if flow.of_velocity:
        notes.append(Note("unit discharge = depth x velocity", flow.components[0].name))
    elif flow.components:
        notes.append(Note("velocity = unit discharge / depth", flow.components[0].name))
    elif edge is not None:
        notes.append(Note("unit discharge of faces from the discharges of their edges", edge.name))
    if edge is not None:
        text = "edge discharge counts positive from left to right of an edge, walking from its first node to its second"
        notes.append(Note(text, edge.name))
    return notes


def _stored_level(parts: Parts) -> StoredLevel | None:
    """The file's level, where depth is what the run is made of."""
    level, depth = parts.fields.get("level"), parts.fields.get("depth")
    if level is None or depth is None or level.location == "edge":
        return None
    read, order = level.read, _order(parts.mesh, level.location)
    beside = level.location == depth.location == _flow(parts).place
    return StoredLevel(level.name, level.location, lambda index: read(index, order), beside)


def _order(mesh: Mesh, location: str) -> np.ndarray:
    return {"node": mesh.file_node, "face": mesh.file_face, "edge": mesh.file_edge}[location]


def _bed(parts: Parts) -> tuple[np.ndarray, np.ndarray]:
    """Node and face bed, m; from level and depth where the file has no bed."""
    mesh, fields = parts.mesh, parts.fields
    given: dict[str, np.ndarray] = {}
    for location in ("node", "face"):
        f = fields.get(f"{location} bed")
        if f is not None:
            given[location] = f.read(0, _order(mesh, location))
            faults.check_bed(parts.file, f.name, location, given[location], mesh)
    if not given:
        depth, level = fields.get("depth"), fields.get("level")
        if depth is None or level is None or depth.location != level.location or depth.location == "edge":
            raise ValueError(
                f"{parts.file} has no bed level that can be recognised; export it, or name it with "
                "mapping.bed.variable."
            )
        order = _order(mesh, depth.location)
        derived = level.read(0, order) - depth.read(0, order)
        faults.check_bed(parts.file, f"{level.name} - {depth.name}", depth.location, derived, mesh)
        given[depth.location] = derived
        parts.notes.append(Note("bed = level - depth of the first frame", level.name))
    for location, other in (("node", "face"), ("face", "node")):
        if location not in given:
            rule = {"face": "the area mean of its nodes", "node": "carried from faces exactly for linear fields"}[location]
            parts.notes.append(Note(f"{location} bed is made from the {other} bed: {rule}", ""))
    return face_bed_and_node_bed(mesh, given.get("node"), given.get("face"))


def _roughness(parts: Parts) -> np.ndarray | None:
    """Manning's n of faces; node values give faces their area mean."""
    f = parts.fields.get("roughness")
    if f is None:
        return None
    mesh = parts.mesh
    values = f.read(0, _order(mesh, f.location))
    if f.location == "node":
        values = mesh.triangle_to_face(of_corners(mesh, values))
    faults.check_roughness(parts.file, f.name, values, mesh)
    return values


def check_edge_sense(parts: Parts, run: Run) -> list[Note]:
    """Whether stored edge discharges run with the faces' own flow.

    Raises ``ValueError`` when they clearly run against it.
    """
    first = run.read(0)
    if first.edge_discharge is None or first.unit_discharge is None or first.stored_on != "face":
        return []
    own, theirs = np.nan_to_num(first.unit_discharge), flow_from_edges(run.mesh, first.edge_discharge)
    product = float(np.sum(own * theirs))
    sizes = float(np.sqrt(np.sum(own**2) * np.sum(theirs**2)))
    name = parts.fields["edge_discharge"].name
    if sizes == 0 or product > 0.9 * sizes:
        return []
    if product < -0.5 * sizes:
        raise ValueError(
            f"{parts.file}: {name} runs against the faces' own flow; it seems to count from right to left of its "
            "edges: say "
            'mapping.edge_discharge.positive = "right to left".'
        )
    text = (
        f"edge discharges and the faces' own flow agree only in part (correlation {product / sizes:.2f}); ask which is "
        "right"
    )
    return [Note(text, name)]
