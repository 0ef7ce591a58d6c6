"""The kinds of value a case file holds, each with the words that say what was expected."""

from __future__ import annotations

import math
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field

from bemwave.case.faults import LARGEST, SMALLEST, Fault, expecting

number = Field(strict=True, allow_inf_nan=False, ge=-LARGEST, le=LARGEST)
positive = Field(strict=True, allow_inf_nan=False, ge=SMALLEST, le=LARGEST)
not_negative = Field(strict=True, allow_inf_nan=False, ge=0, le=LARGEST)


def _deep(value: Any) -> Any:
    endless = isinstance(value, int | float) and value > LARGEST
    return math.inf if value == "deep" or endless else value


def _pair(value: Any) -> Any:
    # one number stands for both directions
    return (value, value) if isinstance(value, int | float) else value


Number = Annotated[float, number, expecting("a number")]
Positive = Annotated[float, positive, expecting("a number above 0")]
NotNegative = Annotated[float, not_negative, expecting("a number of 0 or more")]
Count = Annotated[
    int, Field(strict=True, ge=1, le=10**5), expecting("a whole number from 1 to 100000")
]
Whole = Annotated[
    int, Field(strict=True, ge=0, le=10**9), expecting("a whole number from 0 to 1000000000")
]
Flag = Annotated[bool, Field(strict=True), expecting("true or false")]
Text = Annotated[str, Field(strict=True), expecting("a text in quotes")]
FileName = Annotated[str, Field(strict=True, min_length=1), expecting("the name of a file")]
Name = Annotated[
    str,
    Field(strict=True, pattern=r"^[A-Za-z0-9][A-Za-z0-9_-]*$", max_length=100),
    expecting("a name of letters, digits, - and _, 100 at most (it names files)"),
]

Depth = Annotated[
    float,
    Field(strict=True, ge=SMALLEST),
    BeforeValidator(_deep),
    expecting('a number above 0 in metres, or "deep"'),
]
AutoPositive = Annotated[
    Literal["auto"] | Annotated[float, positive], expecting('a number above 0, or "auto"')
]
AutoNotNegative = Annotated[
    Literal["auto"] | Annotated[float, not_negative],
    expecting('a number of 0 or more, or "auto"'),
]
Point = Annotated[
    tuple[Annotated[float, number], Annotated[float, number]], expecting("two numbers [x, y]")
]
Point3 = Annotated[
    tuple[Annotated[float, number], Annotated[float, number], Annotated[float, number]],
    expecting("three numbers [x, y, z]"),
]
Focus = Annotated[
    tuple[Annotated[float, number], Annotated[float, number], Annotated[float, number]],
    expecting("three numbers [x, y, t]"),
]
Size = Annotated[
    tuple[Annotated[float, positive], Annotated[float, positive]],
    expecting("two numbers above 0, [along x, along y]"),
]
SizeOrDiameter = Annotated[
    Annotated[float, positive] | tuple[Annotated[float, positive], Annotated[float, positive]],
    expecting("two numbers above 0, [along x, along y], or for a circle its diameter"),
]
Spacing = Annotated[
    tuple[Annotated[float, positive], Annotated[float, positive]],
    BeforeValidator(_pair),
    expecting("a number above 0, or two, [horizontal, vertical]"),
]
Radii = Annotated[
    tuple[Annotated[float, positive], Annotated[float, positive], Annotated[float, positive]],
    expecting("three numbers above 0, [about x, about y, about z]"),
]
Mode = Literal["surge", "sway", "heave", "roll", "pitch", "yaw"]
Side = Literal["x_min", "x_max", "y_min", "y_max"]


class Table(BaseModel):
    """A table of the case file: its keys are fixed and its values do not change."""

    model_config = ConfigDict(frozen=True, extra="forbid")


class Region(Table):
    """A rectangle of the water's plane: `centre` and `size` in metres."""

    centre: Point = (0.0, 0.0)
    size: Size


def keys_for(
    table: Table, owner: str, needed: tuple[str, ...], refused: tuple[str, ...]
) -> list[Fault]:
    """The faults of a table whose keys depend on one of its values.

    Parameters
    ----------
    table : Table
        The table, each key of it sound by itself.
    owner : str
        What the keys depend on, for the message: `kind = "regular"`.
    needed, refused : tuple of str
        Keys that must be there, and keys that must not.
    """
    given = table.model_fields_set
    faults = [Fault((key,), f"missing; {owner} needs it") for key in needed if key not in given]
    return faults + [
        Fault((key,), f"not a key for {owner}; take it out") for key in refused if key in given
    ]
