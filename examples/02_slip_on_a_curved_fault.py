"""Which way does each stretch of a curved fault slip under a known stress, and how much does that hang on the shape ratio R?"""

import numpy as np

from structviz.kinematics.senses import describe_rake
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.lines import vectors
from structviz.orientation.planes import rakes_deg, strike_dip_deg
from structviz.orientation.vectors import unit
from structviz.stress.tensor import reduced_tensor, slip_tendency
from structviz.synthetic import bent_surface

# Strike-slip: sigma1 level towards 020, sigma2 vertical, sigma3 level towards 110.
axes = np.stack([vectors(20, 0), vectors(0, 90), vectors(110, 0)])

# A fault that strikes 140 in the middle and turns by 60 degrees from end to end, dipping 75 degrees to the south-west.
surface = bent_surface("curved", 140, 75, 12_000, 5_000, (0, 0, -4_000), bend_deg=60)

# Area-weighted normals of six stretches, from one end to the other; the triangles already face the hanging wall.
corners = surface.vertices[surface.triangles]
area_vectors = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]) / 2
along = corners.mean(1) @ vectors(140, 0)
stretch = np.digitize(along, np.linspace(along.min(), along.max(), 7)[1:-1])
normals = unit(np.stack([area_vectors[stretch == k].sum(0) for k in range(6)]))
strikes, dips = strike_dip_deg(normals)

print("stretch  strike/dip   R = 0.1                 R = 0.5                 R = 0.9                 tendency")
for k in range(6):
    slips = [rakes_deg(normals[k], resolved_slip(reduced_tensor(axes, ratio), normals[k])) for ratio in (0.1, 0.5, 0.9)]
    words = "  ".join(f"{rake:5.0f} {describe_rake(float(rake)):<16}" for rake in slips)
    tendency = float(slip_tendency(reduced_tensor(axes, 0.5), normals[k]))
    print(f"{k + 1:>7}  {strikes[k]:03.0f}/{dips[k]:02.0f}      {words}  {tendency:.2f}")

print("\nRakes after Aki and Richards: 0 sinistral, 180 dextral, 90 reverse, -90 normal. Tendency: share of the greatest on any plane.")
