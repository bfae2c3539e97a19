"""Stresses and plane sets with known answers, without meshes."""

import numpy as np

from structviz.kinematics.senses import nearest_word, sector_of_words
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.planes import rakes_deg
from structviz.orientation.vectors import rotation
from structviz.stress.evidence import gather
from structviz.stress.tensor import reduced_tensor


def conjugate_normals(axes, count, scatter_deg, rng, half_angle_deg=30.0):
    """Normals of two conjugate sets about axes (rows), each turned by a random vector; upward."""
    inner = np.radians(half_angle_deg)
    sets = np.array([[np.sin(inner), 0, np.cos(inner)], [np.sin(inner), 0, -np.cos(inner)]]) @ axes
    turned = [rotation(rng.normal(size=3), abs(rng.normal()) * scatter_deg) @ sets[k % 2] for k in range(count)]
    up = np.array(turned)
    return up * np.where(up[:, 2:] < 0, -1.0, 1.0)


def labels_of(axes, ratio, normal_vectors):
    """The dominant word of the slip that a stress gives each plane."""
    rakes = rakes_deg(normal_vectors, resolved_slip(reduced_tensor(axes, ratio), normal_vectors))
    return [nearest_word(rake) for rake in rakes]


def evidence_of(normal_vectors, words):
    count = len(normal_vectors)
    sectors = [sector_of_words(word) if word else None for word in words]
    return gather(list(normal_vectors[:, None]), [np.ones(1)] * count, sectors, np.ones(count), np.ones(count, bool))
