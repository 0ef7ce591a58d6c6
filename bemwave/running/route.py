"""The route that a case takes, with the reason.

The grid holds open water at the cost of a few Fourier transforms, and of hulls what its nodes can
show: waterplanes with three of them across, water with four. What is nearer or thinner it gets
wrong without a sign, so that such cases go to panels. What lies deep enough makes no difference:
hulls are panels on both routes.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import chain

import numpy as np

from bemwave.case import Case
from bemwave.errors import InputError
from bemwave.geometry.hull import Hull
from bemwave.geometry.narrow import Narrow, narrowest_gap, thin_member, waterplane_widths

MOST_TRIANGLES = 20_000  # dense matrices of more do not fit 24 GB
FEW_TRIANGLES = 5_000  # with so many, panels take seconds to assemble and less than 1 GB

# spacings of the grid
THICK = 3.0  # across waterplanes and members, at least
GAP = 4.0  # across water, at least
DEEP = 2.0  # the shortest waves the grid holds are exp(-2 pi) there of what they are on top

SLACK = 0.97  # of these: what the chords of panels take off a round waterline


@dataclass(frozen=True)
class Misfit:
    """Something the grid cannot hold.

    Attributes
    ----------
    found, wanted : in words.
    remedy : what makes it fit.
    """

    found: str
    wanted: str
    remedy: str


def choose(case: Case, hulls: Sequence[Hull], triangles: int) -> tuple[str, str]:
    """The route of a case, and why.

    Parameters
    ----------
    case : the case.
    hulls : its bodies in their places.
    triangles : that it would make on route "panels", about.

    Raises
    ------
    InputError
        If the grid is named in a case that does not fit it, or no route takes the case.
    """
    route, spacing = case.surface.route, case.surface.spacing
    if route == "panels":
        return route, "named in the case"
    small = route == "auto" and triangles <= FEW_TRIANGLES
    misfit = next(chain(_of_water(case), [] if small else _of_hulls(hulls, spacing)), None)
    if misfit is None:
        if route == "grid":
            return route, "named in the case"
        if small:
            return "panels", f"about {triangles} triangles; up to {FEW_TRIANGLES} are quick"
        return "grid", f"open water that would take about {triangles} triangles"
    if route == "grid":
        raise InputError(
            f'[surface] route = "grid" was given, and {misfit.found}; expected {misfit.wanted}: '
            f'{misfit.remedy}, or write route = "panels"'
        )
    if triangles > MOST_TRIANGLES:
        raise InputError(
            f"no route takes this case: {misfit.found}, where the grid wants {misfit.wanted}, and "
            f"panels would be about {triangles} triangles, where {MOST_TRIANGLES} fit: "
            f"{misfit.remedy}, or take less water or a larger [surface] spacing"
        )
    return "panels", f"{misfit.found}; the grid wants {misfit.wanted}"


def _of_water(case: Case) -> Iterator[Misfit]:
    surface = case.surface
    if surface.walls:
        sides = "all round" if surface.outline == "circle" else f"at {', '.join(surface.walls)}"
        yield Misfit(f"there are walls {sides}", "open edges", 'write edges = "absorb"')
    if surface.mesh is not None:
        yield Misfit(f"[surface] mesh = {surface.mesh!r} is given", "none", "take it out")


def _of_hulls(hulls: Sequence[Hull], spacing: float) -> Iterator[Misfit]:
    thick, gap, deep = (SLACK * spacing * spacings for spacings in (THICK, GAP, DEEP))
    for hull in hulls:
        for width in waterplane_widths(hull):
            if width.size < thick:
                found = f"the waterplane of {hull.name} is {width.size:.3g} m across"
                yield _too_narrow(width, found, THICK, spacing)
        member = thin_member(hull, thick, deep)
        if member is not None:
            found = f"a part of {hull.name} is {member.size:.3g} m thick"
            yield _too_narrow(member, found, THICK, spacing, "leave it out by `without`, ")
        top = hull.mesh.points[np.argmax(hull.mesh.points[:, 2])].tolist()
        if -deep < top[2] < 0.0:
            found = f"the water over {hull.name} is {-top[2]:.3g} m deep"
            yield _too_narrow(Narrow(-top[2], tuple(top), ()), found, DEEP, spacing)
    water = narrowest_gap(hulls, deep)
    if water is not None and water.size < gap:
        names = water.names
        between = " and ".join(names) if len(names) > 1 else f"parts of {names[0]}"
        found = f"the water between {between} is {water.size:.3g} m"
        yield _too_narrow(water, found, GAP, spacing)


def _too_narrow(
    narrow: Narrow, found: str, spacings: float, spacing: float, first: str = ""
) -> Misfit:
    place = ", ".join(f"{round(x, 2) + 0.0:g}" for x in narrow.place)
    return Misfit(
        f"{found} at ({place})",
        f"{spacings:g} spacings or more ({spacings * spacing:.3g} m)",
        f"{first}give [surface] spacing {narrow.size / spacings:.3g} m or less",
    )
