"""Compiled loops of the shallow-water solver: gradients, edge fluxes, cell updates, time steps.

State is depth h (m) and unit discharge hu, hv (m2/s) at cell centroids. Godunov's method with
linear reconstruction, HLLC fluxes (Toro 2001) and hydrostatic reconstruction (Audusse et al. 2004).
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit

G = 9.81  # m/s2
DRY = 1e-3  # m; below this a cell has no slope and no velocity
INTERIOR, WALL, RIVER, TRIBUTARY, OUTFLOW, PIER = 0, 1, 2, 3, 4, 5


@njit(cache=True, error_model="numpy")
def gradients(h, hu, hv, bed, start, near, wx, wy, cell_edge_arm, value, slope):
    """Level, depth, u and v of each cell and their gradients by least squares over cells that share a node.

    ``value`` (n, 4) and ``slope`` (n, 4, 2) are filled. Level and depth are limited so that no edge
    midpoint leaves the range of the neighbours (Barth & Jespersen 1989); beside dry cells all is flat.
    """
    n = len(h)
    for i in range(n):
        value[i, 0], value[i, 1] = bed[i] + h[i], h[i]
        wet = h[i] >= DRY
        value[i, 2] = hu[i] / h[i] if wet else 0.0
        value[i, 3] = hv[i] / h[i] if wet else 0.0
    for i in range(n):
        slope[i] = 0.0
        flat = h[i] < DRY
        for k in range(start[i], start[i + 1]):
            if h[near[k]] < DRY:
                flat = True
                break
        if flat:
            continue
        low0 = high0 = value[i, 0]
        low1 = high1 = value[i, 1]
        for k in range(start[i], start[i + 1]):
            j = near[k]
            for m in range(4):
                d = value[j, m] - value[i, m]
                slope[i, m, 0] += wx[k] * d
                slope[i, m, 1] += wy[k] * d
            low0, high0 = min(low0, value[j, 0]), max(high0, value[j, 0])
            low1, high1 = min(low1, value[j, 1]), max(high1, value[j, 1])
        limit(value, slope, cell_edge_arm, i, 0, low0, high0)
        limit(value, slope, cell_edge_arm, i, 1, low1, high1)


@njit(cache=True, error_model="numpy")
def limit(value, slope, arm, i, m, low, high):
    """Shrink one gradient so that the value at each edge midpoint stays within low and high."""
    share = 1.0
    for k in range(3):
        d = slope[i, m, 0] * arm[i, k, 0] + slope[i, m, 1] * arm[i, k, 1]
        if d > 1e-14:
            share = min(share, (high - value[i, m]) / d)
        elif d < -1e-14:
            share = min(share, (low - value[i, m]) / d)
    slope[i, m, 0] *= share
    slope[i, m, 1] *= share


@njit(cache=True, error_model="numpy", inline="always")
def hllc(hl, ul, vl, hr, ur, vr):
    """Flux of (water, normal momentum, tangential momentum) and the fastest wave, for a flat bed."""
    if hl <= 1e-9 and hr <= 1e-9:
        return 0.0, 0.0, 0.0, 0.0
    cl, cr = math.sqrt(G * hl), math.sqrt(G * hr)
    if hl <= 1e-9:
        sl, sr = ur - 2 * cr, ur + cr
    elif hr <= 1e-9:
        sl, sr = ul - cl, ul + 2 * cl
    else:
        us = 0.5 * (ul + ur) + cl - cr
        cs = abs(0.5 * (cl + cr) + 0.25 * (ul - ur))
        sl, sr = min(ul - cl, us - cs), max(ur + cr, us + cs)
    fast = max(abs(sl), abs(sr))
    ql, qr = hl * ul, hr * ur
    ml, mr = ql * ul + 0.5 * G * hl * hl, qr * ur + 0.5 * G * hr * hr
    if sl >= 0:
        return ql, ml, ql * vl, fast
    if sr <= 0:
        return qr, mr, qr * vr, fast
    q = (sr * ql - sl * qr + sl * sr * (hr - hl)) / (sr - sl)
    m = (sr * ml - sl * mr + sl * sr * (qr - ql)) / (sr - sl)
    return q, m, q * (vl if q > 0 else vr), fast


@njit(cache=True, error_model="numpy")
def eddy_viscosity(h, value, roughness, alpha, nu):
    """nu = alpha h u*, with u* of the bed; resistance above n = 0.05 stands for form drag and stirs nothing."""
    for i in range(len(h)):
        nu[i] = 0.0
        if h[i] >= DRY:
            shear = math.sqrt(G) * min(roughness[i], 0.05) * math.hypot(value[i, 2], value[i, 3]) / h[i] ** (1 / 6)
            nu[i] = alpha * h[i] * shear


@njit(cache=True, error_model="numpy")
def edge_fluxes(value, slope, nu, kind, left, right, normal, length, middle, centre, inflow, outlet_level, flux, pace):
    """Flux through each edge, per metre, from left to right.

    ``flux`` (e, 5): water; momentum (x, y) as the left cell sees it; the same as the right cell sees
    it (they differ by the bed's push). ``pace`` (e,): wave speed plus diffusion, for the time step.
    """
    for e in range(len(left)):
        i, nx, ny = left[e], normal[e, 0], normal[e, 1]
        if value[i, 1] == 0.0 and (kind[e] == WALL or (kind[e] == INTERIOR and value[right[e], 1] == 0.0)):
            flux[e] = 0.0
            pace[e] = 0.0
            continue
        ax, ay = middle[e, 0] - centre[i, 0], middle[e, 1] - centre[i, 1]
        el = value[i, 0] + slope[i, 0, 0] * ax + slope[i, 0, 1] * ay
        hl = max(value[i, 1] + slope[i, 1, 0] * ax + slope[i, 1, 1] * ay, 0.0)
        xl = value[i, 2] + slope[i, 2, 0] * ax + slope[i, 2, 1] * ay
        yl = value[i, 3] + slope[i, 3, 0] * ax + slope[i, 3, 1] * ay
        ul, vl = xl * nx + yl * ny, -xl * ny + yl * nx
        push = 0.5 * G * (hl + value[i, 1]) * (el - value[i, 0])
        if kind[e] == INTERIOR:
            j = right[e]
            bx, by = middle[e, 0] - centre[j, 0], middle[e, 1] - centre[j, 1]
            er = value[j, 0] + slope[j, 0, 0] * bx + slope[j, 0, 1] * by
            hr = max(value[j, 1] + slope[j, 1, 0] * bx + slope[j, 1, 1] * by, 0.0)
            xr = value[j, 2] + slope[j, 2, 0] * bx + slope[j, 2, 1] * by
            yr = value[j, 3] + slope[j, 3, 0] * bx + slope[j, 3, 1] * by
            ur, vr = xr * nx + yr * ny, -xr * ny + yr * nx
            z = max(el - hl, er - hr)
            sl, sr = max(el - z, 0.0), max(er - z, 0.0)
            q, m, t, fast = hllc(sl, ul, vl, sr, ur, vr)
            left_m = m - 0.5 * G * sl * sl + push
            right_m = m - 0.5 * G * sr * sr + 0.5 * G * (hr + value[j, 1]) * (er - value[j, 0])
            # Diffusion along the line of centres, corrected by the mean gradient.
            dx, dy = centre[j, 0] - centre[i, 0], centre[j, 1] - centre[i, 1]
            d2 = dx * dx + dy * dy
            across = (dx * nx + dy * ny) / d2
            share = 0.5 * (nu[i] + nu[j]) * min(sl, sr)
            gx = 0.5 * (slope[i, 2, 0] + slope[j, 2, 0])
            gy = 0.5 * (slope[i, 2, 1] + slope[j, 2, 1])
            fx = -share * (gx * nx + gy * ny + (value[j, 2] - value[i, 2] - gx * dx - gy * dy) * across)
            gx = 0.5 * (slope[i, 3, 0] + slope[j, 3, 0])
            gy = 0.5 * (slope[i, 3, 1] + slope[j, 3, 1])
            fy = -share * (gx * nx + gy * ny + (value[j, 3] - value[i, 3] - gx * dx - gy * dy) * across)
            flux[e, 0] = q
            flux[e, 1], flux[e, 2] = left_m * nx - t * ny + fx, left_m * ny + t * nx + fy
            flux[e, 3], flux[e, 4] = right_m * nx - t * ny + fx, right_m * ny + t * nx + fy
            pace[e] = fast + (nu[i] + nu[j]) * across
            continue
        q, m, t, fast, drag = boundary(kind[e], hl, el, ul, vl, inflow[e], outlet_level)
        if kind[e] == PIER and hl > DRY:
            distance = abs(ax * nx + ay * ny)
            t = nu[i] * hl * (-value[i, 2] * ny + value[i, 3] * nx) / distance
            drag = nu[i] / distance
        left_m = m - 0.5 * G * hl * hl + push
        flux[e, 0] = q
        flux[e, 1], flux[e, 2] = left_m * nx - t * ny, left_m * ny + t * nx
        pace[e] = fast + 2 * drag


@njit(cache=True, error_model="numpy", inline="always")
def boundary(kind, h, level, u, v, inflow, outlet_level):
    """Water, normal momentum, tangential momentum outward, fastest wave, and a zero for wall drag."""
    c = math.sqrt(G * h)
    if kind == RIVER or kind == TRIBUTARY:
        q = -inflow
        return q, q * q / max(h, DRY) + 0.5 * G * h * h, 0.0, abs(q) / max(h, DRY) + c, 0.0
    if kind == OUTFLOW and h > DRY:
        depth = max(outlet_level - (level - h), 0.0)
        speed = max(u + 2 * (c - math.sqrt(G * depth)), 0.0)  # the outgoing wave's invariant is kept
        q = depth * speed
        return q, q * speed + 0.5 * G * depth * depth, q * v, max(abs(u) + c, speed + math.sqrt(G * depth)), 0.0
    return 0.0, 0.5 * G * h * h, 0.0, abs(u) + c, 0.0


@njit(cache=True, error_model="numpy")
def time_step(area, cell_edge, length, pace, courant):
    """Longest step, s, that the fastest cell allows."""
    most = 0.0
    for i in range(len(area)):
        total = 0.0
        for k in range(3):
            total += length[cell_edge[i, k]] * pace[cell_edge[i, k]]
        most = max(most, total / area[i])
    return 2 * courant / max(most, 1e-12)


@njit(cache=True, error_model="numpy")
def update(h, hu, hv, flux, dt, area, cell_edge, cell_side, length, roughness, out_h, out_hu, out_hv):
    """One explicit stage with friction taken at its end; returns the volume added where a depth fell below 0."""
    added = 0.0
    for i in range(len(h)):
        water = mx = my = 0.0
        for k in range(3):
            e = cell_edge[i, k]
            if cell_side[i, k] == 0:
                water += length[e] * flux[e, 0]
                mx += length[e] * flux[e, 1]
                my += length[e] * flux[e, 2]
            else:
                water -= length[e] * flux[e, 0]
                mx -= length[e] * flux[e, 3]
                my -= length[e] * flux[e, 4]
        depth = h[i] - dt / area[i] * water
        if depth < 0:
            added -= depth * area[i]
            depth = 0.0
        out_h[i] = depth
        if depth < DRY:
            out_hu[i] = out_hv[i] = 0.0
            continue
        speed = math.hypot(hu[i], hv[i]) / max(h[i], DRY)
        slow = 1 + dt * G * roughness[i] ** 2 * speed / (depth * np.cbrt(depth))
        out_hu[i] = (hu[i] - dt / area[i] * mx) / slow
        out_hv[i] = (hv[i] - dt / area[i] * my) / slow
    return added
