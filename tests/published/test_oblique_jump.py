"""The oblique hydraulic jump at a wall turned into supercritical flow, sampled on meshes.

Ippen, A.T. 1951, Mechanics of supercritical flow, Trans. ASCE 116 (from memory): Froude 2.74 at a wall turned by 8.95
degrees gives a front at 29.99 degrees to the flow and 1.5003 times the depth behind it. The field on both sides is uniform, so heads and discharges are
closed forms; the front of a sampled field is known to about a triangle.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
import shapely
from scipy.optimize import brentq

from hydro.arrival import audit
from hydro.section import cut, section_figures
from hydro.section.fronts import jump_fronts
from hydro.section.profile import profile
from tests.builders import channel, frame_of, free_mesh, raw_of, run_of

G, FROUDE, DEPTH = 9.81, 2.74, 0.8
TURN, FRONT, RATIO = np.radians(8.95), np.radians(29.99), 1.5003
SPEED = FROUDE * np.sqrt(G * DEPTH)


def front_of(turn: float) -> float:
    """The front's angle from the turn's, by momentum along and continuity across it (Ippen 1951)."""

    def short(b):
        root = np.sqrt(1 + 8 * FROUDE**2 * np.sin(b) ** 2)
        return np.tan(b) * (root - 3) / (2 * np.tan(b) ** 2 + root - 1) - np.tan(turn)

    return brentq(short, np.arcsin(1 / FROUDE), np.radians(60))


BEHIND = DEPTH * (np.sqrt(1 + 8 * (FROUDE * np.sin(front_of(TURN))) ** 2) - 1) / 2
# Along the front the velocity stays; across it the discharge does.
ALONG, ACROSS = SPEED * np.cos(front_of(TURN)), SPEED * np.sin(front_of(TURN)) * DEPTH / BEHIND
SPEED_BEHIND = np.hypot(ALONG, ACROSS)


def behind(x, y):
    """Whether a point lies between the front and the wall."""
    return (x > 0) & (y < x * np.tan(front_of(TURN)))


def depth(x, y):
    return np.where(behind(x, y), BEHIND, DEPTH)


def velocity(x, y):
    b = behind(x, y)
    return np.where(b, SPEED_BEHIND * np.cos(TURN), SPEED), np.where(b, SPEED_BEHIND * np.sin(TURN), 0.0)


@cache
def mesh_of(size: float):
    wall = 30 * np.tan(TURN)
    return free_mesh(shapely.Polygon([(-10, 0), (0, 0), (30, wall), (30, 24), (-10, 24)]), size)


def frame(size: float, stored_on: str = "node"):
    return frame_of(mesh_of(size), depth, velocity, bed=50.0, stored_on=stored_on)


def test_the_closed_form_is_ippens():
    assert np.degrees(front_of(TURN)) == pytest.approx(29.99, abs=0.02)
    assert BEHIND / DEPTH == pytest.approx(RATIO, abs=1e-3)
    assert np.arctan2(ACROSS, ALONG) == pytest.approx(front_of(TURN) - TURN, abs=1e-9), "behind it the flow follows the wall"


@pytest.mark.parametrize("stored_on", ["node", "face"])
@pytest.mark.parametrize("size", [1.0, 0.5])
def test_the_front_is_found_at_its_angle_within_the_mesh_size(size, stored_on):
    """The flow is faster than its waves on both sides: only the part of it that crosses the front passes Froude 1."""
    fronts = jump_fronts(frame(size, stored_on))
    assert len(fronts) == 1
    found = fronts[0]
    length = 24 / np.sin(FRONT) * 0.6  # to the domain's right side at x = 30
    assert found.angle_deg == pytest.approx(29.99, abs=np.degrees(np.arctan(2 * size / found.length_m)))
    assert found.length_m > length
    away = np.abs(found.middle @ [-np.sin(FRONT), np.cos(FRONT)])
    assert away < size
    if stored_on == "node":  # on faces the step is spread over the nodes about it
        assert found.depth_ratio == pytest.approx(RATIO, abs=1e-3)


def parallel(offset: float) -> np.ndarray:
    """A section along the front, a distance to its left (ahead) or right (behind), left bank first, 8 m long."""
    along = np.array([np.cos(FRONT), np.sin(FRONT)])
    left = np.array([-np.sin(FRONT), np.cos(FRONT)])
    near = 9 * along + offset * left
    return np.array([near + 8 * along, near])


def test_both_sides_carry_one_discharge_across_the_front_and_lose_the_head_of_a_jump():
    """Continuity: h1 u1n = h2 u2n. Head lost is (h2 - h1)^3 / (4 h1 h2) (Belanger, with the velocities across the front).

    Tolerance: both sides are uniform, but the line stands on the printed angle, 0.01 degrees off: 2e-4 of the discharge.
    """
    sides = [section_figures(cut(frame(0.5), parallel(offset))) for offset in (2.0, -2.0)]
    ahead, after = (abs(f.discharge_m3_s) for f in sides)
    assert ahead == pytest.approx(8 * DEPTH * SPEED * np.sin(FRONT), rel=1e-9)
    assert after == pytest.approx(ahead, rel=5e-4)
    assert sides[0].head_m == pytest.approx(50 + DEPTH + SPEED**2 / (2 * G), rel=1e-9)
    assert sides[1].head_m == pytest.approx(50 + BEHIND + SPEED_BEHIND**2 / (2 * G), rel=1e-9)
    assert sides[0].head_m - sides[1].head_m == pytest.approx((BEHIND - DEPTH) ** 3 / (4 * DEPTH * BEHIND), rel=1e-6)


def test_a_profile_across_it_has_both_froude_numbers_and_no_jump_of_the_whole_flow():
    """Closed form behind: |u2| / sqrt(g h2) = 1.98 to two places, still above 1: the profile along the flow has no jump."""
    p = profile(frame(0.5), np.array([[-8.0, 5.0], [28.0, 5.0]]))
    assert p.froude[3] == pytest.approx(FROUDE, rel=1e-9)
    assert p.froude[-3] == pytest.approx(SPEED_BEHIND / np.sqrt(G * BEHIND), rel=1e-9)
    assert p.froude[-3] > 1 and p.jumps == ()


def test_the_audit_names_the_front_with_its_angle():
    mesh = mesh_of(0.5)
    run = run_of(mesh, [0.0], lambda i: raw_of(mesh, depth, velocity, stored_on="node"), bed=50.0)
    found = next(f for f in audit(run) if f.id == "supercritical flow")
    angle = float(found.sentence.split(" at ")[-1].split(" degrees")[0])
    assert angle == pytest.approx(29.99, abs=2) and "no-roller" in found.figure.cautions


def test_a_jump_square_to_the_flow_is_a_front_at_ninety_degrees():
    """Belanger: 0.4 m at 2.4 m2/s goes to 1.52504 m; the front stands where it was put, x = 60 m."""
    h = lambda x, y: np.where(x < 60, 0.4, 1.52504)  # noqa: E731
    found = jump_fronts(frame_of(channel(100, 20, 100, 20), h, (lambda x, y: 2.4 / h(x, y), 0.0), stored_on="node"))
    assert len(found) == 1
    assert found[0].angle_deg == pytest.approx(90, abs=1) and found[0].middle[0] == pytest.approx(60, abs=1)
    assert found[0].depth_ratio == pytest.approx(1.52504 / 0.4, rel=1e-9) and found[0].length_m == pytest.approx(20, abs=2)


@pytest.mark.parametrize(
    "h", [lambda x, y: 2.0 + 0 * x, lambda x, y: np.where(x < 60, 1.52504, 0.4), lambda x, y: np.where(x < 60, 1.2, 2.0)],
    ids=["uniform", "a fall", "a step in slow water"],
)
def test_what_is_no_jump_has_no_front(h):
    """A jump needs flow from below to above its conjugate depth, across Froude 1: neither a fall nor a step in slow water does."""
    assert jump_fronts(frame_of(channel(100, 10, 100, 20), h, (lambda x, y: 2.4 / h(x, y), 0.0), stored_on="node")) == []
