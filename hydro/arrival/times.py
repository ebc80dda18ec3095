"""Time: gaps, frozen frames, spacing against the shedding period of each pier, drift of a steady run."""

from __future__ import annotations

import numpy as np

from ..figure import Figure, signed
from .finding import Finding, Material, fullest, point
from .mesh import short_side

STROUHAL = 0.2  # Williamson 1996 for a cylinder (from memory); the range is 0.12 to 0.27 with shape and blockage
PER_PERIOD = 10
DRIFT_SHARE = 0.01


def time_findings(m: Material) -> list[Finding]:
    """Findings on the times of the frames."""
    found = [_gap(m), _frozen(m), *_shedding(m), _drift(m)]
    return [f for f in found if f is not None]


def _gap(m: Material) -> Finding | None:
    """A gap of about a whole multiple of the spacing on both of its sides: frames are missing."""
    s = m.run.times.seconds
    if len(s) < 5:
        return None
    gaps = np.diff(s)
    beside = np.array([min(gaps[max(i - 1, 0)], gaps[min(i + 1, len(gaps) - 1)]) for i in range(len(gaps))])
    long = gaps > 1.5 * np.maximum(beside, np.median(gaps))
    if not long.any():
        return None
    i = int(np.where(long, gaps, 0).argmax())
    return Finding(
        "missing frames", "ask", f"Frames {i} and {i + 1} stand {gaps[i]:g} s apart; their neighbours {beside[i]:g} s. About {round(gaps[i] / beside[i]) - 1:g} seem to be missing.",
        "What happened in between is not in the file.", "Please send the frames in between.", Figure("gap", float(gaps[i]), "s"), frame=i,
    )


def _frozen(m: Material) -> Finding | None:
    """Two successive frames that are the same to the last digit while the others change."""
    run = m.run
    if run.n_frames < 3:
        return None
    same, last = [], run.frame(0)
    for i in range(1, run.n_frames):
        here = run.frame(i)
        if np.array_equal(here.face_depth, last.face_depth) and np.array_equal(here.face_unit_discharge, last.face_unit_discharge):
            same.append(i)
        last = here
    if not same or len(same) == run.n_frames - 1:
        return None
    return Finding(
        "frozen frame", "resolve before use", f"Frame {same[0]} repeats frame {same[0] - 1} to the last digit (and {len(same) - 1} more).",
        "The output was written twice, or the model stood still.", "Why do these frames repeat?", Figure("repeated frames", float(len(same)), ""), frame=same[0],
    )


def expected_period(m: Material, structure) -> tuple[float, float] | None:
    """Shedding period of a pier, s, and the approach speed, m/s: W / (St U) with St 0.2.

    The width is the outline's extent normal to the mean flow two widths upstream, at the fullest frame.
    """
    import shapely

    frame = m.run.frame(fullest(m.run))
    width = short_side(structure.geometry)
    ring = structure.geometry.buffer(3 * width).difference(structure.geometry.buffer(width))
    shapely.prepare(ring)
    near = shapely.contains_xy(ring, *frame.mesh.face_centroid.T) & frame.wet_faces
    if not near.any():
        return None
    mean = (frame.face_unit_discharge[near] * frame.mesh.face_area[near, None]).sum(axis=0)
    depth = float((frame.face_depth * frame.mesh.face_area)[near].sum())
    speed = float(np.hypot(*mean)) / depth
    if speed < 1e-3:
        return None
    across = np.array([-mean[1], mean[0]]) / np.hypot(*mean)
    extent = float(np.ptp(np.asarray(structure.geometry.exterior.coords)[:, :2] @ across))
    return extent / (STROUHAL * speed), speed


def _shedding(m: Material) -> list[Finding]:
    out = []
    s = m.run.times.seconds
    gap = float(np.median(np.diff(s))) if len(s) > 1 else None
    for pier in (p for p in m.reach.structures if p.kind == "pier" and p.geometry.geom_type == "Polygon"):
        period = expected_period(m, pier)
        if period is None:
            continue
        at = np.asarray(pier.geometry.centroid.coords[0])
        if m.run.n_frames == 1 and m.run.times.kinds[0] == "instant":
            out.append(Finding(
                "one instant", "ask", f"One instant is given; behind {pier.name} eddies may be shed about every {period[0]:.0f} s.",
                "A single instant is one of many; its eddies are not those of the mean flow.", "Is the flow steady behind the piers? Please send a mean over at least five periods.",
                Figure("expected period", period[0], "s", place=m.place(at)), point(at),
            ))
        elif gap is not None and "instant" in m.run.times.kinds and gap > period[0] / PER_PERIOD and s[-1] - s[0] > period[0]:
            out.append(Finding(
                "frames too far apart", "note", f"Frames are {gap:g} s apart; eddies behind {pier.name} may be shed about every {period[0]:.0f} s.",
                "Single eddies cannot be followed from frame to frame there.", f"Can a burst be sent with a frame every {period[0] / PER_PERIOD:.1f} s over six periods?",
                Figure("expected period", period[0], "s", place=m.place(at)), point(at),
            ))
    return out


def _drift(m: Material) -> Finding | None:
    """One mean or several: whether inflow still differs from outflow."""
    if m.run.n_frames > 1 or m.run.times.kinds[0] == "maximum":
        return None
    sf = m.sf(0)
    if not sf.through_discharge_m3_s > 0:
        return None
    apart = (sf.outflow_m3_s - sf.inflow_m3_s) / sf.through_discharge_m3_s
    if abs(apart) <= DRIFT_SHARE:
        return None
    return Finding(
        "not steady", "ask", f"Outflow differs from inflow by {signed(100 * apart, 1)} % in the only frame.",
        "The run is still filling or emptying, or does not conserve water.", "How long did the run go on, and had it settled?",
        Figure("outflow minus inflow", apart, "-"), frame=0,
    )
