"""The whole case: its tables, and the checks that need more than one of them."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Literal, Self, TypeVar

from pydantic import (
    Discriminator,
    Field,
    PrivateAttr,
    Tag,
    ValidationError,
    ValidationInfo,
    field_validator,
    model_validator,
)

from bemwave.case.body import Body
from bemwave.case.faults import CaseFaults, Fault, faults_of, refuse
from bemwave.case.output import Frames, Gauge, Handoff
from bemwave.case.sea import Hump, Pressure, Wave, Wavemaker
from bemwave.case.together import faults_together
from bemwave.case.values import (
    AutoNotNegative,
    AutoPositive,
    Depth,
    FileName,
    Point,
    Positive,
    Region,
    Side,
    SizeOrDiameter,
    Table,
    Text,
)
from bemwave.case.writer import to_toml

Edge = Literal["absorb", "wall"]
_Filled = TypeVar("_Filled", Handoff, Frames)
SIDES: tuple[Side, ...] = ("x_min", "x_max", "y_min", "y_max")


class Water(Table):
    """[water]: `depth` in metres, infinite for "deep"; SI units."""

    depth: Depth
    density: Positive = 1025.0
    gravity: Positive = 9.80665
    current: Point = (0.0, 0.0)


class Edges(Table):
    """The four sides of a rectangle, each an open edge that absorbs or a wall."""

    x_min: Edge = "absorb"
    x_max: Edge = "absorb"
    y_min: Edge = "absorb"
    y_max: Edge = "absorb"


def _word_or_table(value: Any) -> str:
    return "<table>" if isinstance(value, dict | Edges) else "<word>"


class Surface(Table):
    """[surface]: the useful water, outside which the absorber is added, and its panels."""

    route: Literal["auto", "panels", "grid"] = "auto"
    outline: Literal["rectangle", "circle"] = "rectangle"
    centre: Point = (0.0, 0.0)
    size: SizeOrDiameter
    spacing: Positive
    fine_spacing: Positive | None = None
    edges: Annotated[
        Annotated[Edge, Tag("<word>")] | Annotated[Edges, Tag("<table>")],
        Discriminator(_word_or_table),
    ] = "absorb"
    absorber: AutoPositive = "auto"
    mesh: FileName | None = None

    @property
    def extent(self) -> tuple[float, float]:
        """The size along x and y, metres; a circle's diameter twice."""
        return self.size if isinstance(self.size, tuple) else (self.size, self.size)

    def edge(self, side: Side) -> Edge:
        """Whether a side is an open edge ("absorb") or a wall; a circle has one edge for all."""
        edge: Edge = getattr(self.edges, side) if isinstance(self.edges, Edges) else self.edges
        return edge

    @property
    def walls(self) -> tuple[Side, ...]:
        """The sides that are walls."""
        return tuple(side for side in SIDES if self.edge(side) == "wall")

    def contains(self, x: float, y: float) -> bool:
        """Whether (x, y) is in the useful water, its rim included."""
        dx, dy = x - self.centre[0], y - self.centre[1]
        if self.outline == "circle":
            return bool(dx * dx + dy * dy <= (self.extent[0] / 2) ** 2 * (1 + 1e-9))
        lx, ly = self.extent
        return abs(dx) <= lx / 2 * (1 + 1e-9) and abs(dy) <= ly / 2 * (1 + 1e-9)

    @model_validator(mode="after")
    def _check(self) -> Self:
        faults = []
        if self.outline == "circle" and isinstance(self.size, tuple):
            text = f"got {list(self.size)}, expected one number, the circle's diameter"
            faults.append(Fault(("size",), text))
        if self.outline == "rectangle" and not isinstance(self.size, tuple):
            text = f"got {self.size:g}, expected two numbers, [along x, along y]"
            faults.append(Fault(("size",), text))
        if self.outline == "circle" and isinstance(self.edges, Edges):
            text = 'got a side by side table, expected "absorb" or "wall" for a circle'
            faults.append(Fault(("edges",), text))
        if self.spacing > min(self.extent) / 2:
            text = f"got {self.spacing:g}, expected at most half the water's lesser side"
            faults.append(Fault(("spacing",), f"{text} ({min(self.extent) / 2:g})"))
        if self.fine_spacing is not None and self.fine_spacing > self.spacing:
            text = f"got {self.fine_spacing:g}, expected at most spacing ({self.spacing:g})"
            faults.append(Fault(("fine_spacing",), text))
        refuse(faults)
        return self


