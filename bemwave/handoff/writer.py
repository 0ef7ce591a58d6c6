"""handoff/NAME.nc: the file a near-field solver reads its boundary from."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from bemwave import __version__
from bemwave.handoff.box import FACES, Array, PointSet
from bemwave.handoff.closure import ClosureInstant
from bemwave.handoff.divergence import DivergenceInstant
from bemwave.handoff.netcdf import Layout, SeriesFile, Variable
from bemwave.handoff.placing import Axes
from bemwave.handoff.sampler import Instant, Values
from bemwave.waves.crest import CrestRule

CAUTION = (
    "Linear potential theory: no breaking, no viscosity, no drift. Not for design or operations "
    "without qualified practice and the codes that apply."
)
PRESSURE_NOTE = (
    "dynamic pressure -rho d(potential)/dt up to still water, rho g elevation between still water "
    "and a crest; the quadratic term -rho/2 |velocity|^2 is left out"
)
CREST_NOTES = {
    "linear": "above still water f(z) = f(0) + z df/dz(0)",
    "cut": "above still water f(z) = f(0)",
    "wheeler": "velocities of a column at h (z - elevation)/(h + elevation) (Wheeler 1970)",
}
ZONE_STRENGTH = 3.5  # damping rate at the sides times the peak period
_STANDARD_NAMES = {
    "u": "sea_water_x_velocity",
    "v": "sea_water_y_velocity",
    "w": "upward_sea_water_velocity",
}


@dataclass(frozen=True)
class Terms:
    """What the file says about itself.

    Attributes
    ----------
    case_text : the case.
    crest : rule above still water.
    every : s between instants.
    shortest_period, peak_period : s, of what the field holds.
    """

    case_text: str
    crest: CrestRule
    every: float
    shortest_period: float
    peak_period: float

    @property
    def interpolation_error(self) -> float:
        """Error of linear interpolation between instants, (w dt)^2/8 of the shortest waves."""
        return (2 * math.pi / self.shortest_period * self.every) ** 2 / 8


class HandoffFile:
    """Writes one hand-off, instant by instant.

    Parameters
    ----------
    path : Path
    times : (n,) s of the run, of all instants that will be.
    points : PointSet
    axes : Axes
        Those the file speaks in.
    terms : Terms
    parts : bool
        Whether the incident part is written beside the total.
    balanced : bool
        Whether closure and divergence are told: for the faces of a box.
    keep : int, optional
        Instants of an interrupted run to keep.
    """

    def __init__(
        self,
        path: Path,
        times: Array,
        points: PointSet,
        axes: Axes,
        terms: Terms,
        parts: bool = False,
        balanced: bool = False,
        keep: int | None = None,
    ) -> None:
        self._axes, self._parts, self._balanced = axes, parts, balanced
        layout = Layout(
            dimensions={"point": len(points.points), "column": len(points.columns)},
            fixed=_places(points, axes, terms.peak_period),
            series=[
                *_series(axes),
                *(_series(axes, "_incident") if parts else []),
                _wet,
                *(_balance if balanced else []),
            ],
            attributes=_attributes(axes, terms),
            times=times - axes.time_zero,
        )
        self._file = SeriesFile(path, layout, keep)

    @property
    def count(self) -> int:
        """Number of instants given so far."""
        return self._file.count

    def append(
        self,
        instant: Instant,
        closure: ClosureInstant | None = None,
        divergence: DivergenceInstant | None = None,
    ) -> None:
        """Add an instant; closure and divergence where the file tells them."""
        values = {"wet": instant.wet, **self._fields(instant.total)}
        if self._parts and instant.incident is not None:
            values |= self._fields(instant.incident, "_incident")
        if self._balanced and closure is not None and divergence is not None:
            values |= {
                "net_flux": closure.net_flux,
                "volume_rate": closure.volume_rate,
                "largest_face_flux": closure.largest_face_flux,
                "wet_excess": closure.wet_excess,
                "level_drift": closure.level_drift,
                "cell_net_flux": divergence.net_flux,
                "cell_face_flux": divergence.face_flux,
            }
        self._file.append(instant.time - self._axes.time_zero, values)

    def flush(self) -> None:
        """Put every instant given so far on the disk."""
        self._file.flush()

    def _fields(self, values: Values, ending: str = "") -> dict[str, Any]:
        u, v, w = self._axes.vectors(values.velocity).T
        fields = {"u": u, "v": v, "w": w, "p": values.pressure, "elevation": values.elevation}
        return {name + ending: field for name, field in fields.items()}


def _places(points: PointSet, axes: Axes, peak_period: float) -> list[tuple[Variable, Any]]:
    """Variables that do not change: where the points are and what they stand for."""
    place, normal = axes.points(points.points), axes.vectors(points.normals)
    foot = axes.points(np.column_stack([points.columns, np.zeros(len(points.columns))]))
    made: list[tuple[Variable, Any]] = [
        (Variable(name, ("point",), "m", f"{name} of the point"), place[:, k])
        for k, name in enumerate("xyz")
    ]
    made += [
        (
            Variable(f"n{name}", ("point",), "1", f"{name} of the face's outward normal"),
            normal[:, k],
        )
        for k, name in enumerate("xyz")
    ]
    flags: Mapping[str, Any] = {
        "flag_values": np.arange(len(FACES), dtype=np.int8),
        "flag_meanings": " ".join(FACES),
    }
    face = Variable("face", ("point",), "1", "where the point lies", "i1", attributes=flags)
    rate = ZONE_STRENGTH / peak_period * points.zone_weight
    made += [
        (face, points.face),
        (Variable("area", ("point",), "m2", "area of the face's cell"), points.area),
        (Variable("zone_weight", ("point",), "1", _WEIGHT), points.zone_weight),
        (Variable("zone_rate", ("point",), "s-1", _RATE), rate),
        (Variable("column_index", ("point",), "1", "the point's column", "i4"), points.column),
    ]
    # with another axis up than z the third coordinate of a column is not constant
    names = "xy" if axes.up == "z" else "xyz"
    return made + [
        (Variable(f"column_{n}", ("column",), "m", f"{n} of the column at still water"), foot[:, k])
        for k, n in enumerate(names)
    ]


_WEIGHT = "weight in the transition zone: (1 - distance inside the side / zone width)^2"
_RATE = f"damping rate for elevation and velocity alike: {ZONE_STRENGTH:g}/peak period times weight"


def _series(axes: Axes, ending: str = "") -> list[Variable]:
    part = "of the incident waves" if ending else "of the water"
    made = []
    for name, axis in zip("uvw", "xyz", strict=True):
        standard = {"standard_name": _STANDARD_NAMES[name]} if axes.up == "z" and not ending else {}
        made.append(_field(name + ending, "m s-1", f"velocity {part} along {axis}", standard))
    made.append(_field("p" + ending, "Pa", f"dynamic pressure {part}", {"comment": PRESSURE_NOTE}))
    elevation = f"elevation {part} above still water"
    foot = {"coordinates": "column_x column_y" + ("" if axes.up == "z" else " column_z")}
    place = ("time", "column")
    made.append(Variable("elevation" + ending, place, "m", elevation, attributes=foot))
    return made


def _field(name: str, units: str, long_name: str, more: Mapping[str, str]) -> Variable:
    places = {"coordinates": "x y z", **more}
    return Variable(name, ("time", "point"), units, long_name, attributes=places)


_wet = Variable(
    "wet",
    ("time", "point"),
    "1",
    "fraction of the point's cell under the surface; where 0, u v w p are fill values",
    attributes={"coordinates": "x y z"},
)
_balance = [
    Variable("net_flux", ("time",), "m3 s-1", "flux out of all faces up to still water"),
    Variable("volume_rate", ("time",), "m3 s-1", "growth of the volume under the surface"),
    Variable("largest_face_flux", ("time",), "m3 s-1", "largest flux through one face, in size"),
    Variable(
        "wet_excess",
        ("time",),
        "m3 s-1",
        "flux out of the wet cells, crests counted and troughs not, less net_flux: second order",
    ),
    Variable("level_drift", ("time",), "m s-1", "rise of the mean level that wet_excess implies"),
    Variable("cell_net_flux", ("time",), "m3 s-1", "largest net flux of the small cells tried"),
    Variable("cell_face_flux", ("time",), "m3 s-1", "largest flux through a face of those cells"),
]


def _attributes(axes: Axes, terms: Terms) -> dict[str, Any]:
    return {
        "title": "Water velocity, pressure and elevation for a near-field solver",
        "source": f"bemwave {__version__}, linear potential theory",
        "case": terms.case_text,
        "sign_convention": "normals nx ny nz point out of the box; fluxes are positive outward",
        "crest_rule": terms.crest,
        "crest_rule_meaning": CREST_NOTES[terms.crest],
        "pressure": PRESSURE_NOTE,
        "interval_s": terms.every,
        "shortest_period_kept_s": terms.shortest_period,
        "peak_period_s": terms.peak_period,
        "linear_interpolation_error": terms.interpolation_error,
        "linear_interpolation_error_meaning": "(w dt)^2/8 of the shortest waves kept",
        "axes_origin_on_earth_m": np.array(axes.origin),
        "axes_heading_on_earth_degrees": math.degrees(axes.heading),
        "axes_up": axes.up,
        "time_zero_s": axes.time_zero,
        "closure": "net_flux + volume_rate, largest over time, over the largest largest_face_flux",
        "caution": CAUTION,
    }
