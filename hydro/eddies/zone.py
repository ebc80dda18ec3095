"""A recirculation zone with its figures, and the set of zones of one frame."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
import shapely

from ..figure import Place
from .regions import Region
from .survival import Residence
from .wake import Wake

if TYPE_CHECKING:
    from .travelling import Traveller

KINDS = ("behind structure", "at bank", "side bay", "free", "travelling")


@dataclass(frozen=True, eq=False)
class Zone:
    """One recirculation zone. Points are local metres.

    Attributes
    ----------
    id, name : str
        ``id`` is lasting in a ledger that follows zones in time; ``name`` is a label.
    kind : one of KINDS
    wall : str or None
        Id of the wall or structure that it leans on or lies behind.
    rotation : "clockwise" or "anticlockwise"
        Seen from above.
    centre : (2,) float64
    chainage_m, offset_m : float or None
        Of the centre; None without a centre line.
    area_m2, volume_m3, length_m, width_m, mean_depth_m, max_depth_m : float
        Length along and width across the outer flow.
    psi_centre_m3_s, psi_edge_m3_s : float
    psi_wall_m3_s : float or None
        The dividing level is often not the wall's; both are given.
    recirculating_discharge_m3_s : float
    share_of_through_discharge : float or None
    rotation_time_s : float
        Volume over recirculating discharge; no residence time.
    separation, reattachment : (2,) float64 or None
        Where the dividing streamline leaves the wall and comes back; for wake eddies ``reattachment`` is
        where the wake closes.
    triangles_across : float
    max_reverse_speed_m_s : float
        Greatest speed against the outer flow.
    flags, cautions : tuple of str
    sensitivity : mapping of figure to (low, high)
    wake : Wake or None
        For zones behind a structure.
    contour : shapely Polygon or MultiPolygon
    inner : shapely Polygon or MultiPolygon
        The contour at the dividing level moved inwards by the noise of psi.
    streamlines : list of (k, 2) float64
        Closed streamlines inside, for drawing.
    along : (2,) float64
        Unit vector of the outer flow.
    noise_m3_s : float
        Noise of psi there.
    region : Region
    core : (c,) int32
        Nodes by which the zone is followed in time: those nearest to its extremum in psi.
    residence : Residence or None
        How long water stays, where it was asked for.
    """

    id: str
    name: str
    kind: str
    wall: str | None
    rotation: str
    centre: np.ndarray
    chainage_m: float | None
    offset_m: float | None
    area_m2: float
    volume_m3: float
    length_m: float
    width_m: float
    mean_depth_m: float
    max_depth_m: float
    psi_centre_m3_s: float
    psi_edge_m3_s: float
    psi_wall_m3_s: float | None
    recirculating_discharge_m3_s: float
    share_of_through_discharge: float | None
    rotation_time_s: float
    separation: np.ndarray | None
    reattachment: np.ndarray | None
    triangles_across: float
    max_reverse_speed_m_s: float
    flags: tuple[str, ...]
    sensitivity: Mapping[str, tuple[float, float]]
    cautions: tuple[str, ...]
    wake: Wake | None
    contour: shapely.Polygon | shapely.MultiPolygon
    inner: shapely.Polygon | shapely.MultiPolygon
    streamlines: list[np.ndarray]
    along: np.ndarray
    noise_m3_s: float
    region: Region
    core: np.ndarray
    residence: Residence | None = None

    def place(self, mesh) -> Place:
        """The centre in world coordinates."""
        x, y = mesh.to_world(self.centre)
        return Place(float(x), float(y), self.chainage_m, self.offset_m)


@dataclass(frozen=True, eq=False)
class SmallRegion:
    """A region under the floor: counted, and listed on request.

    ``why`` is "weaker than the noise of psi", "under the least share", "too few triangles across", "cut by a link's
    path", "the field itself does not turn back there" or "open to the boundary".
    """

    centre: np.ndarray
    rotation: str
    recirculating_discharge_m3_s: float
    area_m2: float
    why: str


@dataclass(frozen=True, eq=False)
class ZoneSet:
    """The zones of one frame.

    ``zones`` are those kept, along the reach; ``small`` are those under the floor; ``open_to_boundary`` those
    that the model's edge cuts; ``travelling`` are seen in instants only, each in the view that moves with it.
    """

    zones: tuple[Zone, ...]
    small: tuple[SmallRegion, ...] = ()
    open_to_boundary: tuple[SmallRegion, ...] = ()
    notes: tuple[str, ...] = field(default=())
    travelling: tuple[Traveller, ...] = ()

    def zone(self, id_: str) -> Zone:
        """The zone with this id; an unknown one lists the known ones."""
        for z in self.zones:
            if z.id == id_:
                return z
        raise ValueError(f"there is no zone {id_!r}; this frame has {', '.join(z.id for z in self.zones) or 'none'}.")
