"""How does the answer change with the friction angle, and without any one of the faults, for a model built from arrays?"""

import numpy as np

from structviz import Fault, FaultModel, Settings, Surface, run, sector_of_words

TRIANGLES = np.array([[0, 1, 2], [0, 2, 3]])


def rectangle(name: str, trace: tuple[float, float, float, float], dip_deg: float, depth_m: float = 5000.0) -> Surface:
    """Return a fault that dips to the right of its trace (easting, northing of start and end, m) from the ground to a depth."""
    start, end = np.array(trace).reshape(2, 2)
    along = (end - start) / np.hypot(*(end - start))
    right = np.array([along[1], -along[0]]) * depth_m / np.tan(np.radians(dip_deg))
    corners = [(*start, 0), (*end, 0), (*(end + right), -depth_m), (*(start + right), -depth_m)]
    return Surface(name, np.array(corners, float), TRIANGLES)


# A graben that strikes north, faults on both sides, and two transfer faults across it. One of the labels is wrong.
rows = [
    ("West 1", (0, 0, 300, 9000), 58, "normal"),
    ("West 2", (2500, 500, 2300, 8500), 63, "normal"),
    ("West 3", (4000, 1000, 4900, 8000), 60, "normal"),
    ("East 1", (12000, 9000, 11500, 0), 62, "normal"),
    ("East 2", (14000, 8000, 14400, 500), 57, "normal"),
    ("East 3", (16000, 8500, 15800, 1500), 65, "reverse"),
    ("North transfer", (1000, 9500, 13000, 13500), 75, "sinistral-normal"),
    ("South transfer", (1000, -500, 13000, -4500), 75, "dextral-normal"),
]
faults = tuple(Fault(name, rectangle(name, trace, dip), sector_of_words(sense)) for name, trace, dip, sense in rows)
model = FaultModel("graben", faults)


def summary(model: FaultModel, settings: Settings) -> str:
    """Return the regime and the conflicts of a model in a line."""
    analysis = run(model, settings)
    if not analysis.regimes:
        return "no stress could be inferred"
    regime = analysis.regimes[0]
    conflicts = ", ".join(result.fault.name for result in analysis.conflicting) or "none"
    return f"{regime.kind:<14} SHmax {regime.shmax_deg:03.0f} +/- {regime.shmax_half_width_deg:.0f}   conflicts: {conflicts}"


print("friction angle")
for friction in (15, 30, 45):
    print(f"  {friction} deg            {summary(model, Settings(friction_angle_deg=friction))}")

print("without")
for left_out in faults:
    others = tuple(fault for fault in faults if fault is not left_out)
    print(f"  {left_out.name:<16}  {summary(FaultModel('graben', others), Settings())}")
