"""manifest.json: what ran, with which versions, inputs and threads, on which route and why."""

from __future__ import annotations

import hashlib
import json
import math
import platform
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass, field, replace
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from typing import Any, Literal

from bemwave import __version__
from bemwave.errors import InputError
from bemwave.geometry.hull import Hull, place_hull
from bemwave.geometry.pose import on_earth
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.records.folder import write_whole

Status = Literal["running", "finished", "interrupted", "failed"]
_PERIODS = ("shortest_period", "peak_period")
_SUM = "sha256"  # of the rest of the manifest
_LIBRARIES = ("numpy", "scipy", "numba", "netCDF4", "pydantic")


@dataclass(frozen=True)
class Rest:
    """Where a body rests: its origin on earth, m, its heading, rad, its centre of mass in it, m."""

    position: Sequence[float]
    heading: float
    centre_of_mass: Sequence[float]

    @classmethod
    def of(cls, hull: Hull) -> Rest:
        """Where a hull rests."""
        x, y = hull.place.shift[:2].tolist()
        return cls([x, y], hull.heading, hull.centre_of_mass.tolist())

    def hull(self, name: str, wetted: SurfaceMesh) -> Hull:
        """The hull of a wetted mesh on earth that rests here."""
        x, y = self.position
        level = wetted.with_points(on_earth((x, y), self.heading).back(wetted.points))
        return place_hull(
            name,
            level,
            position=(x, y),
            heading=self.heading,
            centre_of_mass=self.centre_of_mass,
        )


@dataclass(frozen=True)
class Manifest:
    """Content of manifest.json.

    Attributes
    ----------
    versions : of bemwave, Python and the libraries the numbers depend on.
    inputs : SHA-256 of each input file, by its name in the case.
    threads : number of threads of the kernels.
    route, reason : the route taken, and why.
    closed : whether walls close the water.
    mirrors : walls that are images, as (axis, position) pairs.
    sheet : west and south corner, spacing [m] and shape of the grid, on that route.
    part_names : names of the parts of mesh.vtp, in order.
    bodies : where each body that the water flows round rests, by name; see `Rest`.
    riders : the same of those that ride the surface.
    shortest_period, peak_period : s, of what the field holds.
    status : how far the run is.
    started, ended : times of day, UTC.
    files : SHA-256 of each file of a finished run, by its name in the folder.
    notes : anything else worth keeping; values that JSON can hold.
    """

    inputs: Mapping[str, str]
    threads: int
    route: str
    reason: str
    closed: bool
    mirrors: tuple[tuple[str, float], ...]
    part_names: tuple[str, ...]
    shortest_period: float
    peak_period: float
    sheet: Mapping[str, Any] | None = None
    bodies: Mapping[str, Rest] = field(default_factory=dict)
    riders: Mapping[str, Rest] = field(default_factory=dict)
    status: Status = "running"
    versions: Mapping[str, str] = field(default_factory=lambda: versions_now())
    started: str = field(default_factory=lambda: now())
    ended: str | None = None
    files: Mapping[str, str] = field(default_factory=dict)
    notes: Mapping[str, Any] = field(default_factory=dict)

    def with_status(self, status: Status) -> Manifest:
        """Return the manifest of the same run further on; all but "running" end it."""
        return replace(self, status=status, ended=None if status == "running" else now())


def write_manifest(manifest: Manifest, path: Path) -> None:
    """Write manifest.json; at every moment the old or the new one is there, whole."""
    content = asdict(manifest)
    for period in _PERIODS:  # JSON has no infinity; null stands for it
        content[period] = content[period] if math.isfinite(content[period]) else None
    content[_SUM] = _sum_of(content)
    text = json.dumps(content, indent=2, allow_nan=False) + "\n"
    write_whole(path, text.encode("utf-8"))


def _sum_of(content: Mapping[str, Any]) -> str:
    """SHA-256 of all else that a manifest says."""
    told = {key: value for key, value in content.items() if key != _SUM}
    text = json.dumps(told, sort_keys=True, allow_nan=False)
    return hashlib.sha256(text.encode("utf-8")).hexdigest()


def read_manifest(path: Path) -> Manifest:
    """Read manifest.json.

    Raises
    ------
    InputError
        If it is missing or damaged.
    """
    try:
        content = json.loads(path.read_text(encoding="utf-8"))
        if content[_SUM] != _sum_of(content):
            raise ValueError("its checksum is another")
        del content[_SUM]
        content["mirrors"] = tuple((axis, float(place)) for axis, place in content["mirrors"])
        content["part_names"] = tuple(content["part_names"])
        for period in _PERIODS:
            content[period] = math.inf if content[period] is None else content[period]
        for group in ("bodies", "riders"):
            rests = content.get(group, {})
            content[group] = {name: Rest(**rest) for name, rest in rests.items()}
        return Manifest(**content)
    except FileNotFoundError:
        raise InputError(
            f"{path.parent} holds no run ({path.name} is missing); expected a folder that "
            "`bemwave run` made: check its name"
        ) from None
    except (ValueError, TypeError, KeyError, AttributeError, RecursionError) as error:
        raise InputError(
            f"{path} is damaged ({error}); expected what `bemwave run` wrote: run the case again"
        ) from error


def versions_now() -> dict[str, str]:
    """Versions of what the numbers depend on."""
    here = {"bemwave": __version__, "python": platform.python_version()}
    return here | {name: version(name) for name in _LIBRARIES}


def now() -> str:
    """Time of day, UTC, to the second."""
    return datetime.now(UTC).isoformat(timespec="seconds")
