"""`bemwave plan`: what a case will take and how good it will be, before anything is solved."""

from __future__ import annotations

import math
import os
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from bemwave.case import Case
from bemwave.frames import frame_times
from bemwave.geometry.hull import Hull
from bemwave.running.budget import GIGABYTE, budget, memory_allowed
from bemwave.running.driving import start_up
from bemwave.running.forecast import forecasts, trustworthy_from
from bemwave.running.frames_output import note_on
from bemwave.running.outputs import dry_places
from bemwave.running.sampling import refuse_unfit, sampling_memory, sampling_seconds
from bemwave.running.sea import PANELS_PER_WAVELENGTH, length_of_period
from bemwave.running.survey import Survey, behind, survey
from bemwave.stepping.absorber import forecast


def plan(case: Case, *, picture: str | os.PathLike[str] | None = None) -> str:
    """Survey a case and say in text what to expect of a run.

    Parameters
    ----------
    case : Case
    picture : path, optional
        A PNG of the layout, to scale.

    Raises
    ------
    InputError, NotYetError, MissingLibraryError
        As `run` would, for what can be told before solving.
    """
    surveyed = survey(case)
    refuse_unfit(surveyed)
    lines = [
        (label, text)
        for section in SECTIONS
        for label, text in section(surveyed)
    ]
    if picture is not None:
        from bemwave.running.picture import draw

        draw(surveyed, Path(picture))
        lines.append(("picture", str(picture)))
    width = max(len(label) for label, _ in lines)
    return "\n".join(f"{label:<{width}}  {text}" for label, text in lines)


_Lines = Iterator[tuple[str, str]]


def _route(s: Survey) -> _Lines:
    route, reason = s.route
    yield "route", f"{route} ({reason})"


def _water(s: Survey) -> _Lines:
    surface = s.case.surface
    depth = s.case.water.depth
    deep = "deep" if math.isinf(depth) else f"{depth:g} m deep"
    extent = " x ".join(f"{side:g}" for side in surface.extent)
    shape = f"circle of {surface.extent[0]:g} m" if surface.outline == "circle" else f"{extent} m"
    yield "useful water", f"{shape}, {deep}"
    if s.closed:
        yield "edges", "walls all round, meshed"
    elif s.mirrors:
        walls = ", ".join(f"{m.axis} = {m.position:g}" for m in s.mirrors)
        yield "edges", f"straight walls at {walls}, by images; open elsewhere"
    else:
        yield "edges", "open"
    if s.layer is not None:
        longest = s.periods.longest
        length = length_of_period(longest, depth, s.case.water.gravity)
        yield "absorber", (
            f"{s.layer.width:.3g} m wide, for waves up to {length:.3g} m ({longest:.3g} s); "
            f"reflects {100 * s.layer.reflection:.2g} % of them{_through(s.layer.passed)}"
        )
        beyond = behind(s.route[0], s.closed)
        for wave in forecast(s.layer, depth, s.case.water.gravity, surface.spacing, beyond):
            yield "", (
                f"of waves of {wave.wavelength:.3g} m at {math.degrees(wave.angle):.0f} degrees "
                f"{100 * wave.reflected:.2g} %{_through(wave.passed)}"
            )


def _through(passed: float) -> str:
    return f", and lets {100 * passed:.2g} % through its seam" if passed else ""


def _sea(s: Survey) -> _Lines:
    sea = s.sea
    if not sea.count:
        yield "incident sea", "none"
        return
    yield "incident sea", (
        f"{sea.count} components, periods {2 * math.pi / sea.frequency.max():.3g} to "
        f"{2 * math.pi / sea.frequency.min():.3g} s, significant height "
        f"{sea.significant_height:.3g} m"
    )
    if sea.count > 1:
        yield "repeats after", f"{sea.repeat_time:.3g} s (2 pi over the least frequency spacing)"
    if s.hulls:
        yield "not scattered", (
            f"{100 * s.unscattered_share:.2g} % of the sea's energy: waves of fewer than "
            f"{PANELS_PER_WAVELENGTH:g} panels stay incident only"
        )


