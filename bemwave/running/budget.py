"""Memory and time that a case will take, forecast before anything large is made."""

from __future__ import annotations

import math
import os
import time as clock
from dataclasses import dataclass

import numpy as np

from bemwave.errors import InputError
from bemwave.flow.coupling import AT_ONCE, CLOSE, FINER, POINTS
from bemwave.flow.elements import split
from bemwave.flow.images import make_images
from bemwave.flow.sheet import Sheet
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.waterplane import WATERPLANE
from bemwave.running.route import MOST_TRIANGLES
from bemwave.running.solution import STEPS_PER_PERIOD
from bemwave.running.survey import Survey

GIGABYTE = 1e9

INSTANTS_PER_PERIOD = 20  # at gauges, and for loads and energy, in the shortest period of all
_COMPONENT = 1e-8  # s, of a component of the sea at one of three points of a hull's panel: measured
_INSTANT = 1.5e-3  # s, to read the field off, reckon energy and loads, and write them: measured

# bytes a node of the grid, measured; a part of the field is kept at eight steps and two rates
_FIELDS, _PART, _SAMPLED = 125, 200, 85
_ON_PANELS = 0.25 * GIGABYTE  # libraries and kernels together, measured
_ASSEMBLING, _RUNNING = 0.295 * GIGABYTE, 0.4 * GIGABYTE  # the same on the grid
_FEW = 170  # rows that stand for all


@dataclass(frozen=True)
class Budget:
    """Forecast of a run.

    triangles, nodes : of the boundary mesh; unknowns of the surface.
    memory : largest at any time [bytes].
    assembly, stepping : wall seconds.
    """

    triangles: int
    nodes: int
    memory: float
    assembly: float
    stepping: float


def memory_of(survey: Survey) -> tuple[int, int, float]:
    """Triangles, surface unknowns and peak memory [bytes] of a surveyed case."""
    if survey.mesh is None:
        return 0, 0, 0.2 * GIGABYTE
    if survey.sheet is not None:
        return _on_grid(survey, survey.mesh, survey.sheet)
    return _on_panels(survey, survey.mesh)


def _on_panels(survey: Survey, mesh: SurfaceMesh) -> tuple[int, int, float]:
    """The same on panels: dense matrices of float64, as many as `flow/panels.py` has at a time."""
    e = split(mesh, survey.closed, survey.mirrors, survey.case.water.depth)
    water, hull, nodes, free = len(e.water), len(e.hull), e.nodes, e.free
    layers = 2 if survey.closed or survey.mirrors else 1  # whose images' weights differ
    most = [
        layers * water**2 + water * nodes + 2 * nodes**2,
        2 * hull**2 + hull * nodes + 2 * nodes**2,
        7 * free**2 + 2 * free * hull + e.below * (free + hull),  # the map of a step
    ]
    if survey.closed:
        factor = water**2 + 2 * water * hull
        most[1] += factor
        most += [3 * water**2 + nodes**2]
        most += [factor + 3 * water * nodes + 5 * hull * nodes + nodes**2]
    return len(mesh.triangles), free, 8.0 * max(most) + _ON_PANELS


def _on_grid(survey: Survey, mesh: SurfaceMesh, sheet: Sheet) -> tuple[int, int, float]:
    """The same on the grid: fields of its nodes, and dense maps between hulls and nodes near.

    These are made from a finer sheet round the hulls, some points of hulls at a time.
    """
    case, triangles, nodes = survey.case, len(mesh.triangles), len(mesh.points)
    hull = mesh.triangles[mesh.part != mesh.part_names.index(WATERPLANE)]
    panels, rows = len(hull), len(hull) + len(np.unique(hull))
    near = 2.0 * CLOSE[1] + np.ptp(mesh.points[:, :2], axis=0) / sheet.spacing if nodes else 0.0
    close = float(np.prod(near))
    fine = FINER**2 * float(np.prod(near + 2.0)) if nodes else 0.0
    held = nodes**2 + nodes * panels + rows * (close + _FEW)
    parts = max(15 * POINTS * fine, 10 * AT_ONCE if nodes else 0)  # at a time; measured
    assembling = max(2 * triangles**2, held + 2 * nodes**2 + nodes * panels + parts)
    scattered = bool(survey.scattered.count or case.hump or case.pressure)
    moved = any(body.attitude not in ("fixed", "follow") for body in case.body)
    sampled = bool(case.gauge or case.handoff or case.frames)
    # nine arrays of a part are kept from step to step
    a_part = _PART - (36 if case.run.precision == "single" else 0)
    a_node = _FIELDS + a_part * max(1, scattered + moved) + _SAMPLED * sampled
    running = 8.0 * held + a_node * sheet.size + _RUNNING
    return triangles, sheet.size, max(8.0 * assembling + _ASSEMBLING, running)


