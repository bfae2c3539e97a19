"""Where does the stress of a model turn, and how well is it known at places of your own?"""

import numpy as np

from structviz import Settings, run, stress_field
from structviz.synthetic import turning_model

# Eighty normal faults under a stress whose azimuth turns by 60 degrees from west to east.
known = turning_model(60.0, 80, random_state=5)
analysis = run(known.model, Settings(replicates=200))
place = analysis.by_place
assert place is not None

print(f"bandwidth {place.bandwidth.radius_m / 1000:.1f} km, {place.bandwidth.gain:.0f} nats better than one stress")
for regime in analysis.regimes:
    print(f"{regime.name}: {regime.kind}, SHmax {regime.shmax_deg:03.0f} +/- {regime.shmax_half_width_deg:.0f}, {regime.faults} faults")

# A line of places from west to east through the middle of the model, and one far outside it.
west, east = place.data.places[:, 0].min(), place.data.places[:, 0].max()
middle = place.data.places.mean(0)
line = np.array([[easting, middle[1], middle[2]] for easting in [*np.linspace(west, east, 5), east + 100_000.0]])
field = stress_field(place.data, line, place.bandwidth.radius_m)

print("easting   SHmax  spread  faults near")
for easting, azimuth, spread, count, supported in zip(
    line[:, 0], field.shmax_deg, field.spread_deg[:, 2], field.count, field.supported, strict=True
):
    told = f"{azimuth:5.0f}  {spread:5.0f}" if supported else "  blank beyond the data"
    print(f"{easting:7.0f}   {told}  {count:6d}")
