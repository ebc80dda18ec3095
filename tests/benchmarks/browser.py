"""python -m tests.benchmarks.browser [TRIANGLES ...]: the desk in a real browser, ms for a first picture, a frame, a zoom and a pan.

A file of so many triangles with a few frames is made, the desk is served from a process of its own, and each
change is timed from the key press in the page until two animation frames after the new picture is there.
Printed, not judged: on a shared machine the figures are upper ones.
"""

from __future__ import annotations

import os
import statistics
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import xarray as xr
from playwright.sync_api import Page, sync_playwright

from tests.benchmarks.channel import case
from tests.browser.conftest import launch_options, running_dashboard

FRAMES, CHANGES = 6, 9
_WAIT = 600_000  # ms: everything has to be compiled first
# Runs a change and answers with the ms until the map's water is a new one and has been painted.
_TIMED = """([what, id]) => new Promise((done) => {
    const water = Bokeh.documents[0].get_model_by_name("map-water"), begin = performance.now();
    const drawn = () => {
        water.change.disconnect(drawn);
        requestAnimationFrame(() => requestAnimationFrame(() => done(performance.now() - begin)));
    };
    water.change.connect(drawn);
    const at = document.getElementById(id);
    at.focus();
    if (what === "frame") {
        at.value = (Number(at.value) + 1) % (Number(at.max) + 1);
        at.dispatchEvent(new Event("input", { bubbles: true }));
        at.dispatchEvent(new Event("change", { bubbles: true }));
    } else at.dispatchEvent(new KeyboardEvent("keydown", { key: what, bubbles: true }));
})"""


def main(sizes: list[int]) -> None:
    """Print a row for each size."""
    print(f"{'triangles':>12}{'first picture':>16}{'frame':>16}{'zoom':>16}{'pan':>16}   ms, median (greatest)")
    for size in sizes:
        with tempfile.TemporaryDirectory() as folder:
            file = Path(folder) / "channel.nc"
            count = made(file, size)
            with running_dashboard(Path(folder) / "log.txt", str(file)) as server:
                print(f"{count:>12,}" + "".join(f"{shown(times):>16}" for times in measured(server.address).values()), flush=True)


def made(file: Path, size: int) -> int:
    """Write the benchmark's channel as a UGRID file whose flow swells from frame to frame; the number of its triangles."""
    mesh, depth, velocity = case(size)
    swell = 1 + 0.1 * np.arange(FRAMES)[:, None]
    level = np.zeros(mesh.n_faces)
    face = {"mesh": "mesh2d", "location": "face"}
    xr.Dataset(
        {
            "mesh2d": ((), np.int32(0), {
                "cf_role": "mesh_topology", "topology_dimension": 2, "node_coordinates": "x y", "face_node_connectivity": "faces",
            }),
            "faces": (("face", "three"), mesh.face_nodes[:, :3].astype(np.int32), {"cf_role": "face_node_connectivity", "start_index": 0}),
            "bed": (("face",), level, face | {"units": "m", "standard_name": "ground_level_altitude"}),
            "depth": (("time", "face"), depth * np.sqrt(swell), face | {"units": "m", "standard_name": "sea_floor_depth_below_sea_surface"}),
            "u": (("time", "face"), velocity[:, 0] * swell, face | {"units": "m s-1", "standard_name": "eastward_sea_water_velocity"}),
            "v": (("time", "face"), velocity[:, 1] * swell, face | {"units": "m s-1", "standard_name": "northward_sea_water_velocity"}),
        },
        coords={
            "x": (("node",), mesh.node_xy[:, 0], {"units": "m", "standard_name": "projection_x_coordinate"}),
            "y": (("node",), mesh.node_xy[:, 1], {"units": "m", "standard_name": "projection_y_coordinate"}),
            "time": (("time",), 600.0 * np.arange(FRAMES), {"units": "seconds since 2031-03-02 06:00:00"}),
        },
        attrs={"Conventions": "CF-1.11 UGRID-1.0"},
    ).to_netcdf(file, engine="h5netcdf")
    return int(mesh.n_triangles)


def measured(address: str) -> dict[str, list[float]]:
    """Times of each kind of change, ms."""
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(**launch_options(os.environ["LEEWATER_CHROMIUM"]))
        page = browser.new_page(viewport={"width": 1440, "height": 900})
        opened(page, address)  # compiles, and follows the eddies, so that only the picture is timed below
        page.wait_for_selector(".progress button", state="detached", timeout=_WAIT)
        begin = time.perf_counter()
        opened(page, address)
        first = [1000 * (time.perf_counter() - begin)]
        return {
            "first": first, "frame": changes(page, "frame", "time"), "zoom": changes(page, "+", "map"), "pan": changes(page, "ArrowRight", "map"),
        }


def opened(page: Page, address: str) -> None:
    page.goto(address)
    page.wait_for_function(
        "() => window.Bokeh?.documents[0]?.get_model_by_name('map-water')?.data.image?.length > 0", timeout=_WAIT
    )


def changes(page: Page, what: str, id_: str) -> list[float]:
    times = []
    for _ in range(CHANGES):
        page.wait_for_selector("html[data-working=no]", state="attached", timeout=_WAIT)
        page.wait_for_load_state("networkidle")
        times.append(page.evaluate(_TIMED, [what, id_]))
    return times


def shown(times: list[float]) -> str:
    return f"{statistics.median(times):.0f} ({max(times):.0f})"


if __name__ == "__main__":
    main([int(a) for a in sys.argv[1:]] or [30_000, 1_000_000])
