"""Time stepping in one compiled loop: Heun's method, changing inflow, the rated outlet and the culvert."""

from __future__ import annotations

import math

import numpy as np
from numba import njit

from . import flow
from .flow import RIVER, TRIBUTARY, G


@njit(cache=True)
def interpolated(t, times, values):
    """Linear between times, constant beyond."""
    if t <= times[0]:
        return values[0]
    for k in range(1, len(times)):
        if t <= times[k]:
            return values[k - 1] + (values[k] - values[k - 1]) * (t - times[k - 1]) / (times[k] - times[k - 1])
    return values[-1]


@njit(cache=True, error_model="numpy")
def share_inflow(h, roughness, left, length, kind, discharge, group, inflow):
    """Unit inflow at each edge of one group, m2/s, as h^(5/3)/n; the sum is the discharge exactly."""
    total = 0.0
    for e in range(len(kind)):
        if kind[e] == group:
            i = left[e]
            inflow[e] = max(h[i], 1e-3) ** (5 / 3) / roughness[i]
            total += inflow[e] * length[e]
    for e in range(len(kind)):
        if kind[e] == group:
            inflow[e] *= discharge / total


@njit(cache=True, error_model="numpy")
def culvert_discharge(h, bed, link, area, loss):
    """Discharge of a full pipe, m3/s: area sqrt(2 g fall / loss), 0 without fall, less when the inlet is shallow."""
    if link[0] < 0:
        return 0.0
    i, j = link[0], link[1]
    fall = bed[i] + h[i] - bed[j] - h[j]
    if fall <= 0:
        return 0.0
    diameter = math.sqrt(4 * area / math.pi)
    return area * math.sqrt(2 * G * fall / loss) * min(h[i] / diameter, 1.0) ** 2


@njit(cache=True, error_model="numpy")
def march(
    h, hu, hv, bed, roughness, alpha, courant, mesh, link, link_area, link_loss, drive, outlet, state, t_end, work, sums
):
    """Advance the state from ``state[0]`` to ``t_end`` exactly.

    ``mesh``: tuple of arrays (see solver.Model.mesh); ``drive``: times and the two inflows; ``outlet``:
    discharges and levels of the rating. ``state``: time, relaxed outflow, volume in, volume out, volume
    added by clipping, steps, longest step allowed, culvert discharge, culvert volume. ``sums``: depth x dt,
    edge discharge x dt, and the last step's edge discharge. Returns 0, or 1 when the step collapsed.
    """
    start, near, wx, wy, arm, kind, left, right, normal, length, middle, centre, area, cell_edge, cell_side = mesh
    value, slope, nu, flux, pace, inflow, h1, hu1, hv1, h2, hu2, hv2, first_flux = work
    sum_h, sum_q, last_q = sums
    while state[0] < t_end - 1e-9:
        river = interpolated(state[0], drive[0], drive[1])
        side = interpolated(state[0], drive[0], drive[2])
        share_inflow(h, roughness, left, length, kind, river, RIVER, inflow)
        share_inflow(h, roughness, left, length, kind, side, TRIBUTARY, inflow)
        level = interpolated(state[1], outlet[0], outlet[1])
        pipe = culvert_discharge(h, bed, link, link_area, link_loss)
        flow.gradients(h, hu, hv, bed, start, near, wx, wy, arm, value, slope)
        flow.eddy_viscosity(h, value, roughness, alpha, nu)
        flow.edge_fluxes(value, slope, nu, kind, left, right, normal, length, middle, centre, inflow, level, flux, pace)
        dt = flow.time_step(area, cell_edge, length, pace, courant)
        if not dt > 1e-7:
            return 1
        state[6] = dt
        dt = min(dt, t_end - state[0])
        if link[0] >= 0:
            pipe = min(pipe, 0.2 * h[link[0]] * area[link[0]] / dt)
        first_flux[:] = flux[:, 0]
        added = 0.5 * flow.update(h, hu, hv, flux, dt, area, cell_edge, cell_side, length, roughness, h1, hu1, hv1)
        convey(h1, hu1, hv1, area, link, pipe * dt)
        flow.gradients(h1, hu1, hv1, bed, start, near, wx, wy, arm, value, slope)
        flow.edge_fluxes(value, slope, nu, kind, left, right, normal, length, middle, centre, inflow, level, flux, pace)
        added += 0.5 * flow.update(h1, hu1, hv1, flux, dt, area, cell_edge, cell_side, length, roughness, h2, hu2, hv2)
        convey(h2, hu2, hv2, area, link, pipe * dt)
        for i in range(len(h)):
            h[i], hu[i], hv[i] = 0.5 * (h[i] + h2[i]), 0.5 * (hu[i] + hu2[i]), 0.5 * (hv[i] + hv2[i])
            sum_h[i] += h[i] * dt
        out = tally(kind, first_flux, flux, length, dt, sum_q, last_q, state)
        state[0] += dt
        state[1] += (out - state[1]) * min(dt / 20.0, 1.0)
        state[4] += added
        state[5] += 1
        state[7] = pipe
        state[8] += pipe * dt
    return 0


@njit(cache=True)
def convey(h, hu, hv, area, link, volume):
    """Take a volume out of the culvert's inlet cell, with its momentum, and lay it at rest in the outlet cell."""
    if link[0] < 0 or volume <= 0:
        return
    i, j = link[0], link[1]
    left_over = 1 - volume / area[i] / h[i]
    h[i] -= volume / area[i]
    hu[i] *= left_over
    hv[i] *= left_over
    h[j] += volume / area[j]


@njit(cache=True)
def tally(kind, first_flux, flux, length, dt, sum_q, last_q, state):
    """Add up the discharge through each edge as Heun's method used it; returns the outflow, m3/s."""
    out = 0.0
    for e in range(len(kind)):
        q = 0.5 * (first_flux[e] + flux[e, 0]) * length[e]
        last_q[e] = q
        sum_q[e] += q * dt
        if kind[e] == flow.OUTFLOW:
            out += q
        if kind[e] != flow.INTERIOR:
            state[2] -= min(q, 0.0) * dt
            state[3] += max(q, 0.0) * dt
    return out


def work_arrays(cells: int, edges: int) -> tuple[np.ndarray, ...]:
    """Scratch space for :func:`march`."""
    shapes = [(cells, 4), (cells, 4, 2), (cells,), (edges, 5), (edges,), (edges,)] + [(cells,)] * 6 + [(edges,)]
    return tuple(np.zeros(s) for s in shapes)
