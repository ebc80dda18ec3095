"""How well the discharge of a section can be read from its file, by the file's own data: two readings, and the banks.

References
----------
.. [1] JCGM 100:2008, Guide to the expression of uncertainty in measurement: expanded uncertainty, coverage factor 2 (6.2).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..mesh import Mesh
from .cut import Section

COVERAGE = 2.0  # times the standard uncertainty: about 95 % (JCGM 100:2008, 6.3.3)


@dataclass(frozen=True, slots=True)
class ReadingError:
    """Error of reading a section's discharge from the file, m3/s; the model's own error is not included.

    ``within`` comes from the faces, ``banks`` from an outline that is not the model's own (0 where it is);
    ``cell_m`` is the size of the faces that the line crosses, by their median.
    """

    within_m3_s: float
    banks_m3_s: float
    cell_m: float

    @property
    def total_m3_s(self) -> float:
        """Both: the banks move together, so they are added."""
        return self.within_m3_s + self.banks_m3_s


def reading_error(section: Section) -> ReadingError:
    """The error of a section's discharge that its own file lets us see.

    Notes
    -----
    Within the mesh the flow is read twice, constant in each face and linear between nodes. The difference of the
    two over each face is taken as a standard uncertainty that is that face's own, their sum as one that all share
    (a line that runs through every face at the same place); both by the root of the sum of squares, doubled [1]_. At each end of the water where the mesh is stepped, the bank may stand a
    cell away: the width of the cell, where values are those of cells, or the whole diagonal, where points are joined
    and what lies outside the last whole face is missing, times the unit discharge there: along a bank a strip carries
    that whichever way the line crosses it.
    """
    mesh = section.frame.mesh
    face = mesh.triangle_face[section.triangle]
    _, of = np.unique(face, return_inverse=True)
    apart = np.bincount(of, (section.flow.mean(axis=1) - section.face_flow) * section.widths)
    size = np.sqrt(mesh.face_area[face])
    banks = 0.0
    if mesh.stepped:
        frame = section.frame
        most = np.hypot(*frame.unit_discharge.T)[mesh.triangles[section.triangle]].max(axis=1)
        away = _diagonal(mesh, face) if frame.stored_on == "node" else size
        banks = sum(float(away[i] * most[i]) for i in _at_banks(section))
    return ReadingError(COVERAGE * float(np.hypot(apart.sum(), np.linalg.norm(apart))), banks, float(np.median(size)))


def _at_banks(section: Section) -> list[int]:
    """Pieces where the water meets a bank or pier on the line: a dry piece, a gap, or the end of the mesh beside it."""
    wet, d = section.wet, section.distance
    gap = 1e-6 * section.length
    first = np.concatenate([[d[0, 0] > gap], (d[1:, 0] - d[:-1, 1] > gap) | ~wet[:-1]])
    last = np.concatenate([(d[1:, 0] - d[:-1, 1] > gap) | ~wet[1:], [section.length - d[-1, 1] > gap]])
    return [*np.flatnonzero(wet & first), *np.flatnonzero(wet & last)]


def _diagonal(mesh: Mesh, face: np.ndarray) -> np.ndarray:
    """Greatest distance (k,) between two corners of each face, m."""
    corners = mesh.node_xy[np.where(mesh.face_nodes >= 0, mesh.face_nodes, mesh.face_nodes[:, :1])][face]
    return np.linalg.norm(corners[:, :, None] - corners[:, None], axis=3).max(axis=(1, 2))
