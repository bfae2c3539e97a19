"""Geometry against values from outside the project, source beside each."""

import numpy as np
import pytest

from structviz.surfaces.measure import measure
from structviz.surfaces.proximity import point_triangle_distance
from structviz.surfaces.surface import Surface


def icosphere(rounds):
    """The icosahedron, its edges halved and its vertices pushed to the unit sphere."""
    golden = (1 + 5**0.5) / 2
    points = [(0, s, t * golden) for s in (-1, 1) for t in (-1, 1)]
    vertices = np.array([np.roll(point, turn) for turn in range(3) for point in points], float)
    near = np.isclose(np.linalg.norm(vertices[:, None] - vertices[None], axis=-1), 2.0)
    triangles = [(i, j, k) for i in range(12) for j in range(i) for k in range(j) if near[i, j] and near[j, k] and near[k, i]]
    corners = vertices[np.array(triangles)]
    for _ in range(rounds):
        corners /= np.linalg.norm(corners, axis=-1, keepdims=True)
        a, b, c = corners.transpose(1, 0, 2)
        ab, bc, ca = (a + b) / 2, (b + c) / 2, (c + a) / 2
        corners = np.concatenate([np.stack(t, 1) for t in ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))])
    return corners / np.linalg.norm(corners, axis=-1, keepdims=True)


def measured(corners):
    corners = np.asarray(corners, float)
    # The two ends of an edge are added in either order; their last digits are made equal so that the seams close.
    vertices = np.round(corners.reshape(-1, 3), 12) + 0.0
    return measure(Surface("s", vertices, np.arange(len(vertices)).reshape(-1, 3)))


def volume(found):
    return abs(float((found.areas_m2[:, None] * found.normals * found.centroids).sum()) / 3)


# GEO-01. Source: trimesh 5.2.0 area and volume; closed form for the icosahedron (a = 4/sqrt(10 + 2 sqrt 5),
# A = 5 sqrt 3 a^2, V = 5/12 (3 + sqrt 5) a^3). Status: computed by library.
@pytest.mark.parametrize(
    "rounds, triangles, area, inside",
    [
        (0, 20, 9.5745413833, 2.5361507101),
        (1, 80, 11.6659313917, 3.6587122085),
        (2, 320, 12.3298485952, 4.04704468),
        (3, 1280, 12.506492734, 4.1527408171),
        (4, 5120, 12.5513538801, 4.179738948),
    ],
)
def test_area_and_volume_of_the_icosphere(rounds, triangles, area, inside):
    found = measured(icosphere(rounds))
    assert len(found.areas_m2) == triangles
    assert found.area_m2 == pytest.approx(area, abs=1e-8)
    assert volume(found) == pytest.approx(inside, abs=1e-8)  # only with one winding all round
    assert len(found.parts) == 1
    assert not found.meaningful
    assert "faces every way" in found.why_not
    # Euler: V - E + F = 2 for a closed surface without handles.
    assert found.condition.rims == 0
    assert len(found.areas_m2) // 2 + 2 == len(np.unique(found.surface.vertices, axis=0))


# GEO-02. Source: trimesh 5.2.0; Gauss-Bonnet. Status: computed by library.
def test_area_and_volume_of_the_torus():
    around, across = np.meshgrid(2 * np.pi * np.arange(64) / 64, 2 * np.pi * np.arange(32) / 32, indexing="ij")
    out = 3 + np.cos(across)
    points = np.stack([out * np.cos(around), out * np.sin(around), np.sin(across)], -1)
    a, b, c, d = points, np.roll(points, -1, 0), np.roll(points, (-1, -1), (0, 1)), np.roll(points, -1, 1)
    found = measured(np.concatenate([np.stack(t, -2).reshape(-1, 3, 3) for t in ((a, b, c), (a, c, d))]))
    assert found.area_m2 == pytest.approx(118.12643503, abs=1e-7)
    assert volume(found) == pytest.approx(58.74338448, abs=1e-7)
    assert found.area_m2 == pytest.approx(118.43525281, rel=0.01)
    assert len(found.areas_m2) // 2 == len(np.unique(found.surface.vertices, axis=0))  # V - E + F = 0: one handle


def upper(corners):
    """Triangles cut at up = 0, the part above kept."""
    kept = []
    for triangle in corners:
        ring = []
        for p, q in zip(triangle, np.roll(triangle, -1, 0), strict=True):
            if p[2] >= 0:
                ring.append(p)
            if p[2] * q[2] < 0:
                low, high = (p, q) if p[2] < q[2] else (q, p)
                ring.append(low + (high - low) * low[2] / (low[2] - high[2]))
        kept += [[ring[0], ring[k], ring[k + 1]] for k in range(1, len(ring) - 1)]
    return kept


# GEO-06. Source: trimesh 5.2.0 slice_plane; vector area of a cap = area of its boundary polygon. Status: computed by library.
def test_vector_area_of_the_hemisphere_is_that_of_its_rim():
    ball = icosphere(3)
    ball[np.abs(ball) < 1e-12] = 0.0
    found = measured(upper(ball))
    assert found.areas_m2 @ found.normals == pytest.approx([0.0, 0.0, 3.12565298], abs=1e-8)
    assert found.area_m2 == pytest.approx(6.25324637, abs=1e-8)
    assert found.condition.rims == 1
    assert found.dip_deg == pytest.approx(0.0, abs=1e-6)
    assert found.why_not == "it faces every way (mean resultant 0.50)"


def test_vector_area_of_a_closed_surface_is_nil():
    found = measured(icosphere(3))
    assert np.abs(found.areas_m2 @ found.normals).max() < 1e-8


# GEO-10. Source: trimesh 5.2.0 proximity.closest_point. Status: computed by library.
def test_closest_point_on_a_triangle():
    triangle = np.array([[0.0, 0, 0], [10, 0, 0], [0, 10, 0]])
    points = np.array([[2.0, 2, 5], [6, 6, 0], [-3, -4, 0], [5, -2, 1], [12, 0, 0]])
    distance, closest = point_triangle_distance(points, triangle)
    assert distance == pytest.approx([5.0, 1.4142135624, 5.0, 2.2360679775, 2.0], abs=1e-9)
    assert closest == pytest.approx(np.array([[2.0, 2, 0], [5, 5, 0], [0, 0, 0], [5, 0, 0], [10, 0, 0]]), abs=1e-9)
