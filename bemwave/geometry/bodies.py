"""From a [[body]] of the case to its hull."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from pathlib import Path

from bemwave.case.body import Body
from bemwave.errors import InputError
from bemwave.geometry import forms
from bemwave.geometry.columns import columns
from bemwave.geometry.files import read_mesh
from bemwave.geometry.hull import Hull, place_hull, prepare_hull
from bemwave.geometry.hydrostatics import least_width
from bemwave.geometry.surface_mesh import SurfaceMesh


def hull_from(body: Body, *, spacing: float, depth: float, folder: Path) -> Hull:
    """Make the hull that a [[body]] describes, at rest in its place.

    Parameters
    ----------
    body : Body
        Of the case; angles in degrees.
    spacing : float
        [surface] spacing, m: panels are half of it or a sixth of the body's least width, whichever
        is smaller, unless the body gives `panel_size`.
    depth : float
        Water depth, m, or inf.
    folder : Path
        Where relative file names start.

    Raises
    ------
    InputError, MissingLibraryError
    """
    position = (float(body.position[0]), float(body.position[1]))
    heading = math.radians(body.heading)
    centre = body.centre_of_mass
    if body.mesh is not None:
        given = body.model_fields_set
        return prepare_hull(
            read_mesh(folder / body.mesh),
            body.name,
            source=str(body.mesh),
            scale=body.scale if "scale" in given else None,
            up=body.up if "up" in given else None,
            draught=None if body.draught is None else float(body.draught),
            trim=math.radians(body.trim),
            heel=math.radians(body.heel),
            without=body.without,
            depth=depth,
            panel_size=body.panel_size or default_panel_size(spacing),
            position=position,
            heading=heading,
            centre_of_mass=centre,
        )
    wetted = form_mesh(body, spacing, depth)
    if body.form != "cylinder" and wetted.points[:, 2].min() <= -depth:
        return prepare_hull(
            wetted.flipped(),
            body.name,
            scale=1.0,
            up="z",
            depth=depth,
            panel_size=_form_panel_size(body, spacing),
            position=position,
            heading=heading,
            centre_of_mass=centre,
        )
    return place_hull(body.name, wetted, position=position, heading=heading, centre_of_mass=centre)


def default_panel_size(spacing: float) -> Callable[[SurfaceMesh], float]:
    """Half the surface's spacing or a sixth of the hull's least width, whichever is smaller."""
    return lambda wetted: min(0.5 * spacing, least_width(wetted) / 6.0)


def default_fine_spacing(spacing: float, hulls: Sequence[Hull]) -> float:
    """Water spacing at waterlines where the case gives none, m: by the same rule for all hulls."""
    widths = [
        least_width(hull.mesh.with_points(hull.place.back(hull.mesh.points)))
        for hull in hulls
        if hull.waterlines
    ]
    return min([0.5 * spacing, *(width / 6.0 for width in widths)]) if widths else spacing


def form_mesh(body: Body, spacing: float, depth: float) -> SurfaceMesh:
    """Wetted mesh of a body given by formula, in body axes.

    Raises
    ------
    InputError
        If the form cannot be made with these values.
    """
    size = _form_panel_size(body, spacing)
    values = {key: getattr(body, key) or 0.0 for key in ("length", "beam", "radius", "spacing")}
    match body.form:
        case "cylinder":
            stands = body.draught == "bed" or float(body.draught or 0.0) >= depth
            if stands and not math.isfinite(depth):
                raise InputError(
                    f'{body.name}: draught = "bed" in water of depth "deep"; give [water] depth '
                    "in metres or the cylinder a draught"
                )
            draught = depth if stands else float(body.draught or 0.0)
            return forms.cylinder(values["radius"], draught, size, stands_on_bed=stands)
        case "sphere":
            return forms.sphere(values["radius"], body.centre_depth, size)
        case "columns":
            return columns(
                values["spacing"],
                body.column_radius or 0.0,
                body.pontoon or 0.0,
                float(body.draught or 0.0),
                size,
            )
        case "wigley":
            make = forms.wigley
        case _:
            make = forms.box
    return make(values["length"], values["beam"], float(body.draught or 0.0), size)


def _form_panel_size(body: Body, spacing: float) -> float:
    if body.panel_size is not None:
        return float(body.panel_size)
    widths = {
        "sphere": 2.0 * (body.radius or 0.0),
        "cylinder": 2.0 * (body.radius or 0.0),
        "columns": 2.0 * (body.column_radius or 0.0),
    }
    least = widths.get(body.form or "", min(body.length or 0.0, body.beam or 0.0))
    return min(0.5 * spacing, least / 6.0)
