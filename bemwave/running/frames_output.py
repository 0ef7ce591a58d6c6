"""The frames of a run: what is drawn of a case, and when."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from pathlib import Path

import numpy as np
import numpy.typing as npt

from bemwave import __version__
from bemwave.bodies.modes import displacement
from bemwave.case.output import Box
from bemwave.case.output import Frames as Entry
from bemwave.flow.state import SurfaceState
from bemwave.frames import (
    Crests,
    DrawnBody,
    FrameWriter,
    Guide,
    MovingSurface,
    Sheet,
    SolvedShift,
    drawn_mesh,
    sheet_of,
)
from bemwave.frames.surface import Flow
from bemwave.geometry.outline import Circle, Rectangle
from bemwave.geometry.pose import Pose
from bemwave.running.riding import Rider
from bemwave.running.sea import added_sea, unscattered_sea
from bemwave.running.solution import Solution
from bemwave.running.survey import Survey
from bemwave.waves import Sea

Array = npt.NDArray[np.float64]

TAPER_CELLS = 4  # squares from a waterline over which displacement comes up


class FramesOutput:
    """frames/, told where the bodies have gone."""

    def __init__(
        self,
        survey: Survey,
        solution: Solution | None,
        flow: Flow | None,
        riders: Sequence[Rider],
        folder: Path,
        keep: int,
    ) -> None:
        case = survey.case
        assert case.frames is not None
        self._survey, self._solution, self._riders = survey, solution, riders
        asked = case.solved_bodies + case.riding_bodies
        bodies = [
            DrawnBody(hull.name, drawn_mesh(hull), hull.place, body.attitude != "fixed")
            for hull, body in zip(survey.hulls + survey.riders, asked, strict=True)
        ]
        surface = moving_surface(survey, case.frames, flow)
        note = f"{note_on(survey)}; bemwave {__version__}"
        guides = list(_guides(survey))
        self._writer = FrameWriter(case.frames, surface, bodies, folder, keep, guides, note)
        self.times = self._writer.times

    @property
    def count(self) -> int:
        """See `Output`."""
        return self._writer.count

    def write(self, state: SurfaceState) -> None:
        """See `Output`."""
        places: dict[str, Pose] = {}
        if self._solution is not None:
            motion = self._solution.motions(state.time)[0]
            hulls = self._survey.hulls
            places = {h.name: displacement(h, row) for h, row in zip(hulls, motion, strict=True)}
        for hull, rider in zip(self._survey.riders, self._riders, strict=True):
            places[hull.name] = displacement(hull, rider.motion(state))
        self._writer.write(state, places)

    def flush(self) -> None:
        """Frames are whole files already."""


def moving_surface(survey: Survey, entry: Entry, flow: Flow | None) -> MovingSurface:
    """The surface that [frames] asks for."""
    sheet = sheet_of(entry, survey.water, survey.hulls, survey.outline.contains)
    lines = [polygon for hull in survey.hulls for polygon in hull.polygons()]
    sea, short = _seas(survey, bool(lines))
    crests = _crests(survey, entry, flow, sheet, lines) if entry.horizontal_displacement else None
    return MovingSurface(sheet, sea, flow, short, lines, crests)


def _seas(survey: Survey, sheltered: bool) -> tuple[Sea, Sea]:
    """What is drawn as it is, and what is faded behind hulls."""
    added = added_sea(survey.case, survey.mirrors)
    if not (added.count and sheltered):
        return survey.sea + added, Sea.still(added.depth, added.density, added.gravity)
    spacing = survey.case.surface.spacing
    return survey.scattered, unscattered_sea(survey.sea, spacing) + added


def _crests(
    survey: Survey, entry: Entry, flow: Flow | None, sheet: Sheet, lines: list[Array]
) -> Crests:
    spacing, outline = survey.case.surface.spacing, survey.outline
    width = max(TAPER_CELLS * entry.spacing, spacing)
    if flow is None:
        return Crests(sheet, lines, width)
    if isinstance(outline, Circle):
        reach = outline.radius
        water = Rectangle(
            outline.x - reach, outline.x + reach, outline.y - reach, outline.y + reach
        )
    else:
        water = outline
    places, depth = sheet.mesh.points[:, :2], survey.case.water.depth
    around = (water, outline.contains, survey.hulls, spacing, depth, places)
    return Crests(sheet, lines, width, SolvedShift(flow.surface_sampler, *around))


def shares(survey: Survey) -> dict[str, float]:
    """Shares of the drawn sea's variance: the case's own, solved with, and added above its band."""
    if survey.case.frames is None:
        return {}
    added = added_sea(survey.case, survey.mirrors).moment(0)
    whole = survey.sea.moment(0) + added
    share = added / whole if whole > 0.0 else 0.0
    return {"frames_share_solved": 1.0 - share, "frames_share_added": share}


def note_on(survey: Survey) -> str:
    """What whoever opens a frame must know of it."""
    entry, share = survey.case.frames, shares(survey)
    assert entry is not None
    drawn = []
    if share["frames_share_added"] > 0.0:
        drawn.append(
            f"{100 * share['frames_share_added']:.2g} % of the sea's variance is detail added "
            "above the band solved with, short waves faded behind hulls"
        )
    if entry.horizontal_displacement:
        drawn.append("crests are displaced horizontally as linear theory has it")
    if not drawn:
        return "linear waves: elevation of the case's sea and solved field"
    return "; ".join(drawn) + ": for pictures only, never for loads or clearance"


def _guides(survey: Survey) -> Iterator[Guide]:
    """Gauges as upright lines, hand-off boxes as their edges."""
    half = max(1.0, survey.sea.significant_height)
    for gauge in survey.case.gauge:
        if gauge.body is None:
            foot, head = ([*gauge.position, z] for z in (-half, half))
            yield Guide(gauge.name, [np.array([foot, head], dtype=np.float64)])
    for entry in survey.case.handoff:
        if entry.box is not None and entry.body is None:
            yield Guide(entry.name, _edges(entry.box))


def _edges(box: Box) -> list[Array]:
    turn = math.radians(box.angle)
    axes = np.array([[math.cos(turn), math.sin(turn)], [-math.sin(turn), math.cos(turn)]])
    corners = np.array([[-1, -1], [1, -1], [1, 1], [-1, 1], [-1, -1]]) * np.array(box.size) / 2
    plan = corners @ axes + box.centre
    rings = [np.column_stack([plan, np.full(5, z)]) for z in (box.bottom, box.top)]
    return [*rings, *(np.array([rings[0][k], rings[1][k]]) for k in range(4))]
