"""Which stress could have moved the faults of the demo model, and which declared movements does it contradict?"""

from pathlib import Path

import structviz

model = Path(__file__).resolve().parents[1] / "meshes" / "model.toml"
analysis = structviz.check(model)

for reading in analysis.readings:
    if reading.regime is None:
        print(f"{reading.title:<24} nothing: {reading.why_not}")
        continue
    regime = reading.regime
    cones = "/".join(f"{cone:.0f}" for cone in regime.cones_deg)
    print(f"{reading.title:<24} {regime.kind}, SHmax {regime.shmax_deg:03.0f}, cones of sigma1/2/3 {cones} deg")

table = structviz.fault_table(analysis)
print(f"\n{'fault':<10} {'strike/dip':<11} {'declared':<17} {'predicted':<17} {'misfit':>6}  verdict")
for row in sorted(range(len(table["name"])), key=lambda k: -table["misfit_deg"][k]):
    plane = f"{table['strike_deg'][row]:03.0f}/{table['dip_deg'][row]:02.0f}"
    words = f"{table['declared'][row]:<17} {table['predicted'][row]:<17}"
    print(f"{table['name'][row]:<10} {plane:<11} {words} {table['misfit_deg'][row]:>6.0f}  {table['verdict'][row]}")

print("\nFindings about the model as a whole:")
for finding in analysis.findings:
    if finding.subject == "model":
        print(f"- {finding.severity}: {finding.message}")
