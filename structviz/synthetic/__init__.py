"""Models with known answers: random ones to measure accuracy, large ones for speed, damaged surfaces, the demo model.

Everything here is made from a fixed random state and nothing is read from a file.
"""

from structviz.synthetic.damage import DAMAGE, damaged_surface, sound_surface
from structviz.synthetic.demo import Demo, demo_model
from structviz.synthetic.models import Known, large_model, random_model
from structviz.synthetic.phased import KnownPhases, phased_model
from structviz.synthetic.shapes import Relief, bent_surface, overturning_surface, plane_surface, relief_surface
from structviz.synthetic.turning import KnownTurning, turning_model

__all__ = [
    "DAMAGE",
    "Demo",
    "Known",
    "KnownPhases",
    "KnownTurning",
    "Relief",
    "bent_surface",
    "damaged_surface",
    "demo_model",
    "large_model",
    "overturning_surface",
    "phased_model",
    "plane_surface",
    "random_model",
    "relief_surface",
    "sound_surface",
    "turning_model",
]
