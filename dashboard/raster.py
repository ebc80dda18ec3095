"""The water's picture: which triangle lies under each pixel of a view, and the bytes that colour it.

The index is made once a view; a change of time only paints it anew.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from hydro._kernels import pixels
from hydro.frame import Frame
from hydro.mesh import Mesh


@dataclass(frozen=True, slots=True)
class View:
    """A window on the map: local centre and width in m, size in px."""

    x: float
    y: float
    width_m: float
    columns: int
    rows: int

    @property
    def step(self) -> float:
        """m a pixel."""
        return self.width_m / self.columns

    @property
    def height_m(self) -> float:
        return self.rows * self.step

    @property
    def extent(self) -> tuple[float, float, float, float]:
        """Local (west, south, east, north), m."""
        w, h = self.width_m / 2, self.height_m / 2
        return self.x - w, self.y - h, self.x + w, self.y + h

    def widened(self, share: float) -> View:
        """The same scale with ``share`` of the size added on every side, so a pan has water to show."""
        more_c, more_r = round(self.columns * share), round(self.rows * share)
        return View(self.x, self.y, self.width_m + 2 * more_c * self.step, self.columns + 2 * more_c, self.rows + 2 * more_r)


@dataclass(frozen=True, eq=False)
class IndexRaster:
    """Triangle under each pixel centre of a view, rows from the south; -1 off the mesh."""

    mesh: Mesh
    view: View
    index: np.ndarray
    x: np.ndarray
    y: np.ndarray

    def paint(
        self, frame: Frame, value: np.ndarray, top: float, *,
        psi: np.ndarray | None = None, tube: float = 0.0, carries: np.ndarray | None = None,
    ) -> np.ndarray:
        """The map's bytes (rows, columns) uint8 for a theme's water palette.

        Parameters
        ----------
        frame : Frame
            Gives the depth and what counts as wet.
        value : (n,) float64
            What the shade tells, such as speed in m/s.
        top : float
            The value at the ramp's end; higher ones keep that shade.
        psi, tube : (n,) m3/s and the tubes' discharge, m3/s
            Left out, all water is of one tube.
        carries : (m,) bool, optional
            Triangles that are water however shallow, such as the domain of psi.
        """
        west, south, _, _ = self.view.extent
        out = np.empty(self.index.shape, np.uint8)
        levels = np.zeros(self.mesh.n_nodes) if psi is None else psi
        always = np.zeros(self.mesh.n_triangles, np.bool_) if carries is None else carries
        pixels.paint(
            self.index, self.x, self.y, self.mesh.triangles, west, south, self.view.step,
            np.ascontiguousarray(value, float), float(top), frame.depth, frame.wet_depth_m,
            np.ascontiguousarray(levels, float), 0.0 if psi is None else float(tube), always, out,
        )
        return out

    def values(self, value: np.ndarray) -> np.ndarray:
        """Node values (n,) at the pixel centres (rows, columns); NaN off the mesh."""
        west, south, _, _ = self.view.extent
        out = np.empty(self.index.shape)
        pixels.at_pixels(
            self.index, self.x, self.y, self.mesh.triangles, west, south, self.view.step,
            np.ascontiguousarray(value, float), out,
        )
        return out


@dataclass(frozen=True, eq=False)
class Canvas:
    """A mesh made ready for rasters: coordinates by column and the bounds of every triangle."""

    mesh: Mesh
    x: np.ndarray
    y: np.ndarray
    bounds: np.ndarray

    def index(self, view: View) -> IndexRaster:
        """The index raster of a view.

        Raises ``ValueError`` for a view without pixels or without width.
        """
        if view.rows < 1 or view.columns < 1 or not view.width_m > 0:
            raise ValueError(f"a map of {view.columns} by {view.rows} px and {view.width_m:g} m cannot be drawn.")
        out = np.empty((view.rows, view.columns), np.int32)
        west, south, _, _ = view.extent
        pixels.fill_index(self.x, self.y, self.mesh.triangles, self.bounds, west, south, view.step, out)
        return IndexRaster(self.mesh, view, out, self.x, self.y)


def canvas(mesh: Mesh) -> Canvas:
    """Prepare a mesh for rasters."""
    x, y = (np.ascontiguousarray(c) for c in mesh.node_xy.T)
    return Canvas(mesh, x, y, pixels.bounds_of(x, y, mesh.triangles))
