"""What was run? The case in words, the route and why, versions, the case file itself."""

from __future__ import annotations

import math
from collections.abc import Iterator

from bemwave.records import Run
from bemwave.report.content import Block, Material, Section, Source, Table
from bemwave.report.words import number

QUESTION = "What was run?"


def setup(material: Material) -> Section:
    """The section on the run itself."""
    run = material.run
    blocks: list[Block] = [
        Table("The run.", ("", ""), list(_run_rows(material))),
        Table("The water.", ("", ""), list(_water_rows(run))),
    ]
    if run.case.body:
        blocks.append(_body_table(run))
    if run.manifest.inputs:
        rows = [(name, digest) for name, digest in run.manifest.inputs.items()]
        blocks.append(Table("Input files.", ("file", "SHA-256"), rows))
    blocks.append(Source("The case file", run.case.text))
    manifest = run.manifest
    answer = f"{_brief(run)} The route was {manifest.route}: {manifest.reason}."
    return Section("setup", QUESTION, f"route {manifest.route}, {manifest.status}", answer, blocks)


def _brief(run: Run) -> str:
    sea, case = run.sea, run.case
    if sea.count == 0:
        waves = "no incident waves"
    elif sea.count == 1:
        period = number(2.0 * math.pi / float(sea.frequency[0]))
        waves = f"a regular wave of {number(2.0 * float(sea.amplitude[0]))} m and {period} s"
    else:
        waves = (
            f"a sea of {number(sea.significant_height)} m significant height and {_period(run)} "
            f"({sea.count} components)"
        )
    depth = "deep water" if math.isinf(sea.depth) else f"water {sea.depth:g} m deep"
    names = ", ".join(body.name for body in case.body) or "no bodies"
    return f"{waves[0].upper()}{waves[1:]} in {depth}, with {names}, for {case.run.duration:g} s."


def _period(run: Run) -> str:
    """The peak's where the case gives one for all, else that of the mean energy."""
    given = {wave.period for wave in run.case.waves}
    peak = given.pop() if len(given) == 1 else None
    if peak is not None:
        return f"{number(peak)} s at the peak"
    energy = 2.0 * math.pi * run.sea.moment(-1) / run.sea.moment(0)
    return f"{number(energy)} s energy period"


def _run_rows(material: Material) -> Iterator[tuple[str, str]]:
    run = material.run
    manifest, settings = run.manifest, run.case.run
    yield "status", manifest.status
    yield "route", f"{manifest.route} ({manifest.reason})"
    yield "reached, s", f"{number(material.reached, 4)} of {settings.duration:g}"
    yield "records", f"{len(run.times)}, every {settings.record_every:g} s"
    if manifest.route == "panels" and run.history is not None:
        yield "triangles", str(len(run.mesh.triangles))
    yield "started, ended", f"{manifest.started}, {manifest.ended or 'not yet'}"
    yield "threads", str(manifest.threads)
    yield "versions", ", ".join(f"{name} {text}" for name, text in manifest.versions.items())


def _water_rows(run: Run) -> Iterator[tuple[str, str]]:
    surface, water = run.case.surface, run.case.water
    yield "depth", "deep" if math.isinf(water.depth) else f"{water.depth:g} m"
    yield "density, gravity", f"{water.density:g} kg/m³, {water.gravity:g} m/s²"
    sides = " x ".join(f"{side:g}" for side in surface.extent)
    round_ = surface.outline == "circle"
    yield "useful water", f"circle of {surface.extent[0]:g} m" if round_ else f"{sides} m"
    yield "spacing", f"{surface.spacing:g} m"
    if run.manifest.closed:
        yield "edges", "walls all round"
    elif run.manifest.mirrors:
        walls = ", ".join(f"{axis} = {place:g} m" for axis, place in run.manifest.mirrors)
        yield "edges", f"walls at {walls}; open elsewhere"
    else:
        absorbed = "reflection" in run.manifest.notes
        yield "edges", "open, with an absorber outside" if absorbed else "open"
    for place, wave in enumerate(run.case.waves, 1):
        given = wave.model_dump(exclude_unset=True, exclude_none=True)
        yield f"waves {place}", ", ".join(f"{key} {value}" for key, value in given.items())
    if run.sea.count > 1:
        yield "repeats after", f"{number(run.sea.repeat_time)} s"


def _body_table(run: Run) -> Table:
    rows = []
    bodies = run.case.solved_bodies + run.case.riding_bodies
    for body, hull in zip(bodies, run.hulls + run.riders, strict=True):
        here = hull.hydrostatics
        rows.append(
            (
                body.name,
                str(body.attitude),
                f"({body.position[0]:g}, {body.position[1]:g})",
                f"{body.heading:g}",
                f"{number(here.length)} x {number(here.beam)} x {number(here.draught)}",
                number(here.volume, 4),
                str(len(hull.mesh.triangles)),
            )
        )
    head = (
        "body",
        "attitude",
        "place, m",
        "heading, degrees",
        "length x beam x draught, m",
        "displaced volume, m\u00b3",
        "panels",
    )
    return Table("Bodies at rest.", head, rows)