def memory_allowed(survey: Survey) -> float:
    """What the case or the machine allows [bytes]."""
    asked = survey.case.run.memory_limit
    if asked != "auto":
        return float(asked) * GIGABYTE
    return 0.9 * float(os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES"))


def refuse_too_large(survey: Survey) -> None:
    """Raise InputError if the case does not fit, saying what would."""
    triangles, nodes, memory = memory_of(survey)
    allowed = memory_allowed(survey)
    if survey.sheet is not None and memory > allowed:
        fits = survey.case.surface.spacing * (memory / allowed) ** 0.5
        raise InputError(
            f"[surface] spacing = {survey.case.surface.spacing:g} m makes {nodes} nodes, which "
            f"need {memory / GIGABYTE:.1f} GB; expected at most {allowed / GIGABYTE:.1f} GB: about "
            f"spacing = {fits:.2g} m would fit, or less water"
        )
    if triangles <= MOST_TRIANGLES and memory <= allowed:
        return
    ratio = max(triangles / MOST_TRIANGLES, (memory / allowed) ** 0.5)
    fits = survey.case.surface.spacing * ratio**0.5
    raise InputError(
        f"[surface] spacing = {survey.case.surface.spacing:g} m makes {triangles} triangles, which "
        f"need {memory / GIGABYTE:.1f} GB; expected at most {MOST_TRIANGLES} triangles and "
        f"{allowed / GIGABYTE:.1f} GB: about spacing = {fits:.2g} m would fit, or less water"
    )


def budget(survey: Survey) -> Budget:
    """Forecast memory, and time by a short calibration on this machine and mesh."""
    triangles, nodes, memory = memory_of(survey)
    if survey.mesh is None:
        return Budget(0, 0, memory, 0.0, 0.0)
    if survey.sheet is not None:
        return _grid_budget(survey, survey.sheet, triangles, memory)
    product = _seconds_per_flop()
    # five products for the step's map, and where walls close the water a factor of the sheet's V
    flops = 10 * nodes**3 + (triangles**3 / 3 if survey.closed else 0)
    assembly = _assembly_seconds(survey) + product * flops
    steps = _steps(survey)
    # a step and a state read off are about four products bound by memory, 8 bytes an entry
    stepping = steps * 4 * nodes**2 * 8 / 1.5e10 + _beside_flow(survey, steps)
    return Budget(triangles, nodes, memory, assembly, stepping)


def _grid_budget(survey: Survey, sheet: Sheet, panels: int, memory: float) -> Budget:
    """A step is about four pairs of transforms, a state read off eight."""
    field = np.zeros((1, *sheet.shape))
    pair = math.inf
    for _ in range(3):  # the first is slower than those of a run
        start = clock.perf_counter()
        sheet.back(sheet.transform(field))
        pair = min(pair, clock.perf_counter() - start)
    steps = _steps(survey)
    # the bed's images are sums over nodes, which cost little beside the fine sheet: measured
    a_panel = 0.005 if math.isinf(sheet.depth) else 0.01
    stepping = steps * 8.0 * pair + _beside_flow(survey, steps)
    return Budget(panels, sheet.size, memory, panels * a_panel, stepping)


def _beside_flow(survey: Survey, steps: float) -> float:
    """Seconds for the sea at the hulls, at steps and at instants, and for what is written then."""
    assert survey.mesh is not None
    instants = instants_between(survey)
    points = 3 * (len(survey.mesh.triangles) - len(survey.water.triangles))
    sea = _COMPONENT * survey.scattered.count * points * (steps + 2.0 * instants)
    return sea + instants * _INSTANT


def instants_between(survey: Survey) -> int:
    """How many intervals gauges, loads and energy have: of every record, whole ones."""
    run = survey.case.run
    records = round(run.duration / run.record_every)
    wanted = survey.periods.kept / INSTANTS_PER_PERIOD
    return records * max(1, math.ceil(run.record_every / wanted - 1e-9))


def _steps(survey: Survey) -> float:
    """How many are taken, about: the mesh's own quick waves may ask for more."""
    run, step = survey.case.run, survey.periods.shortest / STEPS_PER_PERIOD[survey.route[0]]
    return run.duration / (max(step, 1e-3) if run.step == "auto" else float(run.step))


def _seconds_per_flop() -> float:
    matrix = np.ones((600, 600))
    matrix @ matrix
    start = clock.perf_counter()
    for _ in range(3):
        matrix @ matrix
    return (clock.perf_counter() - start) / (3 * 2 * 600**3)


def _assembly_seconds(survey: Survey) -> float:
    """Time of the panel integrals, from a few rows of them."""
    from bemwave.kernels.panels import pack, single_layer

    assert survey.mesh is not None
    table = pack(survey.mesh.vertices)
    span = float(np.ptp(survey.mesh.points[:, :2], axis=0).max())
    images = make_images(survey.case.water.depth, not survey.closed, survey.mirrors, span)
    count = max(1, len(images.weights) // (2 if survey.closed else 4))
    rows = table[:: max(1, len(table) // 48)]
    one = (images.signs[:1], images.shifts[:1], images.weights[:1, None])
    single_layer(rows[:2], table[:2], *one)
    start = clock.perf_counter()
    single_layer(rows, table, *one)
    per_row = (clock.perf_counter() - start) / len(rows)
    return 1.5 * per_row * len(table) * count
