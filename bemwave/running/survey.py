"""What a case amounts to before anything is solved: sea, hulls, meshes, edges, periods."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from bemwave.case import Case, refuse_not_yet
from bemwave.case.body import Body
from bemwave.errors import InputError
from bemwave.flow.images import Mirror
from bemwave.flow.sheet import Sheet
from bemwave.geometry.bodies import default_fine_spacing, hull_from
from bemwave.geometry.boundary import RIM, boundary_mesh
from bemwave.geometry.files import read_mesh
from bemwave.geometry.hull import Hull
from bemwave.geometry.layout import check_layout
from bemwave.geometry.outline import SIDES, Circle, Outline, Rectangle
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.water_surface import expected_triangles, fitted_water, water_surface
from bemwave.geometry.waterplane import closed_bodies
from bemwave.handoff.box import Box
from bemwave.handoff.plan import grid_quadrature, water_quadrature
from bemwave.running.route import MOST_TRIANGLES, choose
from bemwave.running.sea import incident_sea, length_of_period, period_of_length, scattered_sea
from bemwave.stepping.absorber import Layer, layer_for
from bemwave.stepping.damped_line import Behind
from bemwave.stepping.motion_file import MotionFile
from bemwave.waves import Sea

Array = npt.NDArray[np.float64]

# spacings of the grid; a pile's loads are right up to 2 and 4 % off at 2.4
LARGEST_PANEL = 1.5


@dataclass(frozen=True)
class Periods:
    """Wave periods of a case [s]; infinite where there are no waves.

    longest, shortest : of the waves that are solved (scattered, radiated, let go).
    peak : of the most energetic of all.
    kept : shortest of all, incident waves too.
    """

    longest: float
    shortest: float
    peak: float
    kept: float


@dataclass(frozen=True)
class Survey:
    """A case read, meshed and measured.

    Attributes
    ----------
    case : the case.
    sea, scattered, unscattered_share : the incident sea, its components that hulls scatter, and
        the energy share of the others.
    hulls : the bodies that the water flows round, at rest.
    riders : those that ride the surface and make no waves, at rest.
    motion_files : what moves each of them from a file, or None.
    route : the route taken, and why.
    outline : the water with its absorber.
    layer : the absorber, or None where no edge absorbs.
    closed, mirrors : whether meshed walls close the water, and walls that are images.
    sheet : the grid, on that route; else None.
    water : the meshed surface; on the grid it has no triangles.
    mesh : the whole boundary, on the grid the closed surfaces of hulls and waterplanes; None where
        there is nothing to solve.
    periods : of its waves.
    """

    case: Case
    sea: Sea
    scattered: Sea
    unscattered_share: float
    hulls: tuple[Hull, ...]
    riders: tuple[Hull, ...]
    motion_files: tuple[MotionFile | None, ...]
    route: tuple[str, str]
    outline: Outline
    layer: Layer | None
    closed: bool
    mirrors: tuple[Mirror, ...]
    sheet: Sheet | None
    water: SurfaceMesh
    mesh: SurfaceMesh | None
    periods: Periods

    @property
    def solved(self) -> bool:
        """Whether there is anything to solve beside the sea."""
        return self.mesh is not None

    def surface_in(self, box: Box) -> tuple[Array, Array]:
        """Points (n, 2) and weights [m2] that integrate over the solved water in a box."""
        if self.sheet is not None:
            return grid_quadrature(box, self.sheet.spacing, self.hulls)
        return water_quadrature(box, self.water)

    def outside(self, xy: Array) -> Array:
        """Distance (n,) of places (n, 2) outside the useful water [m]; zero inside."""
        surface = self.case.surface
        offset = np.asarray(xy)[:, :2] - surface.centre
        if surface.outline == "circle":
            return np.asarray(np.maximum(np.hypot(*offset.T) - surface.extent[0] / 2, 0.0))
        beyond = np.maximum(np.abs(offset) - np.array(surface.extent) / 2, 0.0)
        return np.asarray(beyond.max(axis=1))


def survey(case: Case) -> Survey:
    """Read, mesh and measure a case; solves nothing.

    Raises
    ------
    InputError, NotYetError, MissingLibraryError
    """
    refuse_not_yet(case)
    surface, water = case.surface, case.water
    closed, mirrors = _edges(case)
    sea = incident_sea(case, mirrors)
    scattered, unscattered = scattered_sea(sea, surface.spacing)
    hulls, riders = _hulls(case, case.solved_bodies), _hulls(case, case.riding_bodies)
    files = tuple(_motion_file(case, body) for body in case.solved_bodies)
    periods = _periods(case, sea, scattered, list(_periods_made(case, hulls, files)))
    check_layout(hulls + riders, useful_water(case))
    _refuse_without_waterplane(riders)
    expected = _expected_triangles(case, periods, hulls)
    route = choose(case, hulls, expected)
    _refuse_single_on_panels(case, route)
    layer = _layer(case, periods, behind(route[0], closed))
    outline = _outline(case, 0.0 if layer is None else layer.width)
    solved = bool(hulls or case.hump or case.pressure or case.wavemaker)
    sheet = None
    if route[0] == "grid":
        _refuse_large_panels(hulls, surface.spacing)
        sheet, meshed = _grid(case, layer), closed_bodies([])
        outline = Rectangle(*sheet.extent)
        mesh = closed_bodies(hulls) if solved else None
    else:
        _refuse_on_panels(case, expected)
        meshed = _meshed_water(case, outline, hulls)
        walls = ([RIM] if surface.outline == "circle" else list(SIDES)) if closed else []
        mesh = boundary_mesh(meshed, hulls, walls, water.depth) if solved else None
    return Survey(
        case, sea, scattered, unscattered, hulls, riders, files, route, outline, layer, closed,
        mirrors, sheet, meshed, mesh, periods,
    )  # fmt: skip


def _edges(case: Case) -> tuple[bool, tuple[Mirror, ...]]:
    """Whether walls close the water, and else the walls that are images.

    One wall, two that meet or two that face each other are images, with open water beyond the
    other edges. Walls on three sides and more, round water and wavemakers need meshed walls all
    round, with the absorber in front of the edges that absorb.
    """
    surface = case.surface
    walls = surface.walls
    few = 0 if surface.outline == "circle" else 2
    closed = len(walls) > few or bool(case.wavemaker)
    if closed and case.waves:
        raise InputError(
            "[[waves]] are given in water that walls close; incident waves need an open edge to "
            'come from: write "absorb" for two sides or more, or make waves with a [[wavemaker]]'
        )
    if closed and math.isinf(case.water.depth):
        raise InputError(
            '[water] depth = "deep" with walls all round; expected a depth in metres: walls need '
            "a bed to stand on"
        )
    if closed:
        return True, ()
    half = [extent / 2 for extent in surface.extent]
    at = {
        f"{axis}_{end}": surface.centre[k] + sign * half[k]
        for k, axis in enumerate("xy")
        for end, sign in (("min", -1), ("max", 1))
    }
    return False, tuple(Mirror(side[0], at[side]) for side in walls)


def _hulls(case: Case, bodies: tuple[Body, ...]) -> tuple[Hull, ...]:
    spacing, depth = case.surface.spacing, case.water.depth
    return tuple(
        hull_from(body, spacing=spacing, depth=depth, folder=case.folder) for body in bodies
    )


def _refuse_without_waterplane(riders: tuple[Hull, ...]) -> None:
    for hull in riders:
        if not hull.waterlines:
            raise InputError(
                f'{hull.name}: attitude = "follow" was given, and it lies wholly under water; '
                "expected a body that pierces the surface it rides: raise it, or write "
                'attitude = "fixed"'
            )


def _motion_file(case: Case, body: Body) -> MotionFile | None:
    name = body.motions_file
    return None if name is None else MotionFile(case.folder / name, case.run.duration)


def _periods(case: Case, sea: Sea, scattered: Sea, made: list[float]) -> Periods:
    longest, shortest = list(made), list(made)
    if case.solved_bodies and scattered.count:
        order = np.argsort(scattered.frequency)
        share = np.cumsum(scattered.amplitude[order] ** 2)
        low = scattered.frequency[order][np.searchsorted(share, 0.05 * share[-1])]
        longest.append(2 * math.pi / float(low))
        shortest.append(2 * math.pi / float(scattered.frequency.max()))
    peak = list(made)
    if sea.count:
        peak += [wave.period for wave in case.waves if wave.period is not None] or [
            2 * math.pi / float(sea.frequency[np.argmax(sea.amplitude)])
        ]
    kept = [2 * math.pi / float(sea.frequency.max())] if sea.count else []
    none = [math.inf]
    return Periods(
        max(longest or none), min(shortest or none), max(peak or none), min(kept + made or none)
    )


def _periods_made(
    case: Case, hulls: tuple[Hull, ...], files: tuple[MotionFile | None, ...]
) -> Iterator[float]:
    """Periods of the waves that bodies, wavemakers, humps and patches make themselves."""
    depth, gravity = case.water.depth, case.water.gravity
    for body in case.solved_bodies:
        if body.forced is not None:
            yield body.forced.period
    for hull, file in zip(hulls, files, strict=True):
        if file is not None:
            yield from file.periods(hull.hydrostatics.length / 2.0) or ()
    for maker in case.wavemaker:
        yield maker.period
    widths = [hump.width for hump in case.hump] + [patch.width for patch in case.pressure]
    for width in widths:
        # from the waves of six widths, those of most energy, to the shortest that matter
        yield period_of_length(6.0 * width, depth, gravity)
        yield period_of_length(2.0 * width, depth, gravity)
    for patch in case.pressure:
        speed = math.hypot(*patch.velocity)
        if speed > 0.0:
            yield 2.0 * math.pi * speed / gravity  # the waves that follow it, in deep water


def behind(route: str, closed: bool) -> Behind:
    """What lies behind the absorber."""
    if route == "grid":
        return "itself"
    return "wall" if closed else "still water"


def _layer(case: Case, periods: Periods, beyond: Behind) -> Layer | None:
    surface = case.surface
    absorbing = 1 if surface.outline == "circle" else 4
    if len(surface.walls) == absorbing or math.isinf(periods.longest):
        return None
    depth, gravity = case.water.depth, case.water.gravity
    width = None if surface.absorber == "auto" else float(surface.absorber)
    wavelength = length_of_period(periods.longest, depth, gravity)
    return layer_for(wavelength, depth, gravity, surface.spacing, width=width, behind=beyond)


def useful_water(case: Case) -> Outline:
    """The outline of the useful water."""
    (x, y), (lx, ly) = case.surface.centre, case.surface.extent
    if case.surface.outline == "circle":
        return Circle(x, y, lx / 2)
    return Rectangle(x - lx / 2, x + lx / 2, y - ly / 2, y + ly / 2)


def _outline(case: Case, width: float) -> Outline:
    """The useful water with the absorber outside the edges that absorb."""
    useful = useful_water(case)
    if isinstance(useful, Circle):
        return Circle(useful.x, useful.y, useful.radius + width)
    margin = {side: 0.0 if side in case.surface.walls else width for side in SIDES}
    return Rectangle(
        useful.x_min - margin["x_min"],
        useful.x_max + margin["x_max"],
        useful.y_min - margin["y_min"],
        useful.y_max + margin["y_max"],
    )


def _fine_spacing(case: Case, hulls: tuple[Hull, ...]) -> float:
    surface = case.surface
    return surface.fine_spacing or default_fine_spacing(surface.spacing, hulls)


def _expected_triangles(case: Case, periods: Periods, hulls: tuple[Hull, ...]) -> int:
    """On route "panels", in open water, about: with an absorber a wavelength wide."""
    water, fine = case.water, _fine_spacing(case, hulls)
    width = case.surface.absorber
    if width == "auto":
        known = math.isfinite(periods.longest)
        width = length_of_period(periods.longest, water.depth, water.gravity) if known else 0.0
    outline = _outline(case, float(width))
    on_hulls = sum(len(hull.mesh.triangles) for hull in hulls)
    return on_hulls + expected_triangles(outline, case.surface.spacing, hulls, fine)


def _refuse_on_panels(case: Case, expected: int) -> None:
    if expected > 5 * MOST_TRIANGLES:  # nearer to it the mesh itself tells, with its memory
        fits = case.surface.spacing * (expected / MOST_TRIANGLES) ** 0.5
        raise InputError(
            f"[surface] spacing = {case.surface.spacing:g} m makes about {expected:.2g} triangles; "
            f"expected at most {MOST_TRIANGLES} on panels: about spacing = {fits:.2g} m would fit, "
            "or less water"
        )
    if case.run.history_region is not None:
        raise InputError(
            "[run] history_region was given on route panels; expected it on the grid alone, whose "
            "surface is large: take it out, for panels record the whole surface"
        )


def _refuse_single_on_panels(case: Case, route: tuple[str, str]) -> None:
    if case.run.precision == "single" and route[0] == "panels":
        raise InputError(
            f'[run] precision = "single" was given, and the route is panels ({route[1]}); expected '
            '"double" there: write that, or [surface] route = "grid"'
        )


def _refuse_large_panels(hulls: Sequence[Hull], spacing: float) -> None:
    """Panels much larger than the grid's squares leave its shortest waves unseen by hulls."""
    for hull in hulls:
        for line in hull.polygons():
            edge = float(np.linalg.norm(np.roll(line, -1, axis=0) - line, axis=1).max())
            if edge > LARGEST_PANEL * spacing:
                raise InputError(
                    f"{hull.name} has panels of {edge:.3g} m at its waterline; expected at most "
                    f"{LARGEST_PANEL:g} spacings of the grid, {LARGEST_PANEL * spacing:.3g} m: "
                    "give the body a smaller panel_size, or a larger [surface] spacing"
                )


