"""The water's surface and speed: spikes at the waterline, supercritical flow and jumps, head that rises, slope against friction."""

from __future__ import annotations

import numpy as np

from ..figure import Figure
from ..reach import CentreLine
from ..section import cut, section_figures
from ..section.fronts import jump_fronts
from .finding import Finding, Material, first_of_each, point

SPIKE = 3.0  # times the greatest speed among the faces round it (common practice, no source)
GREATEST_SPEED = 12.0  # m/s; above it, units are doubted (common practice, no source)
GREATEST_DEPTH = 60.0  # m
RISE_M = 0.02
FRICTION_RANGE = (0.25, 4.0)  # slope of the head over Manning's slope


def surface_findings(m: Material) -> list[Finding]:
    """Findings on depth, speed and head in the frames that stand for the run."""
    if "maximum" in m.run.times.kinds:
        return []
    found = []
    for index in m.chosen():
        found += [f for f in (_absurd(m, index), _spike(m, index), _jump(m, index), *_heads(m, index)) if f is not None]
    return first_of_each(found)


def _absurd(m: Material, index: int) -> Finding | None:
    frame = m.run.frame(index)
    speed, depth = np.hypot(*frame.face_velocity.T), frame.face_depth
    fast, deep = float(np.percentile(speed[frame.wet_faces], 99)) if frame.wet_faces.any() else 0.0, float(depth.max())
    if fast <= GREATEST_SPEED and deep <= GREATEST_DEPTH:
        return None
    what = f"a speed of {fast:.1f} m/s" if fast > GREATEST_SPEED else f"a depth of {deep:.0f} m"
    i = int((speed if fast > GREATEST_SPEED else depth).argmax())
    at = frame.mesh.face_centroid[i]
    return Finding(
        "units doubted", "resolve before use", f"Frame {index} has {what}, at {m.where(at)}.", "No river of this size does; the unit of depth or velocity is probably not what the file says.",
        "In which units are depth and velocity stored?", Figure("greatest", fast if fast > GREATEST_SPEED else deep, "m/s or m", place=m.place(at)), point(at), index,
    )


def _spike(m: Material, index: int) -> Finding | None:
    """A shallow face much faster than every wet face that shares a node with it."""
    frame = m.run.frame(index)
    mesh = frame.mesh
    speed = np.hypot(*frame.face_velocity.T)
    shallow = frame.wet_faces & (frame.face_depth < 4 * frame.wet_depth_m)
    start, around = mesh.node_faces
    suspects = np.flatnonzero(shallow & (speed > 2.0))
    for i in suspects[np.argsort(-speed[suspects])]:
        near = np.unique(np.concatenate([around[start[n] : start[n + 1]] for n in mesh.face_nodes[i][: mesh.face_count[i]]]))
        near = near[(near != i) & frame.wet_faces[near]]
        if near.size and speed[i] > SPIKE * speed[near].max():
            at = mesh.face_centroid[i]
            return Finding(
                "speed spike", "ask", f"Frame {index} has {speed[i]:.1f} m/s in {frame.face_depth[i]:.2f} m of water at {m.where(at)}; its neighbours stay under {speed[near].max():.1f} m/s.",
                "Such spikes at the waterline come from the numerics; they do not belong in maxima.", "Which least depth does the model use for velocity?",
                Figure("speed", float(speed[i]), "m/s", place=m.place(at)), point(at), index,
            )
    return None


def _jump(m: Material, index: int) -> Finding | None:
    frame = m.run.frame(index)
    froude = np.where(frame.wet_faces, np.hypot(*frame.face_velocity.T) / np.sqrt(9.81 * np.maximum(frame.face_depth, 1e-9)), 0)
    fast = (froude > 1) & (frame.face_depth > 2 * frame.wet_depth_m)
    if not fast.any():
        return None
    area = float(frame.mesh.face_area[fast].sum())
    i = int(np.where(fast, froude * frame.face_depth, 0).argmax())
    at = frame.mesh.face_centroid[i]
    fronts = jump_fronts(frame, gravity=m.run.settings["gravity_m_s2"])
    front = ""
    if fronts:
        f = fronts[0]
        front = f" The longest jump, about {f.length_m:.0f} m, stands at {m.where(f.middle)}, at {f.angle_deg:.0f} degrees to the flow."
    return Finding(
        "supercritical flow", "note",
        f"Flow is faster than its own waves on {area:.0f} m2 in frame {index}, most at {m.where(at)} (Froude {froude[i]:.1f}).{front}",
        "Levels there do not feel the downstream side; a jump follows, which a depth-averaged model shows without its roller.",
        "Does the mesh resolve the jump, and is the drowning hazard assessed by a specialist?", Figure("Froude number", float(froude[i]), "-", cautions=("no-roller",), place=m.place(at)), point(at), index,
    )


def _heads(m: Material, index: int) -> list[Finding]:
    """Section head along the chainage: it may not rise in steady flow, and its slope is that of friction."""
    centre = m.reach.centre_line
    if centre is None:
        return []
    frame = m.run.frame(index)
    rows = []
    for chainage, line in m.sections():
        try:
            f = section_figures(cut(frame, line))
        except ValueError:  # the line falls between two arms of the mesh
            continue
        if f.head_m is not None and abs(f.discharge_m3_s) > 0 and f.mean_depth_m:
            rows.append((chainage, f.head_m, f.mean_velocity_m_s, f.mean_depth_m))
    if len(rows) < 5:
        return []
    table = np.array(rows, float)
    found = [_friction(m, index, table)]
    if frame.kind == "mean" or m.run.n_frames == 1:
        found.append(_rise(m, centre, index, table))
    return [f for f in found if f is not None]


def _rise(m: Material, centre: CentreLine, index: int, rows: np.ndarray) -> Finding | None:
    step = np.diff(rows[:, 1])
    i = int(step.argmax())
    if step[i] <= RISE_M:
        return None
    at = centre.at(np.array([(rows[i, 0] + rows[i + 1, 0]) / 2]))[0]
    return Finding(
        "head rises", "resolve before use", f"The section head rises by {step[i]:.3f} m between chainage {rows[i, 0]:.0f} m and {rows[i + 1, 0]:.0f} m.",
        "In steady flow the head of the whole section falls downstream: bed, datum or depth has a step there.", "Do bed and level share one datum on both sides?",
        Figure("rise of head", float(step[i]), "m", place=m.place(at)), point(at), index,
    )


def _friction(m: Material, index: int, rows: np.ndarray) -> Finding | None:
    """Median slope of the head over Manning's slope with the run's own roughness."""
    if m.run.roughness is None:
        return None
    n = float(np.median(m.run.roughness))
    local = -np.diff(rows[:, 1]) / np.diff(rows[:, 0])
    v, h = (rows[1:, k] + rows[:-1, k] for k in (2, 3))
    due = n**2 * (v / 2) ** 2 / (h / 2) ** (4 / 3)
    ratio = float(np.median(local) / np.median(due))
    if FRICTION_RANGE[0] <= ratio <= FRICTION_RANGE[1]:
        return None
    return Finding(
        "slope against friction", "resolve before use",
        f"The head falls {ratio:.2g} times as fast as Manning's n of {n:.3f} asks for, by the median of sections.",
        "Speed, depth or roughness is in another unit than stated, or the levels are not those of this flow.", "In which units are velocity, depth and roughness?",
        Figure("slope over friction slope", ratio, "-"), frame=index,
    )
