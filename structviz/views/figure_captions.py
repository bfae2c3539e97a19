"""What stands under a figure: what it shows of which model, under which stress, and the caution that goes with it."""

from __future__ import annotations

from collections.abc import Sequence

from structviz.analysis import CAUTIONS, Analysis
from structviz.stress.regime import Regime
from structviz.views.captions import regime_line, shortened
from structviz.views.misfits import Misfits
from structviz.views.mohr import Mohr
from structviz.views.plunges import Plunges
from structviz.views.rose import Rose
from structviz.views.scene import Scene
from structviz.views.stereonet import Net
from structviz.views.viewpoints import Viewpoint

MOST_NAMED = 8
GLYPHS = (
    "Each body is a stress: dark cones press along \u03c31, the lens is long along \u03c33; "
    "large for all faults together, small where pairs of faults meet."
)


def _told(analysis: Analysis, *sentences: str) -> str:
    """Return a caption: sentences on the figure, then model, stress and caution."""
    return " ".join([*(s for s in sentences if s), _model(analysis), _stress(analysis), CAUTIONS[0]])


def _model(analysis: Analysis) -> str:
    crs = f", {shortened(analysis.model.crs, 40)}" if analysis.model.crs else ""
    return f"Model: {shortened(analysis.model.title, 80)}, {_count(len(analysis.faults), 'fault')}{crs}."


def _stress(analysis: Analysis) -> str:
    if len(analysis.regimes) < 2:
        return f"{regime_line(analysis)}{' (95 %)' if analysis.regimes else ''}."
    return f"{regime_line(analysis)}: {'; '.join(_one_of_several(k, regime) for k, regime in enumerate(analysis.regimes, 1))}."


def _one_of_several(number: int, regime: Regime) -> str:
    azimuth, sure = f"{round(regime.shmax_deg) % 180:03d}", f"{regime.shmax_half_width_deg:.0f}\u00b0"
    name = f"{shortened(regime.name, 40)}, {regime.kind}" if regime.name and regime.name != regime.kind else regime.kind
    return f"({number}) {name}, SHmax {azimuth} \u00b1 {sure}"


def _conflicts(analysis: Analysis, how: str) -> str:
    """Return who conflicts, and how that is drawn."""
    names = [shortened(result.fault.name, 30) for result in analysis.conflicting]
    if not names:
        return "No declared movement conflicts with the stress that the other faults tell of."
    listed = ", ".join(names[:MOST_NAMED]) + (f" and {len(names) - MOST_NAMED} more" if len(names) > MOST_NAMED else "")
    return f"{how} the {_count(len(names), 'fault')} whose declared movement conflicts with the stress that the others tell of ({listed})."


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"


def scene_caption(analysis: Analysis, scene: Scene, place: Viewpoint) -> str:
    """Return the caption of the scene from a viewpoint."""
    eye = (
        ""
        if place.key == "map"
        else f" (azimuth {round(place.azimuth_deg) % 360:03d}\u00b0, {place.elevation_deg:.0f}\u00b0 above the horizon)"
    )
    return _told(
        analysis,
        f"The model {place.title}{eye}, faults by verdict.",
        _conflicts(analysis, "Dark, with a heavy rim:"),
        "Light, with a dashed rim: undetermined." if any(surface.kind == "undetermined" for surface in scene.surfaces) else "",
        GLYPHS if scene.glyphs else "",
        "Parallel projection, no vertical exaggeration.",
    )


def net_caption(analysis: Analysis, net: Net) -> str:
    """Return the caption of the net."""
    missing = len(analysis.faults) - len(net.planes)
    axes = ", ".join(f"{axis.label} {axis.text}" for axis in net.axes)
    return _told(
        analysis,
        f"Equal-area net, lower hemisphere: mean planes of {_count(len(net.planes), 'fault')} as great circles, their poles as crosses.",
        f"{_count(missing, 'fault')} without a meaningful mean plane left out." if missing else "",
        _conflicts(analysis, "Heavy lines:"),
        "Filled triangles: slip of the hanging wall predicted by the other faults, pointing down where it goes down; open ones: declared.",
        f"Principal axes, trend/plunge with 95 % cones: {axes}." if axes else "",
    )


def mohr_caption(analysis: Analysis, diagrams: Sequence[Mohr]) -> str:
    """Return the caption of Mohr's diagrams."""
    points = sum(len(fault.points) for each in diagrams for fault in each.faults)
    notes = "; ".join(f"({k}) {each.note}" for k, each in enumerate(diagrams, 1)) if len(diagrams) > 1 else diagrams[0].note
    return _told(
        analysis,
        f"Mohr diagram of reduced stress (0 at \u03c33, 1 at \u03c31; no magnitudes): "
        f"shear over normal stress at {points:,} stations on the faults.",
        f"{notes}.",
        _conflicts(analysis, "Dark triangles:"),
    )


def plunges_caption(analysis: Analysis, plunges: Plunges) -> str:
    """Return the caption of the triangle of plunges."""
    return _told(
        analysis,
        "Plunges of the principal axes: in a corner one axis stands upright; distances from the sides are squared sines of the plunges.",
        f"Large marks: the stress inferred; dots: {len(plunges.regimes[0].cloud)} bootstrap replicates over the faults.",
    )


def rose_caption(analysis: Analysis, rose: Rose) -> str:
    """Return the caption of the rose."""
    return _told(
        analysis,
        f"Rose of strikes of {_count(rose.faults, 'fault')}, undirected, in petals of 10\u00b0 whose areas are shares of the faults' area "
        f"(outer circle {100 * rose.longest_share:.0f} %).",
        _conflicts(analysis, "Dark, outermost in a petal:"),
    )


def misfits_caption(analysis: Analysis, misfits: Misfits) -> str:
    """Return the caption of the histogram of misfits."""
    return _told(
        analysis,
        f"Angles from declared to predicted slip of {_count(len(misfits.blocks), 'fault')}, each a block; "
        "the prediction leaves the fault itself out.",
        _conflicts(analysis, "Dark:"),
    )
