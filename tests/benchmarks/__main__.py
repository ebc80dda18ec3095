"""python -m tests.benchmarks [TRIANGLES ...]: time and peak memory of the inner work, beside peers in the same run.

Each row is the median of three runs after one that warms up. Only ratios of one run on one machine mean
anything; they are printed, not judged.
"""

from __future__ import annotations

import resource
import statistics
import sys
import time
from collections.abc import Callable

import numpy as np

from hydro.eddies import find_zones
from hydro.frame import RawFrame, make_frame
from hydro.mesh import Mesh
from hydro.streamfunction import Plan, stream_function
from hydro.tracks import on_line, streamlines
from hydro.tracks.unsteady import advance, release
from hydro.transfer import Transfer
from tests.benchmarks.channel import case

POINTS, FLOATS = 200_000, 10_000


def main(sizes: list[int]) -> None:
    """Print a table for each size."""
    for size in sizes:
        mesh, depth, q = case(size)
        zero = np.zeros(mesh.n_nodes)
        frame = make_frame(
            mesh, RawFrame("face", depth, q), zero, np.zeros(mesh.n_faces), index=0, seconds=0.0, time=None, kind="instant", wet_depth_m=0.05
        )
        print(f"\n{mesh.n_triangles:,} triangles, {mesh.n_nodes:,} nodes")
        print(f"{'work':<52}{'ours, s':>10}{'peer, s':>10}{'peer/ours':>11}  peer")
        for row in (_located(mesh), _psi(frame), _tree(frame), _moved(frame), _along(frame), _shared(mesh)):
            _print(*row)
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
        print(f"peak memory of the process so far: {peak:,.0f} MB")


def _print(work: str, ours: float, peer: float | None, name: str) -> None:
    ratio = "" if peer is None else f"{peer / ours:.1f}"
    print(f"{work:<52}{ours:>10.3f}{'' if peer is None else f'{peer:.3f}':>10}{ratio:>11}  {name}")


def timed(work: Callable[[], object], runs: int = 3) -> float:
    """Median seconds of ``runs`` after one that warms up."""
    work()
    seconds = []
    for _ in range(runs):
        begin = time.perf_counter()
        work()
        seconds.append(time.perf_counter() - begin)
    return statistics.median(seconds)


def _located(mesh: Mesh):
    import vtk
    from vtk.util.numpy_support import numpy_to_vtk

    rng = np.random.default_rng(0)
    weights = rng.dirichlet((1, 1, 1), POINTS)
    chosen = rng.integers(0, mesh.n_triangles, POINTS)
    points = np.einsum("kc,kcj->kj", weights, mesh.node_xy[mesh.triangles[chosen]])
    grid = vtk_grid(mesh)
    probe, source = vtk.vtkProbeFilter(), vtk.vtkPolyData()
    held = vtk.vtkPoints()
    held.SetData(numpy_to_vtk(np.column_stack([points, np.zeros(POINTS)]), deep=True))
    source.SetPoints(held)
    probe.SetInputData(source)
    probe.SetSourceData(grid)
    probe.SetCellLocator(vtk.vtkStaticCellLocator())

    def peer() -> None:
        probe.Modified()
        probe.Update()

    return f"{POINTS:,} random points located", timed(lambda: mesh.find(points)), timed(peer, 1), "VTK probe, static cell locator"


def _psi(frame):
    from scipy.sparse import csc_matrix
    from scipy.sparse.linalg import splu

    mesh = frame.mesh
    ours = timed(lambda: stream_function(frame, plan=Plan(frame)), 1)
    if mesh.n_nodes > 300_000:
        return "psi of one frame, set-up and all", ours, None, "none at this size"
    matrix = csc_matrix(laplacian(mesh) + 1e-9 * _identity(mesh.n_nodes))
    return "psi of one frame, set-up and all", ours, timed(lambda: splu(matrix, permc_spec="MMD_AT_PLUS_A").solve(np.ones(mesh.n_nodes)), 1), "scipy splu, one Laplacian"


def _tree(frame):
    sf = stream_function(frame)
    psi = np.nan_to_num(sf.psi)
    return "zones of one frame, merge trees both ways", timed(lambda: find_zones(sf), 1), timed(lambda: np.argsort(psi)), "np.argsort of psi"


