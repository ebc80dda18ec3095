"""Whether the run conserves water: sections along the reach, flow through walls, storage, envelopes of maxima."""

from __future__ import annotations

import numpy as np

from ..figure import Figure, percent
from ..ledger.frames import depth_rate
from ..reach import CentreLine
from .finding import Finding, Material, first_of_each, point

WALL_SHARE = 0.01  # of the through-discharge
SOURCE_SHARE = 0.01
UNEXPLAINED = 0.05  # share of the flow's size that nothing explains
BROKEN = 0.25


def mass_findings(m: Material) -> list[Finding]:
    """Findings on the water balance, in the frames that stand for the run."""
    if "maximum" in m.run.times.kinds:
        return [_maxima()]
    out: list[Finding] = []
    for index in m.chosen():
        out += _frame(m, index)
    return [*first_of_each(out), *_storage(m)]


def _maxima() -> Finding:
    return Finding(
        "maximum envelope", "ask", "The frames hold maxima over time, not the flow of one moment.",
        "Maxima of different moments do not belong together: psi, tracks, heads and products are refused.",
        "Please send instants, or means over a stated interval.",
    )


def _frame(m: Material, index: int) -> list[Finding]:
    sf = m.sf(index)
    frame = sf.frame
    out = []
    if sf.misfit.unexplained > UNEXPLAINED:
        worst = int(np.argmax(sf.triangle_misfit))
        at = frame.mesh.triangle_centroid[worst]
        out.append(Finding(
            "no continuity", "resolve before use" if sf.misfit.unexplained > BROKEN else "ask",
            f"{percent(sf.misfit.unexplained, 1)} of the flow in frame {index} is explained by no stream function; it is worst at {m.where(at)}.",
            "A flow of one moment, or a mean, conserves water; an envelope of maxima, a mirrored component or wrong units do not.",
            "Are these maxima over time? Are both velocity components in the same axes and units? How were they made from the model's own fluxes?",
            Figure("unexplained misfit", sf.misfit.unexplained, "-", place=m.place(at)), point(at), index,
        ))
    return out + _walls(m, index) + _sections(m, index)


def _walls(m: Material, index: int) -> list[Finding]:
    """Edges that no open boundary holds and that water crosses all the same."""
    sf = m.sf(index)
    frame = sf.frame
    mesh = frame.mesh
    edges = np.setdiff1d(mesh.boundary_edges, np.concatenate([b.edges for b in sf.open_boundaries]) if sf.open_boundaries else [])
    if frame.edge_discharge is not None:
        flux = np.abs(frame.edge_discharge[edges])
    else:
        a, b = mesh.node_xy[mesh.edge_nodes[edges]].transpose(1, 0, 2)
        face = mesh.edge_faces[edges].max(axis=1)
        q = frame.face_unit_discharge[face]
        flux = np.abs(q[:, 0] * (b - a)[:, 1] - q[:, 1] * (b - a)[:, 0])
    limit = WALL_SHARE * sf.through_discharge_m3_s
    middle = mesh.node_xy[mesh.edge_nodes[edges]].mean(axis=1)
    if not flux.size or flux.max() <= limit / 3:
        return []
    i = int(flux.argmax())
    near = np.hypot(*(middle - middle[i]).T) < 5 * mesh.edge_length[edges[i]]
    total = float(flux[near].sum())
    if total <= limit:
        return []
    return [Finding(
        "leaking wall", "resolve before use", f"{total:.2f} m3/s crosses the wall at {m.where(middle[i])}, where no open boundary is.",
        "Water leaves or enters where none should; psi cannot hold it.", "Is there a boundary condition or a source at that place?",
        Figure("flow through the wall", total, "m3/s", place=m.place(middle[i])), point(middle[i]), index,
    )]


def _sections(m: Material, index: int) -> list[Finding]:
    """Discharge along automatic sections against what boundaries bring in and storage takes up."""
    centre = m.reach.centre_line
    sf = m.sf(index)
    frame = sf.frame
    if centre is None or not sf.through_discharge_m3_s > 0:
        return []
    rate = depth_rate(m.run, index, frame) if m.run.n_frames > 1 else None
    rows = np.column_stack([m.gauges.chainage, m.gauges.surplus(sf, rate)])
    return _steps(m, centre, index, rows, m.spacing_m) if len(rows) > 4 else []


def _steps(m: Material, centre: CentreLine, index: int, rows: np.ndarray, spacing: float) -> list[Finding]:
    """Lasting steps of the surplus along the chainage: the mean of three sections after minus three before."""
    sf = m.sf(index)
    chainage, surplus = rows.T
    best, at = 0.0, None
    for i in range(2, len(surplus) - 2):
        step = float(np.median(surplus[i : i + 3]) - np.median(surplus[max(i - 3, 0) : i]))
        if abs(step) > abs(best):
            best, at = step, (chainage[i - 1] + chainage[i]) / 2
    noise = float(np.median(np.abs(np.diff(surplus))))
    # Storage is known only as well as neighbouring frames tell it: half of it may be wrong.
    least = max(SOURCE_SHARE * sf.through_discharge_m3_s, 6 * noise) + 0.5 * abs(sf.storage_m3_s or 0.0)
    if at is None or abs(best) <= least:
        return []
    xy = centre.at(np.array([at]))[0]
    word = "appear" if best > 0 else "vanish"
    return [Finding(
        "undeclared source", "resolve before use",
        f"{abs(best):.2f} m3/s {word} near chainage {at:.0f} m (within {spacing:.0f} m), in frame {index}, and no boundary explains it.",
        "A source, sink or link that the file does not name acts there, or the stored velocities do not conserve water.",
        "What enters or leaves the model there: a tributary, a culvert, rain, infiltration?",
        Figure("discharge step", best, "m3/s", place=m.place(xy)), point(xy), index,
    )]


def _storage(m: Material) -> list[Finding]:
    """Rise of the stored volume between frames against inflow minus outflow: a reversed time turns its sign."""
    run = m.run
    if run.n_frames < 4 or "mean" in run.times.kinds:
        return []
    index = [int(i) for i in np.unique(np.linspace(0, run.n_frames - 1, min(run.n_frames, 21)).astype(int))]
    volume = np.array([float(run.frame(i).face_depth @ run.mesh.face_area) for i in index])
    net = np.array([_net(m, i) for i in index])
    t = run.times.seconds[index]
    gained = np.diff(volume)
    brought = np.diff(t) * (net[1:] + net[:-1]) / 2
    through = max(m.sf(m.chosen()[-1]).through_discharge_m3_s, 1e-12)
    if np.abs(gained).sum() < 0.02 * through * (t[-1] - t[0]):
        return []
    slope = float(gained @ brought / max(gained @ gained, 1e-300))
    if slope > 0.3:
        return []
    words = "the volume falls while more flows in than out" if slope < -0.3 else "the stored volume does not follow inflow minus outflow"
    return [Finding(
        "storage against flow", "resolve before use", f"Over the run {words} (slope {slope:.2f}; 1 where water is conserved).",
        "Time runs backwards in the file, frames are out of order, or depth and velocity are of different times.",
        "In which order were the frames written, and are depth and velocity of the same instant?", Figure("storage slope", slope, "-"),
    )]


def _net(m: Material, index: int) -> float:
    sf = m.sf(index)
    return sf.inflow_m3_s - sf.outflow_m3_s
