"""Flows to check against: closed forms, and a small steady Navier-Stokes solver that shares no code with Leewater.

The solver is scikit-fem's Taylor-Hood pair (velocity quadratic, pressure linear) with Newton steps.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import skfem
from scipy.sparse import bmat, csc_matrix
from scipy.sparse.linalg import splu
from scipy.special import jv
from skfem.helpers import ddot, div, dot, grad, mul


@dataclass(frozen=True)
class Viscous:
    """A steady viscous flow on a mesh whose nodes include the middles of the solver's sides."""

    xy: np.ndarray  # (n, 2)
    triangles: np.ndarray  # (m, 3)
    velocity: np.ndarray  # (n, 2)


def navier_stokes(
    mesh: skfem.MeshTri, viscosity: float, held: dict[str, Callable], *, steps: int = 12, start: float | None = None
) -> Viscous:
    """Steady flow: velocity given on named boundaries, no stress on the others.

    ``held`` maps a boundary's name to a function of x, y that gives u, v (None: left free). ``start`` is a greater viscosity to
    start from.
    """
    space = skfem.Basis(mesh, skfem.ElementVector(skfem.ElementTriP2()), intorder=5)
    pressure = space.with_element(skfem.ElementTriP1())
    viscous = skfem.BilinearForm(lambda u, v, w: ddot(grad(u), grad(v))).assemble(space)
    divergence = skfem.BilinearForm(lambda u, q, w: -div(u) * q).assemble(space, pressure)

    @skfem.BilinearForm
    def carried(u, v, w):
        return dot(mul(grad(w["flow"]), u) + mul(grad(u), w["flow"]), v)

    @skfem.LinearForm
    def carrying(v, w):
        return dot(mul(grad(w["flow"]), w["flow"]), v)

    flow = np.zeros(space.N)
    fixed = []
    for name, function in held.items():
        dofs = space.get_dofs(name)
        for k, part in enumerate(("u^1", "u^2")):
            chosen = np.concatenate([dofs.nodal[part], dofs.facet[part]])
            value = function(*space.doflocs[:, chosen])[k]
            if value is not None:
                flow[chosen] = value
                fixed.append(chosen)
    fixed = np.unique(np.concatenate(fixed))
    n, p = space.N, np.zeros(pressure.N)
    free = np.setdiff1d(np.arange(n + pressure.N), fixed)
    if set(held) >= set(mesh.boundaries):  # pressure is free up to a constant
        free = free[:-1]
    for nu in (None, *([start] if start else []), viscosity):
        for _ in range(steps if nu else 1):
            if nu is None:  # creeping flow to start from
                jacobian, rest = viscous, viscous @ flow + divergence.T @ p
            else:
                at = space.interpolate(flow)
                jacobian = nu * viscous + carried.assemble(space, flow=at)
                rest = nu * viscous @ flow + carrying.assemble(space, flow=at) + divergence.T @ p
            residual = np.concatenate([rest, divergence @ flow])[free]
            matrix = csc_matrix(bmat([[jacobian, divergence.T], [divergence, None]]))[free][:, free]
            change = splu(matrix).solve(-residual)
            whole = np.zeros(n + pressure.N)
            whole[free] = change
            flow, p = flow + whole[:n], p + whole[n:]
            if np.abs(change[: n // 2]).max() < 1e-7:
                break
    return _on_halved_mesh(mesh, space, flow)


def _on_halved_mesh(mesh: skfem.MeshTri, space, flow: np.ndarray) -> Viscous:
    """Each triangle cut in four at the middles of its sides, where the quadratic velocity has its own unknowns."""
    corner, side = mesh.t.T, mesh.t2f.T + mesh.p.shape[1]
    a, b, c = corner.T
    ab, bc, ca = side[:, 0], side[:, 1], side[:, 2]
    triangles = np.concatenate([np.column_stack(t) for t in ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))])
    xy = np.vstack([mesh.p.T, mesh.p[:, mesh.facets].mean(axis=1).T])
    velocity = np.vstack([flow[space.nodal_dofs].T, flow[space.facet_dofs].T])
    return Viscous(xy, triangles, velocity)


def cavity(n: int = 40, reynolds: float = 100.0) -> Viscous:
    """The lid-driven square of side 1, finer towards its walls; the lid at y = 1 moves to the right at speed 1."""
    s = np.linspace(0, np.pi, n + 1)
    x = (1 - np.cos(s)) / 2
    mesh = skfem.MeshTri.init_tensor(x, x).with_boundaries(
        {"lid": lambda p: p[1] > 1 - 1e-12, "walls": lambda p: p[1] <= 1 - 1e-12}
    )
    held = {"lid": lambda x, y: (np.ones_like(x), 0 * x), "walls": lambda x, y: (0 * x, 0 * x)}
    return navier_stokes(mesh, 1 / reynolds, held)