def _bodies(s: Survey) -> _Lines:
    for hull, body, file in zip(s.hulls, s.case.solved_bodies, s.motion_files, strict=True):
        h = hull.hydrostatics
        yield f"body {hull.name}", (
            f"{len(hull.mesh.triangles)} panels, {h.length:.4g} x {h.beam:.4g} x "
            f"{h.draught:.4g} m, {h.volume:.4g} m3, waterplane {h.waterplane_area:.4g} m2"
        )
        yield from _left_out(s, hull)
        for note in hull.notes:
            yield "", note
        if file is not None and (periods := file.periods(h.length / 2.0)) is not None:
            yield "", (
                f"moved by {body.attitude}: nine tenths of its speed's variance between periods of "
                f"{periods[1]:.3g} and {periods[0]:.3g} s; eased in over the start-up"
            )
    for hull in s.riders:
        h = hull.hydrostatics
        yield f"body {hull.name}", (
            f"rides the surface, makes no waves: {h.length:.4g} x {h.beam:.4g} x "
            f"{h.draught:.4g} m, in surge and sway with the incident waves alone"
        )


def _left_out(s: Survey, hull: Hull) -> _Lines:
    """Parts left out: the thinner they are for the waves solved, the less is wrong by it."""
    for name, width in hull.left_out:
        told = "not under water" if width is None else f"{width:.3g} m wide under water"
        if width is not None and math.isfinite(s.periods.shortest):
            water = s.case.water
            shortest = length_of_period(s.periods.shortest, water.depth, water.gravity)
            told += f", {width / shortest:.2g} of the shortest solved wave ({shortest:.3g} m)"
        yield "", f"left out: {name}, {told}"


def _panels(s: Survey) -> _Lines:
    if s.mesh is None:
        yield "panels", "none: the sea is all there is"
        return
    if math.isinf(s.periods.shortest):
        yield "resolution", "no waves are solved: none are made, and none are scattered"
        return
    found = forecasts(s)
    depth, gravity = s.case.water.depth, s.case.water.gravity
    shortest = length_of_period(s.periods.shortest, depth, gravity)
    yield "resolution", (
        f"{shortest / s.case.surface.spacing:.3g} panels in the shortest solved wave "
        f"({shortest:.3g} m, {s.periods.shortest:.3g} s)"
    )
    if s.sheet is not None:
        yield "phase error", "none: waves of the grid are exact in space and time"
        return
    yield "phase error", (
        f"{found['phase_error_degrees']:.2g} degrees over the useful water, for waves of the peak "
        f"({100 * found['dispersion_forecast']:.2g} % in frequency)"
    )


def _times(s: Survey) -> _Lines:
    yield "start-up", f"{start_up(s).length:.3g} s"
    first, duration = trustworthy_from(s), s.case.run.duration
    yield "trust from", f"t = {first:.3g} s, when solved waves have passed bodies, gauges and boxes"
    if first > duration:
        yield "", f"that is after the run's end, {duration:g} s: a longer duration is needed"
    for entry in s.case.handoff:
        if s.hulls and s.scattered.count and entry.start < start_up(s).length:
            yield "", (
                f"hand-off {entry.name} starts at {entry.start:g} s, during the start-up: the "
                "waves that bodies throw back are not all there"
            )


def _places(s: Survey) -> _Lines:
    gauges = s.case.gauge
    if not gauges:
        return
    dry = dry_places(s, np.array([gauge.position for gauge in gauges]))
    for gauge, inside in zip(gauges, dry, strict=True):
        if inside:
            yield f"gauge {gauge.name}", "lies on or inside a waterline: it will read NaN"


def _frames(s: Survey) -> _Lines:
    entry = s.case.frames
    if entry is not None:
        yield "frames", f"{len(frame_times(entry))} from t = {entry.start:g} s; {note_on(s)}"
        if s.mesh is not None and entry.start < trustworthy_from(s):
            yield "", "they start before the solved waves can be trusted"


def _files(s: Survey) -> _Lines:
    for number, name in enumerate(s.case.files):
        path = (s.case.folder / name).resolve()
        beside = path.is_relative_to(s.case.folder.resolve())
        yield "" if number else "files read", name if beside else f"{name}, which is {path}"


def _cost(s: Survey) -> _Lines:
    cost = budget(s)
    needed, allowed = (m / GIGABYTE for m in (cost.memory + sampling_memory(s), memory_allowed(s)))
    kind = "nodes of the grid" if s.sheet is not None else "unknowns on the surface"
    yield "triangles", f"{cost.triangles} ({cost.nodes} {kind})"
    yield "memory", f"{needed:.2g} GB of {allowed:.3g} GB allowed"
    yield "time", (
        f"about {_span(cost.assembly)} to assemble, {_span(cost.stepping)} to solve, "
        f"{_span(sampling_seconds(s))} to sample"
    )


SECTIONS = (
    *(_route, _water, _sea, _bodies, _panels),
    *(_times, _places, _frames, _files, _cost),
)


def _span(seconds: float) -> str:
    return f"{seconds:.2g} s" if seconds < 100 else f"{seconds / 60:.2g} min"
