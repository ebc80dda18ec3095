"""Zones of computed viscous flows against published tables: cavity, cylinder, step."""

from __future__ import annotations

import numpy as np
import pytest

from hydro.eddies import find_zones
from hydro.mesh import build_mesh
from hydro.streamfunction import stream_function
from tests import builders
from tests.published import flows


def zones_of(flow: flows.Viscous, boundary_sets=lambda mesh: None):
    """Stream function and zones of a computed flow, depth 1 m, given on nodes."""
    mesh = build_mesh(flow.xy, flow.triangles, origin=(0.0, 0.0))
    u, v = flow.velocity[mesh.file_node].T
    frame = builders.frame_of(mesh, 1.0, (u, v), stored_on="node")
    sf = stream_function(frame, boundary_sets=boundary_sets(mesh))
    return sf, find_zones(sf)


def test_lid_driven_cavity():
    """Ghia, Ghia & Shin 1982 (J. Comput. Phys. 48, 387-411), Re = 100, tables of vortex centres; from memory.

    Primary: (0.6172, 0.7344), psi -0.103423; corner eddies bottom right: (0.9453, 0.0625), 1.25374e-5; bottom
    left: (0.0313, 0.0391), 1.74877e-6. Their grid is 1/128, so centres are known to half of that; corner eddies
    are as weak as 1e-5 of the primary one and are told by size and place.
    """
    _, found = zones_of(flows.cavity(40, 100.0))
    left, primary, right = sorted(found.zones, key=lambda z: z.centre[0])
    assert primary.centre == pytest.approx((0.6172, 0.7344), abs=1 / 256)
    assert primary.psi_centre_m3_s == pytest.approx(-0.103423, rel=0.005)
    assert primary.rotation == "clockwise" and left.rotation == right.rotation == "anticlockwise"
    assert right.centre == pytest.approx((0.9453, 0.0625), abs=1 / 128)
    assert left.centre == pytest.approx((0.0313, 0.0391), abs=1 / 128)
    assert right.psi_centre_m3_s == pytest.approx(1.25374e-5, rel=0.2)
    assert left.psi_centre_m3_s == pytest.approx(1.74877e-6, rel=0.6)
    assert all(z.share_of_through_discharge is None for z in found.zones)


@pytest.mark.parametrize(("reynolds", "length", "angle"), [(20.0, 0.94, 43.7), (40.0, 2.35, 53.8)])
def test_cylinder_wake(reynolds, length, angle):
    """Dennis & Chang 1970 (J. Fluid Mech. 42, 471-489): length over diameter and angle from the rear; from memory.

    Coutanceau & Bouard 1977 measured 0.93 and 2.13. The far boundary at 60 diameters and rings of 0.09 at the
    body leave a few per cent; angles to 5 degrees (a ray is 4 to 6 degrees wide there).
    """
    def far(mesh):
        middle = mesh.node_xy[mesh.edge_nodes[mesh.boundary_edges]].mean(axis=1)
        return {"far": mesh.boundary_edges[np.hypot(*middle.T) > 1.0]}

    _, found = zones_of(flows.cylinder_wake(reynolds), far)
    assert len(found.zones) == 2
    for zone, rotation in zip(sorted(found.zones, key=lambda z: z.centre[1]), ("anticlockwise", "clockwise")):
        assert zone.rotation == rotation and zone.kind == "behind structure"
        assert zone.reattachment[0] - 0.5 == pytest.approx(length, rel=0.1)
        assert np.degrees(np.arctan2(abs(zone.separation[1]), zone.separation[0])) == pytest.approx(angle, abs=6.0)


def test_backward_facing_step():
    """Armaly et al. 1983 (J. Fluid Mech. 127, 473-496), expansion 1.94, Re = 100 on twice the inlet's height and
    its mean speed: reattachment about 3 step heights downstream (read off, 10 %); from memory.
    """
    flow = flows.backward_step()

    def ends(mesh):
        return {k: v for k, v in builders.sides(mesh).items() if k in ("west", "east")}

    sf, found = zones_of(flow, ends)
    (zone,) = found.zones
    step = 0.94
    assert sf.through_discharge_m3_s == pytest.approx(1.0, rel=0.01)
    assert zone.kind == "at bank" and zone.rotation == "clockwise" and zone.wall == "right bank"
    assert zone.separation == pytest.approx((0.0, 0.0), abs=0.1), "it separates at the lip"
    assert zone.reattachment[1] == pytest.approx(-step, abs=1e-9)
    assert zone.reattachment[0] / step == pytest.approx(3.0, rel=0.1)