class RunSettings(Table):
    """[run]: how long and how; seconds. `memory_limit` in GB, `checkpoint_every` wall seconds."""

    duration: Positive
    step: AutoPositive = "auto"
    ramp: AutoNotNegative = "auto"
    record_every: Positive = Field(default_factory=lambda given: given["duration"] / 200)
    checkpoint_every: Positive = 60.0
    memory_limit: AutoPositive = "auto"
    history_region: Region | None = None
    precision: Literal["double", "single"] = "double"


class Case(Table):
    """All that a case file says, checked; the attributes are named as the file's tables and keys.

    Values stay as the file has them (degrees, metres), repeated tables are tuples, and what the
    file leaves out has its default. From Python, tables are given as dicts.

    Raises
    ------
    InputError
        If anything is wrong; the message names each key, what was given and what was expected.

    Examples
    --------
    >>> case = Case(
    ...     water={"depth": 10.0},
    ...     waves=[{"kind": "regular", "height": 0.2, "period": 3.0}],
    ...     surface={"size": [40.0, 20.0], "spacing": 1.0},
    ...     run={"duration": 30.0},
    ... )
    >>> case.waves[0].height
    0.2
    """

    title: Text = ""
    water: Water
    waves: tuple[Wave, ...] = ()
    surface: Surface
    wavemaker: tuple[Wavemaker, ...] = ()
    body: tuple[Body, ...] = ()
    hump: tuple[Hump, ...] = ()
    pressure: tuple[Pressure, ...] = ()
    run: RunSettings
    gauge: tuple[Gauge, ...] = ()
    handoff: tuple[Handoff, ...] = ()
    frames: Frames | None = None

    _folder: Path = PrivateAttr(default_factory=Path)
    _text: str = PrivateAttr(default="")

    def __init__(self, **tables: Any) -> None:
        try:
            super().__init__(**tables)
        except ValidationError as error:
            raise CaseFaults(faults_of(error, type(self)), tables) from None

    @property
    def folder(self) -> Path:
        """Where relative file names of the case start from."""
        return self._folder

    @property
    def files(self) -> tuple[str, ...]:
        """Names of the files that a run of the case reads, as the case has them, in order."""
        named = [wave.file for wave in self.waves] + [body.mesh for body in self.body]
        named += [body.motions_file for body in self.body]
        named += [self.surface.mesh] + [handoff.points for handoff in self.handoff]
        return tuple(sorted({str(name) for name in named if name is not None}))

    @property
    def solved_bodies(self) -> tuple[Body, ...]:
        """The bodies that the water flows round, in order."""
        return tuple(body for body in self.body if not body.rides)

    @property
    def riding_bodies(self) -> tuple[Body, ...]:
        """The bodies that ride the surface and make no waves, in order."""
        return tuple(body for body in self.body if body.rides)

    def placed(self, folder: Path) -> Self:
        """The same case, its relative file names starting from another folder."""
        case = self.model_copy()
        case._folder, case._text = folder, self._text
        return case

    @property
    def text(self) -> str:
        """The case as TOML: as it was read, or written from the values if made in Python."""
        return self._text or to_toml(self.model_dump(exclude_unset=True, exclude_none=True))

    @field_validator("gauge")
    @classmethod
    def _name_gauges(cls, gauges: tuple[Gauge, ...]) -> tuple[Gauge, ...]:
        return tuple(
            gauge if gauge.name else gauge.model_copy(update={"name": f"gauge{number}"})
            for number, gauge in enumerate(gauges, 1)
        )

    @field_validator("handoff")
    @classmethod
    def _fill_handoffs(
        cls, handoffs: tuple[Handoff, ...], info: ValidationInfo
    ) -> tuple[Handoff, ...]:
        run, surface = info.data.get("run"), info.data.get("surface")
        if run is None or surface is None:
            return handoffs  # those are at fault and told, so there is nothing to fill in from
        fine = surface.fine_spacing or surface.spacing / 2
        filled = []
        for number, handoff in enumerate(handoffs, 1):
            defaults = {"name": f"handoff{number}", "end": run.duration}
            if handoff.box is not None:
                defaults["spacing"] = (fine, fine)
            filled.append(_filled(handoff, defaults))
        return tuple(filled)

    @field_validator("frames")
    @classmethod
    def _fill_frames(cls, frames: Frames | None, info: ValidationInfo) -> Frames | None:
        run, surface = info.data.get("run"), info.data.get("surface")
        if frames is None or run is None or surface is None:
            return frames
        return _filled(frames, {"end": run.duration, "spacing": surface.spacing})

    @model_validator(mode="after")
    def _check(self) -> Self:
        refuse(faults_together(self))
        return self


def _filled(table: _Filled, defaults: dict[str, Any]) -> _Filled:
    missing = defaults.keys() - table.model_fields_set
    return table.model_copy(update={key: defaults[key] for key in missing})
