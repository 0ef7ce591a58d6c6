"""One way to write netCDF: CF attributes, units on everything, readable after any interruption.

A file is made complete beside its name and renamed into place. Records are gathered and written a
few at a time; between writes the file is closed, so that it is whole on disk and open to readers.
Each write puts the fields first and the times after them: a record whose time is missing is one
that an interruption cut short.
"""

from __future__ import annotations

import os
import time as clock
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from bemwave.errors import RunError

CONVENTIONS = "CF-1.11"
LEAP_SECONDS = "leap_seconds: none"
RECORDS_PER_WRITE = 8
SECONDS_PER_WRITE = 5.0
PATIENCE = 20.0  # seconds to wait for another program that holds the file


@dataclass(frozen=True)
class Variable:
    """A variable to be made: name, dimensions, units, what it is, and how it is stored.

    `fill` gives floats NaN as the value for "none here"; `attributes` adds to units and long_name.
    """

    name: str
    dimensions: tuple[str, ...]
    units: str
    long_name: str
    dtype: str = "f8"
    fill: bool = False
    attributes: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class Layout:
    """What a file of records holds.

    Attributes
    ----------
    dimensions : sizes by name; `time` is added and unlimited.
    fixed : variables without time, each with its values.
    series : variables that grow with time; their first dimension is `time`.
    attributes : global attributes.
    """

    dimensions: Mapping[str, int]
    fixed: Sequence[tuple[Variable, Any]]
    series: Sequence[Variable]
    attributes: Mapping[str, Any]


class SeriesFile:
    """A netCDF-4 file that grows by records.

    Parameters
    ----------
    path : Path
    layout : Layout
    keep : int, optional
        How many records of an earlier, interrupted writing to keep and go on after; by default
        the file is made anew.

    Raises
    ------
    RunError
        If the file cannot be written, or holds fewer records than are to be kept.

    Examples
    --------
    >>> rate = Variable("flow", ("time",), "m3 s-1", "flow through the gate")
    >>> with SeriesFile(path, Layout({}, [], [rate], {})) as out:   # doctest: +SKIP
    ...     out.append(0.0, {"flow": 2.5})
    """

    def __init__(self, path: Path, layout: Layout, keep: int | None = None) -> None:
        self.path = path
        self._series = {v.name: v for v in layout.series}
        self._pending: list[tuple[float, Mapping[str, Any]]] = []
        self._written = 0 if keep is None else keep
        self._last_write = clock.monotonic()
        if keep is None:
            _create(path, layout)
        else:
            _require_records(path, keep)

    @property
    def count(self) -> int:
        """Number of records given so far."""
        return self._written + len(self._pending)

    def append(self, time: float, values: Mapping[str, Any]) -> None:
        """Add a record at `time`, s, with a value for every variable of the series."""
        if values.keys() != self._series.keys():
            raise ValueError(f"{self.path.name} takes {sorted(self._series)}: got {sorted(values)}")
        self._pending.append((time, {k: np.array(v) for k, v in values.items()}))
        waited = clock.monotonic() - self._last_write
        if len(self._pending) >= RECORDS_PER_WRITE or waited > SECONDS_PER_WRITE:
            self.flush()

    def flush(self) -> None:
        """Put every record given so far on the disk and close the file."""
        if not self._pending:
            return
        here = slice(self._written, self.count)
        with open_patiently(self.path, "a") as file:
            for name in self._series:
                file[name][here] = np.stack([values[name] for _, values in self._pending])
            file.sync()
            file["time"][here] = np.array([time for time, _ in self._pending])
        self._written = self.count
        self._pending.clear()
        self._last_write = clock.monotonic()

    def close(self) -> None:
        """Write what is pending; the object is not used after that."""
        self.flush()

    def __enter__(self) -> SeriesFile:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()


def open_patiently(path: Path, mode: Literal["r", "a"]) -> Any:
    """Open a netCDF file, waiting a little while another program has it locked."""
    import netCDF4

    give_up = clock.monotonic() + PATIENCE
    while True:
        try:
            return netCDF4.Dataset(path, mode)
        except OSError as error:
            if not path.exists() or clock.monotonic() > give_up:
                raise RunError(
                    f"{path} could not be opened ({error}); expected a netCDF file that no other "
                    "program holds open: close it there, then resume the run"
                ) from error
            clock.sleep(0.05)


def complete_records(file: Any) -> int:
    """How many records of an open file are complete: those up to the first missing time."""
    missing = np.ma.getmaskarray(file["time"][:])
    return int(np.argmax(missing)) if missing.any() else len(missing)


def read_times(file: Any) -> NDArray[np.float64]:
    """Times of the complete records of an open file, s."""
    return np.asarray(file["time"][: complete_records(file)], dtype=np.float64)


def _require_records(path: Path, keep: int) -> None:
    with open_patiently(path, "r") as file:
        found = complete_records(file)
    if found < keep:
        raise RunError(
            f"{path} holds {found} complete records; the checkpoint was made after {keep}: "
            "the file was changed since; start the run again"
        )


def _create(path: Path, layout: Layout) -> None:
    import netCDF4

    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_name(path.name + ".part")
    with netCDF4.Dataset(beside, "w", format="NETCDF4") as file:
        file.setncatts({"Conventions": CONVENTIONS, **layout.attributes})
        for name, size in layout.dimensions.items():
            file.createDimension(name, size)
        if layout.series:
            file.createDimension("time", None)
            _make_time(file)
        for variable, values in layout.fixed:
            _make(file, variable)[:] = values
        for variable in layout.series:
            _make(file, variable)
    os.replace(beside, path)


def _make_time(file: Any) -> None:
    time = file.createVariable("time", "f8", ("time",), chunksizes=(512,))
    time.units = "s"
    time.long_name = "time since the start of the run"
    time.units_metadata = LEAP_SECONDS


def _make(file: Any, variable: Variable) -> Any:
    """Create a variable, compressed where it is large; a chunk holds one write of a series."""
    if variable.dtype == "str":
        made = file.createVariable(variable.name, str, variable.dimensions)
    else:
        sizes = [len(file.dimensions[name]) for name in variable.dimensions]
        series = variable.dimensions[:1] == ("time",)
        chunks = [RECORDS_PER_WRITE, *(max(n, 1) for n in sizes[1:])] if series else None
        made = file.createVariable(
            variable.name,
            variable.dtype,
            variable.dimensions,
            fill_value=np.nan if variable.fill else None,
            chunksizes=chunks,
            compression="zlib" if variable.dimensions else None,
            complevel=1,
            shuffle=True,
        )
    made.units = variable.units
    made.long_name = variable.long_name
    made.setncatts(dict(variable.attributes))
    return made
