"""Is a phase carried by conjugate planes, or by one set of parallel ones?

Faults that follow an old fabric are parallel, and a stress can always be found for which parallel planes are new faults. What
tells a phase from a fabric is its other plane: new faults form in two sets [anderson1951]. So the orientations of a phase count
for it only where faults of its own stand on both.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.stress.evidence import EvidenceModel, FaultEvidence

Floats = NDArray[np.float64]

OWN = 0.75  # membership from which a fault is a phase's own
NEAR_SCATTERS = 2.5  # a plane this many scatters from the ideal one is still on it
LEAST_ON_EACH = 2.0  # faults; chosen on models of one seed and checked on another (tests/benchmarks/phases.py)


def on_one_plane(evidence: FaultEvidence, membership: Floats, frames: Floats, odds: EvidenceModel) -> NDArray[np.bool_]:
    """Return for each phase, (K,), whether its own faults leave one of the two new planes of its stress empty.

    membership is (F, K), frames (K, 3, 3) with rows sigma1, sigma2, sigma3. Planes at the acute and at the obtuse angle count alike.
    """
    inner = np.radians(90.0 - odds.friction_angle_deg) / 2
    near = np.cos(np.radians(NEAR_SCATTERS * odds.plane_scatter_deg))
    found = []
    for phase, frame in enumerate(frames):
        weight = np.where(membership[:, phase] >= OWN, evidence.shares.T, 0.0).T * evidence.geometry_known[:, None]
        counts = []
        for one, three in ((np.sin(inner), np.cos(inner)), (np.cos(inner), np.sin(inner))):
            sides = [np.abs(evidence.normals @ (one * frame[0] + sign * three * frame[2])) for sign in (1.0, -1.0)]
            counts.append([(weight * (side >= near)).sum() for side in sides])
        found.append(max(min(pair) for pair in counts) < LEAST_ON_EACH)
    return np.array(found, bool)
