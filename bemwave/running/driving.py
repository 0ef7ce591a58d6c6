"""What drives the solved field of a case: scattered sea, moving bodies and walls, patches."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from bemwave.bodies.modes import MODES, mode_shapes, panels_of
from bemwave.case.sea import Hump
from bemwave.flow.elements import Elements
from bemwave.kernels.panels import THREE
from bemwave.running.survey import Survey
from bemwave.stepping.forcing import (
    GivenFlux,
    Motion,
    MovingParts,
    Oscillation,
    PressurePatch,
    Ramp,
    ScatteredSea,
)
from bemwave.stepping.motion_file import FileMotion

Array = npt.NDArray[np.float64]

AT_ONCE = 1e-9  # s: the rates of a shorter start-up would overflow


@dataclass(frozen=True)
class Driving:
    """The given fluxes of a case.

    Attributes
    ----------
    parts : "scattered" and "radiated", those that there are; what humps and patches make and
        hulls throw back of it belongs to the first.
    motions : for each body its six displacements in time, None where it is fixed.
    patches : travelling pressure.
    ramp : the start-up.
    """

    parts: dict[str, GivenFlux]
    motions: tuple[tuple[Motion | None, ...], ...]
    patches: Sequence[PressurePatch]
    ramp: Ramp


def start_up(survey: Survey) -> Ramp:
    """The ramp of the case: two of its longest or peak periods where it is left open."""
    asked = survey.case.run.ramp
    if asked != "auto":
        return Ramp(float(asked) if float(asked) > AT_ONCE else 0.0)
    periods = survey.periods
    known = [p for p in (periods.peak, periods.longest) if math.isfinite(p)]
    return Ramp(2.0 * max(known, default=0.0))


def driving(survey: Survey, elements: Elements) -> Driving:
    """Make the given fluxes of a surveyed case on its elements."""
    ramp = start_up(survey)
    parts: dict[str, GivenFlux] = {}
    if survey.scattered.count or survey.case.hump or survey.case.pressure:
        parts["scattered"] = _scattered(survey, elements, ramp)
    moving = _moving(survey, elements, ramp)
    if moving.motions:
        parts["radiated"] = moving
    patches = [PressurePatch(p.head, p.width, p.centre, p.velocity) for p in survey.case.pressure]
    return Driving(parts, tuple(_motions(survey, ramp)), patches, ramp)


def _scattered(survey: Survey, elements: Elements, ramp: Ramp) -> ScatteredSea:
    corners = elements.points[elements.hull]
    points = np.einsum("qj,mjc->mqc", THREE[:, :3], corners).reshape(-1, 3)
    sea = survey.scattered.at(np.minimum(points, [np.inf, np.inf, 0.0]))
    return ScatteredSea(sea, elements.hull_table[:, 9:12], THREE[:, 3], ramp)


def _motions(survey: Survey, ramp: Ramp) -> list[tuple[Motion | None, ...]]:
    """Displacements of each body; metres and radians."""
    result = []
    for body, file in zip(survey.case.solved_bodies, survey.motion_files, strict=True):
        row: list[Motion | None] = [None] * 6
        if body.forced is not None:
            mode = MODES.index(body.forced.mode)
            amplitude = body.forced.amplitude * (math.pi / 180.0 if mode > 2 else 1.0)
            row[mode] = Oscillation(amplitude, 2.0 * math.pi / body.forced.period, ramp)
        if file is not None:
            row = [
                FileMotion(file, mode, ramp) if mode in file.moved else None for mode in range(6)
            ]
        result.append(tuple(row))
    return result


def _moving(survey: Survey, elements: Elements, ramp: Ramp) -> MovingParts:
    """Bodies that are moved, and wavemakers."""
    mesh = survey.mesh
    assert mesh is not None
    shapes: list[Array] = []
    motions: list[Motion] = []
    for hull, row in zip(survey.hulls, _motions(survey, ramp), strict=True):
        panels = panels_of(elements, mesh.part, mesh.part_names.index(hull.name))
        body_shapes = mode_shapes(elements, panels, hull)
        for mode, motion in enumerate(row):
            if motion is not None:
                shapes.append(body_shapes[:, mode])
                motions.append(motion)
    for maker in survey.case.wavemaker:
        panels = panels_of(elements, mesh.part, mesh.part_names.index(f"wall_{maker.side}"))
        shapes.append(_wall_shape(elements, panels, maker.side, maker.kind, survey))
        motions.append(Oscillation(maker.stroke / 2.0, 2.0 * math.pi / maker.period, ramp))
    stacked = np.column_stack(shapes) if shapes else np.zeros((len(elements.hull), 0))
    return MovingParts(stacked, motions)


def _wall_shape(
    elements: Elements, panels: npt.NDArray[np.int64], side: str, kind: str, survey: Survey
) -> Array:
    """Normal velocity of a wall for a unit velocity into the water, at still water for a flap."""
    depth = survey.case.water.depth
    height = 1.0 + elements.hull_table[panels, 26] / depth if kind == "flap" else 1.0
    inward = np.array([1.0 if side.endswith("min") else -1.0, 0.0, 0.0])
    if side.startswith("y"):
        inward = inward[[1, 0, 2]]
    shape = np.zeros(len(elements.hull))
    shape[panels] = height * (elements.hull_table[panels, 9:12] @ inward)
    return shape


def released_elevation(humps: Sequence[Hump], xy: Array) -> Array:
    """(n,) the humps let go at t = 0, at places (n, 2) [m]."""
    result = np.zeros(len(xy))
    for hump in humps:
        r2 = ((xy - hump.centre) ** 2).sum(axis=1)
        result += hump.height * np.exp(-0.5 * r2 / hump.width**2)
    return result
