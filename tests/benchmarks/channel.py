"""The benchmark case: a meandering channel 20 km long and 200 m wide with twelve round piers."""

from __future__ import annotations

import numpy as np

from hydro.mesh import Mesh, build_mesh

LENGTH, WIDTH, PIERS = 20_000.0, 200.0, 12


def case(triangles: int, *, noise: float = 0.02) -> tuple[Mesh, np.ndarray, np.ndarray]:
    """Mesh of about so many triangles, depth (f,) m and velocity (f, 2) m/s: a stream with an eddy behind each pier."""
    xy, faces, place = nodes_and_faces(triangles)
    mesh = build_mesh(xy, faces, origin=(0.0, 0.0))
    s, n = place[mesh.file_node].T
    psi = 300.0 * (1.5 * (n / 100 + 1) - 0.5 * ((n / 100) ** 3 + 1)) / 2
    for p in range(PIERS):
        at, side = (p + 0.5) * LENGTH / PIERS, WIDTH * 0.1 * (-1) ** p
        for sign in (-1, 1):
            psi -= sign * 60.0 * np.exp(-((s - at - 25) ** 2 + (n - side - sign * 9) ** 2) / 8.0**2)
    gradient = _gradient(mesh, psi) + noise * np.random.default_rng(1).standard_normal((mesh.n_faces, 2))
    depth = 2 + 0.5 * np.sin(mesh.face_centroid[:, 1] / 500)
    return mesh, depth, np.column_stack([gradient[:, 1], -gradient[:, 0]]) / depth[:, None]


def _gradient(mesh: Mesh, values: np.ndarray) -> np.ndarray:
    p, v = mesh.node_xy[mesh.triangles], values[mesh.triangles]
    one, two = p[:, 1] - p[:, 0], p[:, 2] - p[:, 0]
    twice = one[:, 0] * two[:, 1] - one[:, 1] * two[:, 0]
    a, b = v[:, 1] - v[:, 0], v[:, 2] - v[:, 0]
    return np.column_stack([a * two[:, 1] - b * one[:, 1], b * one[:, 0] - a * two[:, 0]]) / twice[:, None]


def nodes_and_faces(triangles: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Nodes (n, 2), faces (f, 3) and the distance along and across the channel (n, 2) of each node, m."""
    n_across = max(8, int(np.sqrt(triangles / 2 / (LENGTH / WIDTH))))
    n_along = int(triangles / 2 / n_across)
    s, n = np.linspace(0, LENGTH, n_along + 1), np.linspace(-WIDTH / 2, WIDTH / 2, n_across + 1)
    place = np.stack(np.meshgrid(s, n, indexing="ij"), axis=-1).reshape(-1, 2)
    angle = 1.1 * np.sin(2 * np.pi * 8 * s / LENGTH)  # a sine-generated curve (Langbein & Leopold 1966)
    step = LENGTH / n_along
    x, y = np.cumsum(np.cos(angle)) * step, np.cumsum(np.sin(angle)) * step
    k = np.repeat(np.arange(n_along + 1), n_across + 1)
    xy = np.column_stack([x[k] - np.sin(angle[k]) * place[:, 1], y[k] + np.cos(angle[k]) * place[:, 1]])
    i, j = (a.ravel() for a in np.meshgrid(np.arange(n_along), np.arange(n_across), indexing="ij"))
    a = i * (n_across + 1) + j
    b, c, d = a + n_across + 1, a + n_across + 2, a + 1
    faces = np.stack([np.column_stack([a, b, c]), np.column_stack([a, c, d])], axis=1).reshape(-1, 3)
    centre = place[faces].mean(axis=1)
    held = np.ones(len(faces), bool)
    for p in range(PIERS):
        held &= np.hypot(*(centre - ((p + 0.5) * LENGTH / PIERS, WIDTH * 0.1 * (-1) ** p)).T) > 9.0
    faces = faces[held]
    used = np.zeros(len(xy), bool)
    used[faces] = True
    number = np.cumsum(used) - 1
    return xy[used], number[faces], place[used]
