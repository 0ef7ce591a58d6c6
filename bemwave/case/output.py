"""What is taken from a run: gauges, hand-off boxes and points, frames for a renderer."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from bemwave.case.faults import Fault, expecting, refuse
from bemwave.case.values import (
    AutoPositive,
    FileName,
    Flag,
    Name,
    NotNegative,
    Number,
    Point,
    Point3,
    Positive,
    Region,
    Size,
    Spacing,
    Table,
    Whole,
    keys_for,
)

Axes = Annotated[
    str,
    Field(strict=True, pattern=r"^(earth|body:.+)$"),
    expecting('"earth", or "body:" and the name of a body'),
]


class Gauge(Table):
    """A wave gauge at [x, y]; with `body` it travels with it, with `deck` it tells the gap."""

    name: Name = ""
    position: Point
    body: Name | None = None
    deck: Number | None = None


class Box(Table):
    """A hand-off box: `centre` and `size` in plan, turned by `angle`, from `bottom` to `top`."""

    centre: Point = (0.0, 0.0)
    size: Size
    angle: Number = 0.0
    bottom: Number
    top: Number

    @model_validator(mode="after")
    def _check(self) -> Self:
        faults = []
        if self.top <= self.bottom:
            text = f"got {self.top:g}, expected a level above the bottom ({self.bottom:g})"
            faults.append(Fault(("top",), text))
        if self.bottom >= 0:
            text = f"got {self.bottom:g}, expected a level below still water (z = 0)"
            faults.append(Fault(("bottom",), text))
        refuse(faults)
        return self


class Place(Table):
    """The near-field solver's own coordinates: origin, heading (degrees), up axis, time zero."""

    origin: Point3 = (0.0, 0.0, 0.0)
    heading: Number = 0.0
    up: Literal["x", "y", "z"] = "z"
    time_zero: Number = 0.0


class Handoff(Table):
    """One entry of [[handoff]]: where, when and how the field is handed to a near-field solver.

    `name`, `spacing` (horizontal, vertical) and `end` are filled in from the case where the file
    leaves them out: handoff1, handoff2 ...; the finest spacing of the water's surface; the run's
    duration.
    """

    name: Name = ""
    box: Box | None = None
    points: FileName | None = None
    axes: Axes = "earth"
    velocity: Literal["earth", "relative"] = "earth"
    field: Literal["total", "incident", "parts"] = "total"
    spacing: Spacing = (0.0, 0.0)
    layout: Literal["points", "lattice"] = "points"
    every: AutoPositive = "auto"
    start: NotNegative = 0.0
    end: NotNegative = 0.0
    zone: NotNegative = 0.0
    volume_at_start: Flag = False
    crest: Literal["linear", "wheeler", "cut"] = "linear"
    average: Flag = False
    balance: Flag = False
    place: Place | None = None
    format: Literal["netcdf", "vtkhdf", "csv"] = "netcdf"

    @property
    def body(self) -> str | None:
        """The name of the body whose axes the box travels in, or None on earth."""
        return self.axes.removeprefix("body:") if self.axes != "earth" else None

    @model_validator(mode="after")
    def _check(self) -> Self:
        if (self.box is None) == (self.points is None):
            given = "neither" if self.box is None else "both"
            refuse([Fault((), f"got {given} of box and points, expected one of them")])
        faults = []
        if self.points is not None:
            box_keys = ("spacing", "layout", "zone", "volume_at_start", "average", "balance")
            faults += keys_for(self, "a list of points", (), box_keys)
        elif self.box is not None and self.zone > min(self.box.size) / 2:
            text = f"got {self.zone:g}, expected at most half the box's lesser side"
            faults.append(Fault(("zone",), f"{text} ({min(self.box.size) / 2:g})"))
        if self.velocity == "relative" and self.axes == "earth":
            text = 'got "relative" with axes = "earth", expected axes = "body:..." with it'
            faults.append(Fault(("velocity",), text))
        refuse(faults)
        return self


class Frames(Table):
    """The surface as meshes for a renderer.

    Filled in from the case: `end` and `spacing`.
    """

    fps: Positive = 24.0
    start: NotNegative = 0.0
    end: NotNegative = 0.0
    first_number: Whole = 1
    formats: Annotated[
        tuple[Literal["usd", "ply", "obj", "vtk", "glb"], ...],
        Field(min_length=1),
        expecting('a list of formats out of "usd", "ply", "obj", "vtk", "glb"'),
    ] = ("vtk",)
    region: Region | None = None
    spacing: Positive = 0.0
    detail: Flag = True
    horizontal_displacement: Flag = False
    shading: Flag = False
    waterline: Literal["skirt", "cut"] = "skirt"
    loop: NotNegative = 0.0
    displacement_maps: Flag = False

    @model_validator(mode="after")
    def _check(self) -> Self:
        if self.displacement_maps and (self.region is None or self.waterline == "cut"):
            given = "no region" if self.region is None else 'waterline = "cut"'
            text = f'got true with {given}, expected a region of squares: waterline = "skirt"'
            refuse([Fault(("displacement_maps",), text)])
        return self
