"""Hand-off: the field at a box's faces, in its zone, or at a list of points, for another solver."""

from bemwave.handoff.box import Box, PointSet, box_points, box_volume, free_points
from bemwave.handoff.closure import Closure, closure_figure
from bemwave.handoff.delivery import Handoff, Scene, axes_of, box_of, instants
from bemwave.handoff.divergence import CellDivergence, divergence_figure
from bemwave.handoff.fields import Flow
from bemwave.handoff.placing import EARTH, Axes
from bemwave.handoff.plan import Waterplane
from bemwave.handoff.sampler import HandoffSampler
from bemwave.handoff.writer import HandoffFile, Terms

__all__ = [
    "EARTH",
    "Axes",
    "Box",
    "CellDivergence",
    "Closure",
    "Flow",
    "Handoff",
    "HandoffFile",
    "HandoffSampler",
    "PointSet",
    "Scene",
    "Terms",
    "Waterplane",
    "axes_of",
    "box_of",
    "box_points",
    "box_volume",
    "closure_figure",
    "divergence_figure",
    "free_points",
    "instants",
]
