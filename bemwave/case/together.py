"""The checks that need more than one table of a case."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

from bemwave.case.faults import Fault, Path, did_you_mean, shown

if TYPE_CHECKING:
    from bemwave.case.model import Case
    from bemwave.case.output import Box

# Miche (1944): a wave breaks at height/length = .142 tanh(kh); it is never longer than in deep
# water, and tanh(kh) <= kh, so height <= .142 times the lesser of both bounds at any depth.
STEEPEST = 0.142


def faults_together(case: Case) -> list[Fault]:
    """All faults of a case whose tables are each sound by themselves."""
    return [
        *_duplicates(case),
        *_waves(case),
        *_walls(case),
        *_bodies(case),
        *_places(case),
        *_times(case),
        *_handoffs(case),
    ]


def _duplicates(case: Case) -> Iterator[Fault]:
    starts = {f"{box.name}-start" for box in case.handoff if box.volume_at_start}
    yield from _twice("body", "name", [body.name for body in case.body], set())
    yield from _twice("gauge", "name", [gauge.name for gauge in case.gauge], set())
    # handoff/NAME-start.nc is the starting volume of NAME
    yield from _twice("handoff", "name", [box.name for box in case.handoff], starts)
    yield from _twice("wavemaker", "side", [maker.side for maker in case.wavemaker], set())


def _twice(table: str, key: str, words: Sequence[str], taken: set[str]) -> Iterator[Fault]:
    for index, word in enumerate(words):
        if word in taken:
            text = f'got "{word}", which is taken, expected each {table} to have its own {key}'
            yield Fault((table, index, key), text)
        taken.add(word)


def _waves(case: Case) -> Iterator[Fault]:
    surface = case.surface
    if case.waves and len(surface.walls) == 4:
        text = "incident waves cannot enter a basin with walls all round; open an edge, or make "
        yield Fault(("waves",), text + "the waves with a [[wavemaker]], and take [[waves]] out")
    for index, wave in enumerate(case.waves):
        if wave.height is None or wave.period is None:
            continue
        longest = case.water.gravity * wave.period**2 / (2 * math.pi)
        highest = STEEPEST * min(longest, 2 * math.pi * case.water.depth)
        if wave.height > highest:
            text = f"got {wave.height:g}, expected less than {highest:.3g} m, where waves of"
            text += f" {wave.period:g} s break (Miche's limit)"
            yield Fault(("waves", index, "height"), text)


def _walls(case: Case) -> Iterator[Fault]:
    for index, maker in enumerate(case.wavemaker):
        place = ("wavemaker", index, "side")
        if case.surface.outline == "circle":
            yield Fault(place, 'needs outline = "rectangle": a circle has no sides')
        elif maker.side not in case.surface.walls:
            text = f'got "{maker.side}", an edge that absorbs, expected a wall: '
            yield Fault(place, text + f'edges = {{ {maker.side} = "wall" }}')
        if math.isinf(case.water.depth):
            yield Fault(place, "a wavemaker reaches to the bed: give [water] depth in metres")


def _bodies(case: Case) -> Iterator[Fault]:
    for index, body in enumerate(case.body):
        if not case.surface.contains(*body.position):
            text = f"got {list(body.position)}, outside the useful water {_useful(case)}"
            yield Fault(("body", index, "position"), text)
        if body.draught == "bed" and math.isinf(case.water.depth):
            text = 'got "bed" in deep water, expected a number, or [water] depth in metres'
            yield Fault(("body", index, "draught"), text)


def _places(case: Case) -> Iterator[Fault]:
    names = [body.name for body in case.body]
    for index, gauge in enumerate(case.gauge):
        if gauge.body is not None and gauge.body not in names:
            yield Fault(("gauge", index, "body"), _no_body(gauge.body, names))
        elif gauge.body is None and not case.surface.contains(*gauge.position):
            text = f"got {list(gauge.position)}, outside the useful water {_useful(case)}"
            yield Fault(("gauge", index, "position"), text)
    for index, hump in enumerate(case.hump):
        if not case.surface.contains(*hump.centre):
            text = f"got {list(hump.centre)}, outside the useful water {_useful(case)}"
            yield Fault(("hump", index, "centre"), text)


def _times(case: Case) -> Iterator[Fault]:
    duration = case.run.duration
    yield from _interval(("run", "record_every"), case.run.record_every, duration, "duration")
    tables: list[tuple[Path, float, float, bool]] = [
        (("handoff", i), h.start, h.end, False) for i, h in enumerate(case.handoff)
    ]
    if case.frames is not None:
        tables.append((("frames",), case.frames.start, case.frames.end, True))
    for place, start, end, one_instant in tables:
        if end > duration:
            text = f"got {end:g}, expected at most the run's duration ({duration:g})"
            yield Fault((*place, "end"), text)
        if end < start or (end == start and not one_instant):
            text = f"got {start:g}, expected a time before the end ({end:g})"
            yield Fault((*place, "start"), text)
    for index, handoff in enumerate(case.handoff):
        span = handoff.end - handoff.start
        if handoff.every != "auto" and span > 0:
            place = ("handoff", index, "every")
            yield from _interval(place, handoff.every, span, "end - start")


def _interval(path: Path, interval: float, span: float, what: str) -> Iterator[Fault]:
    steps = span / interval
    if steps < 0.5 or abs(steps - round(steps)) > 1e-6 * steps:
        nearest = span / max(round(steps), 1)
        text = f"got {interval:g}, expected an interval that divides {what} ({span:g}) evenly"
        yield Fault(path, f"{text}; the nearest is {nearest:.9g}")


def _handoffs(case: Case) -> Iterator[Fault]:
    names = [body.name for body in case.body]
    for index, handoff in enumerate(case.handoff):
        if handoff.body is not None and handoff.body not in names:
            yield Fault(("handoff", index, "axes"), _no_body(handoff.body, names))
        if handoff.box is None:
            continue
        if handoff.box.bottom < -case.water.depth:
            text = f"got {handoff.box.bottom:g}, below the bed (z = {-case.water.depth:g})"
            yield Fault(("handoff", index, "box", "bottom"), text)
        corners = _corners(handoff.box)
        if handoff.body is None and not all(case.surface.contains(x, y) for x, y in corners):
            text = f"reaches outside the useful water {_useful(case)}; make the box smaller, or"
            yield Fault(("handoff", index, "box"), f"{text} [surface] size larger")


def _corners(box: Box) -> list[tuple[float, float]]:
    turn = math.radians(box.angle)
    corners = []
    for sx, sy in ((-1, -1), (1, -1), (1, 1), (-1, 1)):
        x, y = sx * box.size[0] / 2, sy * box.size[1] / 2
        corners.append(
            (
                box.centre[0] + x * math.cos(turn) - y * math.sin(turn),
                box.centre[1] + x * math.sin(turn) + y * math.cos(turn),
            )
        )
    return corners


def _useful(case: Case) -> str:
    surface = case.surface
    (cx, cy), (lx, ly) = surface.centre, surface.extent
    if surface.outline == "circle":
        return f"(a circle of {lx:g} m round {cx:g}, {cy:g})"
    x, y = (cx - lx / 2, cx + lx / 2), (cy - ly / 2, cy + ly / 2)
    return f"({x[0]:g} <= x <= {x[1]:g}, {y[0]:g} <= y <= {y[1]:g})"


def _no_body(name: str, names: list[str]) -> str:
    near = did_you_mean(name, names)
    if near is not None:
        return f'no body is named "{name}"; did you mean "{near}"?'
    known = f"the bodies are {', '.join(names)}" if names else "the case has no [[body]]"
    return f"no body is named {shown(name)}; {known}"
