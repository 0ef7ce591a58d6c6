"""What it takes to write what a case asks for: points, memory and time of hand-offs and frames."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from numba import get_num_threads

from bemwave.errors import InputError
from bemwave.flow.images import make_images
from bemwave.frames import frame_times, need_libraries, refuse_waterlines
from bemwave.handoff import box_of
from bemwave.handoff.box import Box
from bemwave.handoff.delivery import INSTANTS_PER_PERIOD, instants
from bemwave.handoff.point_list import read_points
from bemwave.running.budget import (
    GIGABYTE,
    instants_between,
    memory_allowed,
    memory_of,
    refuse_too_large,
)
from bemwave.running.survey import Survey

# of a hand-off or a frame, and of any file of records; more is a slip of the pen
MOST_POINTS = 5_000_000
MOST_INSTANTS = 10_000_000

# rough costs, measured on one core
_INFLUENCE = 1.2e-7  # s, of a triangle on velocity and pressure at a point, each image
_COMPONENT = 2e-8  # s, of a component of the sea at a point and instant
_BANDWIDTH = 1e10  # bytes a second
_FIT = 1e-4  # s, of the surface's fit at a place
_FIT_BYTES = 2600.0  # of its maps, which stay
_FRAME = 1e-6  # s, of a vertex of one frame: the sea's transform and the writing

_FIELDS = 3  # of the sea whose factors are kept at a hand-off's points
_SEA_KEPT = 2.0**30  # bytes, at most, by `waves.SeaAtPoints`


@dataclass(frozen=True)
class Sampled:
    """A hand-off or the frames: points, how often, and the spacing that makes them [m]."""

    where: str
    points: int
    instants: int
    spacing: float
    inside: bool  # points in the water, not places on its surface


def refuse_unfit(survey: Survey) -> None:
    """Raise InputError for what does not fit in memory, or cannot be read or drawn."""
    refuse_too_large(survey)
    _refuse_endless(survey)
    if survey.case.frames is not None:
        need_libraries(survey.case.frames)
        if survey.sheet is not None and survey.case.frames.region is None:
            raise InputError(
                "[frames] was given without a region on route grid, which has no panels to draw; "
                "expected [frames] region = { size = [along x, along y] } and a spacing"
            )
        refuse_waterlines(survey.case.frames, survey.hulls)
    asked = list(sampled(survey))
    for one in asked:
        if one.points > MOST_POINTS:
            raise InputError(
                f"{one.where} spacing = {one.spacing:g} m makes {one.points:.2g} points; expected "
                f"at most {MOST_POINTS:.0g}: give a larger spacing, or less to sample"
            )
    sampling, allowed = sampling_memory(survey), memory_allowed(survey)
    needed = memory_of(survey)[2] + sampling
    if needed > allowed:
        most = max(asked, key=lambda one: one.points * (_row(survey) if one.inside else _FIT_BYTES))
        raise InputError(
            f"{needed / GIGABYTE:.1f} GB are needed, {sampling / GIGABYTE:.1f} GB of them to "
            f"sample; expected at most {allowed / GIGABYTE:.1f} GB: {most.where} makes "
            f"{most.points} points, give it a larger spacing or raise [run] memory_limit"
        )


def _refuse_endless(survey: Survey) -> None:
    """Raise InputError for more instants than any file should hold; counted, not yet made."""
    run, kept = survey.case.run, survey.periods.kept
    often: dict[str, float] = {
        f"[run] record_every = {run.record_every:g} s": run.duration / run.record_every,
        f"the shortest waves, of {kept:.3g} s,": instants_between(survey),
    }
    for entry in survey.case.handoff:
        every = kept / INSTANTS_PER_PERIOD if entry.every == "auto" else float(entry.every)
        where = f'[[handoff]] "{entry.name}" every = {every:.3g} s'
        often[where] = (entry.end - entry.start) / every
    if (frames := survey.case.frames) is not None:
        often[f"[frames] fps = {frames.fps:g}"] = (frames.end - frames.start) * frames.fps
    for where, count in often.items():
        if count > MOST_INSTANTS:
            raise InputError(
                f"{where} in {run.duration:g} s makes {count:.2g} instants; expected at most "
                f"{MOST_INSTANTS:.0e}: give fewer, or a shorter run"
            )


def sampling_memory(survey: Survey) -> float:
    """Memory for the linear maps to all points and places, and for the sea in the water [bytes]."""
    needed = 0.0
    for one in sampled(survey):
        if one.inside:
            needed += min(_FIELDS * 16.0 * survey.sea.count * one.points, _SEA_KEPT)
            needed += one.points * _row(survey)
        elif survey.mesh is not None:
            needed += one.points * _FIT_BYTES
    return needed


def sampling_seconds(survey: Survey) -> float:
    """Wall time to make the maps and to use them at every instant."""
    images = len(make_images(survey.case.water.depth, not survey.closed, survey.mirrors).weights)
    triangles = 0 if survey.mesh is None else len(survey.mesh.triangles)
    maps = _INFLUENCE * triangles * images / get_num_threads()
    seconds = 0.0
    for one in sampled(survey):
        if one.inside:
            use = _COMPONENT * survey.sea.count + _row(survey) / _BANDWIDTH
            seconds += one.points * (maps + one.instants * use)
        else:
            fit = 0.0 if survey.mesh is None else _FIT
            seconds += one.points * (fit + one.instants * (_FRAME + fit * 1e-2))
    return seconds


def _row(survey: Survey) -> float:
    """Bytes of the maps to velocity and pressure at one point."""
    if survey.mesh is None:
        return 0.0
    if survey.sheet is not None:
        return 8.0 * len(survey.mesh.triangles)  # of few rows' worth; measured
    hull = len(survey.mesh.triangles) - len(survey.water.triangles)
    return 4 * 8.0 * (len(survey.water.points) + 1.5 * hull)


def sampled(survey: Survey) -> Iterator[Sampled]:
    """Every hand-off of a case, and its frames.

    Raises
    ------
    InputError
        If a list of points cannot be read, or leaves the water.
    """
    case = survey.case
    for entry in case.handoff:
        where, box = f'[[handoff]] "{entry.name}"', box_of(entry)
        often = len(instants(entry, survey.periods.kept))
        if box is None:
            yield Sampled(where, len(read_points(entry, case).points), often, 0.0, True)
        else:
            points = _box_points(box, entry.volume_at_start)
            yield Sampled(where, points, often, min(box.spacing), True)
    frames = case.frames
    if frames is not None:
        points, spacing = len(survey.water.points), case.surface.spacing
        if frames.region is not None:
            x, y = (math.ceil(side / frames.spacing) for side in frames.region.size)
            points, spacing = (x + 1) * (y + 1), frames.spacing
        yield Sampled("[frames]", points, len(frame_times(frames)), spacing, False)


def _box_points(box: Box, with_volume: bool) -> int:
    """About as many points as a box has on its faces, in its zone and, if asked for, inside."""
    sides = (*box.size, box.top - box.bottom)
    x, y, z = (
        math.ceil(side / spacing)
        for side, spacing in zip(sides, (box.spacing[0], *box.spacing), strict=True)
    )
    core = math.prod(max(0.0, 1.0 - 2.0 * box.zone / side) for side in box.size)
    volume = x * y * z
    return 2 * (x * y + y * z + z * x) + round((1.0 - core) * volume) + with_volume * volume
