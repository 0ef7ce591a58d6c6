"""The bodies in the water: their shape, place, path and attitude."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import Field, field_validator, model_validator

from bemwave.case.faults import Fault, expecting, refuse
from bemwave.case.values import (
    FileName,
    Flag,
    Mode,
    Name,
    NotNegative,
    Number,
    Point,
    Point3,
    Positive,
    Radii,
    Table,
    Text,
    keys_for,
    not_negative,
    number,
    positive,
)

_csv = Field(strict=True, pattern=r"(?i)\.csv$")

Path = Annotated[
    Literal["fixed"] | Annotated[float, number] | Annotated[str, _csv],
    expecting('"fixed", a speed in m/s, or the name of a .csv file with t, x, y, heading'),
]
Attitude = Annotated[
    Literal["fixed", "forced", "floating", "follow"] | Annotated[str, _csv],
    expecting(
        '"fixed", "forced", "floating", "follow", or the name of a .csv file with t and six motions'
    ),
]
Draught = Annotated[
    Literal["bed"] | Annotated[float, positive],
    expecting('a number above 0, or for a cylinder "bed"'),
]
_number6 = Annotated[float, number]
_from_06 = Annotated[float, not_negative]
Six = Annotated[
    tuple[_number6, _number6, _number6, _number6, _number6, _number6],
    expecting("six numbers, surge to yaw"),
]
SixNotNegative = Annotated[
    tuple[_from_06, _from_06, _from_06, _from_06, _from_06, _from_06],
    expecting("six numbers of 0 or more, surge to yaw"),
]

_shape_keys = {
    "mesh": {"mesh", "scale", "up", "without", "draught", "trim", "heel"},
    "wigley": {"length", "beam", "draught", "thin"},
    "box": {"length", "beam", "draught"},
    "cylinder": {"radius", "draught"},
    "sphere": {"radius", "centre_depth"},
    "columns": {"spacing", "column_radius", "pontoon", "draught"},
}
_needed = {
    "mesh": (),
    "wigley": ("length", "beam", "draught"),
    "box": ("length", "beam", "draught"),
    "cylinder": ("radius", "draught"),
    "sphere": ("radius",),
    "columns": ("spacing", "column_radius", "pontoon", "draught"),
}  # fmt: skip


class Forced(Table):
    """A forced motion, amplitude sin(w t) times the ramp; metres or degrees, seconds."""

    mode: Mode
    amplitude: Number
    period: Positive


class Released(Table):
    """A floating body let go from an offset, metres or degrees."""

    mode: Mode
    offset: Number


class Body(Table):
    """One entry of [[body]]: a hull from a mesh file, or by formula (`form`).

    Lengths in metres, angles in degrees. A value is None where the file leaves it to be worked
    out from the hull: `panel_size`, `mass`, `centre_of_mass`, `radii_of_gyration`, and for a
    mesh `draught`.
    """

    name: Name
    mesh: FileName | None = None
    form: Literal["wigley", "box", "cylinder", "sphere", "columns"] | None = None
    length: Positive | None = None
    beam: Positive | None = None
    radius: Positive | None = None
    centre_depth: Number = 0.0
    spacing: Positive | None = None
    column_radius: Positive | None = None
    pontoon: Positive | None = None
    thin: Flag = False
    scale: Positive = 1.0
    up: Literal["x", "y", "z"] = "z"
    draught: Draught | None = None
    trim: Number = 0.0
    heel: Number = 0.0
    without: Annotated[tuple[Text, ...], expecting("a list of names of parts")] = ()
    position: Point = (0.0, 0.0)
    heading: Number = 0.0
    panel_size: Positive | None = None
    path: Path = "fixed"
    attitude: Attitude = "fixed"
    forced: Forced | None = None
    free: Annotated[tuple[Mode, ...], expecting("a list of modes, surge ... yaw")] | None = None
    mass: Positive | None = None
    centre_of_mass: Point3 | None = None
    radii_of_gyration: Radii | None = None
    stiffness: Six = (0.0, 0.0, 0.0, 0.0, 0.0, 0.0)
    damping: SixNotNegative = (0.0, 0.0, 0.0, 0.0, 0.0, 0.0)
    damping_ratio: Annotated[
        dict[Mode, NotNegative], expecting("a table of modes and ratios, { roll = 0.05 }")
    ] = Field(default_factory=dict)
    released: Released | None = None

    @field_validator("name")
    @classmethod
    def _not_a_part_of_the_water(cls, name: str) -> str:
        # these names belong to the other parts of the boundary mesh
        if name in ("water", "bed") or name.startswith("wall_"):
            refuse([Fault((), f'got "{name}", a name kept for the water, its bed and walls')])
        return name

    @property
    def shape(self) -> str:
        """The word for its shape: `mesh`, or the name of the form."""
        return self.form or "mesh"

    @property
    def rides(self) -> bool:
        """Whether it follows the surface and makes no waves: it is not in the solved boundary."""
        return self.attitude == "follow"

    @property
    def motions_file(self) -> str | None:
        """The name of the .csv file that moves it, or None."""
        return self.attitude if self.attitude.lower().endswith(".csv") else None

    @model_validator(mode="after")
    def _check(self) -> Self:
        if (self.mesh is None) == (self.form is None):
            given = "neither" if self.mesh is None else "both"
            refuse([Fault((), f"got {given} of mesh and form, expected one of them")])
        refuse([*self._shape_faults(), *self._motion_faults()])
        return self

    def _shape_faults(self) -> list[Fault]:
        owner = f'form = "{self.form}"' if self.form else "a body from a mesh file"
        others = set().union(*_shape_keys.values()) - _shape_keys[self.shape]
        refused = tuple(key for key in type(self).model_fields if key in others - {"mesh"})
        faults = keys_for(self, owner, _needed[self.shape], refused)
        if self.draught == "bed" and self.form != "cylinder":
            text = 'got "bed", which goes with form = "cylinder" alone, expected a number'
            faults.append(Fault(("draught",), text))
        if self.radius is not None and self.centre_depth <= -self.radius:
            text = f"got {self.centre_depth:g}, which lifts the sphere out of the water"
            faults.append(Fault(("centre_depth",), text))
        return faults

    def _motion_faults(self) -> list[Fault]:
        owner = f'attitude = "{self.attitude}"'
        needed = ("forced",) if self.attitude == "forced" else ()
        refused = {
            "forced": ("free", "released"),
            "floating": ("forced",),
        }.get(self.attitude, ("forced", "free", "released"))
        faults = keys_for(self, owner, needed, refused)
        if self.rides and self.draught == "bed":
            text = 'got "bed", and what rides the surface stands on nothing; expected a number'
            faults.append(Fault(("draught",), text))
        if self.free is not None and len(set(self.free)) < len(self.free):
            faults.append(Fault(("free",), f"names a mode twice: {', '.join(self.free)}"))
        return faults
