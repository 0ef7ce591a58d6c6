"""Figures about a run known before it is solved: reflection, phase error, time to trust."""

from __future__ import annotations

import math

import numpy as np

from bemwave.flow.dispersion import frequency_error, phase_error
from bemwave.handoff import box_of
from bemwave.running.driving import start_up
from bemwave.running.sea import length_of_period
from bemwave.running.survey import Survey
from bemwave.waves import group_speed


def forecasts(survey: Survey) -> dict[str, float]:
    """Forecast figures by name; they go into the manifest too."""
    figures = {"unscattered_share": survey.unscattered_share}
    water, surface = survey.case.water, survey.case.surface
    if survey.layer is not None:
        figures["reflection"] = survey.layer.reflection
    if survey.layer is not None and survey.layer.passed:
        figures["passed"] = survey.layer.passed
    if survey.sheet is not None:
        return figures
    if survey.mesh is not None and math.isfinite(survey.periods.peak):
        wavelength = length_of_period(survey.periods.peak, water.depth, water.gravity)
        even, distance = not survey.hulls, math.hypot(*surface.extent)
        size, depth = surface.spacing, water.depth
        error = frequency_error(wavelength, size, depth, closed=survey.closed, structured=even)
        phase = phase_error(
            wavelength, size, distance, depth, closed=survey.closed, structured=even
        )
        figures["dispersion_forecast"] = abs(error)
        figures["phase_error_degrees"] = math.degrees(abs(phase))
    return figures


def trustworthy_from(survey: Survey) -> float:
    """When scattered waves of the peak have passed all bodies, gauges and boxes [s].

    They start at the bodies, so that water further off than these does not count.
    """
    water = survey.case.water
    if survey.mesh is None or math.isinf(survey.periods.peak):
        return 0.0
    speed = float(group_speed(survey.periods.peak, water.depth, water.gravity))
    return start_up(survey).length + _span(survey) / speed


def _span(survey: Survey) -> float:
    """Across all that is in the water [m]; across the useful water where waves start in it all."""
    case = survey.case
    if not survey.hulls:
        return math.hypot(*case.surface.extent)
    places = [hull.mesh.points[:, :2] for hull in survey.hulls]
    places += [np.array([gauge.position]) for gauge in case.gauge]
    boxes = [box_of(entry) for entry in case.handoff]
    corners = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]]) / 2.0
    places += [box.to_earth(corners * box.size) for box in boxes if box is not None]
    return float(np.hypot(*np.ptp(np.concatenate(places), axis=0)))