def _moved(frame):
    import vtk
    from vtk.util.numpy_support import numpy_to_vtk

    mesh = frame.mesh
    rng = np.random.default_rng(1)
    starts = mesh.triangle_centroid[rng.integers(0, mesh.n_triangles, FLOATS)]
    sides = np.zeros(3 * mesh.n_triangles, bool)
    seconds = 20.0

    def ours() -> None:
        advance(frame, frame, release(mesh, starts, 0.0), seconds, sides=sides)

    grid = vtk_grid(mesh)
    velocity = numpy_to_vtk(np.column_stack([frame.velocity, np.zeros(mesh.n_nodes)]), deep=True)
    velocity.SetName("u")
    grid.GetPointData().SetVectors(velocity)
    few = max(FLOATS // 20, 1)
    seeds, held = vtk.vtkPolyData(), vtk.vtkPoints()
    held.SetData(numpy_to_vtk(np.column_stack([starts[:few], np.zeros(few)]), deep=True))
    seeds.SetPoints(held)
    tracer = vtk.vtkStreamTracer()
    tracer.SetInputData(grid)
    tracer.SetSourceData(seeds)
    tracer.SetIntegratorTypeToRungeKutta45()
    tracer.SetIntegrationDirectionToForward()
    tracer.SetMaximumPropagation(float(np.percentile(frame.speed, 60)) * seconds)

    def peer() -> None:
        tracer.Modified()
        tracer.Update()

    return f"{FLOATS:,} floats for {seconds:g} s, tolerance 1 mm", timed(ours), timed(peer, 1) * FLOATS / few, f"VTK stream tracer, {few} seeds scaled up"


def _along(frame):
    sf = stream_function(frame)
    west, south, east, north = frame.mesh.bounds
    line = np.array([[west + 0.3 * (east - west), north], [west + 0.3 * (east - west), south]])
    starts = on_line(line, (north - south) / 200)
    found = streamlines(sf, starts).tracks
    crossings = sum(len(t.xy) for t in found)
    seconds = timed(lambda: streamlines(sf, starts))
    return f"{len(starts)} streamlines along psi, {crossings:,} crossings", seconds, None, f"{crossings / seconds / 1e6:.1f} M crossings a second"


def _shared(mesh: Mesh):
    return "areas shared with itself, conservative transfer", timed(lambda: Transfer(mesh, mesh).shared, 1), None, "none"


def vtk_grid(mesh: Mesh):
    """The mesh as a VTK grid."""
    import vtk
    from vtk.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray

    grid, points, cells = vtk.vtkUnstructuredGrid(), vtk.vtkPoints(), vtk.vtkCellArray()
    points.SetData(numpy_to_vtk(np.column_stack([mesh.node_xy, np.zeros(mesh.n_nodes)]), deep=True))
    grid.SetPoints(points)
    rows = np.column_stack([np.full(mesh.n_triangles, 3), mesh.triangles]).astype(np.int64).ravel()
    cells.ImportLegacyFormat(numpy_to_vtkIdTypeArray(rows, deep=True))
    grid.SetCells(vtk.VTK_TRIANGLE, cells)
    return grid


def laplacian(mesh: Mesh):
    """The P1 Laplacian of the mesh, (n, n) sparse: the same pattern that psi solves."""
    from scipy.sparse import coo_matrix

    p = mesh.node_xy[mesh.triangles]
    b = np.stack([p[:, 1, 1] - p[:, 2, 1], p[:, 2, 1] - p[:, 0, 1], p[:, 0, 1] - p[:, 1, 1]], axis=1)
    c = np.stack([p[:, 2, 0] - p[:, 1, 0], p[:, 0, 0] - p[:, 2, 0], p[:, 1, 0] - p[:, 0, 0]], axis=1)
    local = (b[:, :, None] * b[:, None, :] + c[:, :, None] * c[:, None, :]) / (4 * mesh.triangle_area)[:, None, None]
    rows, columns = np.repeat(mesh.triangles, 3, axis=1).ravel(), np.tile(mesh.triangles, (1, 3)).ravel()
    return coo_matrix((local.ravel(), (rows, columns)), shape=(mesh.n_nodes,) * 2).tocsc()


def _identity(n: int):
    from scipy.sparse import identity

    return identity(n, format="csc")


if __name__ == "__main__":
    main([int(a.replace("_", "").replace(",", "")) for a in sys.argv[1:]] or [60_000, 250_000])