def _grid(case: Case, layer: Layer | None) -> Sheet:
    """The useful water and a layer all round, made a little larger for quick Fourier transforms."""
    surface = case.surface
    width = 0.0 if layer is None else layer.width
    nx, ny = (_quick_count((extent + 2.0 * width) / surface.spacing) for extent in surface.extent)
    west, south = (
        centre - 0.5 * count * surface.spacing
        for centre, count in zip(surface.centre, (nx, ny), strict=True)
    )
    return Sheet(west, south, surface.spacing, (nx, ny), case.water.depth)


def _quick_count(least: float) -> int:
    """The least multiple of eight whose Fourier transforms are quick."""
    from scipy.fft import next_fast_len

    return 8 * int(next_fast_len(math.ceil(least / 8.0 - 1e-9), real=True))


def _meshed_water(case: Case, outline: Outline, hulls: tuple[Hull, ...]) -> SurfaceMesh:
    surface = case.surface
    if surface.mesh is not None:
        ready = read_mesh(case.folder / surface.mesh)
        _refuse_other_extent(ready, outline, surface.mesh)
        polygons = [polygon for hull in hulls for polygon in hull.polygons()]
        return fitted_water(ready, polygons, surface.mesh)
    return water_surface(outline, surface.spacing, hulls, _fine_spacing(case, hulls))


def _refuse_other_extent(ready: SurfaceMesh, outline: Outline, name: str) -> None:
    """A ready sheet must be as large as the useful water and its absorber."""
    if isinstance(outline, Circle):
        low = np.array([outline.x, outline.y]) - outline.radius
        high = low + 2.0 * outline.radius
    else:
        low = np.array([outline.x_min, outline.y_min])
        high = np.array([outline.x_max, outline.y_max])
    found_low, found_high = ready.points[:, :2].min(axis=0), ready.points[:, :2].max(axis=0)
    # a circle's rim is a polygon of the same area
    allowed = 0.01 * float((high - low).max())
    if np.abs(found_low - low).max() > allowed or np.abs(found_high - high).max() > allowed:
        raise InputError(
            f"[surface] mesh = {name!r} reaches from ({found_low[0]:g}, {found_low[1]:g}) to "
            f"({found_high[0]:g}, {found_high[1]:g}); expected {outline}, the useful water and its "
            "absorber: make it again, or change [surface] size or absorber"
        )
