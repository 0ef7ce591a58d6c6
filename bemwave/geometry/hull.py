"""A hull ready for the solver: wetted, meshed, in its place on earth."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.hull_file import Wetted, put_in_water, wetted_part
from bemwave.geometry.hydrostatics import Hydrostatics, hydrostatics
from bemwave.geometry.pose import Pose, on_earth
from bemwave.geometry.remesh import is_even, remesh
from bemwave.geometry.surface_mesh import FloatArray, IntArray, SurfaceMesh
from bemwave.geometry.topology import boundary_loops

WORST_VOLUME_CHANGE = 0.05  # by remeshing; more means that the panels do not show the hull


@dataclass(frozen=True, eq=False)
class Hull:
    """A body's wetted surface at rest.

    Attributes
    ----------
    name : str
        The body's name, also of the mesh's one part.
    mesh : SurfaceMesh
        Earth axes, normals out of the water; waterline points have z = 0 exactly.
    waterlines : tuple of (k,) ndarray of int
        Closed loops of point numbers; seen from above, round the hull counter-clockwise, round a
        moonpool clockwise. Empty for a body wholly under water.
    hydrostatics : Hydrostatics
        Of `mesh`, in body axes.
    hydrostatics_before : Hydrostatics
        The same before remeshing: the difference is the chord error of the panels.
    centre_of_mass : (3,) ndarray
        Body axes, m.
    place : Pose
        Body axes to earth axes. Body axes are level, x forward, y to port, z = 0 at still water.
    notes : tuple of str
        What was merged, cut, remeshed.
    left_out : tuple of (str, float or None)
        Parts left out, and how wide each is under water (`hull_file.width_under_water`), m.
    whole : SurfaceMesh, optional
        The whole body, topsides too, as its file has it: body axes, normals out of the hull.
    """

    name: str
    mesh: SurfaceMesh
    waterlines: tuple[IntArray, ...]
    hydrostatics: Hydrostatics
    hydrostatics_before: Hydrostatics
    centre_of_mass: FloatArray
    place: Pose
    notes: tuple[str, ...] = ()
    left_out: tuple[tuple[str, float | None], ...] = ()
    whole: SurfaceMesh | None = None

    @property
    def heading(self) -> float:
        """Direction of body x, rad counter-clockwise from earth x."""
        return math.atan2(self.place.rotation[1, 0], self.place.rotation[0, 0])

    def polygons(self) -> list[FloatArray]:
        """The waterlines as plan polygons in earth axes, each (k, 2), m."""
        return [self.mesh.points[loop, :2] for loop in self.waterlines]

    def moved(self, position: tuple[float, float], heading: float) -> Hull:
        """Return the same hull at another place: m, rad."""
        place = on_earth(position, heading)
        points = place(self.place.back(self.mesh.points))
        points[self.mesh.points[:, 2] == 0.0, 2] = 0.0
        return replace(self, mesh=self.mesh.with_points(points), place=place)


def place_hull(
    name: str,
    wetted: SurfaceMesh,
    *,
    before: Hydrostatics | None = None,
    position: tuple[float, float] = (0.0, 0.0),
    heading: float = 0.0,
    centre_of_mass: Sequence[float] | None = None,
    notes: Sequence[str] = (),
    whole: SurfaceMesh | None = None,
) -> Hull:
    """Put a wetted mesh (body axes, normals out of the water) on earth.

    Parameters
    ----------
    name : str
    wetted : SurfaceMesh
        For instance one of `bemwave.geometry.forms`.
    before : Hydrostatics, optional
        Of the hull before it was remeshed; default those of `wetted`.
    position : (float, float)
        Where the body's origin is, m.
    heading : float
        Rad from +x.
    centre_of_mass : sequence of 3 floats, optional
        Body axes, m; default above or below the centre of buoyancy on z = 0.
    whole : SurfaceMesh, optional
        See `Hull`.

    Raises
    ------
    InputError
        If the mesh's open edge does not run in closed loops on z = 0 or at its lowest level.
    """
    here = hydrostatics(wetted)
    if not here.volume > 0.0:
        raise InputError(f"{name}: the wetted hull encloses a volume of {here.volume:.4g} m3")
    centre = [*here.centre_of_buoyancy[:2], 0.0] if centre_of_mass is None else centre_of_mass
    place = on_earth(position, heading)
    try:
        loops = boundary_loops(wetted.triangles)
    except ValueError as error:
        raise InputError(
            f"{name}: {error}: the hull touches itself at the waterline; change the draught "
            "slightly or repair the file"
        ) from None
    lowest = wetted.points[:, 2].min()
    for loop in loops:
        z = wetted.points[loop, 2]
        if not (np.all(z == 0.0) or np.all(z == lowest)):
            raise InputError(
                f"{name}: the hull has an open edge between z = {z.min():.4g} and {z.max():.4g} m, "
                "neither at the waterline nor at the bed; close it in a mesh program"
            )
    return Hull(
        name=name,
        mesh=wetted.renamed(name).with_points(place(wetted.points)),
        waterlines=tuple(loop for loop in loops if np.all(wetted.points[loop, 2] == 0.0)),
        hydrostatics=here,
        hydrostatics_before=here if before is None else before,
        centre_of_mass=np.array(centre, dtype=np.float64),
        place=place,
        notes=tuple(notes),
        whole=whole,
    )


def prepare_hull(
    file_mesh: SurfaceMesh,
    name: str,
    *,
    source: str | None = None,
    scale: float | None = None,
    up: str | None = None,
    draught: float | None = None,
    trim: float = 0.0,
    heel: float = 0.0,
    without: Sequence[str] = (),
    weld_tolerance: float | None = None,
    depth: float = math.inf,
    panel_size: float | Callable[[SurfaceMesh], float] | None = None,
    position: tuple[float, float] = (0.0, 0.0),
    heading: float = 0.0,
    centre_of_mass: Sequence[float] | None = None,
) -> Hull:
    """Make a solver's hull of a hull file: weld, turn, cut, remesh, place.

    Parameters
    ----------
    file_mesh : SurfaceMesh
        As `read_mesh` gives it, normals out of the hull.
    name : str
        The body's name.
    source : str, optional
        The file's name, for messages.
    scale, up, draught, trim, heel, without, weld_tolerance
        See `put_in_water`; angles in rad.
    depth : float
        Water depth, m: a hull that reaches the bed is cut there too and left open.
    panel_size : float or function, optional
        Edge length of the panels, m, or a function that tells it from the cut hull.
        None: the hull is only cut. A file that needs no cut and is already evenly meshed at
        about this size is kept as it is, and no mesher is needed.
    position, heading
        Where the file's origin goes, m, and the body's direction, rad.
    centre_of_mass : sequence of 3 floats, optional
        In the file's axes after `scale`, m; default on z = 0 over the centre of buoyancy.

    Raises
    ------
    InputError, MissingLibraryError

    Examples
    --------
    >>> hull = prepare_hull(read_mesh("tender.stl"), "tender", draught=1.9, panel_size=0.8)
    """
    source = name if source is None else source
    floating = put_in_water(
        file_mesh,
        source,
        scale=scale,
        up=up,
        draught=draught,
        trim=trim,
        heel=heel,
        without=without,
        weld_tolerance=weld_tolerance,
    )
    wetted = wetted_part(floating, source, depth)
    before = hydrostatics(wetted.mesh)
    if draught is not None and before.waterplane_area == 0.0:
        top = float(floating.mesh.points[:, 2].max())
        raise InputError(
            f"{source}: with draught = {draught:g} the whole hull is under water (its top at z = "
            f"{top:.4g} m); give a smaller draught, or leave it out and place the hull in the file"
        )
    size = panel_size(wetted.mesh) if callable(panel_size) else panel_size
    mesh, notes = _meshed(wetted, before, size, source)
    if centre_of_mass is not None:
        centre_of_mass = floating.pose(np.array(centre_of_mass, dtype=np.float64)).tolist()
    hull = place_hull(
        name,
        mesh,
        before=before,
        position=position,
        heading=heading,
        centre_of_mass=centre_of_mass,
        notes=[*floating.notes, *notes],
        whole=floating.mesh,
    )
    return replace(hull, left_out=floating.left_out)


def _meshed(
    wetted: Wetted, before: Hydrostatics, panel_size: float | None, source: str
) -> tuple[SurfaceMesh, list[str]]:
    """The wetted hull at the panel size, and what to say about it."""
    if panel_size is None:
        return wetted.mesh, ["cut, not remeshed"] if wetted.cut else []
    if not wetted.cut and is_even(wetted.mesh, panel_size):
        return wetted.mesh, ["taken as it is: already meshed at the panel size"]
    mesh, angle = remesh(wetted.mesh, panel_size, source)
    after = hydrostatics(mesh)
    note = (
        f"remeshed at {panel_size:g} m, edges over {angle:g} degrees kept: "
        f"volume {before.volume:.6g} -> {after.volume:.6g} m3, "
        f"waterplane {before.waterplane_area:.6g} -> {after.waterplane_area:.6g} m2, "
        f"centre of buoyancy {_triple(before)} -> {_triple(after)} m"
    )
    if abs(after.volume - before.volume) > WORST_VOLUME_CHANGE * before.volume:
        raise InputError(
            f"{source}, {note}: panels of this size do not show the hull; give a smaller panel_size"
        )
    return mesh, [note]


def _triple(data: Hydrostatics) -> str:
    return "({:.4g}, {:.4g}, {:.4g})".format(*data.centre_of_buoyancy)