def cylinder_wake(reynolds: float, around: int = 36, outward: int = 36, far: float = 60.0) -> Viscous:
    """Flow to the right past a cylinder of diameter 1 about (0, 0), on half rings out to ``far`` diameters.

    The upper half is computed, with no flow and no drag across y = 0, and mirrored.
    """
    r = 0.5 * (2 * far) ** np.linspace(0, 1, outward + 1)
    s = np.linspace(0, np.pi, around + 1)
    th = s - 0.35 * np.sin(s)  # rays gather behind the cylinder, where the wake is
    ring, ray = (a.ravel() for a in np.meshgrid(np.arange(outward), np.arange(around), indexing="ij"))
    a = ring * (around + 1) + ray
    b, c, d = a + around + 1, a + around + 2, a + 1
    xy = np.stack([np.outer(r, np.cos(th)), np.outer(r, np.sin(th))], axis=-1).reshape(-1, 2)
    xy[np.abs(xy[:, 1]) < 1e-9, 1] = 0.0
    t = np.concatenate([np.column_stack([a, b, c]), np.column_stack([a, c, d])])
    on_axis = lambda p: p[1] < 1e-9  # noqa: E731
    mesh = skfem.MeshTri(np.ascontiguousarray(xy.T), np.ascontiguousarray(t.T)).with_boundaries({
        "axis": on_axis,
        "body": lambda p: (np.hypot(*p) < 1.0) & ~on_axis(p),
        "stream": lambda p: (np.hypot(*p) > 1.0) & (p[0] < 0.7 * far) & ~on_axis(p),
        "away": lambda p: (p[0] >= 0.7 * far) & ~on_axis(p),
    })
    held = {
        "axis": lambda x, y: (None, 0 * x),
        "stream": lambda x, y: (np.ones_like(x), 0 * x),
        "body": lambda x, y: (0 * x, 0 * x),
    }
    return _mirrored(navier_stokes(mesh, 1 / reynolds, held, start=0.1))


def _mirrored(half: Viscous) -> Viscous:
    """A flow above y = 0 together with its mirror image."""
    above = np.flatnonzero(half.xy[:, 1] > 0)
    image = np.arange(len(half.xy))
    image[above] = len(half.xy) + np.arange(len(above))
    flip = np.array([1.0, -1.0])
    return Viscous(
        np.vstack([half.xy, half.xy[above] * flip]),
        np.vstack([half.triangles, image[half.triangles][:, ::-1]]),
        np.vstack([half.velocity, half.velocity[above] * flip]),
    )


def backward_step(cells: int = 8, ratio: float = 1.94, reynolds: float = 100.0) -> Viscous:
    """Channel of height 1 that widens at x = 0 to ``ratio``; parabolic inflow of mean speed 1.

    The Reynolds number stands on twice the inlet's height and the mean speed.
    """
    below = np.linspace(1 - ratio, 0, cells + 1)
    y = np.concatenate([below[:-1], np.linspace(0, 1, cells + 1)])
    x = np.concatenate([np.linspace(-3, 0, 10)[:-1], np.linspace(0, 6, 49)[:-1], np.linspace(6, 16, 25)])
    whole = skfem.MeshTri.init_tensor(x, y)
    centre = whole.p[:, whole.t].mean(axis=1)
    mesh = whole.remove_elements(np.flatnonzero((centre[0] < 0) & (centre[1] < 0))).with_boundaries({
        "inflow": lambda p: p[0] < -3 + 1e-9,
        "outflow": lambda p: p[0] > 16 - 1e-9,
        "walls": lambda p: (p[0] > -3 + 1e-9) & (p[0] < 16 - 1e-9),
    })
    held = {"inflow": lambda x, y: (6 * y * (1 - y), 0 * x), "walls": lambda x, y: (0 * x, 0 * x)}
    return navier_stokes(mesh, 2.0 / reynolds, held)


def chaplygin_psi(stream: float = 1.0, radius: float = 10.0) -> Callable:
    """Stream function of the Lamb-Chaplygin dipole at rest in a stream (Lamb 1895; Chaplygin 1903)."""
    k = 3.831705970207512 / radius

    def psi(x, y):
        r = np.maximum(np.hypot(x, y), 1e-12)
        inside = 2 * stream / (k * jv(0, k * radius)) * jv(1, k * r)
        return np.where(r < radius, inside, stream * (r - radius**2 / r)) * y / r

    return psi


def write_ugrid(path: Path, xy: np.ndarray, faces: np.ndarray, velocity: np.ndarray, depth: float = 1.0) -> Path:
    """A UGRID file with node values at one time."""
    import xarray as xr

    n = len(xy)
    data = xr.Dataset(
        {
            "mesh": ((), np.int32(0), {
                "cf_role": "mesh_topology", "topology_dimension": np.int32(2),
                "node_coordinates": "node_x node_y", "face_node_connectivity": "face_nodes",
            }),
            "node_x": ("node", xy[:, 0], {"standard_name": "projection_x_coordinate", "units": "m"}),
            "node_y": ("node", xy[:, 1], {"standard_name": "projection_y_coordinate", "units": "m"}),
            "face_nodes": (("face", "corner"), faces.astype(np.int32), {
                "cf_role": "face_node_connectivity", "start_index": np.int32(0),
            }),
            "bed": ("node", np.zeros(n), _on_node("altitude of the bed", "m", standard_name="altitude")),
            "depth": (("time", "node"), np.full((1, n), depth), _on_node(
                "water depth", "m", standard_name="sea_floor_depth_below_sea_surface")),
            "u": (("time", "node"), velocity[None, :, 0], _on_node(
                "depth-averaged velocity to the east", "m s-1", standard_name="eastward_sea_water_velocity")),
            "v": (("time", "node"), velocity[None, :, 1], _on_node(
                "depth-averaged velocity to the north", "m s-1", standard_name="northward_sea_water_velocity")),
        },
        coords={"time": ("time", [0.0], {"units": "seconds since 2031-01-01 00:00:00", "standard_name": "time"})},
        attrs={"Conventions": "CF-1.11 UGRID-1.0"},
    )
    data.to_netcdf(path, engine="h5netcdf")
    return path


def _on_node(long_name: str, units: str, **more: str) -> dict[str, str]:
    return {"long_name": long_name, "units": units, "mesh": "mesh", "location": "node", **more}
