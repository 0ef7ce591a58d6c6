"""What disturbs the water: incident waves, wavemakers, humps, pressure patches."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from bemwave.case.faults import Fault, expecting, refuse
from bemwave.case.values import (
    Count,
    FileName,
    Flag,
    Focus,
    NotNegative,
    Number,
    Point,
    Positive,
    Side,
    Table,
    keys_for,
    not_negative,
)

SpectrumName = Literal["jonswap", "pierson-moskowitz", "tma"]
Band = Annotated[
    tuple[Annotated[float, not_negative], Annotated[float, not_negative]],
    expecting("two numbers of 0 or more, [lowest, highest], in peak frequencies"),
]
Seed = Annotated[
    int, Field(strict=True, ge=0, lt=2**64), expecting("a whole number from 0 to 2^64 - 1")
]

_drawn = ("spreading", "components", "seed", "random_amplitudes")
_keys = {
    "regular": {"height", "period", "heading", "phase"},
    "pierson-moskowitz": {"height", "period", "heading", "band", *_drawn},
    "jonswap": {"height", "period", "heading", "band", "peakedness", *_drawn},
    "tma": {"height", "period", "heading", "band", "peakedness", *_drawn},
    "group": {
        "height", "period", "heading", "band", "peakedness", "spectrum", "focus",
        "spreading", "components", "seed",
    },
    "table": {"file", "height", "period", "heading", "band", *_drawn},
}  # fmt: skip
_needed = {"table": ("file",), "group": ("height", "period", "spectrum", "focus")}


class Wave(Table):
    """One entry of [[waves]]: a regular wave, a spectrum, a focused group or a table.

    `height` is crest to trough for a regular wave, significant for a spectrum, the crest's for
    a group; `period` is the peak's for a spectrum. Angles in degrees. Which keys go with which
    `kind` is checked; only a table may go without `height` and `period`.
    """

    kind: Literal["regular", "jonswap", "pierson-moskowitz", "tma", "group", "table"]
    height: Positive | None = None
    period: Positive | None = None
    heading: Number = 0.0
    phase: Number = 0.0
    peakedness: Positive = 3.3
    spreading: NotNegative | None = None
    components: Count = 1000
    seed: Seed = 1
    band: Band | None = None
    random_amplitudes: Flag = False
    spectrum: SpectrumName | None = None
    focus: Focus | None = None
    file: FileName | None = None

    @model_validator(mode="after")
    def _check(self) -> Self:
        allowed = _keys[self.kind] | {"kind"}
        refused = tuple(key for key in type(self).model_fields if key not in allowed)
        needed = _needed.get(self.kind, ("height", "period"))
        faults = keys_for(self, f'kind = "{self.kind}"', needed, refused)
        if self.band is not None and self.band[0] >= self.band[1]:
            text = f"got {list(self.band)}, expected the lowest before the highest"
            faults.append(Fault(("band",), text))
        refuse(faults)
        return self


class Wavemaker(Table):
    """A wall that moves: `stroke` in metres from end to end, at still water for a flap."""

    side: Side
    kind: Literal["piston", "flap"]
    stroke: Positive
    period: Positive


class Hump(Table):
    """A mound of water let go at rest: height exp(-r^2/(2 width^2)), metres."""

    height: Number
    width: Positive
    centre: Point = (0.0, 0.0)


class Pressure(Table):
    """A Gaussian pressure patch, `head` in metres of water, at `centre` at t = 0, m/s."""

    head: Number
    width: Positive
    centre: Point = (0.0, 0.0)
    velocity: Point = (0.0, 0.0)
